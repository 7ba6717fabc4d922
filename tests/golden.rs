//! Text and JSON of one fixed measurement, word for word. `UPDATE=1 cargo test --release golden` rewrites the files; read the difference before
//! committing it: scripts and people rely on these forms.

use spotrule::{
    Note,
    bench::Mode,
    frames::{PixelCovariance, PixelPoint},
    measure::{
        BudgetLine, FitSummary, KindStatement, LatticeKind, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary,
        ReciprocalView, RejectedSpot, SampleResult, Value, ZeroOrder,
    },
    photo::Exif,
    report::{Context, Program, json, refusal_text, refused_json, text},
};

#[test]
fn plane_lattice_as_text() {
    compare("plane.txt", &text(&plane(), &Context::default()));
}

#[test]
fn plane_lattice_as_json() {
    compare("plane.json", &json(&plane(), &Context::default(), &program()));
}

#[test]
fn line_grating_of_a_series_as_text() {
    compare("line.txt", &text(&line(), &Context::default()));
}

#[test]
fn line_grating_of_a_series_as_json() {
    compare("line.json", &json(&line(), &Context::default(), &program()));
}

#[test]
fn refusal_as_text_and_json() {
    let why = "7 spots carry an order, the fit needs 9; include more of the pattern or state the throw";
    compare("refused.txt", &refusal_text("too-few-spots", why));
    compare("refused.json", &refused_json("too-few-spots", why, &Context::default(), &program()));
}

/// Versions and commits change without the format changing.
fn program() -> Program {
    Program { version: "1.2.3".to_owned(), commit: "abc1234".to_owned() }
}

#[track_caller]
fn compare(name: &str, got: &str) {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/golden").join(name);
    if std::env::var_os("UPDATE").is_some() {
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(&path, got).unwrap();
    }
    let want = std::fs::read_to_string(&path).unwrap_or_default();
    let differing = want.lines().zip(got.lines()).position(|(want, got)| want != got);
    let line = differing.unwrap_or_else(|| want.lines().count().min(got.lines().count()));
    assert!(
        want == got,
        "{name}, line {}:\n want {:?}\n got  {:?}\nUPDATE=1 rewrites the file",
        line + 1,
        want.lines().nth(line),
        got.lines().nth(line)
    );
}

/// A mesh: every optional part of a report occurs.
fn plane() -> Measurement {
    Measurement {
        sample: mesh(),
        other_samples: vec![],
        zero_order: ZeroOrder { at: at(2010.25, 1498.5), seen: false },
        orders: vec![
            order((1, 0), at(2210.031, 1500.112), [0.021, -0.034]),
            order((0, 1), at(2008.9, 1299.04), [-0.2, 0.01]),
            OrderRow { clipped: true, ..order((-1, 0), at(1810.4, 1497.2), [0.05, 0.06]) },
            OrderRow { used: false, ..order((1, 1), at(2208.0, 1301.0), [3.1, -2.2]) },
        ],
        rejected: vec![rejected(at(3100.0, 200.0), "no order within 5 px"), rejected(at(90.5, 2480.0), "no order within 5 px")],
        parameters: vec![
            parameter("throw", ParameterUnit::Length, Some((0.812, 0.000_8)), (0.815_1, 0.000_25)),
            parameter("wavelength", ParameterUnit::Wavelength, Some((632.82e-9, 0.01e-9)), (632.820_1e-9, 0.01e-9)),
            parameter("incidence about x", ParameterUnit::Angle, Some((0.0, 0.008_726_646)), (0.001_3, 0.004)),
            parameter("focal length", ParameterUnit::Pixel, None, (3011.26, 2.41)),
            parameter("lens k1", ParameterUnit::Number, Some((0.0, 0.1)), (-0.012_3, 0.000_4)),
            parameter("lines of the ruling", ParameterUnit::LineDensity, Some((1000.0, 0.0)), (1000.0, 0.0)),
        ],
        fit: FitSummary {
            chi2_reduced: 1.7312,
            degrees_of_freedom: 1.0,
            rms_px: 0.1284,
            birge_factor: 1.3158,
            spots_used: 3,
            dots_used: 96,
        },
        photos: vec![PhotoSummary {
            file: "mesh.jpg".to_owned(),
            size_px: [4000, 3000],
            exif: Exif {
                focal_length_m: Some(0.035),
                exposure_s: Some(0.016_666_666_666),
                iso: Some(200.0),
                f_number: Some(8.0),
                ..Exif::default()
            },
            spots: 6,
            axes_px: vec![at(2210.01, 1500.15), at(2009.1, 1299.03)],
        }],
        mode: Mode::Reflection,
        trials: None,
        reciprocal: ReciprocalView {
            wavelength_m: 632.82e-9,
            zero_order: [0.0, 0.5],
            vectors_per_m: vec![[15_868.0, 0.0], [0.0, 15_847.0]],
        },
        notes: vec![Note::ToneCurveAssumed],
    }
}

