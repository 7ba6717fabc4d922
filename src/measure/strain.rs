//! Statements of the bench file that the photo contradicts.

use super::{ParameterUnit, conclude::described};
use crate::{
    Note,
    bench::Bench,
    fit::{Fit, Prior, Source},
    math::statistics::chi_square_tail,
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

/// Chance that a bench which was left alone shows this much strain.
const UNLIKELY: f64 = 1e-3;

/// A note when the photo and the calibration do not go together: something moved since.
///
/// The squared residuals of the calibration's rows add up to about as many as directions the new photo measures again (their redundancy).
pub(super) fn strained_calibration(bench: &Bench, fit: &Fit) -> Option<Note> {
    let rows: Vec<usize> =
        (0..).zip(fit.joint.row_sources()).filter(|(_, source)| *source == Source::Calibration).map(|(row, _)| row).collect();
    let leverage = |row: usize| (fit.jacobian.row(row) * &fit.covariance).dot(&fit.jacobian.row(row));
    let redundancy: f64 = rows.iter().map(|&row| 1.0 - leverage(row)).sum();
    let chi2: f64 = rows.iter().map(|&row| fit.residuals[row].powi(2)).sum();
    if rows.is_empty() || chi_square_tail(chi2, redundancy.max(1.0))? > UNLIKELY {
        return None;
    }
    let pulled = fit.joint.layout.entries().iter().filter_map(|entry| match entry.prior {
        Prior::Correlated { mean, u } if entry.source == Source::Calibration => Some((entry, (entry.value - mean) / u)),
        _ => None,
    });
    let (entry, pull) = pulled.max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))?;
    Some(Note::CalibrationStrained { what: described(bench, entry.parameter).0, pull, chi2, redundancy })
}

/// Spots that all lie to one side of their predictions by more than this many standard uncertainties of their mean were shifted.
const SHIFTED: f64 = 4.0;

/// A note when all spots are shifted alike: the fit may rather take its spots for poor than give up a calibration, and what moved shows as
/// a common offset. On a bench that was left alone the mean offset is nought within `1/√Σw`, the Birge factor included.
pub(super) fn shifted_pattern(fit: &Fit) -> Option<Note> {
    if !fit.joint.correlated.iter().any(|prior| prior.source == Source::Calibration) {
        return None;
    }
    let birge = fit.joint.spot_scale.powi(2);
    let (mut weights, mut sums) = ([0.0; 2], [0.0; 2]);
    for (spot, offset) in fit.joint.spots.iter().zip(fit.joint.spot_residuals_px()).filter(|(spot, _)| spot.weight > 0.5) {
        let variances = [spot.covariance.xx * birge, spot.covariance.yy * birge];
        for axis in 0..2 {
            weights[axis] += variances[axis].recip();
            sums[axis] += offset?[axis] / variances[axis];
        }
    }
    let lengths = [0, 1].map(|axis| sums[axis] / weights[axis].sqrt());
    let shift_px = [0, 1].map(|axis| sums[axis] / weights[axis]);
    (lengths[0].hypot(lengths[1]) > SHIFTED).then_some(Note::CalibrationShifted { shift_px })
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
