//! A calibrated camera for scripts: schema `spotrule.camera/1`.

use serde::Serialize;

use super::{json::Program, words::NO_CERTIFICATE};
use crate::{
    calibration::UncertainValue,
    measure::{CameraCalibration, ViewSummary},
    quantity::Unit,
};

/// Name and version of the format.
const SCHEMA: &str = "spotrule.camera/1";

#[derive(Serialize)]
struct CameraJson<'a> {
    schema: &'static str,
    program: &'a Program,
    size_px: [usize; 2],
    parameters: Vec<ParameterJson<'a>>,
    correlation: Vec<Vec<f64>>,
    rms_px: f64,
    chi2_reduced: f64,
    degrees_of_freedom: f64,
    birge_factor: f64,
    dots_used: usize,
    views: Vec<ViewJson<'a>>,
    warnings: Vec<WarningJson>,
    remark: &'static str,
}

#[derive(Serialize)]
struct ParameterJson<'a> {
    name: &'a str,
    unit: &'a str,
    value: f64,
    u: f64,
}

#[derive(Serialize)]
struct ViewJson<'a> {
    file: &'a str,
    dots_used: usize,
    dots_found: usize,
    rms_px: f64,
    oblique_deg: f64,
    distance_mm: f64,
}

#[derive(Serialize)]
struct WarningJson {
    code: &'static str,
    text: String,
}

/// The calibration as pretty-printed JSON, ending with a line break.
#[must_use]
pub fn camera_json(found: &CameraCalibration, program: &Program) -> String {
    let correlation = &found.calibration.posterior.correlation;
    let json = CameraJson {
        schema: SCHEMA,
        program,
        size_px: found.calibration.taken_with.size_px,
        parameters: found.calibration.posterior.values.iter().map(parameter).collect(),
        correlation: correlation.row_iter().map(|row| row.iter().copied().collect()).collect(),
        rms_px: found.calibration.made_from.rms_px,
        chi2_reduced: found.chi2_reduced,
        degrees_of_freedom: found.degrees_of_freedom,
        birge_factor: found.birge_factor,
        dots_used: found.dots_used,
        views: found.views.iter().map(view).collect(),
        warnings: found.notes.iter().map(|note| WarningJson { code: note.code(), text: note.to_string() }).collect(),
        remark: NO_CERTIFICATE,
    };
    super::json::pretty(&json)
}

fn parameter(known: &UncertainValue) -> ParameterJson<'_> {
    let shown = |si: f64| Unit::find(&known.unit).map_or(si, |unit| unit.difference_from_si(si));
    ParameterJson { name: &known.name, unit: &known.unit, value: shown(known.value), u: shown(known.u) }
}

fn view(view: &ViewSummary) -> ViewJson<'_> {
    ViewJson {
        file: &view.file,
        dots_used: view.dots[0],
        dots_found: view.dots[1],
        rms_px: view.rms_px,
        oblique_deg: view.oblique_rad.to_degrees(),
        distance_mm: view.distance_m * 1e3,
    }
}
