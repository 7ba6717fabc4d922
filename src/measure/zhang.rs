//! First guess of a lens from several views of a plane, in closed form.

use nalgebra::{Matrix3, Matrix4, RowVector4, Vector3};

/// Focal lengths outside this range, in longer sides of the picture, are no solution but a degenerate set of views.
const PLAUSIBLE_FOCAL_SIDES: std::ops::RangeInclusive<f64> = 0.2..=30.0;

/// Focal length and principal point, px.
///
/// - `homographies`: metres on the plane to pixels, one per view
/// - `size_px`: size of the picture
///
/// Each view gives two equations on the image of the absolute conic ω = K⁻ᵀK⁻¹: h1ᵀ ω h2 = 0 and h1ᵀ ω h1 = h2ᵀ ω h2. With square
/// pixels and no skew ω has four elements up to scale. Source: `[Zhang2000]`, section 3.1, equations (8) and (9). Where the solution
/// is no camera, the principal point is set to the middle of the picture and only the focal length is solved for.
/// `None` when that gives no camera either.
#[must_use]
pub(super) fn lens_from_homographies(homographies: &[Matrix3<f64>], size_px: [f64; 2]) -> Option<(f64, [f64; 2])> {
    let side = size_px[0].max(size_px[1]);
    let middle = size_px.map(|side| (side - 1.0) / 2.0);
    // Pixels about the middle, in units of the longer side: all elements of ω are then of size 1.
    let normal = Matrix3::new(1.0 / side, 0.0, -middle[0] / side, 0.0, 1.0 / side, -middle[1] / side, 0.0, 0.0, 1.0);
    let mut squares = Matrix4::zeros();
    for homography in homographies {
        let h = normal * homography;
        let length = h.column(0).norm().max(h.column(1).norm());
        if !(length.is_finite() && length > 0.0) {
            return None;
        }
        let (h1, h2): (Vector3<f64>, Vector3<f64>) = (h.column(0) / length, h.column(1) / length);
        for row in [equation(&h1, &h2), equation(&h1, &h1) - equation(&h2, &h2)] {
            squares += row.transpose() * row;
        }
    }
    let plausible = |(focal, [x, y]): &(f64, [f64; 2])| PLAUSIBLE_FOCAL_SIDES.contains(focal) && x.abs().max(y.abs()) < 0.5;
    let (focal, [x, y]) = whole(&squares).filter(plausible).or_else(|| centred(&squares).filter(plausible))?;
    Some((focal * side, [middle[0] + x * side, middle[1] + y * side]))
}

/// Coefficients of (ω11 = ω22, ω13, ω23, ω33) in aᵀ ω b.
fn equation(a: &Vector3<f64>, b: &Vector3<f64>) -> RowVector4<f64> {
    RowVector4::new(a.x * b.x + a.y * b.y, a.x * b.z + a.z * b.x, a.y * b.z + a.z * b.y, a.z * b.z)
}

/// The ω of length 1 that fits best.
fn whole(squares: &Matrix4<f64>) -> Option<(f64, [f64; 2])> {
    let eigen = squares.symmetric_eigen();
    let w = eigen.eigenvectors.column(eigen.eigenvalues.imin());
    let [x, y] = [-w[1] / w[0], -w[2] / w[0]];
    let square = w[3] / w[0] - x * x - y * y;
    (square > 0.0).then(|| (square.sqrt(), [x, y]))
}

/// The same with the principal point in the middle: ω33 / ω11 = f² by least squares.
fn centred(squares: &Matrix4<f64>) -> Option<(f64, [f64; 2])> {
    let square = -squares[(0, 3)] / squares[(3, 3)];
    (square > 0.0).then(|| (square.sqrt(), [0.0; 2]))
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::Rotation3;

    fn view(turn: [f64; 3]) -> Matrix3<f64> {
        let r = Rotation3::from_scaled_axis(Vector3::from(turn)).into_inner();
        let k = Matrix3::new(2900.0, 0.0, 1020.0, 0.0, 2900.0, 741.0, 0.0, 0.0, 1.0);
        k * Matrix3::from_columns(&[r.column(0).into(), r.column(1).into(), Vector3::new(0.01, -0.02, 0.6)]) * -3.0
    }

    #[test]
    fn exact_views_give_back_their_lens() {
        let views = [view([0.4, 0.0, 0.1]), view([-0.1, 0.5, 0.0]), view([-0.3, -0.3, 1.0])];
        let (focal_px, [x, y]) = lens_from_homographies(&views, [2000.0, 1500.0]).unwrap();
        assert!((focal_px - 2900.0).abs() < 1e-6 && (x - 1020.0).abs() < 1e-6 && (y - 741.0).abs() < 1e-6, "{focal_px} {x} {y}");
    }

    #[test]
    fn square_on_views_give_none() {
        assert_eq!(lens_from_homographies(&[view([0.0; 3]), view([0.0, 0.0, 0.7])], [2000.0, 1500.0]), None);
    }
}
