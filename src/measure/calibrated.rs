//! A saved posterior in the place of what was stated: the parameters that it holds enter the problem as one joint prior.

use super::{
    MeasureError,
    cameras::Cameras,
    conclude::described,
    look::{Inputs, Seen},
    measurement::ParameterUnit,
};
use crate::{
    Error, Note,
    bench::Bench,
    calibration::{Calibration, CalibrationError, Posterior, Shows, UncertainValue},
    digest::sha256_hex,
    fit::{CorrelatedPrior, Entry, Layout, Marginal, Parameter, Prior, Source, camera_at, setup::LensKnowledge},
    frames::PixelPoint,
    optics::Camera,
    photo::Exif,
};
use nalgebra::Matrix3;

/// EXIF focal lengths that differ by less are the same zoom: they are written with two to four digits.
const SAME_FOCAL: f64 = 1e-3;

/// The lens: focal length, principal point, distortion.
pub(super) const LENS: [Parameter; 7] = [
    Parameter::LogFocalLength,
    Parameter::PrincipalPoint { axis: 0 },
    Parameter::PrincipalPoint { axis: 1 },
    Parameter::RadialDistortion { term: 0 },
    Parameter::RadialDistortion { term: 1 },
    Parameter::TangentialDistortion { term: 0 },
    Parameter::TangentialDistortion { term: 1 },
];

/// What stays the same when the sample is exchanged, in the order in which it is saved. Everything else (lattice and attitude of a sample,
/// steps of the screen, the target's pitch) is integrated out.
pub(super) fn bench_parameters(lasers: usize) -> Vec<Parameter> {
    let mut parameters = vec![Parameter::Throw];
    parameters.extend([0, 1].map(|axis| Parameter::ScreenTilt { axis }));
    parameters.extend([0, 1].map(|axis| Parameter::ZeroOrderOnPrint { axis }));
    parameters.push(Parameter::PrintTurn);
    parameters.extend((0..lasers).map(|laser| Parameter::Wavelength { laser }));
    parameters.extend(LENS);
    parameters.extend([0, 1, 2].map(|axis| Parameter::CameraTurn { view: 0, axis }));
    parameters.extend([0, 1, 2].map(|axis| Parameter::CameraPlace { view: 0, axis }));
    parameters
}

/// Name of a parameter in a calibration, and the unit in which it is written there.
pub(super) fn saved_as(bench: &Bench, parameter: Parameter) -> (String, &'static str) {
    in_file(described(bench, parameter))
}

/// Name and unit of a parameter as they stand in a calibration.
pub(super) fn in_file((name, unit): (String, ParameterUnit)) -> (String, &'static str) {
    let unit = match unit {
        ParameterUnit::Length => "mm",
        ParameterUnit::Wavelength => "nm",
        ParameterUnit::Angle => "deg",
        ParameterUnit::Pixel => "px",
        ParameterUnit::LineDensity | ParameterUnit::Number => "1",
    };
    (name, unit)
}

/// A saved posterior as entries of the problem.
pub(super) struct Prepared {
    pub(super) entries: Vec<Entry>,
    pub(super) prior: Option<CorrelatedPrior>,
}

/// Puts the parameters that a posterior names into the words of the fit.
pub(super) fn prepared(posterior: &Posterior, bench: &Bench, known: &[Parameter], source: Source) -> Result<Prepared, CalibrationError> {
    let named: Vec<(Parameter, String)> = known.iter().map(|&parameter| (parameter, saved_as(bench, parameter).0)).collect();
    let (mut exact, mut marginals) = (Vec::new(), Vec::new());
    for value in &posterior.values {
        let Some(&(parameter, _)) = named.iter().find(|(_, name)| *name == value.name) else {
            let advice = if value.name.starts_with("wavelength") { "; is a laser missing or renamed?" } else { "" };
            return Err(CalibrationError::UnknownParameter { name: value.name.clone(), advice });
        };
        let (mean, u) = as_fitted(parameter, value)?;
        if u > 0.0 {
            marginals.push(Marginal { parameter, mean, u });
        } else {
            exact.push(Entry { parameter, value: mean, prior: Prior::Exact, source, scale: 1.0 });
        }
    }
    let present = |parameter: &Parameter| {
        exact.iter().any(|entry| entry.parameter == *parameter) || marginals.iter().any(|marginal| marginal.parameter == *parameter)
    };
    // A laser that the calibration did not use keeps what the bench file says of it.
    let missing = named.iter().find(|(parameter, _)| !matches!(parameter, Parameter::Wavelength { .. }) && !present(parameter));
    if let Some((_, name)) = missing {
        return Err(CalibrationError::MissingParameter { name: name.clone() });
    }
    let prior = CorrelatedPrior::new(&marginals, &posterior.correlation, source);
    if prior.is_none() && !marginals.is_empty() {
        return Err(CalibrationError::Form { line: None, reason: "the correlation is not positive definite".to_owned() });
    }
    let entries = exact.into_iter().chain(prior.iter().flat_map(CorrelatedPrior::entries)).collect();
    Ok(Prepared { entries, prior })
}

