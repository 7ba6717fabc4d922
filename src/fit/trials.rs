//! The whole inference drawn again and again: every input around its stated or observed value, then the fit.
//!
//! All rows of the joint problem are whitened, so that drawing every input anew is one standard normal number per row. What the linear
//! propagation takes for straight (the model between its inputs and the pitch) is solved in full in every trial.

use super::{
    cell::{cell, cell_along},
    joint::Joint,
    solve::Fit,
};
use crate::math::{
    Options, Problem, least_squares,
    monte_carlo::{MonteCarlo, MonteCarloOptions, propagate_all},
};
use nalgebra::{DMatrix, DVector};
use rand_chacha::ChaCha8Rng;
use rand_distr::{ChiSquared, Distribution, StandardNormal};
use std::ops::Range;

/// The problem with every input moved by `noise` standard uncertainties.
struct Redrawn<'a> {
    joint: &'a Joint,
    noise: DVector<f64>,
}

impl Problem for Redrawn<'_> {
    fn residuals(&self, parameters: &DVector<f64>) -> Option<DVector<f64>> {
        Some(self.joint.residuals(parameters)? + &self.noise)
    }

    fn residuals_and_jacobian(&self, parameters: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let (residuals, jacobian) = self.joint.residuals_and_jacobian(parameters)?;
        Some((residuals + &self.noise, jacobian))
    }
}

/// Pitches of a sample, shortest first, m, then its lattice angle, rad (absent for a line grating), each by Monte Carlo.
///
/// - `options.block * options.most_blocks`: most trials
/// - `progress`: told after each block how many trials have been made
///
/// A trial whose fit does not converge counts as failed. `None` where hardly any trial gave a value.
///
/// Source: `[JCGM101]` clauses 5 to 7: distributions assigned to the inputs, here normal with the stated standard uncertainties,
/// propagated through the model.
#[must_use]
pub fn trials(fit: &Fit, sample: usize, options: &MonteCarloOptions, progress: &dyn Fn(usize)) -> Option<Vec<MonteCarlo>> {
    let joint = &fit.joint;
    let scales =
        DVector::from_iterator(joint.layout.free().len(), joint.layout.free().iter().map(|&place| joint.layout.entries()[place].scale));
    let best = cell(&joint.layout, &joint.shape, &joint.values(), sample)?;
    let values_of = |values: &[f64]| {
        let cell = cell_along(&joint.layout, &joint.shape, values, sample, Some(best.combinations))?;
        Some(cell.pitch_m.iter().chain(&cell.angle_rad).map(|derived| derived.value).collect::<Vec<f64>>())
    };
    let spreads = Spreads::of(fit);
    // A trial needs its minimum to a hundredth of its own noise.
    let rough = Options { objective_tolerance: 1e-7, step_tolerance: 1e-9, polish_fraction: 1e-2, ..Options::default() };
    let draw = |rng: &mut ChaCha8Rng| {
        let noise = spreads.draw(rng);
        let linear = -(&fit.covariance * fit.jacobian.tr_mul(&noise)).component_div(&scales);
        let problem = Redrawn { joint, noise };
        let solved = least_squares(&problem, linear, &rough).ok()?;
        if solved.ending.was_successful() { values_of(&joint.layout.values_at(&solved.parameters)) } else { None }
    };
    propagate_all(draw, options, progress)
}

/// How the noise of the rows is drawn: standard normal, and for observations whose uncertainty was itself estimated from their scatter
/// (a Birge factor above 1) with Student's distribution in common, as `[JCGM101]` 6.4.9 asks for.
struct Spreads {
    rows: usize,
    /// Rows and degrees of freedom of each group that was scaled.
    scaled: Vec<(Range<usize>, ChiSquared<f64>, f64)>,
}

impl Spreads {
    fn of(fit: &Fit) -> Self {
        let spots = 0..2 * fit.joint.spots.len();
        let prints = spots.end..spots.end + 2 * fit.joint.prints.len();
        let groups = [(spots, fit.joint.spot_scale, fit.spot_freedom), (prints, fit.joint.print_scale, fit.print_freedom)];
        let scaled = groups.into_iter().filter(|(_, scale, _)| *scale > 1.0).filter_map(|(rows, _, freedom)| {
            let freedom = freedom.max(1.0);
            Some((rows, ChiSquared::new(freedom).ok()?, freedom))
        });
        Self { rows: fit.residuals.len(), scaled: scaled.collect() }
    }

    fn draw(&self, rng: &mut ChaCha8Rng) -> DVector<f64> {
        let mut noise = DVector::from_fn(self.rows, |_, _| StandardNormal.sample(rng));
        for (rows, chi_squared, freedom) in &self.scaled {
            let factor = (freedom / chi_squared.sample(rng)).sqrt();
            noise.rows_range_mut(rows.clone()).scale_mut(factor);
        }
        noise
    }
}
