//! From the solved problem to the result: values with uncertainty, budget, tables.

use super::{
    Inputs, MeasureError,
    fitted::Fitted,
    look::Seen,
    measurement::{
        FitSummary, Measurement, OrderRow, ParameterRow, ParameterUnit, PhotoSummary, ReciprocalView, RejectedSpot, SampleResult, ZeroOrder,
    },
    openness,
    orders::Ordered,
    statement::kind_statement,
};
use crate::{
    bench::Bench,
    budget::{self, Value},
    fit::{Cell, Derived, Fit, Parameter, PrintPlace, Prior, SheetEdge, Source, cell},
    frames::{PixelCovariance, PixelPoint},
    optics::{Attitude, zero_order_in_sample_plane},
};

/// Gathers the result of a solved problem.
pub(super) fn conclude(fitted: &Fitted<'_>, bench: &Bench) -> Result<Measurement, MeasureError> {
    let Fitted { inputs, seen, ordered, fit, notes } = fitted;
    let wanted = wanted_sample(bench, fit);
    let mut samples: Vec<usize> = fit.joint.shape.photos.iter().map(|photo| photo.sample).collect();
    samples.sort_unstable();
    samples.dedup();
    let mut results = Vec::new();
    for sample in samples.into_iter().filter(|&sample| sample != wanted) {
        results.push(sample_result(bench, fit, sample)?);
    }
    let photo = fit.joint.shape.photos.iter().position(|photo| photo.sample == wanted).unwrap_or(0);
    let orders = order_rows(seen, fit);
    Ok(Measurement {
        sample: sample_result(bench, fit, wanted)?,
        other_samples: results,
        zero_order: zero_order(fit, photo, &orders)?,
        rejected: rejected_spots(seen, ordered, fit),
        orders,
        parameters: parameter_rows(bench, fit),
        fit: summary(fit),
        photos: photo_summaries(inputs, seen, fit),
        mode: bench.samples[wanted].mode,
        trials: None,
        reciprocal: reciprocal_view(fit, photo),
        notes: notes.clone(),
    })
}

/// The sample to be measured: the first in a photo whose pitch is not known already.
pub(super) fn wanted_sample(bench: &Bench, fit: &Fit) -> usize {
    let shown = |sample: &usize| fit.joint.shape.photos.iter().any(|photo| photo.sample == *sample);
    let samples = 0..bench.samples.len();
    samples
        .clone()
        .filter(shown)
        .find(|&sample| bench.samples[sample].pitch_m.is_empty())
        .or_else(|| samples.clone().find(shown))
        .unwrap_or(0)
}

fn sample_result(bench: &Bench, fit: &Fit, sample: usize) -> Result<SampleResult, MeasureError> {
    let values = fit.joint.values();
    let found: Cell = cell(&fit.joint.layout, &fit.joint.shape, &values, sample).ok_or(MeasureError::FlatLattice)?;
    let value = |derived: &Derived| budget::value(fit, derived);
    let pitch_m: Vec<Value> = found.pitch_m.iter().map(value).collect();
    let is_open = |(_, pitch): &(&Derived, &Value)| !(pitch.u.is_finite() && pitch.u > 0.0 && pitch.u < 0.5 * pitch.value);
    if let Some((derived, open)) = found.pitch_m.iter().zip(&pitch_m).find(is_open) {
        let advice = openness::in_words(bench, fit, derived);
        return Err(MeasureError::PitchNotFixed { pitch_m: open.value, u_m: open.u, advice });
    }
    Ok(SampleResult {
        name: bench.samples[sample].name.clone(),
        kind: kind_statement(fit, &found),
        lattice_angle_rad: found.angle_rad.as_ref().map(value),
        orientation_rad: value(&found.orientation_rad),
        row_spacing_m: found.row_spacing_m.iter().map(value).collect(),
        cell_area_m2: found.area_m2.as_ref().map(value),
        budget: budget::budget(fit, &found.pitch_m, found.angle_rad.as_ref(), |source| source_name(bench, source)),
        pitch_m,
    })
}

/// Name of a budget line; lasers and samples are told apart where there are several.
fn source_name(bench: &Bench, source: Source) -> String {
    let named = |name: &str| if name.is_empty() { source.name().to_owned() } else { format!("{} {name}", source.name()) };
    match source {
        Source::Wavelength { laser } => named(&bench.lasers[laser].name),
        Source::Incidence { sample } | Source::ReferencePitch { sample } if bench.samples.len() > 1 => named(&bench.samples[sample].name),
        _ => source.name().to_owned(),
    }
}

