//! Singular values and right singular vectors by one-sided Jacobi rotations.
//!
//! Chosen over bidiagonalisation because it keeps the *small* singular values of a column-scaled
//! matrix to high relative accuracy, and those are the ones a covariance is made of.

use nalgebra::{DMatrix, DVector};

/// Right half of a singular value decomposition: `A V = U diag(values)`, largest value first.
#[derive(Debug, Clone)]
pub struct RightSingular {
    /// Singular values, largest first, never negative.
    pub values: DVector<f64>,
    /// Orthonormal right singular vectors, one per column, in the order of `values`.
    pub vectors: DMatrix<f64>,
}

/// A sweep over all column pairs roughly squares the remaining error; ten are plenty, this is a fuse.
const MAX_SWEEPS: usize = 60;

/// Singular values and right singular vectors of any m × n matrix, m < n included.
///
/// The matrix is first reduced to an n × n triangle by Householder QR, then its columns are turned
/// against each other until they are orthogonal; their lengths are the singular values.
///
/// `None` when the matrix holds a NaN or an infinity, or squares overflow.
///
/// Source: `[DemmelVeselic1992]` in docs/sources.md (relative accuracy of one-sided Jacobi).
#[must_use]
pub fn right_singular(matrix: DMatrix<f64>) -> Option<RightSingular> {
    if !matrix.iter().all(|v| v.is_finite()) || !matrix.norm_squared().is_finite() {
        return None;
    }
    let n = matrix.ncols();
    let mut columns = square_triangle(matrix);
    let mut vectors = DMatrix::identity(n, n);
    for _ in 0..MAX_SWEEPS {
        if !sweep(&mut columns, &mut vectors) {
            break;
        }
    }
    let lengths: Vec<f64> = columns.column_iter().map(|c| c.norm()).collect();
    let mut order: Vec<usize> = (0..n).collect();
    order.sort_by(|&i, &j| lengths[j].total_cmp(&lengths[i]));
    Some(RightSingular {
        values: DVector::from_iterator(n, order.iter().map(|&i| lengths[i])),
        vectors: DMatrix::from_fn(n, n, |row, column| vectors[(row, order[column])]),
    })
}

/// The triangle R of a QR factorisation, filled up with zero rows to n × n.
fn square_triangle(matrix: DMatrix<f64>) -> DMatrix<f64> {
    let n = matrix.ncols();
    let r = if matrix.nrows() > n { matrix.qr().r() } else { matrix };
    let mut square = DMatrix::zeros(n, n);
    square.rows_mut(0, r.nrows()).copy_from(&r);
    square
}

/// One round over all column pairs; true while any pair was not yet orthogonal to rounding.
fn sweep(columns: &mut DMatrix<f64>, vectors: &mut DMatrix<f64>) -> bool {
    let n = columns.ncols();
    let mut turned = false;
    for i in 0..n {
        for j in i + 1..n {
            let (alpha, beta) = (columns.column(i).norm_squared(), columns.column(j).norm_squared());
            let gamma = columns.column(i).dot(&columns.column(j));
            if gamma.abs() <= f64::EPSILON * (alpha * beta).sqrt() || gamma.abs() < f64::MIN_POSITIVE {
                continue;
            }
            turned = true;
            // tangent of the smaller of the two angles that make the pair orthogonal
            let zeta = (beta - alpha) / (2.0 * gamma);
            let tangent = zeta.signum() / (zeta.abs() + zeta.hypot(1.0));
            let cosine = 1.0 / tangent.hypot(1.0);
            turn(columns, i, j, cosine, cosine * tangent);
            turn(vectors, i, j, cosine, cosine * tangent);
        }
    }
    turned
}

fn turn(matrix: &mut DMatrix<f64>, i: usize, j: usize, cosine: f64, sine: f64) {
    for row in 0..matrix.nrows() {
        let (a, b) = (matrix[(row, i)], matrix[(row, j)]);
        matrix[(row, i)] = cosine * a - sine * b;
        matrix[(row, j)] = sine * a + cosine * b;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Planted decomposition: the vectors must reproduce A^T A and the values must come back.
    #[test]
    fn finds_planted_values_over_ten_decades() {
        // columns of a 4x3 orthonormal set times 1, 1e-5, 1e-10, mixed by a plane rotation
        let u = DMatrix::from_row_slice(4, 3, &[0.5, 0.5, 0.5, 0.5, -0.5, 0.5, 0.5, 0.5, -0.5, 0.5, -0.5, -0.5]);
        let (c, s) = (0.6, 0.8);
        let v = DMatrix::from_row_slice(3, 3, &[c, -s, 0.0, s, c, 0.0, 0.0, 0.0, 1.0]);
        let a = &u * DMatrix::from_diagonal(&DVector::from_vec(vec![1.0, 1e-5, 1e-10])) * v.transpose();
        let got = right_singular(a.clone()).unwrap();
        for (value, want) in got.values.iter().zip([1.0, 1e-5, 1e-10]) {
            // absolute error of the planted product is eps, so 1e-10 is known to about 1e-6 of itself
            assert!((value - want).abs() < 4.0 * f64::EPSILON, "got {value:e}, want {want:e}");
        }
        let unit = got.vectors.transpose() * &got.vectors - DMatrix::identity(3, 3);
        assert!(unit.norm() < 1e-14);
    }

    #[test]
    fn wide_and_zero_matrices_have_their_null_vectors() {
        let wide = DMatrix::from_row_slice(1, 3, &[3.0, 0.0, 4.0]);
        let got = right_singular(wide.clone()).unwrap();
        assert!((got.values[0] - 5.0).abs() < 1e-15 && got.values[1] == 0.0 && got.values[2] == 0.0);
        assert!((&wide * got.vectors.columns(1, 2)).norm() < 1e-15);
        assert_eq!(right_singular(DMatrix::zeros(3, 2)).unwrap().values, DVector::zeros(2));
    }

    #[test]
    fn refuses_what_is_not_finite() {
        assert!(right_singular(DMatrix::from_element(2, 2, f64::NAN)).is_none());
        assert!(right_singular(DMatrix::from_element(2, 2, 1e200)).is_none());
    }
}
