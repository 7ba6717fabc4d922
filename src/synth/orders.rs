//! Which orders the scene shows, where, how large and how bright.

use super::{
    scene::{Lattice, Scene},
    spot_shape::SpotShape,
};
use crate::{
    frames::{PixelCovariance, PixelPoint},
    optics::{order_direction, screen_hit},
};
use rand::Rng;
use rand_chacha::{ChaCha8Rng, rand_core::SeedableRng};
use std::f64::consts::PI;

/// One order as it is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct Order {
    /// Index of the laser.
    pub laser: usize,
    /// 0, or 1 for the second lattice of the sample.
    pub lattice: usize,
    /// Along `g1`.
    pub h: i32,
    /// Along `g2`; 0 for a line grating.
    pub k: i32,
    /// Where the chief ray meets the photo.
    pub at: PixelPoint,
    /// Second moments of the drawn spot, without its skirt, px².
    pub shape: PixelCovariance,
    /// Peak without skirt, paper and vignetting; 1 clips.
    pub amplitude: f64,
}

/// What random numbers are for: each purpose has its own stream, so that changing one leaves the others as they are.
#[derive(Debug, Clone, Copy)]
pub(super) enum Purpose {
    OrderScatter = 1,
    Speckle,
    SpeckleOffset,
    PaperFine,
    PaperCoarse,
    Noise,
    HotPixels,
    Ghosts,
    Specks,
    Redraw,
    Blobs,
    Glints,
}

/// Random numbers for one purpose; `part` tells rows or orders apart, so that nothing depends on the number of threads.
pub(super) fn random(seed: u64, purpose: Purpose, part: u64) -> ChaCha8Rng {
    let mut generator = ChaCha8Rng::seed_from_u64(seed.wrapping_add((purpose as u64).wrapping_mul(0x9e37_79b9_7f4a_7c15)));
    generator.set_stream(part);
    generator
}

/// Orders below this share of the clipping level are not drawn: far below any noise.
const FAINTEST: f64 = 1e-5;

/// All orders of all lasers whose chief ray falls into the photo, brightest first.
///
/// Place: grating equation, screen, print, camera of [`crate::optics`]. Power: the opening's envelope times the scatter. Scale: the brightest
/// order that is not the zero order peaks at `light.brightest_order`, the zero order at `sample.zero_order_factor` times that.
#[must_use]
pub fn orders(scene: &Scene) -> Vec<Order> {
    let mut all: Vec<Order> = (0..scene.lasers.len()).flat_map(|laser| orders_of_laser(scene, laser)).collect();
    // The zero order belongs to both lattices and is drawn once.
    all.retain(|order| order.lattice == 0 || (order.h, order.k) != (0, 0));
    let brightest = all.iter().filter(|order| (order.h, order.k) != (0, 0)).map(|order| order.amplitude).fold(0.0, f64::max);
    for order in &mut all {
        order.amplitude = match (order.h, order.k) {
            (0, 0) => scene.light.brightest_order * scene.sample.zero_order_factor,
            _ => scene.light.brightest_order * order.amplitude / brightest,
        };
    }
    all.retain(|order| order.amplitude >= FAINTEST);
    all.sort_by(|a, b| b.amplitude.total_cmp(&a.amplitude));
    all
}

fn orders_of_laser(scene: &Scene, laser: usize) -> Vec<Order> {
    let second = scene.sample.second.as_ref();
    let mut all = orders_of_lattice(scene, laser, 0, &scene.sample.lattice);
    all.extend(second.into_iter().flat_map(|second| orders_of_lattice(scene, laser, 1, &second.lattice)));
    all
}

impl Scene {
    /// Spatial frequency of an order in the sample plane, cycles per metre.
    pub(super) fn frequency_per_m(&self, order: &Order) -> [f64; 2] {
        let lattice =
            if order.lattice == 0 { Some(&self.sample.lattice) } else { self.sample.second.as_ref().map(|second| &second.lattice) };
        lattice.map_or([0.0; 2], |lattice| frequency(lattice, order.h, order.k))
    }
}

