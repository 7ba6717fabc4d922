//! Where the camera stands, roughly: from the dots of the target, from known marks, or from nothing but "it stood square-on".

use crate::{
    fit::setup::{LensKnowledge, Roll, ViewStart},
    optics::Camera,
    photo::Exif,
};
use nalgebra::{Matrix3, Vector3};

/// Diagonal of the 35 mm frame that equivalent focal lengths refer to, m (CIPA DCG-001: 43.27 mm).
const FRAME_DIAGONAL_M: f64 = 0.043_27;
/// How far an EXIF equivalent focal length is trusted: it is rounded to whole millimetres and does not know of cropping or focus breathing.
const EXIF_FOCAL_UR: f64 = 0.10;
/// An unknown camera: most lie between a wide phone-like 0.7 and a short tele of 2 picture widths.
const UNKNOWN_FOCAL_WIDTHS: f64 = 1.2;
const UNKNOWN_FOCAL_UR: f64 = 0.4;

/// What EXIF data and picture size tell of the lens.
#[must_use]
pub(super) fn lens_knowledge(exif: &Exif, size_px: [f64; 2]) -> LensKnowledge {
    let diagonal_px = size_px[0].hypot(size_px[1]);
    match exif.focal_length_35mm_m {
        Some(focal_m) if focal_m > 1e-3 => {
            let focal_px = focal_m / FRAME_DIAGONAL_M * diagonal_px;
            LensKnowledge { focal_px, u_focal_px: EXIF_FOCAL_UR * focal_px, size_px }
        }
        _ => {
            let focal_px = UNKNOWN_FOCAL_WIDTHS * size_px[0].max(size_px[1]);
            LensKnowledge { focal_px, u_focal_px: UNKNOWN_FOCAL_UR * focal_px, size_px }
        }
    }
}

/// Pose of a camera that sees the print through a homography (metres on the print to pixels), for an assumed focal length.
///
/// `K⁻¹ H ~ [r1 r2 t]`; the two columns are made orthonormal by singular values. Source: `[Zhang2000]` section 3.1.
/// `None` when the homography is degenerate.
#[must_use]
pub(super) fn pose_from_homography(pixel_from_metres: &Matrix3<f64>, lens: &LensKnowledge) -> Option<ViewStart> {
    let centre = lens.size_px.map(|size| (size - 1.0) / 2.0);
    let inverse = Matrix3::new(
        1.0 / lens.focal_px,
        0.0,
        -centre[0] / lens.focal_px,
        0.0,
        1.0 / lens.focal_px,
        -centre[1] / lens.focal_px,
        0.0,
        0.0,
        1.0,
    );
    let columns = inverse * pixel_from_metres;
    let length = (columns.column(0).norm() + columns.column(1).norm()) / 2.0;
    if !(length.is_finite() && length > 1e-300) {
        return None;
    }
    let sign = if columns[(2, 2)] < 0.0 { -1.0 } else { 1.0 };
    let columns = columns * (sign / length);
    let (x, y): (Vector3<f64>, Vector3<f64>) = (columns.column(0).into(), columns.column(1).into());
    let svd = Matrix3::from_columns(&[x, y, x.cross(&y)]).svd(true, true);
    let reference = svd.u? * svd.v_t?;
    (reference.determinant() > 0.0).then(|| ViewStart {
        reference,
        place_m: [columns[(0, 2)], columns[(1, 2)], columns[(2, 2)]],
        roll: Roll::Free,
    })
}

/// Pose of a camera that stands square-on at a distance, the print's origin at a pixel.
#[must_use]
pub(super) fn square_on_pose(lens: &LensKnowledge, origin_px: [f64; 2], distance_m: f64) -> ViewStart {
    let centre = lens.size_px.map(|size| (size - 1.0) / 2.0);
    let place = |axis: usize| (origin_px[axis] - centre[axis]) / lens.focal_px * distance_m;
    ViewStart {
        reference: Matrix3::new(1.0, 0.0, 0.0, 0.0, -1.0, 0.0, 0.0, 0.0, -1.0),
        place_m: [place(0), place(1), distance_m],
        roll: Roll::Defined,
    }
}

