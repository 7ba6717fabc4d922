//! Numerical derivatives, to check the exact ones against.

use super::least_squares::Problem;
use nalgebra::{DMatrix, DVector};

/// Derivative of a function of one number by Ridders' extrapolation of central differences, with an
/// estimate of its error.
///
/// - `x`: where, any unit
/// - `step`: first step, same unit, large enough that the function changes visibly but stays in its domain
///
/// Steps shrink by 1.4 and the differences are extrapolated to step zero by Neville's scheme; the entry
/// of the tableau with the smallest change wins. About 10 digits for a smooth function of order one.
///
/// `None` when `step` is not positive and finite, or the function is undefined at any of the points.
///
/// Source: `[Ridders1982]` in docs/sources.md.
///
/// ```
/// use spotrule::math::finite_difference::derivative;
/// let (slope, _error) = derivative(|x| Some(x.sin()), 0.3, 0.1).unwrap();
/// assert!((slope - 0.3_f64.cos()).abs() < 1e-11);
/// ```
#[must_use]
pub fn derivative(function: impl Fn(f64) -> Option<f64>, x: f64, step: f64) -> Option<(f64, f64)> {
    let quotients: Option<Vec<f64>> =
        widths(step)?.map(|width| Some((function(x + width)? - function(x - width)?) / (2.0 * width))).collect();
    extrapolated(&quotients?)
}

/// Jacobian of a problem's residuals as [`derivative`] would give it entry by entry; for checks, not for fits.
///
/// - `steps`: first step per parameter, same units as `parameters`
///
/// `None` when lengths differ or any point needed lies outside the problem's domain.
#[must_use]
pub fn jacobian(problem: &impl Problem, parameters: &DVector<f64>, steps: &DVector<f64>) -> Option<DMatrix<f64>> {
    if steps.len() != parameters.len() {
        return None;
    }
    let rows = problem.residuals(parameters)?.len();
    let mut result = DMatrix::zeros(rows, parameters.len());
    for column in 0..parameters.len() {
        let at = |value: f64| {
            let mut moved = parameters.clone();
            moved[column] = value;
            problem.residuals(&moved).filter(|residuals| residuals.len() == rows)
        };
        let centre = parameters[column];
        let quotients: Option<Vec<DVector<f64>>> =
            widths(steps[column])?.map(|width| Some((at(centre + width)? - at(centre - width)?) / (2.0 * width))).collect();
        let quotients = quotients?;
        for row in 0..rows {
            let of_row: Vec<f64> = quotients.iter().map(|quotient| quotient[row]).collect();
            result[(row, column)] = extrapolated(&of_row)?.0;
        }
    }
    Some(result)
}

const SHRINK: f64 = 1.4;

/// The twelve steps of one derivative, largest first.
fn widths(step: f64) -> Option<impl Iterator<Item = f64>> {
    (step > 0.0 && step.is_finite()).then(|| std::iter::successors(Some(step), |width| Some(width / SHRINK)).take(12))
}

/// Neville's scheme on central quotients of shrinking width; the error of a quotient is even in its width.
fn extrapolated(quotients: &[f64]) -> Option<(f64, f64)> {
    let mut previous: Vec<f64> = Vec::new();
    let mut best = (f64::NAN, f64::INFINITY);
    for &quotient in quotients {
        let mut row = vec![quotient];
        let mut factor = SHRINK * SHRINK;
        for (column, &above) in previous.iter().enumerate() {
            let left = row[column];
            let value = (left * factor - above) / (factor - 1.0);
            let error = (value - left).abs().max((value - above).abs());
            if error < best.1 {
                best = (value, error);
            }
            row.push(value);
            factor *= SHRINK * SHRINK;
        }
        previous = row;
    }
    best.0.is_finite().then_some(best)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn known_slopes() {
        for x in [0.2, 1.0, 3.0_f64] {
            let (slope, error) = derivative(|t| Some(t.exp()), x, 0.1).unwrap();
            assert!((slope / x.exp() - 1.0).abs() < 1e-11, "at {x}: {slope}, error estimate {error}");
        }
    }

    #[test]
    fn refuses_bad_steps_and_holes_in_the_domain() {
        assert!(derivative(Some, 0.0, 0.0).is_none());
        assert!(derivative(Some, 0.0, f64::NAN).is_none());
        assert!(derivative(|x| (x > 0.0).then(|| x.ln()), 0.05, 0.1).is_none());
        assert!(derivative(|_| Some(f64::NAN), 0.0, 0.1).is_none());
    }
}