/// Mean and u of the parameter as the fit knows it: of the focal length that is the logarithm.
fn as_fitted(parameter: Parameter, known: &UncertainValue) -> Result<(f64, f64), CalibrationError> {
    let positive = matches!(parameter, Parameter::LogFocalLength | Parameter::Throw | Parameter::Wavelength { .. });
    if positive && known.value <= 0.0 {
        return Err(CalibrationError::Form { line: None, reason: format!("{} = {} is not above zero", known.name, known.value) });
    }
    Ok(match parameter {
        Parameter::LogFocalLength => (known.value.ln(), known.u / known.value),
        _ => (known.value, known.u),
    })
}

/// The calibrated view, in place of one that dots or marks would have given.
pub(super) fn cameras(calibration: &Calibration, seen: &Seen, bench: &Bench) -> Result<Cameras, Error> {
    let known = bench_parameters(bench.lasers.len());
    let Prepared { entries, prior } = prepared(&calibration.posterior, bench, &known, Source::Calibration)?;
    let rows = calibration.camera_reference.ok_or(CalibrationError::MissingParameter { name: "camera_reference".to_owned() })?;
    let mut layout = Layout::default();
    entries.into_iter().for_each(|entry| {
        layout.add(entry);
    });
    let lens = lens_of(&layout, calibration.taken_with.size_px);
    let reference = Matrix3::from_fn(|row, column| rows[row][column]);
    let camera = camera_at(&layout, 0, reference);
    let prior =
        prior.map(|prior| prior.along_view(reference, points_over(&camera, lens.size_px)).ok_or(MeasureError::NoPose)).transpose()?;
    Ok(Cameras {
        layout,
        lens,
        references: vec![reference],
        prints: vec![],
        sheet_sides_m: None,
        view_of_photo: vec![0; seen.patterns.len()],
        correlated: prior.into_iter().collect(),
        screen_known: true,
    })
}

/// Points of the print that the camera sees on a regular net over the picture.
fn points_over(camera: &Camera<f64>, size_px: [f64; 2]) -> Vec<[f64; 2]> {
    const NET: [f64; 5] = [0.0, 0.25, 0.5, 0.75, 1.0];
    let pixel = |x: f64, y: f64| PixelPoint { x_px: x * (size_px[0] - 1.0), y_px: y * (size_px[1] - 1.0) };
    let places = NET.into_iter().flat_map(|y| NET.map(|x| pixel(x, y)));
    places.filter_map(|at| camera.print_point(at)).map(|point| [point.x_m, point.y_m]).collect()
}

/// The lens of a layout that knows it, as a start value for poses.
pub(super) fn lens_of(layout: &Layout, size_px: [usize; 2]) -> LensKnowledge {
    #[expect(clippy::cast_precision_loss, reason = "picture sizes are far below 2^53")]
    let size_px = size_px.map(|side| side as f64);
    let focal_px = layout.value(Parameter::LogFocalLength).unwrap_or(0.0).exp();
    LensKnowledge { focal_px, u_focal_px: 0.0, size_px }
}

/// Whether photos belong to the calibrations of a bench file; what cannot be checked gives a note.
pub(super) fn check(inputs: &Inputs<'_>, seen: &Seen, bench: &Bench) -> Result<Vec<Note>, super::Refusal> {
    let mut notes = Vec::new();
    if bench.camera.calibration.is_some() && bench.camera.lens.is_none() && bench.calibration.is_none() {
        return Err(CalibrationError::Absent.into());
    }
    let lens = bench.camera.lens.iter().filter(|_| bench.calibration.is_none());
    for calibration in bench.calibration.iter().chain(lens) {
        let patterns = inputs.patterns.iter().zip(seen.patterns.iter().map(|p| (p.size_px, &p.exif)));
        let targets = inputs.targets.iter().zip(seen.targets.iter().map(|t| (t.size_px, &t.exif)));
        for (file, (size_px, exif)) in patterns.chain(targets) {
            let blaming = |error: CalibrationError| super::Refusal { file: Some(file.name.to_owned()), error: Box::new(error.into()) };
            notes.extend(belongs(calibration, size_px, exif).map_err(blaming)?);
        }
    }
    if let Some(calibration) = &bench.calibration {
        own_evidence(calibration, inputs, bench)?;
    }
    notes.dedup();
    Ok(notes)
}

