//! A camera from several views of the dot target: closed-form start, then all views and the lens in one least-squares problem.

use super::{
    MeasureError, PhotoFile, Refusal,
    calibrate::{made_photos, posterior, taken_with},
    calibrated::{LENS, belongs, in_file},
    cameras::{Discs, approached, pixel_from_metres, print_observations},
    conclude::described_lens,
    look::{SeenDots, look_at_dots},
    view::pose_from_homography,
    zhang::lens_from_homographies,
};
use crate::{
    Error, Note,
    calibration::{Calibration, CalibrationError, Certificate, Kind, MadeFrom, Posterior, Shows},
    fit::{
        Fit, Joint, Layout, Outliers, PrintObservation, PrintPlace, Shape, Sharpness,
        setup::{self, LensKnowledge, ViewStart},
        solve,
    },
    frames::{PixelCovariance, PixelPoint, Side},
    quantity::{Quantity, format_length},
    target,
};
use nalgebra::{Matrix3, Vector3};
use rayon::prelude::*;

/// Two views fix focal length and principal point with nothing left to check them.
const LEAST_VIEWS: usize = 3;
/// Directions closer together leave focal length and distance to be guessed from a hundredth of a pixel.
const LEAST_SPREAD_RAD: f64 = 8.0 * std::f64::consts::PI / 180.0;
/// A focal length known worse than this is no calibration: EXIF data tell as much.
const MOST_RELATIVE_U: f64 = 0.03;

/// A calibrated camera, and how well its views agree.
#[derive(Debug, Clone, PartialEq)]
pub struct CameraCalibration {
    /// Mean and covariance of the lens; lacks date and program.
    pub calibration: Calibration,
    /// Every view, in the order given.
    pub views: Vec<ViewSummary>,
    /// Dots used.
    pub dots_used: usize,
    /// Factor applied to the uncertainties of the dots (1 when they were honest).
    pub birge_factor: f64,
    /// Reduced chi-square of the dots with their stated uncertainties.
    pub chi2_reduced: f64,
    /// Degrees of freedom that the dots leave over.
    pub degrees_of_freedom: f64,
    /// What a reader of the result must know.
    pub notes: Vec<Note>,
}

/// One view of the target.
#[derive(Debug, Clone, PartialEq)]
pub struct ViewSummary {
    /// Name of the photo.
    pub file: String,
    /// Dots used and found.
    pub dots: [usize; 2],
    /// Root mean square distance of the used dots from the model, px.
    pub rms_px: f64,
    /// Angle between the line of sight and the print's normal, rad.
    pub oblique_rad: f64,
    /// From the print's origin to the camera, m.
    pub distance_m: f64,
}

/// A point of a plane, m, and its pixel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PointPair {
    /// Place on the plane, m.
    pub plane_m: [f64; 2],
    /// Where it is seen.
    pub at: PixelPoint,
}

