//! Solves the joint problem: robust first, then plain least squares on what belongs to the model, so that the covariance is honest.

use super::{FitError, cell::Derived, joint::Joint, source::Source};
use crate::math::{self, VarianceSplit, least_squares};
use nalgebra::{DMatrix, DVector};
use std::collections::{BTreeMap, BTreeSet};

/// A spot or dot further off than this many standard uncertainties (of its two coordinates together) does not belong to the model.
/// For a normal law of two coordinates one in 10⁴ honest spots lies beyond.
const REJECT_AT: f64 = 4.3;
/// Bound of the first, robust passes (Huber), in the same measure.
const HUBER_AT: f64 = 2.0;
/// Median of the length of a two-dimensional standard normal vector.
const MEDIAN_LENGTH: f64 = 1.177_410_022_515_474_7;

/// A solved joint problem.
#[derive(Debug, Clone)]
pub struct Fit {
    /// The problem, its layout moved to the solution.
    pub joint: Joint,
    /// Covariance of the unknowns in the order of `joint.layout.free()`, SI units.
    pub covariance: DMatrix<f64>,
    /// Whitened residuals at the solution.
    pub residuals: DVector<f64>,
    /// Whitened Jacobian at the solution against the unknowns in SI units.
    pub jacobian: DMatrix<f64>,
    /// Degrees of freedom that the spots leave over.
    pub spot_freedom: f64,
    /// Sum of the squared whitened spot residuals before Birge scaling, over `spot_freedom`.
    pub spot_chi2_reduced: f64,
    /// Degrees of freedom that dots and marks leave over.
    pub print_freedom: f64,
    /// The same for dots and marks.
    pub print_chi2_reduced: f64,
    /// Root mean square distance of the used spots from their predictions, px.
    pub spot_rms_px: f64,
    /// Evaluations of the model.
    pub evaluations: usize,
}

/// Whether observations that do not belong to the model are looked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outliers {
    /// Robust passes, then rejection.
    Rejected,
    /// All observations are taken as they are.
    Kept,
}

/// Solves the problem from the values in its layout.
///
/// # Errors
/// [`FitError`] when the solver does not converge or too few observations are left.
pub fn solve(mut joint: Joint, outliers: Outliers) -> Result<Fit, FitError> {
    let mut evaluations = 0;
    if outliers == Outliers::Rejected {
        for _ in 0..2 {
            solve_once(&mut joint, &mut evaluations)?;
            reweigh(&mut joint, |length, scale| (HUBER_AT * scale / length.max(1e-12)).min(1.0));
        }
        for _ in 0..4 {
            solve_once(&mut joint, &mut evaluations)?;
            if !reweigh(&mut joint, |length, scale| if length > REJECT_AT * scale.max(1.0) { 0.0 } else { 1.0 }) {
                break;
            }
        }
    }
    let solution = solve_once(&mut joint, &mut evaluations)?;
    let freedom = freedoms(&joint, &solution);
    let (spot_freedom, spot_chi2_reduced) = freedom.spots;
    let (print_freedom, print_chi2_reduced) = freedom.prints;
    joint.spot_scale *= birge(spot_chi2_reduced, spot_freedom);
    joint.print_scale *= birge(print_chi2_reduced, print_freedom);
    let solution = solve_once(&mut joint, &mut evaluations)?;
    Ok(finished(joint, &solution, [spot_freedom, spot_chi2_reduced, print_freedom, print_chi2_reduced], evaluations))
}

/// Birge's factor: the observations' own scatter, where it is larger than stated. It never shrinks an uncertainty.
fn birge(chi2_reduced: f64, freedom: f64) -> f64 {
    if freedom >= 1.0 { chi2_reduced.sqrt().max(1.0) } else { 1.0 }
}

fn solve_once(joint: &mut Joint, evaluations: &mut usize) -> Result<math::Solution, FitError> {
    let start = DVector::zeros(joint.layout.free().len());
    let solution =
        least_squares(joint, start, &math::Options::default()).map_err(|error| FitError::NotConverged { ending: error.to_string() })?;
    *evaluations += solution.evaluations;
    joint.layout.advance(&solution.parameters);
    Ok(solution)
}

/// Gives every spot and dot a weight from the length of its residual; says whether any weight changed.
fn reweigh(joint: &mut Joint, weight: impl Fn(f64, f64) -> f64) -> bool {
    let mut changed = false;
    let mut apply = |target: &mut f64, length: Option<f64>, scale: f64| {
        let new = length.map_or(0.0, |length| weight(length, scale));
        changed |= (*target - new).abs() > 1e-3;
        *target = new;
    };
    let lengths = joint.spot_lengths();
    let scale = spread(&lengths);
    for (spot, length) in joint.spots.iter_mut().zip(lengths) {
        apply(&mut spot.weight, length, scale);
    }
    let lengths = joint.print_lengths();
    let scale = spread(&lengths);
    for (print, length) in joint.prints.iter_mut().zip(lengths) {
        apply(&mut print.weight, length, scale);
    }
    changed
}

