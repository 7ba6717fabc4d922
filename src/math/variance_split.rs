//! Who owns how much of a result's variance, and how well each group of residuals is checked by the rest.

use super::{count, gum::Contribution};
use nalgebra::{DMatrix, DVector};

/// The variance of one result, split exactly among independent groups of residuals.
#[derive(Debug, Clone, PartialEq)]
pub struct VarianceSplit {
    /// Part of the variance owned by each group, in the square of the result's unit; never negative.
    pub parts: Vec<f64>,
}

impl VarianceSplit {
    /// Splits the variance of a result of a least-squares fit.
    ///
    /// The fitted result is linear in everything that was fed in: `δy = cᵀ C Jᵀ δz = Σ_rows w_i δz_i` with
    /// whitened inputs z of variance one. Group g owns `Σ_{i in g} w_i²`, and the parts add up to `cᵀ C c`.
    ///
    /// - `jacobian`: whitened, m rows, priors included as rows of their own
    /// - `covariance`: `(JᵀJ)⁻¹`
    /// - `gradient`: `∂y/∂p`
    /// - `group_of_row`: for each of the m rows the number of its group, below `groups`
    ///
    /// Exact when the weights of the fit are the inverse covariances of the inputs and rows of different
    /// groups are independent. Where robust weights or a Birge factor changed the weights, whiten with the final ones.
    ///
    /// `None` when sizes differ, a group number is too large, or a number is not finite.
    ///
    /// Source: generalised least squares, `[JCGM102]` 6.3 in explicit form.
    #[must_use]
    pub fn new(
        jacobian: &DMatrix<f64>,
        covariance: &DMatrix<f64>,
        gradient: &DVector<f64>,
        group_of_row: &[usize],
        groups: usize,
    ) -> Option<Self> {
        let n = jacobian.ncols();
        let fits = covariance.shape() == (n, n) && gradient.len() == n && group_of_row.len() == jacobian.nrows();
        if !fits || group_of_row.iter().any(|&group| group >= groups) {
            return None;
        }
        let pull = jacobian * (covariance * gradient);
        let mut parts = vec![0.0; groups];
        for (weight, &group) in pull.iter().zip(group_of_row) {
            parts[group] += weight * weight;
        }
        parts.iter().sum::<f64>().is_finite().then_some(Self { parts })
    }

    /// The whole variance, the sum of the parts.
    #[must_use]
    pub fn variance(&self) -> f64 {
        self.parts.iter().sum()
    }

    /// Each group's share; they add up to one. All zero when there is no variance to share.
    #[must_use]
    pub fn shares(&self) -> Vec<f64> {
        let whole = self.variance();
        self.parts.iter().map(|part| if whole > 0.0 { part / whole } else { 0.0 }).collect()
    }

    /// The parts as contributions for Welch-Satterthwaite, with the degrees of freedom of each group.
    ///
    /// `None` when there is not one number per group.
    #[must_use]
    pub fn contributions(&self, degrees_of_freedom: &[f64]) -> Option<Vec<Contribution>> {
        (degrees_of_freedom.len() == self.parts.len()).then(|| {
            let pairs = self.parts.iter().zip(degrees_of_freedom);
            pairs.map(|(&variance, &degrees_of_freedom)| Contribution { variance, degrees_of_freedom }).collect()
        })
    }
}

/// Redundancy of each residual, `1 - h_i` with leverage `h_i = (J C Jᵀ)_ii`: how much of an error in that
/// reading its own residual shows. Between 0 (nothing else checks it) and 1 (it has no say in the fit).
///
/// Summed over all rows it is m - rank; summed over a group it is the degrees of freedom of that group's
/// chi-square, which is what a Birge ratio of the group must be divided by.
///
/// - `jacobian`: whitened, `covariance`: `(JᵀJ)⁻¹`
///
/// `None` when the sizes do not fit or a number is not finite.
///
/// Source: `[Foerstner1979]` (redundancy numbers).
#[must_use]
pub fn redundancy(jacobian: &DMatrix<f64>, covariance: &DMatrix<f64>) -> Option<DVector<f64>> {
    let n = jacobian.ncols();
    if covariance.shape() != (n, n) {
        return None;
    }
    let spread = jacobian * covariance;
    let leverage = |row: usize| spread.row(row).dot(&jacobian.row(row));
    let numbers = DVector::from_fn(jacobian.nrows(), |row, _| (1.0 - leverage(row)).clamp(0.0, 1.0));
    numbers.iter().all(|v| v.is_finite()).then_some(numbers)
}

/// Chi-square and degrees of freedom of one group of residuals.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GroupChiSquare {
    /// Sum of the group's squared whitened residuals.
    pub chi_square: f64,
    /// Sum of the group's redundancy numbers.
    pub degrees_of_freedom: f64,
    /// Rows in the group.
    pub rows: usize,
}

impl GroupChiSquare {
    /// Birge ratio `√(χ²/ν)`, never below 1: uncertainties are enlarged where the data ask for it, not shrunk.
    ///
    /// 1 as well when the group has less than one degree of freedom, from which nothing can be concluded.
    ///
    /// Source: `[Birge1932]`.
    #[must_use]
    pub fn birge_ratio(self) -> f64 {
        if self.degrees_of_freedom < 1.0 { 1.0 } else { (self.chi_square / self.degrees_of_freedom).sqrt().max(1.0) }
    }
}

