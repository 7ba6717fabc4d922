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
    /// Rejection alone, from a start that is nearly the solution.
    Rechecked,
    /// All observations are taken as they are.
    Kept,
}

/// Solves the problem from the values in its layout.
///
/// # Errors
/// [`FitError`] when the solver does not converge or too few observations are left.
pub fn solve(mut joint: Joint, outliers: Outliers) -> Result<Fit, FitError> {
    let evaluations = sort_out(&mut joint, outliers)?;
    scaled_by_birge(joint, evaluations)
}

/// Moves the layout near the solution and settles what belongs to the model, without the digits and the uncertainty of [`solve`].
///
/// # Errors
/// As [`solve`].
pub fn approach(mut joint: Joint, outliers: Outliers) -> Result<Joint, FitError> {
    let mut evaluations = sort_out(&mut joint, outliers)?;
    if outliers == Outliers::Kept {
        solve_once(&mut joint, &rough(), &mut evaluations)?;
    }
    Ok(joint)
}

/// Robust passes, then rejection; gives the evaluations used.
fn sort_out(joint: &mut Joint, outliers: Outliers) -> Result<usize, FitError> {
    let mut evaluations = 0;
    if outliers == Outliers::Rejected {
        for _ in 0..2 {
            calm(joint);
            solve_once(joint, &rough(), &mut evaluations)?;
            reweigh(joint, |length, scale| (HUBER_AT * scale / length.max(1e-12)).min(1.0));
        }
    }
    if outliers != Outliers::Kept {
        for _ in 0..4 {
            calm(joint);
            solve_once(joint, &rough(), &mut evaluations)?;
            if !reweigh(joint, |length, scale| if length > REJECT_AT * scale.max(1.0) { 0.0 } else { 1.0 }) {
                break;
            }
        }
    }
    Ok(evaluations)
}

/// Plain least squares, repeated until the Birge factors that it finds are those that it was weighed with.
///
/// The factors come from above: weighed with too small an uncertainty, noise would bend lens and geometry first and never be given back.
fn scaled_by_birge(mut joint: Joint, mut evaluations: usize) -> Result<Fit, FitError> {
    let mut freedom = Freedoms::default();
    for _ in 0..BIRGE_PASSES {
        let solution = solve_once(&mut joint, &fine(), &mut evaluations)?;
        freedom = freedoms(&joint, &solution);
        let next = [freedom.spots.birge(), freedom.prints.birge()];
        #[expect(clippy::float_cmp, reason = "the very factors that it was weighed with, usually 1")]
        let weighed_with_them = next == [joint.spot_scale, joint.print_scale];
        if weighed_with_them {
            return Ok(finished(joint, &solution, &freedom, evaluations));
        }
        let settled = (next[0] / joint.spot_scale).ln().abs() < BIRGE_SETTLED && (next[1] / joint.print_scale).ln().abs() < BIRGE_SETTLED;
        [joint.spot_scale, joint.print_scale] = next;
        if settled {
            break;
        }
    }
    let solution = solve_once(&mut joint, &fine(), &mut evaluations)?;
    Ok(finished(joint, &solution, &freedom, evaluations))
}

const BIRGE_PASSES: usize = 6;
/// Factors that agree within 1 % are the same.
const BIRGE_SETTLED: f64 = 0.01;

/// Before a robust pass uncertainties are raised to what the residuals show, so that a bad start or underestimated noise does not bend what
/// the operator knows.
fn calm(joint: &mut Joint) {
    joint.spot_scale = spread(&joint.spot_lengths()).max(1.0);
    joint.print_scale = spread(&lengths_of_many(joint)).max(1.0);
}

/// Passes whose result is only a start need no digits.
fn rough() -> math::Options {
    math::Options { objective_tolerance: 1e-5, step_tolerance: 1e-6, polish_fraction: 0.5, ..math::Options::default() }
}

/// The solver's last steps are full Gauss-Newton steps, which bring the digits that the trust region leaves: to a millionth of the noise.
fn fine() -> math::Options {
    math::Options { objective_tolerance: 1e-9, polish_fraction: 1e-6, ..math::Options::default() }
}

