//! What a Jacobian says about its parameters: their covariance, and the directions it leaves open.

use super::singular_values::{RightSingular, right_singular};
use nalgebra::{DMatrix, DVector};

/// The inverse of `JᵀJ`, with the directions in which there is none.
///
/// Parameters are compared in the *scaled* space `q_j = s_j p_j`, where `s_j` is the length of the
/// j-th column of J (1 for a column of zeros), so that neither the rank nor the open directions
/// depend on the units of the parameters.
#[derive(Debug, Clone)]
pub struct NormalInverse {
    /// `(JᵀJ)⁻¹` in the caller's parameters. When rank is lost this is the pseudo-inverse over the
    /// directions that *are* fixed: ask [`NormalInverse::variance`], which refuses the others.
    pub covariance: DMatrix<f64>,
    /// How many directions the residuals fix.
    pub rank: usize,
    /// Unit vectors in scaled parameter space that change no residual.
    pub null_directions: Vec<DVector<f64>>,
    /// The scale `s_j` of each parameter.
    pub column_scales: DVector<f64>,
    /// Singular values of the scaled Jacobian, largest first; largest over smallest is its condition number.
    pub singular_values: DVector<f64>,
}

impl NormalInverse {
    /// Takes a Jacobian of whitened residuals apart.
    ///
    /// - `jacobian`: one row per residual, one column per parameter, finite
    /// - `rank_tolerance`: a direction whose singular value is below this fraction of the largest is
    ///   called open; dimensionless, sensible between 1e-14 and 1e-8
    ///
    /// `None` when an entry is not finite or so large that its square is not.
    #[must_use]
    pub fn new(jacobian: &DMatrix<f64>, rank_tolerance: f64) -> Option<Self> {
        let column_scales = DVector::from_iterator(jacobian.ncols(), jacobian.column_iter().map(|c| unit_or(c.norm())));
        let mut scaled = jacobian.clone();
        for (mut column, scale) in scaled.column_iter_mut().zip(column_scales.iter()) {
            column /= *scale;
        }
        let singular = right_singular(scaled)?;
        let largest = singular.values.iter().copied().fold(0.0, f64::max);
        let threshold = largest * rank_tolerance;
        let rank = singular.values.iter().take_while(|&&value| value > threshold).count();
        let covariance = unscaled_inverse(&singular, rank, &column_scales);
        if !covariance.iter().all(|v| v.is_finite()) {
            return None;
        }
        let null_directions = (rank..singular.values.len()).map(|k| singular.vectors.column(k).into_owned()).collect();
        Some(Self { covariance, rank, null_directions, column_scales, singular_values: singular.values })
    }

    /// Variance of a scalar result with the given gradient: `cᵀ (JᵀJ)⁻¹ c`.
    ///
    /// `None` when the result moves along a direction that nothing fixes (its variance is unbounded),
    /// when the length of `gradient` is not the number of parameters, or a number is not finite.
    #[must_use]
    pub fn variance(&self, gradient: &DVector<f64>) -> Option<f64> {
        self.fixes(gradient).then(|| gradient.dot(&(&self.covariance * gradient)))
    }

    /// Whether the residuals fix the result with this gradient.
    ///
    /// In scaled space the gradient may lie along an open direction by at most 1e-6 of its length: the
    /// rounding that is left in an open direction of a problem of condition 1e10.
    #[must_use]
    pub fn fixes(&self, gradient: &DVector<f64>) -> bool {
        if gradient.len() != self.column_scales.len() || !gradient.iter().all(|v| v.is_finite()) {
            return false;
        }
        let scaled = gradient.component_div(&self.column_scales);
        let limit = 1e-6 * scaled.norm();
        self.null_directions.iter().all(|direction| direction.dot(&scaled).abs() <= limit)
    }
}

fn unit_or(length: f64) -> f64 {
    if length > 0.0 { length } else { 1.0 }
}

/// `S⁻¹ V diag(1/σ²) Vᵀ S⁻¹` over the first `rank` singular values; symmetric to the last bit.
fn unscaled_inverse(singular: &RightSingular, rank: usize, column_scales: &DVector<f64>) -> DMatrix<f64> {
    let mut half = singular.vectors.columns(0, rank).into_owned();
    for (mut column, value) in half.column_iter_mut().zip(singular.values.iter()) {
        column /= *value;
    }
    for (mut row, scale) in half.row_iter_mut().zip(column_scales.iter()) {
        row /= *scale;
    }
    let covariance = &half * half.transpose();
    (&covariance + covariance.transpose()) * 0.5
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A 2x2 case by hand: `JᵀJ = [[2, 1], [1, 2]]`, its inverse `[[2, -1], [-1, 2]] / 3`.
    #[test]
    fn inverse_by_hand_in_two_unit_scales() {
        let j = DMatrix::from_row_slice(3, 2, &[1.0, 0.0, 0.0, 1.0, 1.0, 1.0]);
        for scale in [1.0, 1e-9, 1e9] {
            let mut scaled = j.clone();
            scaled.column_mut(1).scale_mut(scale);
            let got = NormalInverse::new(&scaled, 1e-12).unwrap();
            assert_eq!((got.rank, got.null_directions.len()), (2, 0));
            let want = [[2.0 / 3.0, -1.0 / 3.0 / scale], [-1.0 / 3.0 / scale, 2.0 / 3.0 / scale / scale]];
            for (r, row) in want.iter().enumerate() {
                for (c, value) in row.iter().enumerate() {
                    assert!((got.covariance[(r, c)] / value - 1.0).abs() < 1e-14);
                }
            }
        }
    }

    /// Only the sum a + b is seen: the difference is the open direction, the sum keeps its variance.
    #[test]
    fn open_direction_is_named_and_refused() {
        let j = DMatrix::from_row_slice(2, 3, &[1.0, 1.0, 0.0, 1.0, 1.0, 0.0]);
        let got = NormalInverse::new(&j, 1e-12).unwrap();
        assert_eq!((got.rank, got.null_directions.len()), (1, 2));
        let sum = DVector::from_vec(vec![1.0, 1.0, 0.0]);
        assert!((got.variance(&sum).unwrap() - 0.5).abs() < 1e-14);
        assert!(got.variance(&DVector::from_vec(vec![1.0, 0.0, 0.0])).is_none());
        assert!(got.variance(&DVector::from_vec(vec![0.0, 0.0, 1.0])).is_none());
        assert!(got.variance(&DVector::from_vec(vec![1.0])).is_none());
        assert!(got.covariance.iter().all(|v| v.is_finite()));
    }

    #[test]
    fn nothing_known_is_rank_zero() {
        let got = NormalInverse::new(&DMatrix::zeros(4, 2), 1e-12).unwrap();
        assert_eq!((got.rank, got.null_directions.len()), (0, 2));
        assert!(NormalInverse::new(&DMatrix::from_element(1, 1, f64::INFINITY), 1e-12).is_none());
    }
}
