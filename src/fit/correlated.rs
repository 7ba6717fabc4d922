//! What is known of several parameters together: a joint normal prior, whose rows are whitened by the Cholesky factor of its covariance.

use super::{
    parameter::{Entry, Layout, Parameter, Prior},
    source::Source,
};
use nalgebra::{Cholesky, DMatrix, DVector};

/// A joint normal prior.
///
/// Its rows are `r = L⁻¹ (p − m)` with `C = L Lᵀ`: `rᵀr = (p − m)ᵀ C⁻¹ (p − m)`, one row per parameter, together owned by one source.
#[derive(Debug, Clone, PartialEq)]
pub struct CorrelatedPrior {
    /// Owner of its share of the budget.
    pub source: Source,
    parameters: Vec<Parameter>,
    mean: DVector<f64>,
    u: DVector<f64>,
    whitening: DMatrix<f64>,
}

/// One parameter of a joint prior.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Marginal {
    /// Which.
    pub parameter: Parameter,
    /// Mean, SI.
    pub mean: f64,
    /// Standard uncertainty, above zero.
    pub u: f64,
}

impl CorrelatedPrior {
    /// A joint prior from its marginals and their correlation.
    ///
    /// `None` when sizes differ, a u is not above zero, or the correlation is not positive definite.
    #[must_use]
    pub fn new(marginals: &[Marginal], correlation: &DMatrix<f64>, source: Source) -> Option<Self> {
        let count = marginals.len();
        if count == 0 || correlation.shape() != (count, count) || marginals.iter().any(|m| !(m.u > 0.0 && m.u.is_finite())) {
            return None;
        }
        let u = DVector::from_iterator(count, marginals.iter().map(|m| m.u));
        // C = D R D: the correlation is factored alone, so that units as far apart as nm and m cost no digits.
        let factor = Cholesky::new(correlation.clone())?.unpack();
        let mut whitening = factor.solve_lower_triangular(&DMatrix::identity(count, count))?;
        for (mut column, u) in whitening.column_iter_mut().zip(&u) {
            column /= *u;
        }
        let parameters = marginals.iter().map(|m| m.parameter).collect();
        let mean = DVector::from_iterator(count, marginals.iter().map(|m| m.mean));
        whitening.iter().all(|w| w.is_finite()).then_some(Self { source, parameters, mean, u, whitening })
    }

    /// The parameters as entries of a layout, at their means.
    pub fn entries(&self) -> impl Iterator<Item = Entry> + '_ {
        self.parameters.iter().zip(self.mean.iter().zip(&self.u)).map(|(&parameter, (&mean, &u))| Entry {
            parameter,
            value: mean,
            prior: Prior::Correlated { mean, u },
            source: self.source,
            scale: u,
        })
    }

    /// Number of rows.
    #[must_use]
    #[expect(clippy::len_without_is_empty, reason = "never empty")]
    pub fn len(&self) -> usize {
        self.parameters.len()
    }

    /// The parameters, in the order of the columns of [`Self::whitening`].
    #[must_use]
    pub fn parameters(&self) -> &[Parameter] {
        &self.parameters
    }

    /// `L⁻¹`, lower triangular.
    #[must_use]
    pub fn whitening(&self) -> &DMatrix<f64> {
        &self.whitening
    }

    /// `L⁻¹ (p − m)`; `None` when the layout lacks one of the parameters.
    #[must_use]
    pub fn residuals(&self, layout: &Layout, values: &[f64]) -> Option<DVector<f64>> {
        let places: Option<Vec<usize>> = self.parameters.iter().map(|parameter| layout.place(*parameter)).collect();
        let difference = DVector::from_iterator(self.len(), places?.into_iter().zip(&self.mean).map(|(place, mean)| values[place] - mean));
        Some(&self.whitening * difference)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::dmatrix;

    fn prior(correlation: f64) -> Option<CorrelatedPrior> {
        let marginal = |parameter, mean, u| Marginal { parameter, mean, u };
        let marginals = [marginal(Parameter::Throw, 0.8, 1e-3), marginal(Parameter::Wavelength { laser: 0 }, 650e-9, 1e-9)];
        CorrelatedPrior::new(&marginals, &dmatrix![1.0, correlation; correlation, 1.0], Source::Calibration)
    }

    /// By hand: for two parameters χ² = (a² − 2 ρ a b + b²) / (1 − ρ²) with a, b in units of u.
    #[test]
    fn the_sum_of_squares_is_that_of_the_joint_density() {
        for correlation in [0.0, 0.6, -0.999] {
            let prior = prior(correlation).unwrap();
            let mut layout = Layout::default();
            prior.entries().for_each(|entry| {
                layout.add(entry);
            });
            let (a, b): (f64, f64) = (1.5, -0.4);
            let chi2 = prior.residuals(&layout, &[0.8 + a * 1e-3, 650e-9 + b * 1e-9]).unwrap().norm_squared();
            let want = (a * a - 2.0 * correlation * a * b + b * b) / (1.0 - correlation * correlation);
            assert!((chi2 / want - 1.0).abs() < 1e-9, "{chi2} {want}");
        }
    }

    #[test]
    fn what_is_no_covariance_is_refused() {
        assert!(prior(1.0).is_none() && prior(f64::NAN).is_none() && prior(-1.2).is_none());
        assert!(prior(0.5).unwrap().residuals(&Layout::default(), &[]).is_none());
    }
}
