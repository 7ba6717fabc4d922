//! The result by Monte Carlo beside the linear one, as text and as JSON.

use super::{
    columns::{Align, WIDTH, columns, paragraph},
    rounding::{percent, rounded},
    sample_json::number,
    units::{self, Unit},
    words::numbered,
};
use crate::{
    math::{count, monte_carlo::MonteCarlo},
    measure::{Measurement, Trials, Value},
};
use schemars::JsonSchema;
use serde::Serialize;

/// Every value with its name, unit, linear result and distribution.
fn rows<'a>(measurement: &'a Measurement, trials: &'a Trials) -> Vec<(String, Unit, Value, &'a MonteCarlo)> {
    let count = trials.pitch_m.len();
    let pitches = measurement.sample.pitch_m.iter().zip(&trials.pitch_m).enumerate();
    let mut rows: Vec<_> =
        pitches.map(|(i, (linear, drawn))| (numbered("pitch", i, count), units::for_pitch(linear.value), *linear, drawn)).collect();
    let angle = measurement.sample.lattice_angle_rad.zip(trials.lattice_angle_rad.as_ref());
    rows.extend(angle.map(|(linear, drawn)| ("lattice angle".to_owned(), units::DEGREE, linear, drawn)));
    rows
}

/// A table: u and the interval of 95 %, linear and by trials.
pub(super) fn trials_text(measurement: &Measurement) -> String {
    let Some(trials) = &measurement.trials else { return String::new() };
    let mut table = vec![["", "linear u", "linear interval", "trials u", "trials interval"].map(str::to_owned).to_vec()];
    for (name, unit, linear, drawn) in rows(measurement, trials) {
        let interval = |ends: [f64; 2]| {
            let [low, high] = ends.map(|end| rounded(end * unit.per_si, linear.u * unit.per_si).value);
            format!("{low} to {high}{}", unit.suffix())
        };
        let u = |u: f64| format!("{}{}", rounded(u * unit.per_si, 0.1 * linear.u * unit.per_si).value, unit.suffix());
        let ends = [linear.value - linear.expanded(), linear.value + linear.expanded()];
        table.push(vec![name, u(linear.u), interval(ends), u(drawn.u), interval(drawn.symmetric)]);
    }
    let right = [Align::Left, Align::Right, Align::Right, Align::Right, Align::Right];
    columns(&table, &right) + &paragraph("  ", &explanation(trials), WIDTH)
}

fn explanation(trials: &Trials) -> String {
    let Some(first) = trials.pitch_m.first() else { return String::new() };
    let settled = if trials.pitch_m.iter().chain(&trials.lattice_angle_rad).all(|drawn| drawn.settled) {
        "two digits of every u stand still".to_owned()
    } else {
        // Standard deviation of an estimated standard deviation (normal law).
        let open = 1.0 / (2.0 * count(first.trials)).sqrt();
        format!("u is thereby known to {}", percent(open))
    };
    let failed = match first.failed {
        0 => String::new(),
        failed => format!("; {failed} trials gave no lattice and are left out"),
    };
    format!(
        "Monte Carlo (JCGM 101): {} trials with every input redrawn, seed {}; {settled}{failed}. Intervals hold 95.45 %, half of the rest on either side.",
        first.trials, trials.seed
    )
}

/// The trials in the JSON result; the interval in the unit of the value.
#[derive(Serialize, JsonSchema)]
pub(super) struct TrialsJson {
    seed: u64,
    values: Vec<DrawnJson>,
}

#[derive(Serialize, JsonSchema)]
struct DrawnJson {
    name: String,
    unit: &'static str,
    mean: Option<f64>,
    u: Option<f64>,
    interval: [Option<f64>; 2],
    shortest_interval: [Option<f64>; 2],
    trials: usize,
    failed: usize,
    settled: bool,
}

pub(super) fn trials_json(measurement: &Measurement) -> Option<TrialsJson> {
    let trials = measurement.trials.as_ref()?;
    let drawn = |(name, unit, _, drawn): (String, Unit, Value, &MonteCarlo)| {
        let in_unit = |value: f64| number(value * unit.per_si);
        DrawnJson {
            name: name.replace(' ', "_"),
            unit: unit.ascii,
            mean: in_unit(drawn.mean),
            u: in_unit(drawn.u),
            interval: drawn.symmetric.map(in_unit),
            shortest_interval: drawn.shortest.map(in_unit),
            trials: drawn.trials,
            failed: drawn.failed,
            settled: drawn.settled,
        }
    };
    Some(TrialsJson { seed: trials.seed, values: rows(measurement, trials).into_iter().map(drawn).collect() })
}
