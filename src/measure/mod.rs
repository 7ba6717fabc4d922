//! The whole measurement on one screen: photos and bench in, [`Measurement`] out.
//!
//! Takes bytes, never files; start reading at [`measure`], then `fitted.rs`, which is the table of contents of a measurement.

mod align;
mod assemble;
mod bounds;
mod calibrate;
mod calibrated;
mod cameras;
mod conclude;
mod deciders;
mod error;
mod fitted;
mod lens;
mod look;
mod measurement;
mod openness;
mod orders;
mod rough;
mod ruling;
mod scan;
mod sheet;
mod statement;
mod strain;
mod strays;
mod trials;
mod view;
mod zero_order;
mod zhang;

pub use crate::{
    budget::{BudgetLine, Value},
    lattice::LatticeKind,
};
pub use error::{MeasureError, Refusal};
pub use lens::{CameraCalibration, PointPair, ViewSummary, calibrate_camera, lens_from_points};
pub use look::{Inputs, PhotoFile};
pub use measurement::{
    FitSummary, KindStatement, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary, ReciprocalView, RejectedSpot,
    SampleResult, ZeroOrder,
};
pub use trials::{TrialOptions, Trials};

use crate::{bench::Bench, calibration::Calibration};

/// Start value of a throw that nobody measured, m.
const GAUGE_THROW_M: f64 = 0.5;

/// Measures the pitch of a sample.
///
/// - `inputs`: the photos of the pattern in the order of [`Bench::photos`] (or a single one), and the photos of the target
/// - `bench`: what the operator knows
///
/// # Errors
/// Whatever makes an honest result impossible; the message says what to do.
pub fn measure(inputs: &Inputs<'_>, bench: &Bench) -> Result<Measurement, Refusal> {
    measure_with(inputs, bench, None)
}

/// [`measure`], and the whole inference by Monte Carlo where `trials` asks for it.
///
/// # Errors
/// As [`measure`].
pub fn measure_with(inputs: &Inputs<'_>, bench: &Bench, trials: Option<&TrialOptions<'_>>) -> Result<Measurement, Refusal> {
    let fitted = fitted::fitted(inputs, bench)?;
    let mut measurement = conclude::conclude(&fitted, bench)?;
    if let Some(options) = trials {
        trials::add_trials(&mut measurement, bench, &fitted.fit, options)?;
    }
    Ok(measurement)
}

/// Measures what can be measured, and keeps the posterior of everything that stays when the sample is exchanged.
///
/// The calibration lacks what only the caller knows: date, program, and the bench file's text.
///
/// # Errors
/// As [`measure`], and where there is not one camera position to keep.
pub fn calibrate(inputs: &Inputs<'_>, bench: &Bench) -> Result<(Measurement, Calibration), Refusal> {
    let fitted = fitted::fitted(inputs, bench)?;
    let calibration = calibrate::bench_calibration(&fitted, bench)?;
    Ok((conclude::conclude(&fitted, bench)?, calibration))
}
