//! Where a ray meets the screen, and what a reader of the print calls that place.

use crate::{frames::Side, math::rotation::turned_about_x_then_y};
use nalgebra::{Matrix3, Vector3};
use num_dual::DualNum;

/// Plane of the screen: through (0, 0, throw), turned about x, then about y.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ScreenPose<D> {
    throw_m: D,
    axes: Matrix3<D>,
}

impl<D: DualNum<f64> + Copy> ScreenPose<D> {
    /// `throw_m`: sample to zero-order spot along the beam; `tilt_rad`: turns about x and y, right-handed.
    pub fn new(throw_m: D, tilt_rad: [D; 2]) -> Self {
        Self { throw_m, axes: turned_about_x_then_y(tilt_rad) }
    }
}

/// Place (x, y) in the screen's own axes, m from the zero-order spot, where the ray `direction` from the sample meets the screen.
///
/// `H = u (Z0·N)/(u·N)`; `x = e_x·(H − Z0)`, `y = e_y·(H − Z0)`. `None` when the ray runs away from the screen or along it.
pub fn screen_hit<D: DualNum<f64> + Copy>(screen: &ScreenPose<D>, direction: &Vector3<D>) -> Option<[D; 2]> {
    // (e_x·u, e_y·u, N·u)
    let u = screen.axes.tr_mul(direction);
    if u.z.re() <= 1e-9 {
        return None;
    }
    let z0 = screen.axes.row(2) * screen.throw_m;
    let along = z0[2] / u.z;
    Some([u.x * along - z0[0], u.y * along - z0[1]])
}

/// Inverse of [`screen_hit`]: unit direction from the sample to a place of the screen.
///
/// `None` when the place coincides with the sample.
#[must_use]
pub fn direction_to(screen: &ScreenPose<f64>, place_m: [f64; 2]) -> Option<Vector3<f64>> {
    let hit = Vector3::new(0.0, 0.0, screen.throw_m) + screen.axes.column(0) * place_m[0] + screen.axes.column(1) * place_m[1];
    hit.try_normalize(1e-12)
}

/// How the print lies in the screen plane: which of its points the zero order hits, and its turn.
///
/// `(r, v) = Rot(turn) ((X, Y) − (Xz, Yz))`, counter-clockwise for the viewer; in bench terms x = −r seen from the front
/// (the sample's side) and x = +r seen from behind; y = v.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrintPose<D> {
    /// Place of the zero order on the print (X, Y), m.
    pub zero_order_m: [D; 2],
    /// Turn of the print, rad.
    pub turn_rad: D,
    /// From where the camera looks.
    pub seen_from: Side,
}

impl<D: DualNum<f64> + Copy> PrintPose<D> {
    /// What the reader of the print calls a place of the screen: (X, Y), m.
    pub fn print_from_screen(&self, screen_m: [D; 2]) -> [D; 2] {
        let r = match self.seen_from {
            Side::Front => -screen_m[0],
            Side::Behind => screen_m[0],
        };
        let (v, sine, cosine) = (screen_m[1], self.turn_rad.sin(), self.turn_rad.cos());
        [cosine * r + sine * v + self.zero_order_m[0], cosine * v - sine * r + self.zero_order_m[1]]
    }

    /// Inverse of [`Self::print_from_screen`].
    pub fn screen_from_print(&self, print_m: [D; 2]) -> [D; 2] {
        let (x, y) = (print_m[0] - self.zero_order_m[0], print_m[1] - self.zero_order_m[1]);
        let (sine, cosine) = (self.turn_rad.sin(), self.turn_rad.cos());
        let (r, v) = (cosine * x - sine * y, sine * x + cosine * y);
        match self.seen_from {
            Side::Front => [-r, v],
            Side::Behind => [r, v],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tilted_screen_is_hit_where_the_ray_says() {
        let screen = ScreenPose::new(0.8, [0.1, -0.2]);
        let u = Vector3::new(0.2, -0.1, 0.9).normalize();
        let place = screen_hit(&screen, &u).unwrap();
        let back = direction_to(&screen, place).unwrap();
        assert!((u - back).norm() < 1e-14);
    }

    #[test]
    fn positive_tilt_about_y_brings_the_x_side_nearer() {
        let screen = ScreenPose::new(1.0, [0.0, 0.1]);
        let u = Vector3::new(0.1, 0.0, 1.0).normalize();
        // nearer on the +x side: the ray is stopped before x = 0.1 m
        assert!(screen_hit(&screen, &u).unwrap()[0] < 0.1);
    }

    #[test]
    fn a_ray_away_from_the_screen_hits_nothing() {
        assert!(screen_hit(&ScreenPose::new(1.0, [0.0, 0.0]), &Vector3::new(0.0, 0.0, -1.0)).is_none());
    }

    #[test]
    fn print_and_screen_are_inverse_from_both_sides() {
        for seen_from in [Side::Front, Side::Behind] {
            let print = PrintPose { zero_order_m: [0.02, -0.03], turn_rad: 0.3, seen_from };
            let back = print.screen_from_print(print.print_from_screen([0.11, 0.07]));
            assert!((back[0] - 0.11).abs() < 1e-15 && (back[1] - 0.07).abs() < 1e-15);
        }
    }
}