/// Calibrates a camera from photos of the printed dot target, laser off, taken from different directions with one zoom and focus.
///
/// - `photos`: three or more
/// - `pitch_m`: pitch of the target; the lens does not depend on it, the stated distances do
///
/// # Errors
/// A photo that shows no target, photos of different settings, views that do not fix the lens.
pub fn calibrate_camera(photos: &[PhotoFile<'_>], pitch_m: Quantity) -> Result<CameraCalibration, Refusal> {
    enough(photos.len())?;
    let made = made_photos(photos, Shows::Target).collect::<Vec<_>>();
    for (i, photo) in made.iter().enumerate() {
        if let Some(first) = made[..i].iter().find(|other| other.sha256 == photo.sha256) {
            return Err(blaming(&photo.file, CalibrationError::ViewTwice { first: first.file.clone() }.into()));
        }
    }
    let looked = |file: &PhotoFile<'_>| look_at_dots(file).map_err(|error| blaming(file.name, error));
    let seen = photos.par_iter().map(looked).collect::<Result<Vec<SeenDots>, Refusal>>()?;
    let mut calibration = Calibration {
        kind: Kind::Camera,
        made_from: MadeFrom {
            photos: made,
            certificates: vec![Certificate { of: "target".to_owned(), pitch: format_length(pitch_m.value, pitch_m.u) }],
            ..MadeFrom::default()
        },
        taken_with: taken_with(seen[0].size_px, &seen[0].exif),
        camera_reference: None,
        posterior: Posterior { values: vec![], correlation: nalgebra::DMatrix::zeros(0, 0) },
    };
    for (file, view) in photos.iter().zip(&seen) {
        let differ = |why| CalibrationError::ViewsDiffer { first: photos[0].name.to_owned(), why: Box::new(why) };
        belongs(&calibration, view.size_px, &view.exif).map_err(|why| blaming(file.name, differ(why).into()))?;
    }
    let views = seen.iter().enumerate().map(|(number, view)| Plane {
        homography: pixel_from_metres(&view.reading, pitch_m.value),
        prints: print_observations(number, &view.reading).collect(),
    });
    let discs = Discs { pitch_m: pitch_m.value, readings: seen.iter().map(|view| &view.reading).collect() };
    let fit = solved(&views.collect::<Vec<_>>(), seen[0].size_px, Some(&discs), Outliers::Rejected)?;
    let distances = distances_px(&fit);
    calibration.posterior = lens_posterior(&fit)?;
    calibration.made_from.rms_px = rms(distances.iter().map(|(_, distance)| *distance));
    Ok(CameraCalibration {
        calibration,
        views: (0..photos.len()).map(|view| summary(&fit, photos[view].name, view, &distances)).collect(),
        dots_used: distances.len(),
        birge_factor: fit.joint.print_scale,
        chi2_reduced: fit.print_chi2_reduced,
        degrees_of_freedom: fit.print_freedom,
        notes: seen.iter().flat_map(|view| view.reading.notes.iter().cloned()).collect(),
    })
}

/// The lens from points of a plane whose pixels are known to `u_px` at best: mean and covariance, with nothing known beforehand.
///
/// Where the points scatter more than `u_px`, their scatter counts.
///
/// # Errors
/// As [`calibrate_camera`].
pub fn lens_from_points(views: &[Vec<PointPair>], size_px: [usize; 2], u_px: f64) -> Result<Posterior, Error> {
    enough(views.len())?;
    let plane = |(view, pairs): (usize, &Vec<PointPair>)| {
        let corners: Vec<([f64; 2], [f64; 2])> = pairs.iter().map(|pair| (pair.plane_m, [pair.at.x_px, pair.at.y_px])).collect();
        let homography = target::homography(&corners).ok_or(MeasureError::NoPose)?;
        let print = |pair: &PointPair| PrintObservation {
            view,
            at: pair.at,
            sharpness: Sharpness::Point(PixelCovariance::isotropic(u_px)),
            place: PrintPlace::Metres(pair.plane_m),
            weight: 1.0,
        };
        Ok(Plane { homography: Matrix3::from_fn(|row, column| homography[row][column]), prints: pairs.iter().map(print).collect() })
    };
    let planes = views.iter().enumerate().map(plane).collect::<Result<Vec<_>, MeasureError>>()?;
    Ok(lens_posterior(&solved(&planes, size_px, None, Outliers::Kept)?)?)
}

/// A plane in one view: a first homography (metres to pixels) and its points.
struct Plane {
    homography: Matrix3<f64>,
    prints: Vec<PrintObservation>,
}

fn blaming(file: &str, error: Error) -> Refusal {
    Refusal { file: Some(file.to_owned()), error: Box::new(error) }
}

fn enough(found: usize) -> Result<(), CalibrationError> {
    if found < LEAST_VIEWS { Err(CalibrationError::TooFewViews { found, needed: LEAST_VIEWS }) } else { Ok(()) }
}

/// All views and the lens, nothing known beforehand.
fn solved(planes: &[Plane], size_px: [usize; 2], discs: Option<&Discs<'_>>, outliers: Outliers) -> Result<Fit, Error> {
    #[expect(clippy::cast_precision_loss, reason = "picture sizes are far below 2^53")]
    let size_px = size_px.map(|side| side as f64);
    let homographies: Vec<Matrix3<f64>> = planes.iter().map(|plane| plane.homography).collect();
    let parallel = |spread_rad| CalibrationError::ViewsParallel { spread_rad, needed_rad: LEAST_SPREAD_RAD };
    let (focal_px, principal_px) = lens_from_homographies(&homographies, size_px).ok_or_else(|| parallel(0.0))?;
    let lens = LensKnowledge { focal_px, u_focal_px: 0.0, size_px };
    let starts = homographies.iter().map(|homography| pose_from_homography(homography, &lens).ok_or(MeasureError::NoPose));
    let starts = starts.collect::<Result<Vec<ViewStart>, MeasureError>>()?;
    // Views that are plainly parallel would only send the solver astray.
    let guessed_rad = widest_angle(starts.iter().map(|start| start.reference.column(2).into_owned()));
    if guessed_rad < LEAST_SPREAD_RAD / 2.0 {
        return Err(parallel(guessed_rad).into());
    }
    let mut layout = Layout::default();
    setup::add_unknown_lens(&mut layout, focal_px, principal_px);
    setup::add_views(&mut layout, &starts);
    if let Some(discs) = discs {
        // Focal length and distortion do not depend on the size of the print.
        setup::add_target_pitch(&mut layout, Quantity::exact(discs.pitch_m));
    }
    let joint = Joint {
        layout,
        shape: Shape { photos: vec![], references: starts.iter().map(|start| start.reference).collect(), seen_from: Side::Front },
        spots: vec![],
        prints: planes.iter().flat_map(|plane| plane.prints.iter().copied()).collect(),
        knowledge: vec![],
        correlated: vec![],
        spot_scale: 1.0,
        print_scale: 1.0,
    };
    let joint = Joint { print_scale: 1.0, ..approached(joint, discs, outliers)? };
    let fit = solve(joint, if outliers == Outliers::Kept { Outliers::Kept } else { Outliers::Rechecked })?;
    let values = fit.joint.values();
    let normal = |view| fit.joint.camera(&values, view).rotation().column(2).into_owned();
    let spread_rad = widest_angle((0..planes.len()).map(normal));
    if spread_rad < LEAST_SPREAD_RAD {
        return Err(parallel(spread_rad).into());
    }
    Ok(fit)
}

/// Largest angle between the normals of two views, as the camera sees them.
fn widest_angle(normals: impl Iterator<Item = Vector3<f64>>) -> f64 {
    let normals: Vec<Vector3<f64>> = normals.collect();
    let pairs = normals.iter().enumerate().flat_map(|(i, a)| normals[..i].iter().map(move |b| a.angle(b)));
    pairs.fold(0.0, f64::max)
}

fn lens_posterior(fit: &Fit) -> Result<Posterior, CalibrationError> {
    let posterior = posterior(fit, &LENS, |parameter| in_file(described_lens(parameter)))?;
    let relative_u = posterior.values[0].u / posterior.values[0].value;
    if relative_u > MOST_RELATIVE_U {
        return Err(CalibrationError::LensOpen { relative_u, most: MOST_RELATIVE_U });
    }
    Ok(posterior)
}

/// View and distance from the model, px, of every dot that took part.
fn distances_px(fit: &Fit) -> Vec<(usize, f64)> {
    let used = fit.joint.prints.iter().zip(fit.joint.print_residuals_px()).filter(|(print, _)| print.weight > 0.5);
    used.filter_map(|(print, offset)| offset.map(|[x, y]| (print.view, x.hypot(y)))).collect()
}

fn rms(distances_px: impl Iterator<Item = f64>) -> f64 {
    let (count, squares) = distances_px.fold((0.0, 0.0), |(count, squares), distance| (count + 1.0, squares + distance * distance));
    if count > 0.0 { (squares / count).sqrt() } else { 0.0 }
}

fn summary(fit: &Fit, file: &str, view: usize, distances: &[(usize, f64)]) -> ViewSummary {
    let camera = fit.joint.camera(&fit.joint.values(), view);
    let eye_m = camera.eye_m();
    let of_view = || distances.iter().filter(|(of, _)| *of == view).map(|(_, distance)| *distance);
    ViewSummary {
        file: file.to_owned(),
        dots: [of_view().count(), fit.joint.prints.iter().filter(|print| print.view == view).count()],
        rms_px: rms(of_view()),
        oblique_rad: camera.rotation()[(2, 2)].abs().min(1.0).acos(),
        distance_m: eye_m.norm(),
    }
}
