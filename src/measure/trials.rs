//! The result once more by Monte Carlo, beside the linear one.

use super::{MeasureError, Measurement, Value, conclude::wanted_sample};
use crate::{
    Note,
    bench::Bench,
    budget::COVERAGE,
    fit::{self, Fit},
    math::{
        count,
        monte_carlo::{MonteCarlo, MonteCarloOptions},
    },
    quantity::{format_angle_deg_interval, format_length_interval},
};

/// How the trials are made.
#[derive(Clone, Copy)]
pub struct TrialOptions<'a> {
    /// Most trials; fewer are made when two digits of every u stand still before.
    pub most: usize,
    /// Same seed, same result.
    pub seed: u64,
    /// Told from time to time how many trials have been made.
    pub progress: &'a dyn Fn(usize),
}

impl std::fmt::Debug for TrialOptions<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("TrialOptions").field("most", &self.most).field("seed", &self.seed).finish_non_exhaustive()
    }
}

/// Distributions of the result by Monte Carlo.
#[derive(Debug, Clone, PartialEq)]
pub struct Trials {
    /// Seed of the generator.
    pub seed: u64,
    /// One per pitch, m; intervals hold 95.45 %.
    pub pitch_m: Vec<MonteCarlo>,
    /// Of the lattice angle, rad; `None` for a line grating.
    pub lattice_angle_rad: Option<MonteCarlo>,
}

/// Fewest trials in a block, and share of all trials that a block takes.
const LEAST_BLOCK: usize = 100;
const BLOCKS: usize = 10;
const LARGEST_BLOCK: usize = 10_000;

/// Draws the trials and notes where they contradict the linear result.
pub(super) fn add_trials(measurement: &mut Measurement, bench: &Bench, fit: &Fit, options: &TrialOptions<'_>) -> Result<(), MeasureError> {
    let block = (options.most / BLOCKS).clamp(LEAST_BLOCK, LARGEST_BLOCK);
    let wanted =
        MonteCarloOptions { probability: COVERAGE, digits: 2, block, most_blocks: options.most.div_ceil(block), seed: options.seed };
    let drawn = fit::trials(fit, wanted_sample(bench, fit), &wanted, options.progress);
    let mut pitch_m = drawn.ok_or(MeasureError::TrialsFailed { most: options.most })?;
    let lattice_angle_rad = measurement.sample.lattice_angle_rad.and_then(|_| pitch_m.pop());
    let several = pitch_m.len() > 1;
    for (number, (linear, drawn)) in measurement.sample.pitch_m.iter().zip(&pitch_m).enumerate() {
        let what = if several { format!("pitch {}", number + 1) } else { "pitch".to_owned() };
        measurement.notes.extend(contradiction(what, linear, drawn, format_length_interval));
    }
    for (linear, drawn) in measurement.sample.lattice_angle_rad.iter().zip(&lattice_angle_rad) {
        measurement.notes.extend(contradiction("lattice angle".to_owned(), linear, drawn, format_angle_deg_interval));
    }
    measurement.trials = Some(Trials { seed: options.seed, pitch_m, lattice_angle_rad });
    Ok(())
}

/// The linear interval stands when both its ends agree with those of the trials to half a unit of the second digit of u, and what the
/// number of trials leaves open (three standard deviations of a quantile).
///
/// Source: `[JCGM101]` 8.1.
fn contradiction(what: String, linear: &Value, drawn: &MonteCarlo, written: fn([f64; 2], f64) -> String) -> Option<Note> {
    let delta = 0.5 * 10_f64.powf(linear.u.log10().floor() - 1.0);
    let tail = 0.5 * (1.0 - COVERAGE);
    // Density of the standard normal law at two standard deviations.
    let density_at_end = (-2.0_f64).exp() / (2.0 * std::f64::consts::PI).sqrt();
    let u_end = linear.u * (tail * (1.0 - tail)).sqrt() / density_at_end / count(drawn.trials).sqrt();
    let ends = [linear.value - linear.expanded(), linear.value + linear.expanded()];
    let off = ends.iter().zip(&drawn.symmetric).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
    (off > delta + 3.0 * u_end).then(|| Note::NotLinear {
        what,
        linear: written(ends, linear.u),
        trials: written(drawn.symmetric, linear.u),
    })
}
