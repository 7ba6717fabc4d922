//! The camera: pinhole with Brown-Conrady distortion, looking at the plane of the print.

use crate::{
    frames::{PixelPoint, TargetPoint},
    math::rotation::rotation_from_vector,
};
use nalgebra::{Matrix3, Vector3};
use num_dual::DualNum;

/// Brown-Conrady distortion, in the order and with the meaning of OpenCV's k1, k2, p1, p2.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Distortion<D> {
    /// Radial, second and fourth power.
    pub radial: [D; 2],
    /// Tangential.
    pub tangential: [D; 2],
}

/// A camera and where it stands in front of the print.
///
/// Camera axes: x right, y down, z forward. A point (X, Y, 0) of the print lies at
/// `rotation_from_vector(turn_rad) * reference * (X, Y, 0) + place_m`. The fixed `reference` keeps the free turn small,
/// where a rotation vector has no singularity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Camera<D> {
    /// Focal length, px.
    pub focal_px: D,
    /// Principal point (x, y), px.
    pub principal_px: [D; 2],
    /// Lens distortion.
    pub distortion: Distortion<D>,
    /// Turn on top of `reference`, rotation vector, rad.
    pub turn_rad: [D; 3],
    /// Origin of the print in camera axes, m.
    pub place_m: [D; 3],
    /// Rotation from print axes to camera axes before `turn_rad`.
    pub reference: Matrix3<f64>,
}

/// Where the undistorting Newton iteration stops, in units of the focal length (1e-12 is far below any pixel).
const UNDISTORTED: f64 = 1e-12;

/// Slope of the distorted radius below which a lens model is no lens any more.
const FOLD: f64 = 0.05;

impl<D: DualNum<f64> + Copy> Camera<D> {
    /// Rotation from print axes to camera axes.
    pub fn rotation(&self) -> Matrix3<D> {
        rotation_from_vector(self.turn_rad) * self.reference.map(D::from)
    }

    /// Pixel of a point given in camera axes, m; `None` behind the camera, and beyond the fold of the distortion polynomial, where it would
    /// send points of the scene back towards the centre.
    ///
    /// `(x, y) = f · distorted(X/Z, Y/Z) + principal point`. Source: `[Brown1971]`, in the form of `[OpenCV]`.
    pub fn project(&self, point_m: &Vector3<D>) -> Option<[D; 2]> {
        if point_m.z.re() <= 0.0 {
            return None;
        }
        let direction = [point_m.x / point_m.z, point_m.y / point_m.z];
        if self.radial_slope(direction) <= FOLD {
            return None;
        }
        let [x, y] = self.distorted(direction);
        Some([x * self.focal_px + self.principal_px[0], y * self.focal_px + self.principal_px[1]])
    }

    /// Projects points of the print; the rotation is worked out once.
    pub fn print_projector(&self) -> impl Fn([D; 2]) -> Option<[D; 2]> + '_ {
        let rotation = self.rotation();
        let place = Vector3::from(self.place_m);
        move |print_m| self.project(&(rotation.column(0) * print_m[0] + rotation.column(1) * print_m[1] + place))
    }

    /// How fast the distorted radius grows with the true one: d(r (1 + k1 r² + k2 r⁴))/dr.
    fn radial_slope(&self, [x, y]: [D; 2]) -> f64 {
        let r2 = x.re() * x.re() + y.re() * y.re();
        let [k1, k2] = self.distortion.radial;
        1.0 + r2 * (3.0 * k1.re() + 5.0 * k2.re() * r2)
    }

    fn distorted(&self, [x, y]: [D; 2]) -> [D; 2] {
        let [k1, k2] = self.distortion.radial;
        let [p1, p2] = self.distortion.tangential;
        let (xx, yy, xy) = (x * x, y * y, x * y);
        let r2 = xx + yy;
        let radial = D::one() + r2 * (k1 + r2 * k2);
        [x * radial + p1 * xy * 2.0 + p2 * (r2 + xx * 2.0), y * radial + p1 * (r2 + yy * 2.0) + p2 * xy * 2.0]
    }
}

impl Camera<f64> {
    /// Point of the print seen at a pixel; `None` when the line of sight misses the print's plane or the distortion cannot be undone there.
    #[must_use]
    pub fn print_point(&self, at: PixelPoint) -> Option<TargetPoint> {
        let distorted = [(at.x_px - self.principal_px[0]) / self.focal_px, (at.y_px - self.principal_px[1]) / self.focal_px];
        let [x, y] = self.undistorted(distorted)?;
        let rotation = self.rotation();
        let sight = rotation.tr_mul(&Vector3::new(x, y, 1.0));
        let eye = -(rotation.tr_mul(&Vector3::from(self.place_m)));
        let along = -eye.z / sight.z;
        let point = eye + sight * along;
        (along > 0.0 && point.x.is_finite() && point.y.is_finite()).then_some(TargetPoint { x_m: point.x, y_m: point.y })
    }

