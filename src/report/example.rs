//! Two fixed measurements for the tests of this room: a plane lattice in a series, and a line grating on its own.

use crate::{
    Note,
    bench::Mode,
    frames::{PixelCovariance, PixelPoint},
    measure::{
        BudgetLine, FitSummary, KindStatement, LatticeKind, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary,
        ReciprocalView, RejectedSpot, SampleResult, Value, ZeroOrder,
    },
    photo::Exif,
};

pub(super) fn value(value: f64, u: f64) -> Value {
    Value { value, u, coverage_factor: 2.01, effective_degrees_of_freedom: 212.0 }
}

/// A hexagonal film with a reference grating.
pub(super) fn plane() -> Measurement {
    Measurement {
        sample: film(),
        other_samples: vec![SampleResult { name: "reference".to_owned(), ..grating() }],
        zero_order: ZeroOrder { at: PixelPoint { x_px: 400.0, y_px: 300.0 }, seen: true },
        orders: hexagon_orders(),
        rejected: vec![
            rejected(520.0, 90.0, "no order within 5 px"),
            rejected(90.0, 480.0, "no order within 5 px"),
            rejected(640.0, 500.0, "ghost of order (1,0)"),
        ],
        parameters: parameters(),
        fit: FitSummary { chi2_reduced: 1.32, degrees_of_freedom: 31.0, rms_px: 0.071, birge_factor: 1.149, spots_used: 17, dots_used: 96 },
        photos: vec![photo()],
        mode: Mode::Transmission,
        trials: None,
        reciprocal: ReciprocalView {
            wavelength_m: 632.82e-9,
            zero_order: [0.02, -0.01],
            vectors_per_m: vec![[281_958.0, -61_690.0], [193_840.0, 213_880.0]],
        },
        notes: vec![Note::ToneCurveAssumed],
    }
}

/// A line grating; nothing estimated from scatter.
pub(super) fn line() -> Measurement {
    let orders: Vec<OrderRow> = (-3..=3).map(|h| order(h, 0, 400.0 + 110.0 * f64::from(h), 300.0)).collect();
    Measurement {
        sample: grating(),
        other_samples: vec![],
        orders,
        rejected: vec![],
        fit: FitSummary { chi2_reduced: 0.9, degrees_of_freedom: 8.0, rms_px: 0.05, birge_factor: 1.0, spots_used: 7, dots_used: 0 },
        notes: vec![],
        mode: Mode::Reflection,
        trials: None,
        reciprocal: ReciprocalView { wavelength_m: 632.82e-9, zero_order: [0.5, 0.0], vectors_per_m: vec![[599_984.0, 0.0]] },
        ..plane()
    }
}

fn film() -> SampleResult {
    SampleResult {
        name: "embossed film".to_owned(),
        pitch_m: vec![value(4.000_312e-6, 0.000_428e-6), value(4.001_120e-6, 0.000_51e-6)],
        lattice_angle_rad: Some(value(119.992f64.to_radians(), 0.012f64.to_radians())),
        orientation_rad: value(12.34f64.to_radians(), 0.21f64.to_radians()),
        row_spacing_m: vec![value(3.464_6e-6, 0.000_4e-6), value(3.465_3e-6, 0.000_45e-6)],
        cell_area_m2: Some(value(13.862e-12, 0.003e-12)),
        kind: Some(KindStatement {
            kind: LatticeKind::Hexagonal,
            p_value: 0.37,
            sentence: "Equal pitches and 120° are within the uncertainty (p = 0.37).".to_owned(),
        }),
        budget: vec![
            budget_line("throw", &[0.812, 0.79], Some(0.0)),
            budget_line("spot centroids", &[0.103_7, 0.13], Some(0.94)),
            budget_line("screen tilt", &[0.05, 0.04], Some(0.06)),
            budget_line("target scale", &[0.034, 0.039_7], Some(0.0)),
            budget_line("wavelength", &[0.000_3, 0.000_3], Some(0.0)),
        ],
    }
}

fn grating() -> SampleResult {
    let pitch_m = Value { effective_degrees_of_freedom: f64::INFINITY, coverage_factor: 2.0, ..value(1.666_71e-6, 0.000_19e-6) };
    SampleResult {
        name: String::new(),
        pitch_m: vec![pitch_m],
        lattice_angle_rad: None,
        row_spacing_m: vec![pitch_m],
        cell_area_m2: None,
        kind: None,
        budget: vec![budget_line("throw", &[0.97], None), budget_line("spot centroids", &[0.03], None)],
        ..film()
    }
}

fn budget_line(source: &str, share: &[f64], angle_share: Option<f64>) -> BudgetLine {
    let u_pitch_m = share.iter().map(|share: &f64| 0.000_428e-6 * share.sqrt()).collect();
    BudgetLine { source: source.to_owned(), share: share.to_vec(), u_pitch_m, angle_share }
}

fn hexagon_orders() -> Vec<OrderRow> {
    let mut orders = vec![];
    for (h, k) in (-2..=2).flat_map(|h| (-2..=2).map(move |k| (h, k))).filter(|(h, k): &(i32, i32)| (h + k).abs() <= 2) {
        let (x, y) = (f64::from(h), f64::from(k));
        orders.push(order(h, k, 400.0 + 100.0 * x + 50.0 * y, 300.0 - 86.6 * y));
    }
    orders
}

fn order(h: i32, k: i32, x_px: f64, y_px: f64) -> OrderRow {
    OrderRow {
        photo: 0,
        h,
        k,
        at: PixelPoint { x_px, y_px },
        covariance: PixelCovariance::isotropic(0.03),
        residual_px: [0.02 * f64::from(h - k), 0.015 * f64::from(k)],
        used: (h, k) != (2, -2),
        clipped: (h, k) == (0, 0),
    }
}

fn rejected(x_px: f64, y_px: f64, reason: &str) -> RejectedSpot {
    RejectedSpot { photo: 0, at: PixelPoint { x_px, y_px }, reason: reason.to_owned(), detail: String::new() }
}

fn parameters() -> Vec<ParameterRow> {
    let row = |name: &str, unit, prior, value, u| ParameterRow { name: name.to_owned(), unit, prior, value, u };
    vec![
        row("throw", ParameterUnit::Length, Some((0.812, 0.000_8)), 0.814_8, 0.000_3),
        row("wavelength", ParameterUnit::Wavelength, Some((632.82e-9, 0.01e-9)), 632.82e-9, 0.01e-9),
        row("screen tilt about x", ParameterUnit::Angle, Some((0.0, 0.008_7)), 0.002, 0.001),
        row("focal length", ParameterUnit::Pixel, None, 3011.2, 2.4),
        row("lens k1", ParameterUnit::Number, Some((0.0, 0.1)), 0.012, 0.000_4),
    ]
}

fn photo() -> PhotoSummary {
    PhotoSummary {
        file: "pattern.jpg".to_owned(),
        size_px: [800, 600],
        exif: Exif { focal_length_m: Some(0.035), iso: Some(200.0), orientation: 1, ..Exif::default() },
        spots: 22,
        axes_px: vec![PixelPoint { x_px: 500.0, y_px: 300.0 }, PixelPoint { x_px: 450.0, y_px: 213.4 }],
    }
}
