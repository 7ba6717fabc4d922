//! Rough geometry: carries spots from pixels to the sample's plane, where the orders form a regular lattice at any angle.

use crate::{
    frames::{PixelCovariance, PixelPoint},
    optics::{Attitude, Camera, PrintPose, ScreenPose, direction_to, in_sample_plane, order_direction, screen_hit},
};

/// The bench as known before (or after) the fit, in plain numbers.
#[derive(Debug, Clone)]
pub(super) struct Rough {
    pub(super) camera: Camera<f64>,
    pub(super) screen: ScreenPose<f64>,
    pub(super) print: PrintPose<f64>,
    pub(super) attitude: Attitude<f64>,
    pub(super) size_px: [f64; 2],
    /// Pixel of the zero order, where a calibration knows it.
    pub(super) zero_order: Option<[f64; 2]>,
}

impl Rough {
    /// Puts the zero order where a pixel is seen; `false` when that pixel does not see the screen.
    pub(super) fn put_zero_order(&mut self, at: PixelPoint) -> bool {
        let Some(place) = self.camera.print_point(at) else { return false };
        self.print.zero_order_m = [place.x_m, place.y_m];
        true
    }

    /// `λ g` (dimensionless) of the order that would be seen at a pixel.
    pub(super) fn lattice_place(&self, at: PixelPoint) -> Option<[f64; 2]> {
        let place = self.camera.print_point(at)?;
        let direction = direction_to(&self.screen, self.print.screen_from_print([place.x_m, place.y_m]))?;
        Some(in_sample_plane(&self.attitude, &direction))
    }

    /// Standard uncertainty of [`Self::lattice_place`] per axis that a centroid's covariance causes.
    pub(super) fn lattice_u(&self, at: PixelPoint, covariance: PixelCovariance) -> Option<f64> {
        let here = self.lattice_place(at)?;
        let moved = |x_px: f64, y_px: f64| {
            let there = self.lattice_place(PixelPoint { x_px: at.x_px + x_px, y_px: at.y_px + y_px })?;
            Some((there[0] - here[0]).hypot(there[1] - here[1]))
        };
        let [u_x, u_y] = covariance.u_px();
        Some(((moved(0.5, 0.0)? * 2.0 * u_x).powi(2) + (moved(0.0, 0.5)? * 2.0 * u_y).powi(2)).sqrt() / std::f64::consts::SQRT_2)
    }

    /// Pixel of the order with a given `λ g`.
    pub(super) fn pixel(&self, lattice_place: [f64; 2]) -> Option<PixelPoint> {
        let direction = order_direction(&self.attitude, 1.0, lattice_place)?;
        let print_m = self.print.print_from_screen(screen_hit(&self.screen, &direction)?);
        let [x_px, y_px] = self.camera.print_projector()(print_m)?;
        Some(PixelPoint { x_px, y_px })
    }

    /// Whether that order would fall inside the photo.
    pub(super) fn in_frame(&self, lattice_place: [f64; 2]) -> bool {
        self.pixel(lattice_place)
            .is_some_and(|at| at.x_px >= 0.0 && at.y_px >= 0.0 && at.x_px < self.size_px[0] && at.y_px < self.size_px[1])
    }
}