fn frequency(lattice: &Lattice, h: i32, k: i32) -> [f64; 2] {
    let (g1, g2) = lattice.reciprocal_per_m();
    let (along1, along2, g2) = (f64::from(h), f64::from(k), g2.unwrap_or([0.0; 2]));
    [along1 * g1[0] + along2 * g2[0], along1 * g1[1] + along2 * g2[1]]
}

fn orders_of_lattice(scene: &Scene, laser: usize, number: usize, lattice: &Lattice) -> Vec<Order> {
    let wavelength_m = scene.lasers[laser].wavelength_m;
    let (a1, a2) = lattice.direct_m();
    let share = if number == 0 { 1.0 } else { scene.sample.second.as_ref().map_or(0.0, |second| second.power) };
    // λ (h g1 + k g2) has a length below 2, and h is its component along a1 over λ.
    let reach = |a: [f64; 2]| super::pixels::ceil_to_i32(2.0 * a[0].hypot(a[1]) / wavelength_m);
    let (h_max, k_max) = (reach(a1), a2.map_or(0, reach));
    let shapes = SpotShape::new(scene);
    let finder = ChiefRays::new(scene, wavelength_m);
    let mut found = Vec::new();
    for h in -h_max..=h_max {
        for k in -k_max..=k_max {
            let g = frequency(lattice, h, k);
            let Some(at) = finder.pixel(g) else { continue };
            let Some(shape) = shapes.of_order(wavelength_m, g) else { continue };
            let power = share * envelope_along(scene, a1, g) * scatter(scene, number, h, k);
            let amplitude = power / (2.0 * PI * (shape.xx * shape.yy - shape.xy * shape.xy).sqrt());
            found.push(Order { laser, lattice: number, h, k, at, shape, amplitude });
        }
    }
    found
}

/// The envelope with `g` turned into the axes of the opening (along the first lattice vector).
fn envelope_along(scene: &Scene, a1: [f64; 2], g: [f64; 2]) -> f64 {
    let length = a1[0].hypot(a1[1]);
    let (cosine, sine) = (a1[0] / length, a1[1] / length);
    scene.sample.opening.envelope([cosine * g[0] + sine * g[1], cosine * g[1] - sine * g[0]])
}

/// Belongs to the sample: the same for an order in every photo.
fn scatter(scene: &Scene, lattice: usize, h: i32, k: i32) -> f64 {
    let part = (u64::from(h.cast_unsigned()) << 32) | u64::from(k.cast_unsigned());
    let uniform: f64 = random(scene.seed.wrapping_add(lattice as u64), Purpose::OrderScatter, part).random_range(-1.0..1.0);
    1.0 + scene.sample.order_scatter * uniform
}

/// Follows chief ray after chief ray through one scene.
struct ChiefRays<'a> {
    scene: &'a Scene,
    wavelength_m: f64,
    attitude: crate::optics::Attitude<f64>,
    screen: crate::optics::ScreenPose<f64>,
    print: crate::optics::PrintPose<f64>,
    camera: crate::optics::Camera<f64>,
}

impl<'a> ChiefRays<'a> {
    fn new(scene: &'a Scene, wavelength_m: f64) -> Self {
        let (attitude, screen) = (scene.attitude(), scene.screen_pose());
        Self { scene, wavelength_m, attitude, screen, print: scene.print_pose(), camera: scene.camera() }
    }

    /// Pixel inside the frame, or `None`.
    fn pixel(&self, g_per_m: [f64; 2]) -> Option<PixelPoint> {
        let direction = order_direction(&self.attitude, self.wavelength_m, g_per_m)?;
        let print_m = self.print.print_from_screen(screen_hit(&self.screen, &direction)?);
        let [x_px, y_px] = self.camera.print_projector()(print_m)?;
        let at = PixelPoint { x_px, y_px };
        let (width, height) = (f64::from(self.scene.file.width_px), f64::from(self.scene.file.height_px));
        if !(-0.5..width - 0.5).contains(&x_px) || !(-0.5..height - 0.5).contains(&y_px) {
            return None;
        }
        // Far outside the field the distortion polynomial folds back; such a pixel does not see this place.
        let seen = self.camera.print_point(at)?;
        ((seen.x_m - print_m[0]).hypot(seen.y_m - print_m[1]) < 1e-6).then_some(at)
    }
}
