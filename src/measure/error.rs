//! Why there is no measurement, and which file is to blame.

use crate::Error;

/// A measurement that was refused.
#[derive(Debug, thiserror::Error)]
#[error("{}{error}", file.as_ref().map(|file| format!("{file}: ")).unwrap_or_default())]
pub struct Refusal {
    /// Name of the photo that is to blame, if it is one photo.
    pub file: Option<String>,
    /// Why.
    pub error: Box<Error>,
}

impl<E: Into<Error>> From<E> for Refusal {
    fn from(error: E) -> Self {
        Self { file: None, error: Box::new(error.into()) }
    }
}

/// Why the photos, taken together with the bench file, give no result.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum MeasureError {
    /// No photo of the pattern was given.
    #[error("no photo of the pattern; name one on the command line or as [[photo]] in the bench file")]
    NoPhoto,
    /// Pattern and target photo differ in size.
    #[error(
        "the photos differ in size ({}x{} and {}x{} px), so they do not share one camera setting; take pattern and target with the same camera, zoom and position",
        first[0], first[1], other[0], other[1]
    )]
    SizesDiffer {
        /// Width and height of the first photo of the pattern.
        first: [usize; 2],
        /// Width and height of the odd one.
        other: [usize; 2],
    },
    /// The sheet may lie lengthwise or upright.
    #[error(
        "the sheet looks as if it lay lengthwise or upright alike, so oblique is the camera to it; photograph it more square-on, \
         state [camera] focal_length, or state its corners as [target] marks"
    )]
    SheetEitherWay,
    /// No camera sees the print as it appears.
    #[error(
        "no camera can see the target's points as they lie in the photo; check that marks and pixels belong together, in the order right, up"
    )]
    NoPose,
    /// The lattice found has no area.
    #[error("the fit collapsed to a lattice without area; restrict [sample] pattern to \"line\" or check the spots in the overlay")]
    FlatLattice,
    /// The spots do not lie on the lattice that was found.
    #[error(
        "the spots lie {rms_px:.1} px (rms) off the best lattice, whose orders are {spacing_px:.1} px apart: this is no single lattice seen on a flat screen; \
         check the overlay for parts that do not belong together, and that the camera's lean is stated"
    )]
    Irregular {
        /// Root mean square distance of the used spots from the model, px.
        rms_px: f64,
        /// Distance of neighbouring orders in the middle of the pattern, px.
        spacing_px: f64,
    },
    /// Nothing in photo and bench file fixes the pitch.
    #[error(
        "photo and bench file do not fix the pitch (best {:.4} um, standard uncertainty {:.4} um): {advice}",
        pitch_m * 1e6, u_m * 1e6
    )]
    PitchNotFixed {
        /// Pitch, m.
        pitch_m: f64,
        /// Standard uncertainty, m.
        u_m: f64,
        /// What it is tied to, and what to measure.
        advice: String,
    },
    /// The stated wavelength is not the colour of the spots.
    #[error(
        "the stated wavelength {:.1} nm is {stated}, the spots in the photo are {seen} (red {:.0} %, green {:.0} %, blue {:.0} %); check [laser] wavelength",
        wavelength_m * 1e9, shares[0] * 100.0, shares[1] * 100.0, shares[2] * 100.0
    )]
    ColourMismatch {
        /// Stated wavelength, m.
        wavelength_m: f64,
        /// Its colour in words.
        stated: &'static str,
        /// Colour of the spots in words.
        seen: &'static str,
        /// Shares of red, green, blue.
        shares: [f64; 3],
    },
    /// Hardly any trial of the Monte Carlo gave a lattice.
    #[error(
        "the Monte Carlo of {most} trials gave no distribution: the fit fails on most redrawn inputs; state throw, tilt and target more closely"
    )]
    TrialsFailed {
        /// Trials asked for.
        most: usize,
    },
    /// The air stated in the bench file is outside the formula.
    #[error("the index of air is not defined for {temperature_celsius:.1} degC, {:.0} hPa, {:.0} % humidity; check [air]", pressure_pa / 100.0, humidity * 100.0)]
    AirOutOfRange {
        /// Temperature.
        temperature_celsius: f64,
        /// Pressure.
        pressure_pa: f64,
        /// Relative humidity.
        humidity: f64,
    },
}

impl MeasureError {
    /// Short machine-readable name of the reason.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::NoPhoto => "no-photo",
            Self::SizesDiffer { .. } => "photo-sizes-differ",
            Self::SheetEitherWay => "sheet-either-way",
            Self::NoPose => "no-camera-pose",
            Self::FlatLattice => "flat-lattice",
            Self::Irregular { .. } => "irregular",
            Self::PitchNotFixed { .. } => "pitch-not-fixed",
            Self::ColourMismatch { .. } => "colour-mismatch",
            Self::TrialsFailed { .. } => "trials-failed",
            Self::AirOutOfRange { .. } => "air-out-of-range",
        }
    }

    /// Whether the input could not be used at all.
    #[must_use]
    pub fn is_unusable_input(&self) -> bool {
        matches!(self, Self::NoPhoto | Self::SizesDiffer { .. } | Self::SheetEitherWay | Self::AirOutOfRange { .. })
    }
}
