//! The result for scripts: schema `spotrule.measurement/1`. Units are fixed: um for pitches, deg for angles, px for places.

use std::collections::BTreeMap;

use schemars::{JsonSchema, generate::SchemaSettings};
use serde::Serialize;

use super::{
    context::Context,
    limits_json::{LimitsJson, limits_json},
    provenance_json::{InputsJson, LogEntryJson, entry_json, inputs_json},
    sample_json::{SampleJson, measured, number, sample_json},
    trials::{TrialsJson, trials_json},
    units,
    words::{NO_CERTIFICATE, mode_name},
};
use crate::{
    Note,
    measure::{FitSummary, Measurement, OrderRow, ParameterRow, PhotoSummary, RejectedSpot},
};

/// Name and version of the format.
const SCHEMA: &str = "spotrule.measurement/1";

/// Which program made a result.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, JsonSchema)]
pub struct Program {
    /// Version of the crate.
    pub version: String,
    /// Commit it was built from, "unknown" when the build did not say (environment variable `SPOTRULE_COMMIT`).
    pub commit: String,
}

impl Program {
    /// The program that is running.
    #[must_use]
    pub fn this() -> Self {
        Self {
            version: env!("CARGO_PKG_VERSION").to_owned(),
            commit: option_env!("SPOTRULE_COMMIT").filter(|commit| !commit.is_empty()).unwrap_or("unknown").to_owned(),
        }
    }
}

/// The measurement as pretty-printed JSON, ending with a line break; every number in it is finite.
#[must_use]
pub fn json(measurement: &Measurement, context: &Context, program: &Program) -> String {
    let several = !measurement.other_samples.is_empty();
    let all = measurement.other_samples.iter().chain([&measurement.sample]);
    pretty(&ResultJson::Measured(Box::new(Measured {
        schema: SCHEMA,
        program,
        status: "measured",
        sample_name: &measurement.sample.name,
        mode: mode_name(measurement.mode),
        sample: sample_json(&measurement.sample),
        samples: several.then(|| all.map(|sample| (sample.name.as_str(), sample_json(sample))).collect()),
        zero_order: place(measurement.zero_order.at.x_px, measurement.zero_order.at.y_px)
            .map(|at| ZeroOrderJson { at, seen: measurement.zero_order.seen }),
        orders: measurement.orders.iter().filter_map(order_json).collect(),
        rejected: measurement.rejected.iter().filter_map(rejected_json).collect(),
        parameters: measurement.parameters.iter().filter_map(parameter_json).collect(),
        fit: fit_json(&measurement.fit),
        monte_carlo: trials_json(measurement),
        photos: measurement.photos.iter().map(photo_json).collect(),
        warnings: measurement.notes.iter().map(warning_json).collect(),
        limits: context.verdict.as_ref().map(limits_json),
        around: around(context),
        remark: NO_CERTIFICATE,
    })))
}

/// A refusal as JSON: nothing can honestly be said, and why.
#[must_use]
pub fn refused_json(code: &str, text: &str, context: &Context, program: &Program) -> String {
    pretty(&ResultJson::Refused(Box::new(Refused {
        schema: SCHEMA,
        program,
        status: "refused",
        sample_name: context.provenance.as_ref().and_then(|provenance| provenance.sample_name.as_deref()),
        reason: Remark { code, text: text.to_owned() },
        around: around(context),
        warnings: vec![],
    })))
}

fn around(context: &Context) -> Around<'_> {
    let provenance = context.provenance.as_ref();
    Around {
        time: provenance.map(|provenance| provenance.time.as_str()),
        operator: provenance.and_then(|provenance| provenance.operator.as_deref()),
        operator_remark: provenance.and_then(|provenance| provenance.remark.as_deref()),
        inputs: provenance.map(inputs_json),
        log: context.entry.as_ref().map(entry_json),
    }
}

/// What a result file holds.
#[derive(Serialize, JsonSchema)]
#[serde(untagged)]
enum ResultJson<'a> {
    /// A measurement.
    Measured(Box<Measured<'a>>),
    /// A refusal.
    Refused(Box<Refused<'a>>),
}

/// JSON Schema of the result, generated from the structs that are written; pretty-printed, ending with a line break.
#[must_use]
pub fn result_schema() -> String {
    let schema = SchemaSettings::draft2020_12().for_serialize().into_generator().into_root_schema_for::<ResultJson<'_>>();
    pretty(&schema)
}

#[derive(Serialize, JsonSchema)]
struct Measured<'a> {
    #[schemars(extend("const" = "spotrule.measurement/1"))]
    schema: &'static str,
    program: &'a Program,
    #[schemars(extend("const" = "measured"))]
    status: &'static str,
    #[serde(rename = "sample")]
    sample_name: &'a str,
    #[schemars(extend("enum" = ["transmission", "reflection"]))]
    mode: &'static str,
    #[serde(flatten)]
    sample: SampleJson,
    #[serde(skip_serializing_if = "Option::is_none")]
    samples: Option<BTreeMap<&'a str, SampleJson>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    zero_order: Option<ZeroOrderJson>,
    orders: Vec<OrderJson>,
    rejected: Vec<RejectedJson<'a>>,
    parameters: Vec<ParameterJson<'a>>,
    fit: FitJson,
    #[serde(skip_serializing_if = "Option::is_none")]
    monte_carlo: Option<TrialsJson>,
    photos: Vec<PhotoJson<'a>>,
    warnings: Vec<Remark<'static>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    limits: Option<LimitsJson>,
    #[serde(flatten)]
    around: Around<'a>,
    remark: &'static str,
}

