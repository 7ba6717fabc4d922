//! From a solved problem to what is worth keeping: the posterior of everything that stays when the sample is exchanged.

use super::{
    calibrated::{bench_parameters, saved_as},
    fitted::Fitted,
};
use crate::{
    bench::{Bench, Target, TargetKind},
    calibration::{Calibration, CalibrationError, Certificate, Kind, MadeFrom, MadePhoto, Posterior, Shows, TakenWith, UncertainValue},
    digest::sha256_hex,
    fit::{Fit, Parameter},
    math::gum::correlation,
    measure::PhotoFile,
    photo::Exif,
    quantity::format_length,
};
use nalgebra::DMatrix;

/// The calibration of a bench: mean and covariance of throw, screen, lasers, lens and camera, given all photos and statements.
///
/// Date, program, hash and sections of the bench file are left to the caller, who knows clock and text.
pub(super) fn bench_calibration(fitted: &Fitted<'_>, bench: &Bench) -> Result<Calibration, CalibrationError> {
    let fit = &fitted.fit;
    let views = fit.joint.shape.references.len();
    if views != 1 {
        return Err(CalibrationError::SeveralViews { views });
    }
    let reference = fit.joint.shape.references[0];
    let pattern = fitted.seen.patterns.first().map(|pattern| (pattern.size_px, &pattern.exif));
    let (size_px, exif) = pattern.ok_or(CalibrationError::Open)?;
    Ok(Calibration {
        kind: Kind::Bench,
        made_from: MadeFrom {
            photos: made_photos(&fitted.inputs.patterns, Shows::Pattern)
                .chain(made_photos(&fitted.inputs.targets, Shows::Target))
                .collect(),
            certificates: certificates(bench),
            rms_px: fit.spot_rms_px,
            ..MadeFrom::default()
        },
        taken_with: taken_with(size_px, exif),
        camera_reference: Some(std::array::from_fn(|row| std::array::from_fn(|column| reference[(row, column)]))),
        posterior: posterior(fit, &bench_parameters(bench.lasers.len()), |parameter| saved_as(bench, parameter))?,
    })
}

/// Mean and covariance of those of the parameters that the problem has; all others are integrated out.
///
/// - `saved_as`: name and unit of a parameter in the file
pub(super) fn posterior(
    fit: &Fit,
    parameters: &[Parameter],
    saved_as: impl Fn(Parameter) -> (String, &'static str),
) -> Result<Posterior, CalibrationError> {
    let layout = &fit.joint.layout;
    let (mut values, mut columns) = (Vec::new(), Vec::new());
    for &parameter in parameters {
        let Some(place) = layout.place(parameter) else { continue };
        let fitted = layout.entries()[place].value;
        let u = layout.column(place).map_or(0.0, |column| {
            columns.push(column);
            fit.covariance[(column, column)].max(0.0).sqrt()
        });
        let (value, u) = if parameter == Parameter::LogFocalLength { (fitted.exp(), fitted.exp() * u) } else { (fitted, u) };
        let (name, unit) = saved_as(parameter);
        values.push(UncertainValue { name, unit: unit.to_owned(), value, u });
    }
    let covariance = DMatrix::from_fn(columns.len(), columns.len(), |i, j| fit.covariance[(columns[i], columns[j])]);
    let mut correlation = correlation(&covariance);
    correlation = (&correlation + correlation.transpose()) / 2.0;
    correlation.fill_diagonal(1.0);
    let fixed = values.iter().all(|known| known.u.is_finite() && known.value.is_finite());
    if !fixed || nalgebra::Cholesky::new(correlation.clone()).is_none() {
        return Err(CalibrationError::Open);
    }
    Ok(Posterior { values, correlation })
}

pub(super) fn made_photos<'a>(files: &'a [PhotoFile<'a>], shows: Shows) -> impl Iterator<Item = MadePhoto> + 'a {
    files.iter().map(move |file| MadePhoto { file: file.name.to_owned(), sha256: sha256_hex(file.bytes), shows })
}

pub(super) fn taken_with(size_px: [usize; 2], exif: &Exif) -> TakenWith {
    TakenWith { size_px, camera: exif.camera.clone(), focal_length_m: exif.focal_length_m, focal_length_35mm_m: exif.focal_length_35mm_m }
}

/// The lengths that everything else rests on.
fn certificates(bench: &Bench) -> Vec<Certificate> {
    let mut known: Vec<Certificate> = Vec::new();
    for sample in &bench.samples {
        let of = if sample.name.is_empty() { "sample" } else { &sample.name };
        known.extend(sample.pitch_m.iter().map(|pitch| Certificate { of: of.to_owned(), pitch: format_length(pitch.value, pitch.u) }));
    }
    if let Some(Target { kind: TargetKind::Dots { pitch_m, .. }, .. }) = &bench.target {
        known.push(Certificate { of: "target".to_owned(), pitch: format_length(pitch_m.value, pitch_m.u) });
    }
    known
}