fn solve_once(joint: &mut Joint, options: &math::Options, evaluations: &mut usize) -> Result<math::Solution, FitError> {
    let start = DVector::zeros(joint.layout.free().len());
    let solution = least_squares(joint, start, options).map_err(|error| FitError::NotConverged { ending: error.to_string() })?;
    *evaluations += solution.evaluations;
    joint.layout.advance(&solution.parameters);
    Ok(solution)
}

fn lengths_of_many(joint: &Joint) -> Vec<Option<f64>> {
    joint.prints.iter().zip(joint.print_lengths()).filter(|(print, _)| print.is_one_of_many()).map(|(_, length)| length).collect()
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
    // Only what the program reads by the hundred can spare a point; marks and scale ends are stated by the operator and stay.
    let scale = spread(&lengths_of_many(joint));
    let lengths = joint.print_lengths();
    for (print, length) in joint.prints.iter_mut().zip(lengths).filter(|(print, _)| print.is_one_of_many()) {
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

/// Degrees of freedom and reduced chi-square of a group of pixels, both with the uncertainties as stated (no Birge factor).
#[derive(Debug, Clone, Copy, Default)]
struct Freedom {
    degrees: f64,
    chi2_reduced: f64,
}

impl Freedom {
    /// Birge's factor: the observations' own scatter, where it is larger than stated. It never shrinks an uncertainty.
    fn birge(&self) -> f64 {
        if self.degrees >= 1.0 { self.chi2_reduced.sqrt().max(1.0) } else { 1.0 }
    }
}

#[derive(Debug, Clone, Copy, Default)]
struct Freedoms {
    spots: Freedom,
    prints: Freedom,
}

fn freedoms(joint: &Joint, solution: &math::Solution) -> Freedoms {
    let spots = 2 * joint.spots.len();
    let prints = spots + 2 * joint.prints.len();
    let leverage = leverages(&solution.jacobian, &solution.covariance);
    let group = |range: std::ops::Range<usize>, coordinates: usize, scale: f64| {
        let degrees = math::count(coordinates) - range.clone().map(|row| leverage[row]).sum::<f64>();
        let chi2: f64 = range.map(|row| solution.residuals[row].powi(2)).sum::<f64>() * scale * scale;
        Freedom { degrees, chi2_reduced: if degrees > 1e-9 { chi2 / degrees } else { 0.0 } }
    };
    Freedoms {
        spots: group(0..spots, 2 * joint.spots.iter().filter(|spot| spot.weight > 0.5).count(), joint.spot_scale),
        prints: group(spots..prints, print_coordinates(joint), joint.print_scale),
    }
}

/// Coordinates of the used points of the print: two of a point, one of a line.
fn print_coordinates(joint: &Joint) -> usize {
    joint.prints.iter().filter(|print| print.weight > 0.5).map(|print| print.sharpness.dimensions()).sum()
}

/// Diagonal of `J C Jᵀ`.
fn leverages(jacobian: &DMatrix<f64>, covariance: &DMatrix<f64>) -> Vec<f64> {
    let spread = jacobian * covariance;
    (0..jacobian.nrows()).map(|row| spread.row(row).dot(&jacobian.row(row))).collect()
}

fn finished(joint: Joint, solution: &math::Solution, freedom: &Freedoms, evaluations: usize) -> Fit {
    let scales: Vec<f64> = joint.layout.free().iter().map(|&place| joint.layout.entries()[place].scale).collect();
    let covariance = DMatrix::from_fn(scales.len(), scales.len(), |i, j| solution.covariance[(i, j)] * scales[i] * scales[j]);
    let mut jacobian = solution.jacobian.clone();
    for (mut column, scale) in jacobian.column_iter_mut().zip(&scales) {
        column /= *scale;
    }
    let spot_rms_px = rms_px(&joint);
    let (
        Freedom { degrees: spot_freedom, chi2_reduced: spot_chi2_reduced },
        Freedom { degrees: print_freedom, chi2_reduced: print_chi2_reduced },
    ) = (freedom.spots, freedom.prints);
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
