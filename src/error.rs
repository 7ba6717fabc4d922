//! Why there is no result. Each room states its own reasons; this enum gathers them, and says which
//! exit code they deserve.

use crate::{
    bench::BenchError, calibration::CalibrationError, fit::FitError, lattice::LatticeError, measure::MeasureError, photo::PhotoError,
    quantity::QuantityError, spots::SpotError, target::TargetError,
};

/// Everything that can stop a measurement. The message names the value seen and what to do.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// A quantity could not be read.
    #[error(transparent)]
    Quantity(#[from] QuantityError),
    /// The bench file says something that cannot be used.
    #[error(transparent)]
    Bench(#[from] BenchError),
    /// A calibration cannot be read, or does not belong to photo and bench file.
    #[error(transparent)]
    Calibration(#[from] CalibrationError),
    /// The photo cannot be decoded or is of no use.
    #[error(transparent)]
    Photo(#[from] PhotoError),
    /// The photo shows no usable spots.
    #[error(transparent)]
    Spots(#[from] SpotError),
    /// The spots form no lattice.
    #[error(transparent)]
    Lattice(#[from] LatticeError),
    /// The dot target cannot be read.
    #[error(transparent)]
    Target(#[from] TargetError),
    /// Photos and bench file do not go together, or do not suffice.
    #[error(transparent)]
    Measure(#[from] MeasureError),
    /// The fit cannot fix the pitch.
    #[error(transparent)]
    Fit(#[from] FitError),
}

impl Error {
    /// Short machine-readable name of the reason, stable between versions.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::Quantity(_) => "quantity",
            Self::Bench(BenchError::Calibration(error)) => error.code(),
            Self::Bench(_) => "bench-file",
            Self::Calibration(error) => error.code(),
            Self::Photo(_) => "photo",
            Self::Spots(_) => "no-spots",
            Self::Lattice(_) => "no-lattice",
            Self::Target(_) => "target",
            Self::Measure(error) => error.code(),
            Self::Fit(_) => "fit",
        }
    }

    /// Whether the input could not be used at all (wrong file, wrong bench file), as opposed to a photo that honestly shows nothing.
    #[must_use]
    pub fn is_unusable_input(&self) -> bool {
        match self {
            Self::Quantity(_) | Self::Bench(_) | Self::Photo(_) => true,
            Self::Measure(error) => error.is_unusable_input(),
            Self::Calibration(error) => error.is_unusable_input(),
            Self::Spots(_) | Self::Lattice(_) | Self::Target(_) | Self::Fit(_) => false,
        }
    }
}