fn order_rows(seen: &Seen, fit: &Fit) -> Vec<OrderRow> {
    let birge = fit.joint.spot_scale.powi(2);
    let row = |(spot, residual): (&crate::fit::SpotObservation, Option<[f64; 2]>)| OrderRow {
        photo: spot.photo,
        h: spot.order.0,
        k: spot.order.1,
        at: spot.at,
        covariance: PixelCovariance { xx: spot.covariance.xx * birge, xy: spot.covariance.xy * birge, yy: spot.covariance.yy * birge },
        residual_px: residual.unwrap_or([0.0; 2]),
        used: spot.weight > 0.5 && residual.is_some(),
        clipped: seen.patterns[spot.photo].spots.spots[spot.spot].clipped_px > 0,
    };
    let mut rows: Vec<OrderRow> = fit.joint.spots.iter().zip(fit.joint.spot_residuals_px()).map(row).collect();
    rows.sort_by_key(|row| (row.photo, row.h.abs() + row.k.abs(), row.h, row.k));
    rows
}

fn rejected_spots(seen: &Seen, ordered: &[Ordered], fit: &Fit) -> Vec<RejectedSpot> {
    let mut rejected = Vec::new();
    for (photo, pattern) in seen.patterns.iter().enumerate() {
        for (number, spot) in pattern.spots.spots.iter().enumerate() {
            if !fit.joint.spots.iter().any(|used| used.photo == photo && used.spot == number) {
                let (reason, detail) = ordered[photo].reason(number);
                rejected.push(RejectedSpot { photo, at: spot.at, reason: reason.to_owned(), detail });
            }
        }
    }
    rejected
}

fn zero_order(fit: &Fit, photo: usize, orders: &[OrderRow]) -> Result<ZeroOrder, MeasureError> {
    let seen = orders.iter().any(|row| row.photo == photo && row.h == 0 && row.k == 0);
    let predicted = fit.joint.predict(&fit.joint.values(), photo, &[(0, 0)]);
    let [x_px, y_px] = predicted[0].ok_or(MeasureError::NoPose)?;
    Ok(ZeroOrder { at: PixelPoint { x_px, y_px }, seen })
}

/// Right is -x for someone who looks along the beam (docs/conventions.md).
fn reciprocal_view(fit: &Fit, photo: usize) -> ReciprocalView {
    let layout = &fit.joint.layout;
    let (sample, laser) = (fit.joint.shape.photos[photo].sample, fit.joint.shape.photos[photo].laser);
    let value = |parameter| layout.value(parameter).unwrap_or(0.0);
    let seen = |[x, y]: [f64; 2]| [-x, y];
    let attitude = Attitude::turned([0, 1].map(|axis| value(Parameter::Incidence { sample, axis })));
    let vector = |vector: usize| {
        let component = |axis| layout.value(Parameter::Lattice { sample, vector, axis });
        Some(seen([component(0)?, component(1)?]))
    };
    ReciprocalView {
        wavelength_m: value(Parameter::Wavelength { laser }),
        zero_order: seen(zero_order_in_sample_plane(&attitude)),
        vectors_per_m: [vector(0), vector(1)].into_iter().flatten().collect(),
    }
}

fn summary(fit: &Fit) -> FitSummary {
    FitSummary {
        chi2_reduced: fit.spot_chi2_reduced,
        degrees_of_freedom: fit.spot_freedom,
        rms_px: fit.spot_rms_px,
        birge_factor: fit.joint.spot_scale,
        spots_used: fit.joint.spots.iter().filter(|spot| spot.weight > 0.5).count(),
        dots_used: fit.joint.prints.iter().filter(|print| print.weight > 0.5 && !matches!(print.place, PrintPlace::ScaleEnd(_))).count(),
    }
}

fn photo_summaries(inputs: &Inputs<'_>, seen: &Seen, fit: &Fit) -> Vec<PhotoSummary> {
    let summary = |(photo, pattern): (usize, &super::look::SeenPattern)| PhotoSummary {
        file: inputs.patterns[photo].name.to_owned(),
        size_px: pattern.size_px,
        exif: pattern.exif.clone(),
        spots: pattern.spots.spots.len(),
        axes_px: fit
            .joint
            .predict(&fit.joint.values(), photo, &[(1, 0), (0, 1)])
            .into_iter()
            .take(
                if fit.joint.layout.place(Parameter::Lattice { sample: fit.joint.shape.photos[photo].sample, vector: 1, axis: 0 }).is_some()
                {
                    2
                } else {
                    1
                },
            )
            .flatten()
            .map(|[x_px, y_px]| PixelPoint { x_px, y_px })
            .collect(),
    };
    seen.patterns.iter().enumerate().map(summary).collect()
}