/// Robust scale of residual lengths: 1 when they follow the stated uncertainties.
fn spread(lengths: &[Option<f64>]) -> f64 {
    let mut sorted: Vec<f64> = lengths.iter().copied().flatten().collect();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).map_or(1.0, |median| (median / MEDIAN_LENGTH).max(1e-3))
}

struct Freedoms {
    spots: (f64, f64),
    prints: (f64, f64),
}

/// Degrees of freedom and reduced chi-square of the two pixel groups.
fn freedoms(joint: &Joint, solution: &math::Solution) -> Freedoms {
    let spots = 2 * joint.spots.len();
    let prints = spots + 2 * joint.prints.len();
    let leverage = leverages(&solution.jacobian, &solution.covariance);
    let group = |range: std::ops::Range<usize>, weights: Vec<f64>| {
        let count = 2.0 * weights.iter().filter(|&&w| w > 0.5).count() as f64;
        let freedom = count - range.clone().map(|row| leverage[row]).sum::<f64>();
        let chi2: f64 = range.map(|row| solution.residuals[row].powi(2)).sum();
        (freedom, if freedom > 1e-9 { chi2 / freedom } else { 0.0 })
    };
    Freedoms {
        spots: group(0..spots, joint.spots.iter().map(|s| s.weight).collect()),
        prints: group(spots..prints, joint.prints.iter().map(|p| p.weight).collect()),
    }
}

/// Diagonal of `J C Jᵀ`.
fn leverages(jacobian: &DMatrix<f64>, covariance: &DMatrix<f64>) -> Vec<f64> {
    let spread = jacobian * covariance;
    (0..jacobian.nrows()).map(|row| spread.row(row).dot(&jacobian.row(row))).collect()
}

fn finished(joint: Joint, solution: &math::Solution, freedom: [f64; 4], evaluations: usize) -> Fit {
    let scales: Vec<f64> = joint.layout.free().iter().map(|&place| joint.layout.entries()[place].scale).collect();
    let covariance = DMatrix::from_fn(scales.len(), scales.len(), |i, j| solution.covariance[(i, j)] * scales[i] * scales[j]);
    let mut jacobian = solution.jacobian.clone();
    for (mut column, scale) in jacobian.column_iter_mut().zip(&scales) {
        column /= *scale;
    }
    let spot_rms_px = rms_px(&joint);
    let [spot_freedom, spot_chi2_reduced, print_freedom, print_chi2_reduced] = freedom;
    let residuals = solution.residuals.clone();
    Fit {
        joint,
        covariance,
        residuals,
        jacobian,
        spot_freedom,
        spot_chi2_reduced,
        print_freedom,
        print_chi2_reduced,
        spot_rms_px,
        evaluations,
    }
}

fn rms_px(joint: &Joint) -> f64 {
    let squares: Vec<f64> = joint
        .spot_residuals_px()
        .iter()
        .zip(&joint.spots)
        .filter(|(_, spot)| spot.weight > 0.5)
        .filter_map(|(r, _)| *r)
        .map(|[x, y]| x * x + y * y)
        .collect();
    (squares.iter().sum::<f64>() / squares.len().max(1) as f64).sqrt()
}

impl Fit {
    /// Variance of a derived value and the part that each source owns; the parts add up to the variance.
    #[must_use]
    pub fn variance_by_source(&self, slopes: &[(usize, f64)]) -> (f64, BTreeMap<Source, f64>) {
        let rows = self.joint.row_sources();
        let sources: Vec<Source> = rows.iter().copied().collect::<BTreeSet<_>>().into_iter().collect();
        let groups: Vec<usize> = rows.iter().map(|source| sources.binary_search(source).unwrap_or(0)).collect();
        let split = VarianceSplit::new(&self.jacobian, &self.covariance, &self.gradient(slopes), &groups, sources.len());
        let Some(split) = split else { return (f64::INFINITY, BTreeMap::new()) };
        (split.variance(), sources.into_iter().zip(split.parts).collect())
    }

    /// Covariance of two derived values.
    #[must_use]
    pub fn covariance_of(&self, a: &Derived, b: &Derived) -> f64 {
        self.gradient(&a.slopes).dot(&(&self.covariance * self.gradient(&b.slopes)))
    }

    fn gradient(&self, slopes: &[(usize, f64)]) -> DVector<f64> {
        let mut gradient = DVector::zeros(self.covariance.nrows());
        for &(place, slope) in slopes {
            if let Some(column) = self.joint.layout.column(place) {
                gradient[column] += slope;
            }
        }
        gradient
    }
}
