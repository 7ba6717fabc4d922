//! Where an order leaves the sample: the grating equation in direction cosines.

use crate::math::rotation::turned_about_x_then_y;
use nalgebra::{Matrix3, Vector3};
use num_dual::DualNum;

/// The sample's own axes in the bench frame: columns x_s, y_s and the normal n on the outgoing side.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Attitude<D> {
    axes: Matrix3<D>,
}

impl<D: DualNum<f64> + Copy> Attitude<D> {
    /// Sample whose plane was turned from the bench's xy plane about x, then about y (right-handed, rad).
    pub fn turned(turn_rad: [D; 2]) -> Self {
        Self { axes: turned_about_x_then_y(turn_rad) }
    }

    /// Components of a bench direction along x_s, y_s and n.
    fn components(&self, direction: &Vector3<D>) -> Vector3<D> {
        self.axes.tr_mul(direction)
    }
}

/// Direction of the order whose reciprocal-lattice vector is `g_per_m`, as a unit vector in the bench frame.
///
/// `u_t = z_t + λ g`, `u = u_t + n sqrt(1 - |u_t|²)`: the sample adds a reciprocal-lattice vector to the part
/// of the zero order (bench z) that lies in its plane. Holds for any incidence and any azimuth (conical
/// mounts), for transmission and reflection alike, because bench z is the zero order *after* the sample.
///
/// - `attitude`: the sample's axes in the bench frame
/// - `wavelength_m`: wavelength in the medium at the sample, m
/// - `g_per_m`: `h g1 + k g2` along x_s and y_s, cycles per metre (without 2π)
///
/// `None` when `|u_t| >= 1`: the order is evanescent.
///
/// Source: `[Harvey1998]` for direction cosines; the same construction as Ewald's sphere cut by rods.
///
/// ```
/// use spotrule::optics::{Attitude, order_direction};
/// let square_on = Attitude::turned([0.0, 0.0]);
/// // first order of a 10 µm pitch at 632.8 nm: sin θ = 0.06328
/// let u = order_direction(&square_on, 632.8e-9, [1.0e5, 0.0]).unwrap();
/// assert!((u.x - 0.06328).abs() < 1e-15);
/// assert!(order_direction(&square_on, 632.8e-9, [16.0e5, 0.0]).is_none());
/// ```
pub fn order_direction<D: DualNum<f64> + Copy>(attitude: &Attitude<D>, wavelength_m: D, g_per_m: [D; 2]) -> Option<Vector3<D>> {
    let axes = &attitude.axes;
    // The zero order is bench z, so its components along the sample's axes are the last row of the matrix.
    let along_x = axes[(2, 0)] + wavelength_m * g_per_m[0];
    let along_y = axes[(2, 1)] + wavelength_m * g_per_m[1];
    let normal_squared = D::one() - along_x * along_x - along_y * along_y;
    if normal_squared.re() <= 0.0 {
        return None;
    }
    let along_n = normal_squared.sqrt();
    Some(axes.column(0) * along_x + axes.column(1) * along_y + axes.column(2) * along_n)
}

/// Part of the zero order in the sample plane: direction cosines along x_s and y_s.
pub fn zero_order_in_sample_plane(attitude: &Attitude<f64>) -> [f64; 2] {
    let components = attitude.components(&Vector3::z());
    [components.x, components.y]
}

/// Inverse of [`order_direction`]: the part of `direction - z` in the sample plane, i.e. `λ g`, dimensionless.
///
/// In these coordinates the orders form a regular lattice around the zero order at any angle.
pub fn in_sample_plane(attitude: &Attitude<f64>, direction: &Vector3<f64>) -> [f64; 2] {
    let difference = attitude.components(&(direction - Vector3::z()));
    [difference.x, difference.y]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn going_out_and_coming_back_gives_the_same_lattice_vector() {
        let attitude = Attitude::turned([0.31, -0.42]);
        let (wavelength_m, g) = (532e-9, [3.1e5, -2.2e5]);
        let u = order_direction(&attitude, wavelength_m, g).unwrap();
        let back = in_sample_plane(&attitude, &u);
        assert!((back[0] - wavelength_m * g[0]).abs() < 1e-14 && (back[1] - wavelength_m * g[1]).abs() < 1e-14);
        assert!((u.norm() - 1.0).abs() < 1e-14);
    }

    #[test]
    fn the_zero_order_is_the_bench_axis_whatever_the_attitude() {
        let u = order_direction(&Attitude::turned([0.5, 0.7]), 633e-9, [0.0, 0.0]).unwrap();
        assert!((u - Vector3::z()).norm() < 1e-15);
    }

    /// Common practice: a tilt of incidence shifts sin θ and leaves the spacing of the orders in sin θ unchanged.
    #[test]
    fn incidence_leaves_the_spacing_in_sine_unchanged() {
        let attitude = Attitude::turned([0.0, 0.2]);
        let sine = |h: f64| {
            let u = order_direction(&attitude, 632.8e-9, [h * 2e5, 0.0]).unwrap();
            attitude.components(&u).x
        };
        assert!((sine(2.0) - sine(1.0) - 632.8e-9 * 2e5).abs() < 1e-15);
        assert!((sine(1.0) - sine(0.0) - 632.8e-9 * 2e5).abs() < 1e-15);
        assert!((sine(0.0) - (-(0.2_f64.sin()))).abs() < 1e-15);
    }
}