/// Chi-square per group; arguments as in [`VarianceSplit::new`], `redundancy` from [`redundancy()`].
///
/// `None` when sizes differ or a group number is too large.
#[must_use]
pub fn chi_square_by_group(
    residuals: &DVector<f64>,
    redundancy: &DVector<f64>,
    group_of_row: &[usize],
    groups: usize,
) -> Option<Vec<GroupChiSquare>> {
    let rows = residuals.len();
    if redundancy.len() != rows || group_of_row.len() != rows || group_of_row.iter().any(|&group| group >= groups) {
        return None;
    }
    let mut result = vec![GroupChiSquare { chi_square: 0.0, degrees_of_freedom: 0.0, rows: 0 }; groups];
    for ((residual, redundancy), &group) in residuals.iter().zip(redundancy.iter()).zip(group_of_row) {
        result[group].chi_square += residual * residual;
        result[group].degrees_of_freedom += redundancy;
        result[group].rows += 1;
    }
    Some(result)
}

/// Degrees of freedom of a standard uncertainty that is itself only known to a fraction, `ν ≈ ½ (Δu/u)⁻²`.
///
/// `relative_doubt` = Δu/u > 0, for example 0.25 for "reliable to about 25 %" (ν = 8). `None` otherwise.
///
/// Source: `[JCGM100]` G.4.2 eq. (G.3).
#[must_use]
pub fn degrees_of_freedom_from_doubt(relative_doubt: f64) -> Option<f64> {
    (relative_doubt > 0.0 && relative_doubt.is_finite()).then(|| 0.5 / (relative_doubt * relative_doubt))
}

/// Degrees of freedom of a sample of n readings from which `fitted` numbers were estimated; zero when too few.
#[must_use]
pub fn degrees_of_freedom_of_readings(readings: usize, fitted: usize) -> f64 {
    count(readings.saturating_sub(fitted))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::NormalInverse;
    use nalgebra::{dmatrix, dvector};

    /// Weighted mean of 10.0(1) and 10.2(2): weights 0.8 and 0.2, so shares 0.8 and 0.2 of u² = 1/125.
    #[test]
    fn weighted_mean_by_hand() {
        let j = dmatrix![10.0; 5.0];
        let c = NormalInverse::new(&j, 1e-12).unwrap().covariance;
        let split = VarianceSplit::new(&j, &c, &dvector![1.0], &[0, 1], 2).unwrap();
        assert!((split.variance() - 1.0 / 125.0).abs() < 1e-16);
        let shares = split.shares();
        assert!((shares[0] - 0.8).abs() < 1e-14 && (shares[1] - 0.2).abs() < 1e-14);
        let left = redundancy(&j, &c).unwrap();
        assert!((left[0] - 0.2).abs() < 1e-14 && (left[1] - 0.8).abs() < 1e-14);
    }

    /// Any J and c: parts add up to cᵀCc, redundancies to m - n, both to 1e-12.
    #[test]
    fn parts_add_up_exactly() {
        let j = DMatrix::from_fn(40, 6, |i, k| ((i * 7 + k * 13) as f64 * 0.37).sin() + if i % 6 == k { 2.0 } else { 0.0 });
        let inverse = NormalInverse::new(&j, 1e-12).unwrap();
        let c = DVector::from_fn(6, |k, _| (k as f64 + 0.5).cos());
        let groups: Vec<usize> = (0..40).map(|i| i % 3).collect();
        let split = VarianceSplit::new(&j, &inverse.covariance, &c, &groups, 3).unwrap();
        assert!((split.variance() / inverse.variance(&c).unwrap() - 1.0).abs() < 1e-12);
        assert!((split.shares().iter().sum::<f64>() - 1.0).abs() < 1e-15);
        let left = redundancy(&j, &inverse.covariance).unwrap();
        assert!((left.sum() - 34.0).abs() < 1e-12);
    }

    #[test]
    fn groups_keep_their_own_chi_square() {
        let residuals = dvector![2.0, 2.0, 0.1];
        let got = chi_square_by_group(&residuals, &dvector![1.0, 1.0, 0.0], &[0, 0, 1], 2).unwrap();
        assert!((got[0].birge_ratio() - 2.0).abs() < 1e-15);
        assert!((got[1].birge_ratio() - 1.0).abs() < 1e-15, "nothing checks the second group");
        assert_eq!((got[0].rows, got[1].rows), (2, 1));
    }

    #[test]
    fn doubt_of_a_quarter_is_eight_degrees() {
        // JCGM 100:2008 G.4.2: 25 % gives ν = 8
        assert!((degrees_of_freedom_from_doubt(0.25).unwrap() - 8.0).abs() < 1e-15);
        assert!(degrees_of_freedom_from_doubt(0.0).is_none());
        assert!(degrees_of_freedom_of_readings(2, 3) <= 0.0);
    }

    #[test]
    fn sizes_that_do_not_fit_give_nothing() {
        let (j, c) = (dmatrix![1.0; 1.0], dmatrix![0.5]);
        assert!(VarianceSplit::new(&j, &c, &dvector![1.0], &[0], 1).is_none());
        assert!(VarianceSplit::new(&j, &c, &dvector![1.0], &[0, 1], 1).is_none());
        assert!(VarianceSplit::new(&j, &c, &dvector![1.0, 1.0], &[0, 0], 1).is_none());
        assert!(redundancy(&j, &DMatrix::zeros(2, 2)).is_none());
        assert!(chi_square_by_group(&dvector![1.0], &dvector![1.0], &[1], 1).is_none());
    }
}
