//! A saved posterior for a terminal.

use super::{
    columns::{Align, WIDTH, columns, paragraph},
    rounding::concise,
};
use crate::{
    calibration::{Calibration, UncertainValue},
    quantity::Unit,
};

/// What was saved, as text for a terminal, ending with a line break.
///
/// - `file`: name of the file that it was written to
#[must_use]
pub fn calibration_text(calibration: &Calibration, file: &str) -> String {
    let title = format!("Calibration of {} parameters, with their correlations, written to {file}:", calibration.posterior.values.len());
    paragraph("", &title, WIDTH) + &parameter_lines(calibration)
}

/// One line per parameter: name, value with u in the last places, unit.
pub(super) fn parameter_lines(calibration: &Calibration) -> String {
    let row = |known: &UncertainValue| {
        let unit = Unit::find(&known.unit);
        let shown = |si: f64| unit.map_or(si, |unit| unit.difference_from_si(si));
        let (value, u) = (shown(known.value), shown(known.u));
        let symbol = unit.map_or(String::new(), |unit| format!(" {}", unit.symbol));
        let text = if u > 0.0 { concise(value, u) } else { format!("{value} (exact)") };
        vec![known.name.clone(), format!("{text}{symbol}")]
    };
    let rows: Vec<Vec<String>> = calibration.posterior.values.iter().map(row).collect();
    columns(&rows, &[Align::Left, Align::Left])
}