fn parameter_rows(bench: &Bench, fit: &Fit) -> Vec<ParameterRow> {
    let layout = &fit.joint.layout;
    let row = |(place, entry): (usize, &crate::fit::Entry)| {
        let (name, unit) = described(bench, entry.parameter);
        let u = layout.column(place).map_or(0.0, |column| fit.covariance[(column, column)].max(0.0).sqrt());
        let prior = match entry.prior {
            Prior::Normal { mean, u } | Prior::Correlated { mean, u } => Some((mean, u)),
            Prior::Exact => Some((entry.value, 0.0)),
            Prior::Free => None,
        };
        let row = ParameterRow { name, unit, prior, value: entry.value, u };
        if entry.parameter == Parameter::LogFocalLength { from_logarithm(row) } else { row }
    };
    layout.entries().iter().enumerate().map(row).collect()
}

/// A row whose parameter is a logarithm, as the quantity itself.
fn from_logarithm(row: ParameterRow) -> ParameterRow {
    let natural = |(log, u): (f64, f64)| (log.exp(), log.exp() * u);
    let (value, u) = natural((row.value, row.u));
    ParameterRow { prior: row.prior.map(natural), value, u, ..row }
}

/// Name and unit of a parameter for reports.
pub(super) fn described(bench: &Bench, parameter: Parameter) -> (String, ParameterUnit) {
    let axis_name = |axis: usize| ["x", "y", "z"][axis.min(2)];
    let of = |name: &str, what: String| if name.is_empty() { what } else { format!("{what} of {name}") };
    match parameter {
        Parameter::Lattice { sample, vector, axis } => {
            (of(&bench.samples[sample].name, format!("g{} {}", vector + 1, axis_name(axis))), ParameterUnit::LineDensity)
        }
        Parameter::Incidence { sample, axis } => {
            (of(&bench.samples[sample].name, format!("incidence {}", axis_name(axis))), ParameterUnit::Angle)
        }
        Parameter::Wavelength { laser } => (of(&bench.lasers[laser].name, "wavelength".to_owned()), ParameterUnit::Wavelength),
        Parameter::Throw => ("throw".to_owned(), ParameterUnit::Length),
        Parameter::Step { photo } => (format!("step of photo {}", photo + 1), ParameterUnit::Length),
        Parameter::ScreenTilt { axis } => (format!("screen tilt {}", axis_name(axis)), ParameterUnit::Angle),
        Parameter::ZeroOrderOnPrint { axis } => (format!("zero order on target {}", ["X", "Y"][axis.min(1)]), ParameterUnit::Length),
        Parameter::PrintTurn => ("target turn".to_owned(), ParameterUnit::Angle),
        Parameter::TargetPitch => ("target pitch".to_owned(), ParameterUnit::Length),
        Parameter::SheetSide { axis } => (["sheet width", "sheet height"][axis.min(1)].to_owned(), ParameterUnit::Length),
        Parameter::SheetBow { edge } => {
            let name = match edge {
                SheetEdge::Left => "left",
                SheetEdge::Right => "right",
                SheetEdge::Bottom => "lower",
                SheetEdge::Top => "upper",
            };
            (format!("bow of the sheet's {name} edge"), ParameterUnit::Length)
        }
        Parameter::LogFocalLength
        | Parameter::PrincipalPoint { .. }
        | Parameter::RadialDistortion { .. }
        | Parameter::TangentialDistortion { .. } => described_lens(parameter),
        Parameter::CameraTurn { view, axis } => (format!("camera turn {} (view {})", axis_name(axis), view + 1), ParameterUnit::Angle),
        Parameter::CameraPlace { view, axis } => (format!("camera place {} (view {})", axis_name(axis), view + 1), ParameterUnit::Length),
        Parameter::ScaleEnd { end, axis } => (format!("scale end {} {}", end + 1, ["X", "Y"][axis.min(1)]), ParameterUnit::Length),
    }
}

/// Name and unit of a parameter of the lens; nothing else has a name here.
pub(super) fn described_lens(parameter: Parameter) -> (String, ParameterUnit) {
    match parameter {
        Parameter::LogFocalLength => ("focal length".to_owned(), ParameterUnit::Pixel),
        Parameter::PrincipalPoint { axis } => (format!("principal point {}", ["x", "y"][axis.min(1)]), ParameterUnit::Pixel),
        Parameter::RadialDistortion { term } => (format!("distortion k{}", term + 1), ParameterUnit::Number),
        Parameter::TangentialDistortion { term } => (format!("distortion p{}", term + 1), ParameterUnit::Number),
        _ => (String::new(), ParameterUnit::Number),
    }
}
