//! Combination of uncertainties by the GUM: full covariance, effective degrees of freedom.

use nalgebra::{DMatrix, DVector};

/// One independent part of a combined variance, with what is known about its own reliability.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Contribution {
    /// The part of the result's variance that it owns, `c² u²`, in the square of the result's unit.
    pub variance: f64,
    /// Degrees of freedom of that variance; infinity for one taken as exactly known.
    pub degrees_of_freedom: f64,
}

/// A combined standard uncertainty and how far it can be trusted.
#[derive(Debug, Clone, PartialEq)]
pub struct Combined {
    /// Combined standard uncertainty `u_c`, in the result's unit.
    pub u: f64,
    /// Effective degrees of freedom by Welch-Satterthwaite; infinity when every input is exactly known.
    pub degrees_of_freedom: f64,
    /// Pairs of correlated inputs of which one has finite degrees of freedom. Not empty: the formula's
    /// premise of independent inputs is broken and `degrees_of_freedom` may be far off. Gather such inputs
    /// into groups and use [`welch_satterthwaite`] on the groups instead.
    pub correlated_inputs: Vec<(usize, usize)>,
}

/// Covariance of several results from the covariance of the inputs, `C V Cᵀ`.
///
/// - `sensitivity`: one row per result, one column per input, `∂y_i/∂x_j`
/// - `covariance`: of the inputs, symmetric
///
/// First order: exact for linear models; otherwise good as long as curvature over one u is small.
///
/// `None` when the sizes do not fit or a number is not finite.
///
/// Source: `[JCGM100]` 5.2.2 eq. (13), for several results `[JCGM102]` 6.2.1.
#[must_use]
pub fn propagated(sensitivity: &DMatrix<f64>, covariance: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    if !covariance.is_square() || sensitivity.ncols() != covariance.nrows() {
        return None;
    }
    let result = sensitivity * covariance * sensitivity.transpose();
    result.iter().all(|v| v.is_finite()).then_some(result)
}

/// Correlation matrix that belongs to a covariance; a row of variance zero correlates with nothing.
#[must_use]
pub fn correlation(covariance: &DMatrix<f64>) -> DMatrix<f64> {
    let u = covariance.diagonal().map(|v| v.max(0.0).sqrt());
    DMatrix::from_fn(covariance.nrows(), covariance.ncols(), |i, j| {
        let scale = u[i] * u[j];
        let off_diagonal = if scale > 0.0 { (covariance[(i, j)] / scale).clamp(-1.0, 1.0) } else { 0.0 };
        if i == j { 1.0 } else { off_diagonal }
    })
}

/// Effective degrees of freedom of a sum of independent contributions, `ν = u_c⁴ / Σ u_i⁴/ν_i`.
///
/// Infinity when no contribution with finite degrees of freedom has any variance. `None` when a variance
/// is negative or not finite, a ν is not positive, or all variances are zero.
///
/// Holds for independent contributions; inputs estimated from the same readings must first be gathered
/// into one contribution with the degrees of freedom of those readings.
///
/// Source: `[JCGM100]` G.4.1 eq. (G.2b); the limits of the formula: `[Willink2007]`.
///
/// ```
/// use spotrule::math::gum::{Contribution, welch_satterthwaite};
/// // JCGM 100:2008 H.1.6, the comparator difference d; printed as 25.6 because u is rounded before its fourth power
/// let parts = [(5.8_f64, 24.0), (3.9, 5.0), (6.7, 8.0)]
///     .map(|(u, nu)| Contribution { variance: u * u, degrees_of_freedom: nu });
/// assert!((welch_satterthwaite(&parts).unwrap() - 25.45).abs() < 0.005);
/// ```
#[must_use]
pub fn welch_satterthwaite(contributions: &[Contribution]) -> Option<f64> {
    let usable = |c: &Contribution| c.variance >= 0.0 && c.variance.is_finite() && c.degrees_of_freedom > 0.0;
    let total: f64 = contributions.iter().map(|c| c.variance).sum();
    if !contributions.iter().all(usable) || total <= 0.0 || !total.is_finite() {
        return None;
    }
    let spread: f64 = contributions.iter().map(|c| (c.variance / total).powi(2) / c.degrees_of_freedom).sum();
    Some(if spread > 0.0 { 1.0 / spread } else { f64::INFINITY })
}

/// Combined standard uncertainty and effective degrees of freedom of one result.
///
/// - `sensitivity`: `∂y/∂x_i`
/// - `covariance`: of the inputs, symmetric, with no negative diagonal entry
/// - `degrees_of_freedom`: of each input's variance; infinity for one taken as exactly known
///
/// `u_c² = cᵀ V c`; `ν_eff = u_c⁴ / Σ (c_i u_i)⁴ / ν_i`.
///
/// `None` when sizes differ, a number is not finite, a ν is not positive, or the variance comes out
/// negative (the covariance is then none). An exactly zero variance gives u = 0 with infinite ν.
///
/// Source: `[JCGM100]` 5.2.2 eq. (13) and G.4.1.
#[must_use]
pub fn combined(sensitivity: &DVector<f64>, covariance: &DMatrix<f64>, degrees_of_freedom: &[f64]) -> Option<Combined> {
    let n = sensitivity.len();
    if covariance.shape() != (n, n) || degrees_of_freedom.len() != n || !degrees_of_freedom.iter().all(|&nu| nu > 0.0) {
        return None;
    }
    let own = DVector::from_fn(n, |i, _| sensitivity[i].powi(2) * covariance[(i, i)]);
    let variance = sensitivity.dot(&(covariance * sensitivity));
    // cancellation of strongly correlated inputs may leave a rounding below zero
    let rounding = 8.0 * f64::EPSILON * crate::math::count(n) * own.sum();
    if !variance.is_finite() || !own.iter().all(|v| *v >= 0.0) || variance < -rounding {
        return None;
    }
    let variance = variance.max(0.0);
    let spread: f64 = own.iter().zip(degrees_of_freedom).map(|(v, nu)| v * v / nu).sum();
    let effective = if spread > 0.0 { variance * variance / spread } else { f64::INFINITY };
    Some(Combined {
        u: variance.sqrt(),
        degrees_of_freedom: effective,
        correlated_inputs: correlated(covariance, &own, degrees_of_freedom),
    })
}