/// New evidence only, and from the place where the camera stood.
fn own_evidence(calibration: &Calibration, inputs: &Inputs<'_>, bench: &Bench) -> Result<(), super::Refusal> {
    if let Some(photo) = bench.photos.iter().find(|photo| photo.target.is_some()) {
        return Err(CalibrationError::CameraMoved { what: format!("[[photo]] {} names", photo.file) }.into());
    }
    for file in &inputs.patterns {
        let hash = sha256_hex(file.bytes);
        if calibration.made_from.photos.iter().any(|photo| photo.shows == Shows::Pattern && photo.sha256 == hash) {
            return Err(super::Refusal { file: Some(file.name.to_owned()), error: Box::new(CalibrationError::SamePhoto.into()) });
        }
    }
    Ok(())
}

/// Size, camera and zoom.
pub(super) fn belongs(calibration: &Calibration, size_px: [usize; 2], exif: &Exif) -> Result<Option<Note>, CalibrationError> {
    let taken = &calibration.taken_with;
    if taken.size_px != size_px {
        return Err(CalibrationError::OtherSize { photo: size_px, calibrated: taken.size_px });
    }
    let mut unchecked = false;
    let focal_lengths = [
        ("a focal length of", taken.focal_length_m, exif.focal_length_m),
        ("a focal length (35 mm equivalent) of", taken.focal_length_35mm_m, exif.focal_length_35mm_m),
    ];
    for (what, calibrated, photo) in focal_lengths {
        match (calibrated, photo) {
            (Some(calibrated), Some(photo)) if (photo / calibrated - 1.0).abs() > SAME_FOCAL => {
                let shown = |focal_m: f64| format!("{} mm", (focal_m * 1e6).round() / 1e3);
                return Err(CalibrationError::OtherCamera { what, photo: shown(photo), calibrated: shown(calibrated) });
            }
            (Some(_), None) => unchecked = true,
            _ => {}
        }
    }
    match (&taken.camera, &exif.camera) {
        (Some(calibrated), Some(photo)) if photo != calibrated => {
            let quoted = |name: &str| format!("\"{name}\"");
            return Err(CalibrationError::OtherCamera { what: "the camera", photo: quoted(photo), calibrated: quoted(calibrated) });
        }
        (Some(_), None) => unchecked = true,
        _ => {}
    }
    Ok(unchecked.then_some(Note::CalibrationUnchecked))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::calibration::{Kind, MadeFrom, TakenWith};
    use nalgebra::DMatrix;

    fn camera(taken_with: TakenWith) -> Calibration {
        let posterior = Posterior { values: vec![], correlation: DMatrix::zeros(0, 0) };
        Calibration { kind: Kind::Camera, made_from: MadeFrom::default(), taken_with, camera_reference: None, posterior }
    }

    #[test]
    fn another_size_camera_or_zoom_is_refused() {
        let taken = TakenWith { size_px: [800, 600], camera: Some("A".to_owned()), focal_length_m: Some(0.035), focal_length_35mm_m: None };
        let calibration = camera(taken);
        let exif = Exif { focal_length_m: Some(0.035), camera: Some("A".to_owned()), ..Exif::default() };
        assert_eq!(belongs(&calibration, [800, 600], &exif), Ok(None));
        assert_eq!(belongs(&calibration, [800, 600], &Exif::default()), Ok(Some(Note::CalibrationUnchecked)));
        let says = |size: [usize; 2], exif: &Exif| belongs(&calibration, size, exif).unwrap_err().to_string();
        assert!(says([600, 800], &exif).contains("600x800") && says([600, 800], &exif).contains("800x600"));
        let zoomed = Exif { focal_length_m: Some(0.050), ..exif.clone() };
        assert!(says([800, 600], &zoomed).contains("50 mm") && says([800, 600], &zoomed).contains("35 mm"));
        assert!(says([800, 600], &Exif { camera: Some("B".to_owned()), ..exif }).contains("\"B\""));
    }
}
