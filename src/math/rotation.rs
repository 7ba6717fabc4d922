//! Rotations, generic over the number type.

use nalgebra::{Matrix3, Vector3};
use num_dual::DualNum;

/// Rotation `Ry(turn[1]) · Rx(turn[0])`, right-handed, rad: a plane is turned about x first, then about y. Columns are the turned axes.
pub fn turned_about_x_then_y<D: DualNum<f64> + Copy>(turn_rad: [D; 2]) -> Matrix3<D> {
    let (sx, cx, sy, cy) = (turn_rad[0].sin(), turn_rad[0].cos(), turn_rad[1].sin(), turn_rad[1].cos());
    Matrix3::new(cy, sy * sx, sy * cx, D::zero(), cx, -sx, -sy, cy * sx, cy * cx)
}

/// Rotation by the vector's length about its direction (Rodrigues), rad; smooth at zero, derivatives included.
///
/// `R = I + a [w]× + b [w]×²` with `a = sin θ / θ`, `b = (1 − cos θ) / θ²`; below θ² = 1e-6 by their series to θ⁴, exact to 1e-21.
pub fn rotation_from_vector<D: DualNum<f64> + Copy>(vector_rad: [D; 3]) -> Matrix3<D> {
    let [x, y, z] = vector_rad;
    let square = x * x + y * y + z * z;
    let (a, b) = if square.re() < 1e-6 {
        (D::one() - square / 6.0 + square * square / 120.0, (D::one() - square / 12.0 + square * square / 360.0) * 0.5)
    } else {
        let angle = square.sqrt();
        (angle.sin() / angle, (D::one() - angle.cos()) / square)
    };
    let cross = Matrix3::new(D::zero(), -z, y, z, D::zero(), -x, -y, x, D::zero());
    let outer = Vector3::new(x, y, z) * nalgebra::RowVector3::new(x, y, z);
    let identity = Matrix3::<D>::from_diagonal_element(D::one());
    let squared = outer - identity * square;
    identity + cross * a + squared * b
}
