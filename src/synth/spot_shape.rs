//! How large and how elongated a spot comes out in the photo.

use super::scene::Scene;
use crate::{
    frames::PixelCovariance,
    optics::{Attitude, Camera, in_sample_plane, order_direction},
};
use nalgebra::{Matrix3, Matrix4x2, Vector3};

/// Carries a bundle of rays from the sample to the photo, to first order around the chief ray.
#[derive(Debug)]
pub(super) struct SpotShape<'a> {
    scene: &'a Scene,
    camera: Camera<f64>,
    attitude: Attitude<f64>,
    normal: Vector3<f64>,
    screen_axes: Matrix3<f64>,
}

/// Steps of the numerical derivative: directions (rad) and places (m). Small against the spot, large against rounding (1e-9 px).
const STEP: f64 = 1e-6;

impl<'a> SpotShape<'a> {
    pub(super) fn new(scene: &'a Scene) -> Self {
        let (camera, attitude) = (scene.camera(), scene.attitude());
        Self { scene, camera, attitude, normal: scene.normal(), screen_axes: scene.screen_axes() }
    }

    /// Second moments of the drawn spot of an order, px².
    ///
    /// `Σ = J diag(σ_θ², σ_θ², σ_w², σ_w²) Jᵀ + (blur² + 1/12) I`: J takes direction and place of an incoming ray to the pixel,
    /// `σ_θ` and `σ_w` are half the 1/e² half-angle and footprint radius, 1/12 is the pixel's own width.
    /// `None` when a ray of the bundle does not reach the photo.
    pub(super) fn of_order(&self, wavelength_m: f64, g_per_m: [f64; 2]) -> Option<PixelCovariance> {
        let mut jacobian = Matrix4x2::zeros();
        for (row, mut slopes) in jacobian.row_iter_mut().enumerate() {
            let mut ray = [0.0; 4];
            ray[row] = STEP;
            let ahead = self.pixel_of_ray(wavelength_m, g_per_m, ray)?;
            ray[row] = -STEP;
            let behind = self.pixel_of_ray(wavelength_m, g_per_m, ray)?;
            slopes[0] = (ahead[0] - behind[0]) / (2.0 * STEP);
            slopes[1] = (ahead[1] - behind[1]) / (2.0 * STEP);
        }
        let beam = &self.scene.beam;
        let (angle, place) = (beam.half_divergence_rad / 2.0, beam.footprint_radius_m / 2.0);
        let spread = nalgebra::Matrix4::from_diagonal(&nalgebra::Vector4::new(angle, angle, place, place)).map(|sigma| sigma * sigma);
        let moments = jacobian.transpose() * spread * jacobian;
        let round = self.scene.camera.lens.blur_px.powi(2) + 1.0 / 12.0;
        Some(PixelCovariance { xx: moments[(0, 0)] + round, xy: moments[(0, 1)], yy: moments[(1, 1)] + round })
    }

    /// Pixel of the ray that comes in with direction (a, b, 1) and passes (c, d) in the plane across the beam.
    pub(super) fn pixel_of_ray(&self, wavelength_m: f64, g_per_m: [f64; 2], [a, b, c, d]: [f64; 4]) -> Option<[f64; 2]> {
        let shift = in_sample_plane(&self.attitude, &Vector3::new(a, b, 1.0).normalize());
        let g = [g_per_m[0] + shift[0] / wavelength_m, g_per_m[1] + shift[1] / wavelength_m];
        let direction = order_direction(&self.attitude, wavelength_m, g)?;
        let start = Vector3::new(c, d, -(c * self.normal.x + d * self.normal.y) / self.normal.z);
        let screen_normal = self.screen_axes.column(2);
        let steepness = direction.dot(&screen_normal);
        if steepness <= 1e-9 {
            return None;
        }
        let zero_order = Vector3::new(0.0, 0.0, self.scene.screen.throw_m);
        let hit = start + direction * ((zero_order - start).dot(&screen_normal) / steepness) - zero_order;
        let on_screen = [self.screen_axes.column(0).dot(&hit), self.screen_axes.column(1).dot(&hit)];
        self.camera.print_projector()(self.scene.print_pose().print_from_screen(on_screen))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{optics::screen_hit, synth::demo_scene};

    #[test]
    fn the_chief_ray_of_the_bundle_is_the_ray_of_the_optics() {
        let scene = demo_scene("shelf-label-panel").unwrap();
        let (wavelength_m, g) = (scene.lasers[0].wavelength_m, [2.3e4, -1.1e4]);
        let direction = order_direction(&scene.attitude(), wavelength_m, g).unwrap();
        let print = scene.print_pose().print_from_screen(screen_hit(&scene.screen_pose(), &direction).unwrap());
        let want = scene.camera().print_projector()(print).unwrap();
        let got = SpotShape::new(&scene).pixel_of_ray(wavelength_m, g, [0.0; 4]).unwrap();
        assert!((want[0] - got[0]).abs() < 1e-8 && (want[1] - got[1]).abs() < 1e-8, "{want:?} {got:?}");
    }

    /// Square on everywhere: sigma in px = f / distance × sqrt((throw θ/2)² + (w/2)²), plus blur and pixel.
    #[test]
    fn a_square_on_zero_order_has_the_textbook_size() {
        let mut scene = demo_scene("embossed-film").unwrap();
        scene.sample.incidence_rad = [0.0; 2];
        scene.screen.tilt_rad = [0.0; 2];
        scene.camera.lean_rad = [0.0; 2];
        scene.camera.aim_m = [0.0; 2];
        let shape = SpotShape::new(&scene).of_order(scene.lasers[0].wavelength_m, [0.0; 2]).unwrap();
        let scale = scene.camera.lens.focal_px / scene.camera.distance_m;
        let sigma_m = (scene.screen.throw_m * scene.beam.half_divergence_rad / 2.0).hypot(scene.beam.footprint_radius_m / 2.0);
        let want = (scale * sigma_m).powi(2) + scene.camera.lens.blur_px.powi(2) + 1.0 / 12.0;
        assert!((shape.xx - want).abs() < 1e-4 * want && (shape.yy - want).abs() < 1e-4 * want && shape.xy.abs() < 1e-4 * want);
    }
}