/// A line grating measured beside a reference; nothing was estimated from scatter.
fn line() -> Measurement {
    let (pitch_m, known_m) = (exact_inputs(1.666_712e-6, 0.000_19e-6), exact_inputs(1.0e-6, 0.000_02e-6));
    let grating = |name: &str, pitch_m: Value| SampleResult {
        name: name.to_owned(),
        pitch_m: vec![pitch_m],
        lattice_angle_rad: None,
        row_spacing_m: vec![pitch_m],
        cell_area_m2: None,
        kind: None,
        budget: vec![line_budget("throw", 0.97, pitch_m.u), line_budget("spot centroids", 0.03, pitch_m.u)],
        ..mesh()
    };
    Measurement {
        sample: grating("", pitch_m),
        other_samples: vec![grating("reference", known_m)],
        zero_order: ZeroOrder { at: at(2000.0, 1500.0), seen: true },
        orders: vec![order((-1, 0), at(1500.0, 1500.0), [0.0, 0.0]), order((1, 0), at(2500.0, 1500.0), [0.0, 0.0])],
        rejected: vec![],
        fit: FitSummary { chi2_reduced: 0.81, degrees_of_freedom: 4.0, rms_px: 0.05, birge_factor: 1.0, spots_used: 2, dots_used: 0 },
        mode: Mode::Transmission,
        trials: None,
        notes: vec![],
        ..plane()
    }
}

fn mesh() -> SampleResult {
    let value = |value: f64, u: f64| Value { value, u, coverage_factor: 2.0456, effective_degrees_of_freedom: 43.21 };
    SampleResult {
        name: "filter mesh".to_owned(),
        pitch_m: vec![value(63.018_4e-6, 0.021_3e-6), value(63.102_2e-6, 0.022e-6)],
        lattice_angle_rad: Some(value(90.012f64.to_radians(), 0.031f64.to_radians())),
        orientation_rad: value((-0.52f64).to_radians(), 0.21f64.to_radians()),
        row_spacing_m: vec![value(63.018_4e-6, 0.021_3e-6), value(63.102_2e-6, 0.022e-6)],
        cell_area_m2: Some(value(3976.6e-12, 2.3e-12)),
        kind: Some(KindStatement {
            kind: LatticeKind::Square,
            p_value: 0.0712,
            sentence: "A deviation from equal pitches at a right angle as large as this one occurs by chance in 7 of 100 cases.".to_owned(),
        }),
        budget: vec![
            budget_line("throw", [0.812, 0.79], 0.0),
            budget_line("spot centroids", [0.1032, 0.1302], 0.94),
            budget_line("incidence about x", [0.05, 0.04], 0.06),
            budget_line("print of the target", [0.0345, 0.0395], 0.0),
            budget_line("wavelength", [0.0002, 0.0002], 0.0),
            budget_line("index of air", [0.0001, 0.0001], 0.0),
        ],
    }
}

fn exact_inputs(value: f64, u: f64) -> Value {
    Value { value, u, coverage_factor: 2.0, effective_degrees_of_freedom: f64::INFINITY }
}

fn budget_line(source: &str, share: [f64; 2], angle_share: f64) -> BudgetLine {
    let u_pitch_m = vec![0.021_3e-6 * share[0].sqrt(), 0.022e-6 * share[1].sqrt()];
    BudgetLine { source: source.to_owned(), share: share.to_vec(), u_pitch_m, angle_share: Some(angle_share) }
}

fn line_budget(source: &str, share: f64, u_pitch_m: f64) -> BudgetLine {
    BudgetLine { source: source.to_owned(), share: vec![share], u_pitch_m: vec![u_pitch_m * share.sqrt()], angle_share: None }
}

fn parameter(name: &str, unit: ParameterUnit, prior: Option<(f64, f64)>, (value, u): (f64, f64)) -> ParameterRow {
    ParameterRow { name: name.to_owned(), unit, prior, value, u }
}

fn order((h, k): (i32, i32), at: PixelPoint, residual_px: [f64; 2]) -> OrderRow {
    let covariance = PixelCovariance { xx: 0.0009, xy: 0.0001, yy: 0.0016 };
    OrderRow { photo: 0, h, k, at, covariance, residual_px, used: true, clipped: false }
}

fn rejected(at: PixelPoint, reason: &str) -> RejectedSpot {
    RejectedSpot { photo: 0, at, reason: reason.to_owned(), detail: String::new() }
}

fn at(x_px: f64, y_px: f64) -> PixelPoint {
    PixelPoint { x_px, y_px }
}
