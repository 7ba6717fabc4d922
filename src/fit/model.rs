//! The chain from parameters to pixels, generic over the number type: sample -> screen -> print -> photo.

use super::parameter::{Layout, Parameter};
use crate::{
    frames::Side,
    optics::{Attitude, Camera, Distortion, PrintPose, ScreenPose, order_direction, screen_hit},
};
use nalgebra::Matrix3;
use num_dual::{DualNum, DualSVec64};

/// Parameters that one spot depends on.
pub(super) const SPOT_LOCALS: usize = 27;
/// Parameters that one point of the print depends on.
pub(super) const PRINT_LOCALS: usize = 16;

/// Which bench one photo shows: the parameters that its spots share.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PhotoShape {
    /// Camera position.
    pub view: usize,
    /// Sample in the beam.
    pub sample: usize,
    /// Laser in use.
    pub laser: usize,
    /// Turn of the sample in its own plane, rad, counter-clockwise from x_s to y_s.
    pub sample_turn_rad: f64,
}

/// What never changes during a fit.
#[derive(Debug, Clone, PartialEq)]
pub struct Shape {
    /// Photos of the pattern.
    pub photos: Vec<PhotoShape>,
    /// Reference rotation of each camera position.
    pub references: Vec<Matrix3<f64>>,
    /// From where the camera looks.
    pub seen_from: Side,
}

/// Places of a list of parameters in a layout; `None` where the problem has no such parameter (its value is then 0).
pub(super) type Places<const N: usize> = [Option<usize>; N];

pub(super) fn spot_places(layout: &Layout, shape: &Shape, photo: usize) -> Places<SPOT_LOCALS> {
    let PhotoShape { view, sample, laser, .. } = shape.photos[photo];
    let lattice = |vector, axis| Parameter::Lattice { sample, vector, axis };
    let camera = camera_parameters(view);
    let mut wanted = vec![lattice(0, 0), lattice(0, 1), lattice(1, 0), lattice(1, 1)];
    wanted.extend([0, 1].map(|axis| Parameter::Incidence { sample, axis }));
    wanted.extend([Parameter::Wavelength { laser }, Parameter::Throw, Parameter::Step { photo }]);
    wanted.extend([0, 1].map(|axis| Parameter::ScreenTilt { axis }));
    wanted.extend([0, 1].map(|axis| Parameter::ZeroOrderOnPrint { axis }));
    wanted.push(Parameter::PrintTurn);
    wanted.extend(camera);
    std::array::from_fn(|i| layout.place(wanted[i]))
}

pub(super) fn print_places(layout: &Layout, view: usize, first: [Option<Parameter>; 3]) -> Places<PRINT_LOCALS> {
    let camera = camera_parameters(view);
    std::array::from_fn(|i| if i < 3 { first[i].and_then(|p| layout.place(p)) } else { layout.place(camera[i - 3]) })
}

pub(super) fn camera_parameters(view: usize) -> [Parameter; 13] {
    [
        Parameter::LogFocalLength,
        Parameter::PrincipalPoint { axis: 0 },
        Parameter::PrincipalPoint { axis: 1 },
        Parameter::RadialDistortion { term: 0 },
        Parameter::RadialDistortion { term: 1 },
        Parameter::TangentialDistortion { term: 0 },
        Parameter::TangentialDistortion { term: 1 },
        Parameter::CameraTurn { view, axis: 0 },
        Parameter::CameraTurn { view, axis: 1 },
        Parameter::CameraTurn { view, axis: 2 },
        Parameter::CameraPlace { view, axis: 0 },
        Parameter::CameraPlace { view, axis: 1 },
        Parameter::CameraPlace { view, axis: 2 },
    ]
}

/// Values of a list of parameters as plain numbers.
pub(super) fn plain<const N: usize>(values: &[f64], places: &Places<N>) -> [f64; N] {
    places.map(|place| place.map_or(0.0, |place| values[place]))
}

/// The same as dual numbers, each unknown seeded with its own direction.
pub(super) fn seeded<const N: usize>(layout: &Layout, values: &[f64], places: &Places<N>) -> [DualSVec64<N>; N] {
    std::array::from_fn(|i| {
        let value = DualSVec64::<N>::from_re(places[i].map_or(0.0, |place| values[place]));
        match places[i].and_then(|place| layout.column(place)) {
            Some(_) => value.derivative(i),
            None => value,
        }
    })
}

pub(super) fn camera<D: DualNum<f64> + Copy>(v: &[D], reference: Matrix3<f64>) -> Camera<D> {
    Camera {
        focal_px: v[0].exp(),
        principal_px: [v[1], v[2]],
        distortion: Distortion { radial: [v[3], v[4]], tangential: [v[5], v[6]] },
        turn_rad: [v[7], v[8], v[9]],
        place_m: [v[10], v[11], v[12]],
        reference,
    }
}

/// The camera of a view at the values of a layout.
#[must_use]
pub fn camera_at(layout: &Layout, view: usize, reference: Matrix3<f64>) -> Camera<f64> {
    let values = camera_parameters(view).map(|parameter| layout.value(parameter).unwrap_or(0.0));
    camera(&values, reference)
}

/// Everything that the spots of one photo share, worked out once.
pub(super) struct Bench<D> {
    pub(super) lattice_per_m: [[D; 2]; 2],
    pub(super) attitude: Attitude<D>,
    pub(super) wavelength_m: D,
    pub(super) screen: ScreenPose<D>,
    pub(super) print: PrintPose<D>,
    pub(super) camera: Camera<D>,
}

impl<D: DualNum<f64> + Copy> Bench<D> {
    /// From the parameters in the order of [`spot_places`].
    pub(super) fn new(v: &[D; SPOT_LOCALS], shape: &Shape, photo: usize) -> Self {
        let PhotoShape { view, sample_turn_rad, .. } = shape.photos[photo];
        let (sine, cosine) = sample_turn_rad.sin_cos();
        let turned = |x: D, y: D| [x * cosine - y * sine, x * sine + y * cosine];
        Self {
            lattice_per_m: [turned(v[0], v[1]), turned(v[2], v[3])],
            attitude: Attitude::turned([v[4], v[5]]),
            wavelength_m: v[6],
            screen: ScreenPose::new(v[7] + v[8], [v[9], v[10]]),
            print: PrintPose { zero_order_m: [v[11], v[12]], turn_rad: v[13], seen_from: shape.seen_from },
            camera: camera(&v[14..], shape.references[view]),
        }
    }

    /// Pixel of an order; `None` when it is evanescent or misses screen or camera.
    pub(super) fn pixel(&self, project: &impl Fn([D; 2]) -> Option<[D; 2]>, (h, k): (i32, i32)) -> Option<[D; 2]> {
        let [g1, g2] = self.lattice_per_m;
        let (h, k) = (f64::from(h), f64::from(k));
        let g = [g1[0] * h + g2[0] * k, g1[1] * h + g2[1] * k];
        let direction = order_direction(&self.attitude, self.wavelength_m, g)?;
        project(self.print.print_from_screen(screen_hit(&self.screen, &direction)?))
    }
}