/// How far the centroid of a disc on the print lies from the projection of its centre, px.
///
/// Brightness of the print is uniform, so the centroid in the photo weighs each piece of the disc with the area that it fills there, which
/// goes with 1/depth³. The disc average of a quadratic is exact with four points at radius/√2. Lens distortion is nearly constant over a dot.
#[must_use]
pub(super) fn disc_centroid_offset(camera: &Camera<f64>, centre_m: [f64; 2], radius_m: f64) -> Option<[f64; 2]> {
    let project = camera.print_projector();
    let (rotation, place) = (camera.rotation(), Vector3::from(camera.place_m));
    let arm = radius_m / std::f64::consts::SQRT_2;
    let (mut sum, mut total) = ([0.0; 2], 0.0);
    for [dx, dy] in [[arm, 0.0], [-arm, 0.0], [0.0, arm], [0.0, -arm]] {
        let point = [centre_m[0] + dx, centre_m[1] + dy];
        let depth = (rotation.column(0) * point[0] + rotation.column(1) * point[1] + place).z;
        let weight = depth.powi(-3);
        let pixel = project(point)?;
        sum = [sum[0] + weight * pixel[0], sum[1] + weight * pixel[1]];
        total += weight;
    }
    let [x, y] = project(centre_m)?;
    Some([sum[0] / total - x, sum[1] / total - y])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::optics::Distortion;

    fn lens() -> LensKnowledge {
        LensKnowledge { focal_px: 2900.0, u_focal_px: 290.0, size_px: [2000.0, 1500.0] }
    }

    #[test]
    fn a_homography_gives_back_its_camera() {
        let start = square_on_pose(&lens(), [900.0, 800.0], 0.6);
        let camera = Camera {
            focal_px: 2900.0,
            principal_px: [999.5, 749.5],
            distortion: Distortion { radial: [0.0; 2], tangential: [0.0; 2] },
            turn_rad: [0.3, -0.2, 0.1],
            place_m: start.place_m,
            reference: start.reference,
        };
        let k = Matrix3::new(2900.0, 0.0, 999.5, 0.0, 2900.0, 749.5, 0.0, 0.0, 1.0);
        let r = camera.rotation();
        let h = k * Matrix3::from_columns(&[r.column(0).into(), r.column(1).into(), Vector3::from(camera.place_m)]) * -7.0;
        let found = pose_from_homography(&h, &lens()).unwrap();
        assert!((found.reference - r).norm() < 1e-12);
        assert!((found.place_m[2] - 0.6).abs() < 1e-12);
    }

    /// Heikkilä & Silvén 1997: a circle of radius r at distance D, tilted by φ, has its ellipse's centre off by f r² sin φ cos φ / (D² − r² sin² φ).
    /// The centroid of a uniformly bright disc is not the ellipse's centre; for the *area* centroid the ellipse is uniform, so both agree.
    #[test]
    fn the_offset_of_a_disc_agrees_with_the_published_ellipse_centre() {
        let phi: f64 = 0.5;
        let (f, d, r) = (2900.0, 0.5, 0.004);
        let tilt = nalgebra::Rotation3::from_axis_angle(&Vector3::y_axis(), phi);
        let camera = Camera {
            focal_px: f,
            principal_px: [0.0; 2],
            distortion: Distortion { radial: [0.0; 2], tangential: [0.0; 2] },
            turn_rad: [0.0; 3],
            place_m: [0.0, 0.0, d],
            reference: *tilt.matrix(),
        };
        let offset = disc_centroid_offset(&camera, [0.0, 0.0], r).unwrap();
        let published = f * r * r * phi.sin() * phi.cos() / (d * d - r * r * phi.sin().powi(2));
        assert!((offset[0].abs() - published).abs() < 0.01 * published, "{offset:?} {published}");
    }
}