    /// Where the camera stands, in print axes (X, Y, and Z out of the printed face), m.
    #[must_use]
    pub fn eye_m(&self) -> Vector3<f64> {
        -(self.rotation().tr_mul(&Vector3::from(self.place_m)))
    }

    fn undistorted(&self, wanted: [f64; 2]) -> Option<[f64; 2]> {
        let mut point = wanted;
        for _ in 0..50 {
            let seen = self.distorted(point);
            let (dx, dy) = (wanted[0] - seen[0], wanted[1] - seen[1]);
            if dx.abs().max(dy.abs()) < UNDISTORTED {
                return Some(point);
            }
            let [[a, b], [c, d]] = self.distortion_jacobian(point);
            let determinant = a * d - b * c;
            // Past the fold of the distortion polynomial no point of the scene is seen.
            if determinant <= FOLD {
                return None;
            }
            point[0] += (d * dx - b * dy) / determinant;
            point[1] += (a * dy - c * dx) / determinant;
        }
        None
    }

    fn distortion_jacobian(&self, [x, y]: [f64; 2]) -> [[f64; 2]; 2] {
        let [k1, k2] = self.distortion.radial;
        let [p1, p2] = self.distortion.tangential;
        let r2 = x * x + y * y;
        let radial = 1.0 + r2 * (k1 + r2 * k2);
        let slope = 2.0 * (k1 + 2.0 * k2 * r2);
        let cross = x * y * slope + 2.0 * (p1 * x + p2 * y);
        [[radial + x * x * slope + 2.0 * p1 * y + 6.0 * p2 * x, cross], [cross, radial + y * y * slope + 6.0 * p1 * y + 2.0 * p2 * x]]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn camera() -> Camera<f64> {
        Camera {
            focal_px: 2300.0,
            principal_px: [1010.0, 740.0],
            distortion: Distortion { radial: [-0.12, 0.05], tangential: [0.001, -0.002] },
            turn_rad: [0.1, -0.2, 0.05],
            place_m: [0.02, -0.01, 0.6],
            reference: Matrix3::new(1.0, 0.0, 0.0, 0.0, -1.0, 0.0, 0.0, 0.0, -1.0),
        }
    }

    #[test]
    fn looking_back_through_a_pixel_finds_the_point() {
        let camera = camera();
        for (x_m, y_m) in [(0.0, 0.0), (0.11, 0.07), (-0.14, -0.09), (0.09, -0.1)] {
            let [x_px, y_px] = camera.print_projector()([x_m, y_m]).unwrap();
            let back = camera.print_point(PixelPoint { x_px, y_px }).unwrap();
            assert!((back.x_m - x_m).abs() < 1e-11 && (back.y_m - y_m).abs() < 1e-11, "{back:?}");
        }
    }

    #[test]
    fn the_print_is_seen_upright_by_the_reference_camera() {
        let mut camera = camera();
        camera.turn_rad = [0.0; 3];
        let project = camera.print_projector();
        let (origin, right, up) = (project([0.0, 0.0]).unwrap(), project([0.01, 0.0]).unwrap(), project([0.0, 0.01]).unwrap());
        assert!(right[0] > origin[0] && up[1] < origin[1]);
        assert!(camera.eye_m().z > 0.0);
    }

    #[test]
    fn beyond_the_fold_of_the_distortion_nothing_is_seen() {
        let camera = camera();
        // slope 1 - 0.36 r² + 0.25 r⁴ stays positive here; a strong barrel folds at r² = 1 / (3 · 0.9)
        let folded = Camera { distortion: Distortion { radial: [-0.9, 0.0], ..camera.distortion }, ..camera };
        assert!(camera.project(&Vector3::new(0.7, 0.0, 1.0)).is_some());
        assert!(folded.project(&Vector3::new(0.5, 0.0, 1.0)).is_some() && folded.project(&Vector3::new(0.7, 0.0, 1.0)).is_none());
    }

    #[test]
    fn a_point_behind_the_camera_has_no_pixel() {
        assert!(camera().project(&Vector3::new(0.0, 0.0, -1.0)).is_none());
    }
}