/// Pairs that break the premise of Welch-Satterthwaite; correlations below 1e-9 are rounding.
fn correlated(covariance: &DMatrix<f64>, own: &DVector<f64>, degrees_of_freedom: &[f64]) -> Vec<(usize, usize)> {
    let r = correlation(covariance);
    let n = own.len();
    let pairs = (0..n).flat_map(|i| (i + 1..n).map(move |j| (i, j)));
    pairs
        .filter(|&(i, j)| r[(i, j)].abs() > 1e-9 && own[i] > 0.0 && own[j] > 0.0)
        .filter(|&(i, j)| degrees_of_freedom[i].is_finite() || degrees_of_freedom[j].is_finite())
        .collect()
}

/// Mean of repeated simultaneous readings and the covariance of the means, with n - 1 degrees of freedom.
///
/// - `readings`: one row per repetition, one column per quantity; at least two rows
///
/// `None` with fewer than two rows or a number that is not finite.
///
/// Source: `[JCGM100]` 4.2 and 5.2.3 eq. (17).
#[must_use]
pub fn mean_of_readings(readings: &DMatrix<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
    if readings.nrows() < 2 || !readings.iter().all(|v| v.is_finite()) {
        return None;
    }
    let n = crate::math::count(readings.nrows());
    let mean = readings.row_mean();
    let mut deviations = readings.clone();
    for mut row in deviations.row_iter_mut() {
        row -= &mean;
    }
    let covariance = deviations.tr_mul(&deviations) / (n * (n - 1.0));
    covariance.iter().all(|v| v.is_finite()).then(|| (mean.transpose(), covariance))
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{dmatrix, dvector};

    /// Two equal parts: ν doubles; a dominant part: its own ν; exactly known parts only raise ν.
    #[test]
    fn effective_degrees_between_smallest_and_sum() {
        let part = |variance, degrees_of_freedom| Contribution { variance, degrees_of_freedom };
        assert!((welch_satterthwaite(&[part(1.0, 4.0), part(1.0, 4.0)]).unwrap() - 8.0).abs() < 1e-12);
        assert!((welch_satterthwaite(&[part(1.0, 4.0), part(0.0, 1.0)]).unwrap() - 4.0).abs() < 1e-12);
        assert!((welch_satterthwaite(&[part(1.0, 4.0), part(1.0, f64::INFINITY)]).unwrap() - 16.0).abs() < 1e-12);
        assert_eq!(welch_satterthwaite(&[part(1.0, f64::INFINITY)]), Some(f64::INFINITY));
        for bad in [part(-1.0, 3.0), part(f64::NAN, 3.0), part(1.0, 0.0), part(0.0, 3.0)] {
            assert_eq!(welch_satterthwaite(&[bad]), None);
        }
    }

    /// y = a - b with r = 1 and equal u: nothing is left, and the pair is named.
    #[test]
    fn full_correlation_cancels_and_is_named() {
        let v = dmatrix![4.0, 4.0; 4.0, 4.0];
        let difference = combined(&dvector![1.0, -1.0], &v, &[5.0, f64::INFINITY]).unwrap();
        assert!(difference.u.abs() < 1e-7);
        assert_eq!(difference.correlated_inputs, [(0, 1)]);
        let sum = combined(&dvector![1.0, 1.0], &v, &[f64::INFINITY, f64::INFINITY]).unwrap();
        assert!((sum.u - 4.0).abs() < 1e-14);
        assert!(sum.correlated_inputs.is_empty(), "exactly known inputs may correlate");
    }

    #[test]
    fn what_is_no_covariance_is_refused() {
        assert!(combined(&dvector![1.0, 1.0], &dmatrix![1.0, -2.0; -2.0, 1.0], &[9.0, 9.0]).is_none());
        assert!(combined(&dvector![1.0], &dmatrix![f64::NAN], &[9.0]).is_none());
        assert!(combined(&dvector![1.0], &dmatrix![1.0], &[0.0]).is_none());
        assert!(combined(&dvector![1.0], &dmatrix![1.0], &[]).is_none());
        assert!(propagated(&dmatrix![1.0, 2.0], &dmatrix![1.0]).is_none());
        assert!(mean_of_readings(&dmatrix![1.0, 2.0]).is_none());
    }

    #[test]
    fn constant_reading_correlates_with_nothing() {
        let (mean, v) = mean_of_readings(&dmatrix![1.0, 7.0; 3.0, 7.0]).unwrap();
        assert_eq!((mean, v.clone()), (dvector![2.0, 7.0], dmatrix![1.0, 0.0; 0.0, 0.0]));
        assert_eq!(correlation(&v), DMatrix::identity(2, 2));
    }
}
