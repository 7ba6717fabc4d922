//! The whole measurement on one screen: photos and bench in, [`Measurement`] out.
//!
//! Takes bytes, never files; start reading at [`measure`], which is the table of contents of a measurement.

mod align;
mod assemble;
mod bounds;
mod cameras;
mod conclude;
mod error;
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

pub use crate::{
    budget::{BudgetLine, Value},
    lattice::LatticeKind,
};
pub use error::{MeasureError, Refusal};
pub use look::{Inputs, PhotoFile};
pub use measurement::{
    FitSummary, KindStatement, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary, RejectedSpot, SampleResult, ZeroOrder,
};
pub use trials::{TrialOptions, Trials};

use crate::{
    bench::Bench,
    fit::{Outliers, solve},
};

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
    let seen = look::look(inputs, bench)?;
    let targets: Vec<&str> = inputs.targets.iter().map(|file| file.name).collect();
    let wavelengths_m = assemble::wavelengths_in_air(bench)?;
    let mut notes = statement::capture_notes(&seen, bench, &wavelengths_m)?;
    let cameras = cameras::cameras(&seen, bench, &targets)?;
    let (cameras, ordered) = scan::order_all(&seen, bench, &cameras)?;
    let joint = assemble::assemble(&seen, bench, &cameras, &ordered, &wavelengths_m);
    statement::enough_spots(&joint)?;
    let fit = solve(joint, Outliers::Rejected)?;
    let (ordered, fit) = zero_order::best_zero_order(&seen, bench, &cameras, ordered, &wavelengths_m, fit)?;
    let fit = strays::taken_in(&seen, bench, fit)?;
    statement::regular_enough(&fit)?;
    notes.extend(statement::numbering_notes(&ordered));
    notes.extend(strain::strained_statements(bench, &fit));
    let mut measurement = conclude::conclude(inputs, bench, &seen, &ordered, &fit, notes)?;
    if let Some(options) = trials {
        trials::add_trials(&mut measurement, bench, &fit, options)?;
    }
    Ok(measurement)
}