/// Who made it, when, from what, and where it is logged.
#[derive(Serialize, JsonSchema)]
struct Around<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    time: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    operator: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    operator_remark: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    inputs: Option<InputsJson<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    log: Option<LogEntryJson<'a>>,
}

#[derive(Serialize, JsonSchema)]
struct Refused<'a> {
    #[schemars(extend("const" = "spotrule.measurement/1"))]
    schema: &'static str,
    program: &'a Program,
    #[schemars(extend("const" = "refused"))]
    status: &'static str,
    #[serde(rename = "sample", skip_serializing_if = "Option::is_none")]
    sample_name: Option<&'a str>,
    reason: Remark<'a>,
    #[serde(flatten)]
    around: Around<'a>,
    warnings: Vec<Remark<'a>>,
}

#[derive(Serialize, JsonSchema)]
struct Remark<'a> {
    code: &'a str,
    text: String,
}

#[derive(Serialize, JsonSchema)]
struct Place {
    x: f64,
    y: f64,
}

#[derive(Serialize, JsonSchema)]
struct ZeroOrderJson {
    #[serde(flatten)]
    at: Place,
    seen: bool,
}

#[derive(Serialize, JsonSchema)]
struct OrderJson {
    photo: usize,
    h: i32,
    k: i32,
    x: f64,
    y: f64,
    u_x: f64,
    u_y: f64,
    dx: f64,
    dy: f64,
    used: bool,
    clipped: bool,
}

#[derive(Serialize, JsonSchema)]
struct RejectedJson<'a> {
    photo: usize,
    #[serde(flatten)]
    at: Place,
    reason: &'a str,
    #[serde(skip_serializing_if = "str::is_empty")]
    detail: &'a str,
}

#[derive(Serialize, JsonSchema)]
struct ParameterJson<'a> {
    name: &'a str,
    unit: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    prior: Option<PriorJson>,
    value: f64,
    u: f64,
}

#[derive(Serialize, JsonSchema)]
struct PriorJson {
    value: f64,
    u: f64,
}

#[derive(Serialize, JsonSchema)]
struct FitJson {
    chi2_reduced: Option<f64>,
    degrees_of_freedom: Option<f64>,
    rms_px: Option<f64>,
    birge_factor: Option<f64>,
    spots_used: usize,
    dots_used: usize,
}

#[derive(Serialize, JsonSchema)]
struct PhotoJson<'a> {
    file: &'a str,
    width: usize,
    height: usize,
    spots: usize,
    axes: Vec<Place>,
    #[serde(skip_serializing_if = "Option::is_none")]
    camera: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    focal_length_mm: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    focal_length_35mm_mm: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    exposure_s: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    iso: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    f_number: Option<f64>,
}

/// Place on the photo to a thousandth of a thousandth of a pixel; `None` when not finite.
fn place(x_px: f64, y_px: f64) -> Option<Place> {
    Some(Place { x: pixel(x_px)?, y: pixel(y_px)? })
}

fn pixel(px: f64) -> Option<f64> {
    number((px * 1e6).round() / 1e6)
}

fn order_json(order: &OrderRow) -> Option<OrderJson> {
    let Place { x, y } = place(order.at.x_px, order.at.y_px)?;
    let [u_x, u_y] = order.covariance.u_px();
    Some(OrderJson {
        photo: order.photo,
        h: order.h,
        k: order.k,
        x,
        y,
        u_x: pixel(u_x)?,
        u_y: pixel(u_y)?,
        dx: pixel(order.residual_px[0])?,
        dy: pixel(order.residual_px[1])?,
        used: order.used,
        clipped: order.clipped,
    })
}

fn rejected_json(spot: &RejectedSpot) -> Option<RejectedJson<'_>> {
    Some(RejectedJson { photo: spot.photo, at: place(spot.at.x_px, spot.at.y_px)?, reason: &spot.reason, detail: &spot.detail })
}

fn parameter_json(parameter: &ParameterRow) -> Option<ParameterJson<'_>> {
    let unit = units::for_parameter(parameter.unit);
    let shown = |value: f64, u: f64| measured(value * unit.per_si, u * unit.per_si);
    let (value, u) = shown(parameter.value, parameter.u)?;
    let prior = parameter.prior.and_then(|(value, u)| shown(value, u)).map(|(value, u)| PriorJson { value, u });
    Some(ParameterJson { name: &parameter.name, unit: unit.ascii, prior, value, u })
}

