//! Statements of the bench file that the photo contradicts.

use super::{ParameterUnit, conclude::described};
use crate::{
    Note,
    bench::Bench,
    fit::{Fit, Prior, Source},
    quantity::{format_angle_deg, format_concise, format_length},
};

/// A statement further off than this many of its standard uncertainties is worth a note: with some ten statements on a bench, one honest
/// measurement in forty would be bothered.
const STRAINED: f64 = 3.0;

/// One note per statement that the fit had to move far.
pub(super) fn strained_statements(bench: &Bench, fit: &Fit) -> Vec<Note> {
    let layout = &fit.joint.layout;
    let mut notes = Vec::new();
    for (place, entry) in layout.entries().iter().enumerate() {
        let Prior::Normal { mean, u } = entry.prior else { continue };
        let pull = (entry.value - mean) / u;
        if pull.abs() < STRAINED || matches!(entry.source, Source::Lens | Source::FocalLength | Source::Gauge) {
            continue;
        }
        let (what, unit) = described(bench, entry.parameter);
        let u_found = layout.column(place).map_or(0.0, |column| fit.covariance[(column, column)].max(0.0).sqrt());
        notes.push(Note::StatementStrained { what, stated: in_unit(unit, mean, u), found: in_unit(unit, entry.value, u_found), pull });
    }
    notes
}

fn in_unit(unit: ParameterUnit, value: f64, u: f64) -> String {
    match unit {
        ParameterUnit::Length | ParameterUnit::Wavelength => format_length(value, u),
        ParameterUnit::Angle => format_angle_deg(value, u),
        ParameterUnit::LineDensity => format_concise(value * 1e-3, u * 1e-3, "lines/mm"),
        ParameterUnit::Pixel => format_concise(value, u, "px"),
        ParameterUnit::Number => format_concise(value, u, ""),
    }
}
