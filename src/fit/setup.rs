//! What is known before the photos are looked at, as entries of the layout: the bench file where it speaks, what holds for ordinary benches
//! and cameras where it is silent.

use super::{
    observation::SheetEdge,
    parameter::{Entry, Layout, Parameter, Prior},
    source::Source,
};
use crate::{
    bench::{Bench, Sample},
    quantity::Quantity,
};
use nalgebra::Matrix3;

/// An ordinary lens: principal point within 3 % of the picture's width (common practice).
const PRINCIPAL_POINT_U_WIDTHS: f64 = 0.03;
/// An ordinary lens: k1 and k2 within 0.3 (common practice; beyond lies the fisheye).
const RADIAL_U: f64 = 0.3;
/// An ordinary lens: p1 and p2 within 0.005 (common practice).
const TANGENTIAL_U: f64 = 0.005;
/// A bench that says nothing of screen tilt or incidence was still set up by eye: within 5°.
const ATTITUDE_BY_EYE_RAD: f64 = 5.0 * std::f64::consts::PI / 180.0;
/// A camera that stands square-on by eye.
pub const SQUARE_ON_BY_EYE_RAD: f64 = 5.0 * std::f64::consts::PI / 180.0;
/// A sheet that is pinned up waves a little: its edges are straight within a millimetre (common practice), u = 1 mm / √3.
const SHEET_BOW_U_M: f64 = 0.58e-3;
/// A print that nobody levelled.
const PRINT_TURN_BY_EYE_RAD: f64 = 5.0 * std::f64::consts::PI / 180.0;

/// A camera position as first guessed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ViewStart {
    /// Rotation from print axes to camera axes.
    pub reference: Matrix3<f64>,
    /// Origin of the print in camera axes, m.
    pub place_m: [f64; 3],
    /// Whether a turn about the optical axis is an unknown (false where the photo itself defines the horizontal).
    pub roll: Roll,
}

/// Whether the camera's turn about its own axis is an unknown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Roll {
    /// The print defines the horizontal.
    Free,
    /// Without a print the photo's own x axis defines it.
    Defined,
}

/// What is known of the lens.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LensKnowledge {
    /// Focal length, px.
    pub focal_px: f64,
    /// Its standard uncertainty, px.
    pub u_focal_px: f64,
    /// Size of the photo, px.
    pub size_px: [f64; 2],
}

fn entry(parameter: Parameter, value: f64, prior: Prior, source: Source, scale: f64) -> Entry {
    Entry { parameter, value, prior, source, scale }
}

/// Prior of a stated quantity: exact when it has no uncertainty.
fn stated(parameter: Parameter, quantity: Quantity, source: Source) -> Entry {
    if quantity.u > 0.0 {
        entry(parameter, quantity.value, Prior::Normal { mean: quantity.value, u: quantity.u }, source, quantity.u)
    } else {
        entry(parameter, quantity.value, Prior::Exact, source, 1.0)
    }
}

fn by_eye(parameter: Parameter, u: f64, source: Source) -> Entry {
    entry(parameter, 0.0, Prior::Normal { mean: 0.0, u }, source, u)
}

/// Adds the camera: intrinsics shared by all views, and the pose of each view.
pub fn add_camera(layout: &mut Layout, lens: &LensKnowledge, views: &[ViewStart]) {
    add_ordinary_lens(layout, lens);
    add_views(layout, views);
}

/// Adds a lens of which nothing is known beforehand, with start values for focal length and principal point, px.
pub fn add_unknown_lens(layout: &mut Layout, focal_px: f64, principal_px: [f64; 2]) {
    let mut free = |parameter, value, scale| layout.add(entry(parameter, value, Prior::Free, Source::Lens, scale));
    free(Parameter::LogFocalLength, focal_px.ln(), 0.01);
    for (axis, place_px) in principal_px.into_iter().enumerate() {
        free(Parameter::PrincipalPoint { axis }, place_px, 1.0);
    }
    for term in 0..2 {
        free(Parameter::RadialDistortion { term }, 0.0, 0.01);
        free(Parameter::TangentialDistortion { term }, 0.0, 0.001);
    }
}

/// An ordinary lens, as far as EXIF data or the operator know it.
fn add_ordinary_lens(layout: &mut Layout, lens: &LensKnowledge) {
    let [width, height] = lens.size_px;
    let u_principal = PRINCIPAL_POINT_U_WIDTHS * width.max(height);
    let normal = |mean, u| Prior::Normal { mean, u };
    // Known as a factor: ln f has the relative uncertainty of f.
    let (log_focal, ur_focal) = (lens.focal_px.ln(), (lens.u_focal_px / lens.focal_px).max(1e-9));
    layout.add(entry(Parameter::LogFocalLength, log_focal, normal(log_focal, ur_focal), Source::FocalLength, 0.01));
    for (axis, centre) in [(width - 1.0) / 2.0, (height - 1.0) / 2.0].into_iter().enumerate() {
        layout.add(entry(Parameter::PrincipalPoint { axis }, centre, normal(centre, u_principal), Source::Lens, 1.0));
    }
    for term in 0..2 {
        layout.add(entry(Parameter::RadialDistortion { term }, 0.0, normal(0.0, RADIAL_U), Source::Lens, 0.01));
    }
    for term in 0..2 {
        layout.add(entry(Parameter::TangentialDistortion { term }, 0.0, normal(0.0, TANGENTIAL_U), Source::Lens, 0.001));
    }
}