fn fit_json(fit: &FitSummary) -> FitJson {
    FitJson {
        chi2_reduced: number(fit.chi2_reduced),
        degrees_of_freedom: number(fit.degrees_of_freedom),
        rms_px: number(fit.rms_px),
        birge_factor: number(fit.birge_factor),
        spots_used: fit.spots_used,
        dots_used: fit.dots_used,
    }
}

fn photo_json(photo: &PhotoSummary) -> PhotoJson<'_> {
    let millimetres = |length_m: Option<f64>| length_m.and_then(|length_m| number(length_m * units::MILLIMETRE.per_si));
    PhotoJson {
        file: &photo.file,
        width: photo.size_px[0],
        height: photo.size_px[1],
        spots: photo.spots,
        axes: photo.axes_px.iter().filter_map(|at| place(at.x_px, at.y_px)).collect(),
        camera: photo.exif.camera.as_deref(),
        focal_length_mm: millimetres(photo.exif.focal_length_m),
        focal_length_35mm_mm: millimetres(photo.exif.focal_length_35mm_m),
        exposure_s: photo.exif.exposure_s.and_then(number),
        iso: photo.exif.iso.and_then(number),
        f_number: photo.exif.f_number.and_then(number),
    }
}

fn warning_json(note: &Note) -> Remark<'static> {
    Remark { code: note.code(), text: note.to_string() }
}

/// These structs hold only text, integers and finite numbers under text keys: writing them cannot fail.
pub(super) fn pretty(result: &impl Serialize) -> String {
    let mut text = serde_json::to_string_pretty(result).unwrap_or_default();
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use serde_json::Value as Json;

    use super::*;
    use crate::report::example;

    fn parsed(measurement: &Measurement) -> Json {
        serde_json::from_str(&json(measurement, &Context::default(), &Program::this())).unwrap()
    }

    #[test]
    fn line_and_plane_have_the_keys_of_the_format() {
        let plane = parsed(&example::plane());
        for key in [
            "schema",
            "program",
            "status",
            "pattern",
            "pitch",
            "lattice_angle",
            "orientation",
            "lattice_kind",
            "zero_order",
            "orders",
            "budget",
            "parameters",
            "fit",
            "warnings",
            "samples",
        ] {
            assert!(plane.get(key).is_some(), "{key}");
        }
        assert_eq!(plane["pattern"], "plane");
        assert_eq!(plane["pitch"][0]["value"], 4.000_312);
        assert_eq!(plane["pitch"][0]["unit"], "um");
        assert_eq!(plane["samples"]["reference"]["pattern"], "line");
        assert_eq!(plane["samples"]["embossed film"]["pitch"], plane["pitch"]);
        let line = parsed(&example::line());
        assert_eq!(line["pattern"], "line");
        for key in ["lattice_angle", "lattice_kind", "samples", "cell_area", "reason"] {
            assert!(line.get(key).is_none(), "{key}");
        }
        assert!(line["pitch"][0].get("degrees_of_freedom").is_none(), "infinite degrees of freedom are left out");
    }

    #[test]
    fn shares_of_each_pitch_sum_to_one() {
        for (measurement, pitches) in [(example::plane(), 2), (example::line(), 1)] {
            let result = parsed(&measurement);
            for pitch in 0..pitches {
                let sum: f64 = result["budget"].as_array().unwrap().iter().map(|line| line["share"][pitch].as_f64().unwrap()).sum();
                // Twelve digits of each share are kept.
                assert!((sum - 1.0).abs() < 1e-10, "pitch {pitch}: {sum}");
            }
        }
    }

    /// `serde_json` writes what is not finite as null; a null under any of the format's keys would break a script.
    #[test]
    fn no_null_in_a_sound_measurement() {
        for measurement in [example::plane(), example::line()] {
            assert!(!json(&measurement, &Context::default(), &Program::this()).contains("null"));
        }
    }

    #[test]
    fn what_is_not_finite_is_left_out() {
        let mut broken = example::plane();
        broken.sample.pitch_m[1].u = f64::NAN;
        broken.orders[3].residual_px[0] = f64::INFINITY;
        broken.sample.orientation_rad.value = f64::NAN;
        broken.zero_order.at.x_px = f64::NAN;
        let result = parsed(&broken);
        assert_eq!(result["pitch"].as_array().unwrap().len(), 1);
        assert_eq!(result["orders"].as_array().unwrap().len(), broken.orders.len() - 1);
        assert!(result["orientation"].is_null() && result.get("zero_order").is_none());
    }

    #[test]
    fn a_refusal_gives_its_reason() {
        let text = refused_json("too-few-spots", "7 spots carry an order, the fit needs 9", &Context::default(), &Program::this());
        let result: Json = serde_json::from_str(&text).unwrap();
        assert_eq!(result["status"], "refused");
        assert_eq!(result["reason"]["code"], "too-few-spots");
        assert_eq!(result["warnings"], Json::Array(vec![]));
        assert_eq!(result["program"]["version"], env!("CARGO_PKG_VERSION"));
    }
}
