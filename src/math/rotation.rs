//! Rotations, generic over the number type, so that exact derivatives come with them.

use nalgebra::{Matrix3, Rotation3, UnitQuaternion};
use num_dual::DualNum;

/// Rotation `Ry(turn[1]) · Rx(turn[0])`: a plane is turned about x first, then about the old y.
///
/// - `turn_rad`: right-handed angles about x and about y, rad. Columns of the result are the turned axes.
#[must_use]
pub fn turned_about_x_then_y<D: DualNum<f64> + Copy>(turn_rad: [D; 2]) -> Matrix3<D> {
    let (sx, cx) = turn_rad[0].sin_cos();
    let (sy, cy) = turn_rad[1].sin_cos();
    Matrix3::new(cy, sy * sx, sy * cx, D::zero(), cx, -sx, -sy, cy * sx, cy * cx)
}

/// Rotation by the vector's length about its direction (Rodrigues), rad; smooth at zero, derivatives included.
///
/// `R = I + a [w]× + b [w]×²` with `a = sin θ / θ` and `b = (1 - cos θ) / θ² = ½ (sin ½θ / ½θ)²`.
///
/// Holds for every vector; values and first derivatives are good to 1e-13 (checked against central
/// differences, and against OpenCV's Rodrigues in `tests/reference`).
///
/// Source: `[Gallego2015]` eq. (1).
#[must_use]
pub fn rotation_from_vector<D: DualNum<f64> + Copy>(vector_rad: [D; 3]) -> Matrix3<D> {
    let [x, y, z] = vector_rad;
    let square = x * x + y * y + z * z;
    let a = sine_over_angle(square);
    let half = sine_over_angle(square * 0.25);
    let b = half * half * 0.5;
    let (xx, yy, zz) = (x * x * b, y * y * b, z * z * b);
    let (xy, xz, yz) = (x * y * b, x * z * b, y * z * b);
    let one = D::one();
    Matrix3::new(one - (yy + zz), xy - z * a, xz + y * a, xy + z * a, one - (xx + zz), yz - x * a, xz - y * a, yz + x * a, one - (xx + yy))
}

/// The shortest vector that [`rotation_from_vector`] turns into this matrix; length at most π.
///
/// - `rotation`: orthonormal to rounding, determinant +1
///
/// Near half a turn the sign of the axis is arbitrary, as it must be.
#[must_use]
pub fn vector_from_rotation(rotation: &Matrix3<f64>) -> [f64; 3] {
    UnitQuaternion::from_rotation_matrix(&Rotation3::from_matrix_unchecked(*rotation)).scaled_axis().into()
}

/// `sin θ / θ` as a function of θ², which is smooth at zero.
///
/// Below θ² = 0.01 the Taylor series, whose next term is under 1e-17; above, the quotient loses at most 3 digits in its derivative.
fn sine_over_angle<D: DualNum<f64> + Copy>(square: D) -> D {
    const SERIES_BELOW: f64 = 1e-2;
    if square.re() >= SERIES_BELOW {
        let angle = square.sqrt();
        return angle.sin() / angle;
    }
    let mut sum = D::one();
    for k in [72.0, 42.0, 20.0, 6.0] {
        sum = D::one() - square * sum / k;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::finite_difference::derivative;
    use nalgebra::Vector3;
    use num_dual::DualSVec64;

    const VECTORS: [[f64; 3]; 8] = [
        [0.0, 0.0, 0.0],
        [1e-12, -2e-12, 0.0],
        [1e-4, 2e-4, -3e-4],
        [0.05, -0.06, 0.06], // just below the switch
        [0.06, -0.06, 0.06], // just above
        [0.3, -0.8, 0.5],
        [0.0, 0.0, 3.1],
        [2.5, 3.0, -4.0],
    ];

    #[test]
    fn orthonormal_and_right_handed_everywhere() {
        for vector in VECTORS {
            let r = rotation_from_vector(vector);
            assert!((r.transpose() * r - Matrix3::identity()).norm() < 4e-15, "{vector:?}");
            assert!((r.determinant() - 1.0).abs() < 4e-15);
            let axis = Vector3::from(vector);
            assert!((r * axis - axis).norm() <= 4e-15 * axis.norm(), "the axis stays");
        }
    }

    /// Independent implementation: nalgebra's rotation from a scaled axis.
    #[test]
    fn agrees_with_nalgebra() {
        for vector in VECTORS {
            let want = Rotation3::from_scaled_axis(Vector3::from(vector)).into_inner();
            assert!((rotation_from_vector(vector) - want).norm() < 4e-15, "{vector:?}");
        }
        let want = Rotation3::from_axis_angle(&Vector3::y_axis(), 0.4) * Rotation3::from_axis_angle(&Vector3::x_axis(), -0.3);
        assert!((turned_about_x_then_y([-0.3, 0.4]) - want.into_inner()).norm() < 1e-15);
    }

    /// A quarter turn about z takes x to y: right-handed.
    #[test]
    fn signs() {
        let r = rotation_from_vector([0.0, 0.0, std::f64::consts::FRAC_PI_2]);
        assert!((r * Vector3::x() - Vector3::y()).norm() < 1e-15);
        // turning a plane about x by +a tips its normal z towards -y; about y by +a towards +x
        assert!((turned_about_x_then_y([0.1, 0.0]).column(2)[1] + 0.1_f64.sin()).abs() < 1e-16);
        assert!((turned_about_x_then_y([0.0, 0.1]).column(2)[0] - 0.1_f64.sin()).abs() < 1e-16);
    }

    #[test]
    fn exact_derivatives_match_differences() {
        for vector in VECTORS {
            let dual: [DualSVec64<3>; 3] = std::array::from_fn(|i| DualSVec64::from_re(vector[i]).derivative(i));
            let exact = rotation_from_vector(dual);
            for (k, entry) in exact.iter().enumerate() {
                let gradient = entry.eps.unwrap_generic(nalgebra::Const::<3>, nalgebra::Const::<1>);
                for i in 0..3 {
                    let along = |value: f64| {
                        let mut moved = vector;
                        moved[i] = value;
                        Some(rotation_from_vector(moved)[k])
                    };
                    let (numeric, _) = derivative(along, vector[i], 0.02).unwrap();
                    assert!((gradient[i] - numeric).abs() < 2e-12, "{vector:?}, entry {k}, d/d{i}: {} against {numeric}", gradient[i]);
                }
            }
        }
    }

    #[test]
    fn vector_comes_back() {
        for vector in VECTORS.iter().filter(|v| Vector3::from(**v).norm() < 3.11) {
            let back = vector_from_rotation(&rotation_from_vector(*vector));
            let error = (Vector3::from(back) - Vector3::from(*vector)).norm();
            assert!(error < 1e-14, "{vector:?} came back as {back:?}");
        }
        let half_turn = vector_from_rotation(&Matrix3::new(-1.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, -1.0));
        assert!((Vector3::from(half_turn).norm() - std::f64::consts::PI).abs() < 1e-14);
    }
}