/// Adds the pose of each view.
pub fn add_views(layout: &mut Layout, views: &[ViewStart]) {
    for (view, start) in views.iter().enumerate() {
        for axis in 0..3 {
            let prior = if axis == 2 && start.roll == Roll::Defined { Prior::Exact } else { Prior::Free };
            layout.add(entry(Parameter::CameraTurn { view, axis }, 0.0, prior, Source::Lens, 1e-3));
        }
        let distance = start.place_m[2].abs().max(1e-3);
        for axis in 0..3 {
            layout.add(entry(Parameter::CameraPlace { view, axis }, start.place_m[axis], Prior::Free, Source::Lens, 1e-3 * distance));
        }
    }
}

/// Adds the distance of the dots or lines of the target.
pub fn add_target_pitch(layout: &mut Layout, pitch_m: Quantity) {
    layout.add(stated(Parameter::TargetPitch, pitch_m, Source::TargetPitch));
}

/// Adds width and height of a sheet of paper, and the bows of its edges.
pub fn add_sheet(layout: &mut Layout, sides_m: [Quantity; 2]) {
    for (axis, side_m) in sides_m.into_iter().enumerate() {
        layout.add(stated(Parameter::SheetSide { axis }, side_m, Source::SheetShape));
    }
    for edge in SheetEdge::ALL {
        layout.add(by_eye(Parameter::SheetBow { edge }, SHEET_BOW_U_M, Source::SheetShape));
    }
}

/// Where the zero order falls on the print, as a start value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ZeroOrderStart {
    /// To be found on the print, m.
    OnPrint([f64; 2]),
    /// It defines the origin: there is no print.
    Origin,
}

/// Where the throw comes from when the bench file is silent.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ThrowStart {
    /// The pattern itself must tell; start value, m.
    FromPattern(f64),
    /// Nothing in the problem has a length, so any value will do: the pitch does not depend on it. m.
    Gauge(f64),
}

/// Adds screen, throw, and how the print lies in the screen plane. `throw_start` serves where the bench file is silent.
pub fn add_screen(layout: &mut Layout, bench: &Bench, throw_start: ThrowStart, zero_order: ZeroOrderStart) {
    layout.add(match (bench.screen.throw_m, throw_start) {
        (Some(quantity), _) => stated(Parameter::Throw, quantity, Source::Throw),
        (None, ThrowStart::FromPattern(throw_m)) => entry(Parameter::Throw, throw_m, Prior::Free, Source::Throw, 0.01 * throw_m),
        (None, ThrowStart::Gauge(throw_m)) => {
            let prior = Prior::Normal { mean: throw_m, u: 0.1 * throw_m };
            entry(Parameter::Throw, throw_m, prior, Source::Gauge, 0.01 * throw_m)
        }
    });
    for axis in 0..2 {
        let parameter = Parameter::ScreenTilt { axis };
        layout.add(match bench.screen.tilt_rad {
            Some(tilt) => stated(parameter, tilt[axis], Source::ScreenTilt),
            None => by_eye(parameter, ATTITUDE_BY_EYE_RAD, Source::ScreenTilt),
        });
        let parameter = Parameter::ZeroOrderOnPrint { axis };
        layout.add(match zero_order {
            ZeroOrderStart::OnPrint(place_m) => entry(parameter, place_m[axis], Prior::Free, Source::Spots, 1e-3),
            ZeroOrderStart::Origin => entry(parameter, 0.0, Prior::Exact, Source::Spots, 1.0),
        });
    }
    layout.add(match bench.target.as_ref().and_then(|target| target.turn_rad) {
        Some(turn) => stated(Parameter::PrintTurn, turn, Source::TargetTurn),
        None => by_eye(Parameter::PrintTurn, PRINT_TURN_BY_EYE_RAD, Source::TargetTurn),
    });
}

/// Adds a laser's wavelength in the air at the sample.
pub fn add_wavelength(layout: &mut Layout, laser: usize, wavelength_m: Quantity) {
    layout.add(stated(Parameter::Wavelength { laser }, wavelength_m, Source::Wavelength { laser }));
}

/// Adds the attitude of a sample.
pub fn add_incidence(layout: &mut Layout, sample: usize, known: &Sample) {
    for axis in 0..2 {
        let parameter = Parameter::Incidence { sample, axis };
        layout.add(match known.incidence_rad {
            Some(incidence) => stated(parameter, incidence[axis], Source::Incidence { sample }),
            None => by_eye(parameter, ATTITUDE_BY_EYE_RAD, Source::Incidence { sample }),
        });
    }
}

/// Adds a sample's lattice with a start value: reciprocal vectors along x_s, y_s, 1/m; one for a line grating.
pub fn add_lattice(layout: &mut Layout, sample: usize, vectors_per_m: &[[f64; 2]]) {
    for (vector, components) in vectors_per_m.iter().enumerate() {
        let scale = 1e-3 * components[0].hypot(components[1]);
        for (axis, &component) in components.iter().enumerate() {
            layout.add(entry(Parameter::Lattice { sample, vector, axis }, component, Prior::Free, Source::Spots, scale));
        }
    }
}

/// Adds the travel of the screen for one photo of a series.
pub fn add_step(layout: &mut Layout, photo: usize, step_m: Quantity) {
    layout.add(stated(Parameter::Step { photo }, step_m, Source::Step));
}

/// Adds the two ends of a known distance, with their places on the screen as start values, m.
pub fn add_scale_ends(layout: &mut Layout, ends_m: [[f64; 2]; 2]) {
    for (end, place_m) in ends_m.into_iter().enumerate() {
        for (axis, place_m) in place_m.into_iter().enumerate() {
            layout.add(entry(Parameter::ScaleEnd { end, axis }, place_m, Prior::Free, Source::Scale, 1e-3));
        }
    }
}
