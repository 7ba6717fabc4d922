//! Nonlinear least squares: the problem's contract, the solver, and what is known at the end.
//!
//! Given m whitened residuals `r(p)` (each divided by its standard uncertainty, priors included as
//! rows of their own) and n parameters p, the solver looks for the p that makes `½ Σ r²` smallest, by
//! Levenberg-Marquardt steps on an orthogonal factorisation of the Jacobian with scaled columns (the
//! method of MINPACK). With whitened residuals `(JᵀJ)⁻¹` at the solution *is* the covariance of p.

use super::normal_inverse::NormalInverse;
use levenberg_marquardt::{LeastSquaresProblem, LevenbergMarquardt, TerminationReason};
use nalgebra::{DMatrix, DVector, Dyn, storage::Owned};
use std::cell::{Cell, RefCell};

/// A least-squares problem: residuals and their derivatives as functions of the parameters.
pub trait Problem {
    /// Whitened residuals and their Jacobian (one row per residual, one column per parameter).
    ///
    /// `None` where the model is not defined: the solver then refuses the step and tries a shorter one.
    /// The number of residuals must be the same at every place.
    fn residuals_and_jacobian(&self, parameters: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)>;

    /// The residuals alone. Worth implementing where they are cheaper than with the Jacobian: the
    /// solver asks for them at every trial step, for the Jacobian once per accepted step.
    fn residuals(&self, parameters: &DVector<f64>) -> Option<DVector<f64>> {
        self.residuals_and_jacobian(parameters).map(|(residuals, _)| residuals)
    }
}

/// When to stop, and what counts as a direction that nothing fixes.
#[derive(Debug, Clone, PartialEq)]
pub struct Options {
    /// Stop when a step lowers the sum of squares by less than this fraction.
    pub objective_tolerance: f64,
    /// Stop when the trust region is smaller than this fraction of the scaled parameters.
    pub step_tolerance: f64,
    /// Stop when no column of the Jacobian makes a larger cosine than this with the residuals.
    pub gradient_tolerance: f64,
    /// First trust region as a multiple of the length of the scaled parameters; 0.1 to 100.
    pub first_step_bound: f64,
    /// Give up after this many evaluations of the residuals per (parameter + 1).
    pub patience: usize,
    /// After the solver has settled, full Gauss-Newton steps follow until the next one would move the fitted
    /// values by less than this fraction of their noise, `‖J δ‖ ≤ f ‖r‖ / √(m - n)`. The solver's own tests
    /// look at the sum of squares, which is flat at its minimum and stops half the digits early.
    pub polish_fraction: f64,
    /// A singular value of the scaled Jacobian below this fraction of the largest marks an open direction.
    pub rank_tolerance: f64,
}

impl Default for Options {
    /// As tight as double precision allows; a problem of 60 parameters gives up after 12 200 evaluations.
    fn default() -> Self {
        let tight = 30.0 * f64::EPSILON;
        Self {
            objective_tolerance: tight,
            step_tolerance: tight,
            gradient_tolerance: tight,
            first_step_bound: 100.0,
            patience: 200,
            polish_fraction: 1e-9,
            rank_tolerance: 1e-12,
        }
    }
}

impl Options {
    fn check(&self) -> Result<(), LeastSquaresError> {
        let not_negative = [
            ("objective_tolerance", self.objective_tolerance),
            ("step_tolerance", self.step_tolerance),
            ("gradient_tolerance", self.gradient_tolerance),
            ("polish_fraction", self.polish_fraction),
            ("rank_tolerance", self.rank_tolerance),
        ];
        for (name, value) in not_negative {
            if !(0.0..1.0).contains(&value) {
                return Err(LeastSquaresError::UnusableOption { name, value });
            }
        }
        if !(self.first_step_bound > 0.0 && self.first_step_bound.is_finite()) {
            return Err(LeastSquaresError::UnusableOption { name: "first_step_bound", value: self.first_step_bound });
        }
        if self.patience == 0 {
            return Err(LeastSquaresError::UnusableOption { name: "patience", value: 0.0 });
        }
        Ok(())
    }
}

/// Every way a fit can end.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Ending {
    /// The last step changed the sum of squares by no more than the tolerance.
    ObjectiveSettled,
    /// The last step changed the parameters by no more than the tolerance.
    ParametersSettled,
    /// Residuals are orthogonal to every column of the Jacobian: a stationary point.
    GradientVanished,
    /// Every residual is zero.
    ResidualsVanished,
    /// Rounding allows no further improvement, although a tolerance asked for one.
    PrecisionReached,
    /// The allowed number of evaluations was used up before anything settled.
    PatienceLost,
    /// An accepted step led to a place where the Jacobian is undefined or not finite.
    DerivativeUndefined,
    /// A norm overflowed inside the solver; parameters are the best ones seen.
    ArithmeticOverflow,
}

impl Ending {
    /// Whether the parameters are a minimum as far as the solver can tell.
    #[must_use]
    pub fn was_successful(self) -> bool {
        match self {
            Self::ObjectiveSettled
            | Self::ParametersSettled
            | Self::GradientVanished
            | Self::ResidualsVanished
            | Self::PrecisionReached => true,
            Self::PatienceLost | Self::DerivativeUndefined | Self::ArithmeticOverflow => false,
        }
    }
}

impl std::fmt::Display for Ending {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Self::ObjectiveSettled => "the sum of squares settled",
            Self::ParametersSettled => "the parameters settled",
            Self::GradientVanished => "the gradient vanished",
            Self::ResidualsVanished => "all residuals are zero",
            Self::PrecisionReached => "rounding allows no further improvement",
            Self::PatienceLost => "the allowed number of evaluations was used up",
            Self::DerivativeUndefined => "the derivatives are undefined where the fit arrived",
            Self::ArithmeticOverflow => "numbers overflowed during the fit",
        })
    }
}

/// Why there is no solution at all, not even a poor one.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LeastSquaresError {
    /// There is nothing to fit.
    #[error("the fit has no free parameter; leave at least one free")]
    NoParameters,
    /// There is nothing to fit to.
    #[error("the fit has no residual; give it data or priors")]
    NoResiduals,
    /// The model is undefined, or not finite, where the fit should begin.
    #[error("the model is undefined at the starting values; start from values that the model allows")]
    StartOutsideDomain,
    /// The problem broke its contract on sizes.
    #[error("the problem gave {found} where {expected} was expected ({what}); its size must not change during a fit")]
    WrongSize {
        /// Which size differs.
        what: &'static str,
        /// The size that was promised.
        expected: usize,
        /// The size that came.
        found: usize,
    },
    /// An option lies outside its range.
    #[error("option {name} = {value} cannot be used; tolerances lie in [0, 1), bounds and patience above 0")]
    UnusableOption {
        /// Name of the field in [`Options`].
        name: &'static str,
        /// Its value.
        value: f64,
    },
}

/// What a fit knows at its end. Every number in it is finite.
#[derive(Debug, Clone)]
pub struct Solution {
    /// The best parameters found.
    pub parameters: DVector<f64>,
    /// Whitened residuals there.
    pub residuals: DVector<f64>,
    /// Their Jacobian there.
    pub jacobian: DMatrix<f64>,
    /// `(JᵀJ)⁻¹`. Where `rank` is lost, see [`Solution::variance`].
    pub covariance: DMatrix<f64>,
    /// How many directions of parameter space the residuals fix.
    pub rank: usize,
    /// Unit vectors, in parameters scaled by the Jacobian's column lengths, that no residual fixes.
    pub null_directions: Vec<DVector<f64>>,
    /// The decomposition behind `covariance`, `rank` and `null_directions`.
    pub normal_inverse: NormalInverse,
    /// How the fit ended.
    pub ending: Ending,
    /// How often residuals were evaluated.
    pub evaluations: usize,
    /// How many trial steps left the domain of the model and were refused.
    pub refused_steps: usize,
}

impl Solution {
    /// Sum of squared whitened residuals.
    #[must_use]
    pub fn chi_square(&self) -> f64 {
        self.residuals.norm_squared()
    }

    /// Residuals minus fixed directions; zero or less means that the residuals cannot test the model.
    #[must_use]
    pub fn degrees_of_freedom(&self) -> usize {
        self.residuals.len().saturating_sub(self.rank)
    }

    /// Variance of a scalar function of the parameters with this gradient; `None` when it is not fixed.
    #[must_use]
    pub fn variance(&self, gradient: &DVector<f64>) -> Option<f64> {
        self.normal_inverse.variance(gradient)
    }
}

/// Finds the parameters with the smallest sum of squared residuals near `start`.
///
/// - `problem`: whitened residuals with exact derivatives
/// - `start`: starting values, finite, inside the problem's domain
///
/// A fit that ends badly still gives a [`Solution`]: look at its [`Ending`]. Lost rank is no failure
/// either: `null_directions` say what nothing fixes.
///
/// Measured on the 27 nonlinear reference data sets of NIST from both published starts: nine digits or more in
/// every parameter (`tests/nist.rs`).
///
/// # Errors
/// See [`LeastSquaresError`]: an empty problem, a start outside the domain, changing sizes, or an
/// option outside its range.
///
/// Source: `[More1978]` in docs/sources.md.
///
/// ```
/// use nalgebra::{DMatrix, DVector, dmatrix, dvector};
/// use spotrule::math::{Options, Problem, least_squares};
///
/// /// A length read twice: 10.0(1) and 10.2(2).
/// struct TwoReadings;
/// impl Problem for TwoReadings {
///     fn residuals_and_jacobian(&self, p: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
///         Some((dvector![(p[0] - 10.0) / 0.1, (p[0] - 10.2) / 0.2], dmatrix![10.0; 5.0]))
///     }
/// }
/// let got = least_squares(&TwoReadings, dvector![1.0], &Options::default()).unwrap();
/// assert!((got.parameters[0] - 10.04).abs() < 1e-12); // weights 100 : 25
/// assert!((got.covariance[(0, 0)] - 1.0 / 125.0).abs() < 1e-14);
/// ```
pub fn least_squares(problem: &impl Problem, start: DVector<f64>, options: &Options) -> Result<Solution, LeastSquaresError> {
    options.check()?;
    if start.is_empty() {
        return Err(LeastSquaresError::NoParameters);
    }
    if !start.iter().all(|v| v.is_finite()) {
        return Err(LeastSquaresError::StartOutsideDomain);
    }
    let engine = LevenbergMarquardt::new()
        .with_ftol(options.objective_tolerance)
        .with_xtol(options.step_tolerance)
        .with_gtol(options.gradient_tolerance)
        .with_stepbound(options.first_step_bound)
        .with_patience(options.patience);
    let (watch, report) = engine.minimize(Watch::new(problem, start));
    let ending = ending(&report.termination, &watch)?;
    finish(watch, ending, options)
}

/// Translates the engine's word; what leaves no solution becomes an error.
fn ending<P: Problem>(reason: &TerminationReason, watch: &Watch<'_, P>) -> Result<Ending, LeastSquaresError> {
    match reason {
        TerminationReason::Converged { ftol: true, .. } => Ok(Ending::ObjectiveSettled),
        TerminationReason::Converged { .. } => Ok(Ending::ParametersSettled),
        TerminationReason::Orthogonal => Ok(Ending::GradientVanished),
        TerminationReason::ResidualsZero => Ok(Ending::ResidualsVanished),
        TerminationReason::NoImprovementPossible(_) => Ok(Ending::PrecisionReached),
        TerminationReason::LostPatience => Ok(Ending::PatienceLost),
        TerminationReason::Numerical(_) => Ok(Ending::ArithmeticOverflow),
        TerminationReason::User(_) if watch.best.borrow().is_none() => Err(LeastSquaresError::StartOutsideDomain),
        TerminationReason::User(_) => Ok(Ending::DerivativeUndefined),
        TerminationReason::NoParameters => Err(LeastSquaresError::NoParameters),
        TerminationReason::NoResiduals => Err(LeastSquaresError::NoResiduals),
        TerminationReason::WrongDimensions(what) => {
            let (expected, found) = watch.sizes.get();
            Err(LeastSquaresError::WrongSize { what, expected, found })
        }
    }
}

/// Evaluates everything once more at the best place seen, and polishes it.
fn finish<P: Problem>(watch: Watch<'_, P>, ending: Ending, options: &Options) -> Result<Solution, LeastSquaresError> {
    let mut evaluations = watch.evaluations.get() + 1;
    let refused_steps = watch.refused.get();
    let at = |parameters| Place::new(watch.problem, parameters, options.rank_tolerance);
    let best = watch.best.into_inner().and_then(|(parameters, _)| at(parameters));
    // the best place may have residuals but no derivatives; then the last one that has both stands
    let ending = if best.is_some() { ending } else { Ending::DerivativeUndefined };
    let mut place = best.or_else(|| watch.differentiable.into_inner().and_then(at)).ok_or(LeastSquaresError::StartOutsideDomain)?;
    if ending.was_successful() {
        evaluations += place.polish(watch.problem, options);
    }
    let Place { parameters, residuals, jacobian, normal_inverse } = place;
    Ok(Solution {
        parameters,
        residuals,
        jacobian,
        covariance: normal_inverse.covariance.clone(),
        rank: normal_inverse.rank,
        null_directions: normal_inverse.null_directions.clone(),
        normal_inverse,
        ending,
        evaluations,
        refused_steps,
    })
}

/// Parameters with everything that is evaluated there.
struct Place {
    parameters: DVector<f64>,
    residuals: DVector<f64>,
    jacobian: DMatrix<f64>,
    normal_inverse: NormalInverse,
}

impl Place {
    fn new(problem: &impl Problem, parameters: DVector<f64>, rank_tolerance: f64) -> Option<Self> {
        let (residuals, jacobian) = problem.residuals_and_jacobian(&parameters)?;
        let normal_inverse = NormalInverse::new(&jacobian, rank_tolerance)?;
        residuals.norm_squared().is_finite().then_some(Self { parameters, residuals, jacobian, normal_inverse })
    }

    /// Full Gauss-Newton steps as long as each is shorter than 0.9 of the one before; gives the evaluations used.
    ///
    /// The first must already be small against the noise (10 %), so that this never leaves the minimum
    /// the solver found; a step that raises the sum of squares by more than rounding is taken back.
    fn polish(&mut self, problem: &impl Problem, options: &Options) -> usize {
        const MOST_STEPS: usize = 100;
        let free = self.residuals.len().saturating_sub(self.normal_inverse.rank).max(1);
        let noise = self.residuals.norm() / crate::math::count(free).sqrt();
        let mut longest = 0.1 * noise;
        for used in 0..MOST_STEPS {
            let step = &self.normal_inverse.covariance * self.jacobian.tr_mul(&self.residuals);
            let length = (&self.jacobian * &step).norm();
            // written so that a NaN stops too
            if !(length > options.polish_fraction * noise && length <= longest) {
                return used;
            }
            match Self::new(problem, &self.parameters - step, options.rank_tolerance) {
                Some(next) if next.residuals.norm() <= self.residuals.norm() * (1.0 + 1e-12) => *self = next,
                _ => return used + 1,
            }
            longest = 0.9 * length;
        }
        MOST_STEPS
    }
}

/// Stands between problem and engine: refuses steps out of the domain, remembers the best place seen.
struct Watch<'a, P> {
    problem: &'a P,
    parameters: DVector<f64>,
    /// Best place so far and the length of its residual vector.
    best: RefCell<Option<(DVector<f64>, f64)>>,
    /// Last place at which the Jacobian was finite.
    differentiable: RefCell<Option<DVector<f64>>>,
    /// Expected and last found size, for the message when they differ.
    sizes: Cell<(usize, usize)>,
    evaluations: Cell<usize>,
    refused: Cell<usize>,
}

impl<'a, P: Problem> Watch<'a, P> {
    fn new(problem: &'a P, parameters: DVector<f64>) -> Self {
        Self {
            problem,
            parameters,
            best: RefCell::new(None),
            differentiable: RefCell::new(None),
            sizes: Cell::new((0, 0)),
            evaluations: Cell::new(0),
            refused: Cell::new(0),
        }
    }

    /// Residuals so long that the engine turns the step down and shrinks its trust region tenfold.
    ///
    /// The engine itself would stop at an undefined place; a step too far is no reason to give up.
    fn refusal(&self) -> Option<DVector<f64>> {
        let best_length = self.best.borrow().as_ref().map(|(_, length)| *length)?;
        self.refused.set(self.refused.get() + 1);
        let mut residuals = DVector::zeros(self.sizes.get().0);
        residuals[0] = 1e3 * best_length;
        Some(residuals)
    }
}

impl<P: Problem> LeastSquaresProblem<f64, Dyn, Dyn> for Watch<'_, P> {
    type ResidualStorage = Owned<f64, Dyn>;
    type JacobianStorage = Owned<f64, Dyn, Dyn>;
    type ParameterStorage = Owned<f64, Dyn>;

    fn set_params(&mut self, parameters: &DVector<f64>) {
        self.parameters.copy_from(parameters);
    }

    fn params(&self) -> DVector<f64> {
        self.parameters.clone()
    }

    fn residuals(&self) -> Option<DVector<f64>> {
        self.evaluations.set(self.evaluations.get() + 1);
        let Some(residuals) = self.problem.residuals(&self.parameters) else { return self.refusal() };
        // a finite square is asked for because the engine compares squares
        let square = residuals.norm_squared();
        if !square.is_finite() {
            return self.refusal();
        }
        let mut best = self.best.borrow_mut();
        let (expected, length) = (best.as_ref().map_or(residuals.len(), |_| self.sizes.get().0), square.sqrt());
        self.sizes.set((expected, residuals.len()));
        if residuals.len() == expected && best.as_ref().is_none_or(|(_, shortest)| length < *shortest) {
            *best = Some((self.parameters.clone(), length));
        }
        Some(residuals)
    }

    fn jacobian(&self) -> Option<DMatrix<f64>> {
        let (_, jacobian) = self.problem.residuals_and_jacobian(&self.parameters)?;
        if jacobian.ncols() != self.parameters.len() {
            self.sizes.set((self.parameters.len(), jacobian.ncols()));
        } else if jacobian.nrows() != self.sizes.get().0 {
            self.sizes.set((self.sizes.get().0, jacobian.nrows()));
        }
        if !jacobian.norm_squared().is_finite() {
            return None;
        }
        *self.differentiable.borrow_mut() = Some(self.parameters.clone());
        Some(jacobian)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{dmatrix, dvector};

    /// Closures as a problem, for the small cases below.
    struct Case<F>(F);
    impl<F: Fn(&DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)>> Problem for Case<F> {
        fn residuals_and_jacobian(&self, p: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
            (self.0)(p)
        }
    }

    fn rosenbrock(p: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        Some((dvector![10.0 * (p[1] - p[0] * p[0]), 1.0 - p[0]], dmatrix![-20.0 * p[0], 10.0; -1.0, 0.0]))
    }

    #[test]
    fn bent_valley_ends_at_its_known_minimum() {
        let got = least_squares(&Case(rosenbrock), dvector![-1.2, 1.0], &Options::default()).unwrap();
        assert!(got.ending.was_successful(), "{}", got.ending);
        assert!((got.parameters - dvector![1.0, 1.0]).norm() < 1e-14);
        assert_eq!(got.rank, 2);
    }

    /// ln p is undefined below zero, where the first full step would land.
    #[test]
    fn step_out_of_the_domain_is_refused_not_fatal() {
        let case = Case(|p: &DVector<f64>| (p[0] > 0.0).then(|| (dvector![p[0].ln() + 2.0], dmatrix![1.0 / p[0]])));
        let got = least_squares(&case, dvector![5.0], &Options::default()).unwrap();
        assert!(got.refused_steps > 0 && got.ending.was_successful());
        assert!((got.parameters[0] - (-2.0_f64).exp()).abs() < 1e-14);
    }

    #[test]
    fn not_finite_counts_as_out_of_the_domain() {
        let case = Case(|p: &DVector<f64>| Some((dvector![p[0].ln() + 2.0], dmatrix![1.0 / p[0]])));
        let got = least_squares(&case, dvector![5.0], &Options::default()).unwrap();
        assert!((got.parameters[0] - (-2.0_f64).exp()).abs() < 1e-14);
        let refused = least_squares(&case, dvector![-1.0], &Options::default());
        assert_eq!(refused.unwrap_err(), LeastSquaresError::StartOutsideDomain);
    }

    /// Only a + b is measured: the fit succeeds and says that a - b is open.
    #[test]
    fn open_direction_is_named() {
        let case = Case(|p: &DVector<f64>| Some((dvector![p[0] + p[1] - 3.0, 2.0 * (p[0] + p[1]) - 6.2], dmatrix![1.0, 1.0; 2.0, 2.0])));
        let got = least_squares(&case, dvector![0.0, 0.0], &Options::default()).unwrap();
        assert!(got.ending.was_successful());
        assert_eq!((got.rank, got.null_directions.len(), got.degrees_of_freedom()), (1, 1, 1));
        let open = &got.null_directions[0];
        assert!((open[0] + open[1]).abs() < 1e-12 && (open.norm() - 1.0).abs() < 1e-12);
        assert!((got.variance(&dvector![1.0, 1.0]).unwrap() - 0.2).abs() < 1e-13);
        assert!(got.variance(&dvector![1.0, 0.0]).is_none());
        assert!(got.covariance.iter().all(|v| v.is_finite()));
    }

    #[test]
    fn empty_or_broken_problems_say_so() {
        let none = Case(|_: &DVector<f64>| Some((DVector::zeros(0), DMatrix::zeros(0, 1))));
        assert_eq!(least_squares(&none, dvector![1.0], &Options::default()).unwrap_err(), LeastSquaresError::NoResiduals);
        let free = least_squares(&Case(rosenbrock), DVector::zeros(0), &Options::default());
        assert_eq!(free.unwrap_err(), LeastSquaresError::NoParameters);
        let wrong = Case(|p: &DVector<f64>| Some((dvector![p[0], 1.0], dmatrix![1.0])));
        let want = LeastSquaresError::WrongSize { what: "jacobian", expected: 2, found: 1 };
        assert_eq!(least_squares(&wrong, dvector![1.0], &Options::default()).unwrap_err(), want);
        let options = Options { objective_tolerance: -1.0, ..Options::default() };
        assert!(matches!(
            least_squares(&Case(rosenbrock), dvector![1.0, 1.0], &options),
            Err(LeastSquaresError::UnusableOption { name: "objective_tolerance", .. })
        ));
    }

    /// Residuals exist everywhere, the Jacobian only above 2.
    #[test]
    fn lost_derivatives_end_at_the_last_place_that_has_them() {
        struct Edge;
        impl Problem for Edge {
            fn residuals_and_jacobian(&self, p: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
                (p[0] > 2.0).then(|| (dvector![p[0]], dmatrix![1.0]))
            }
            fn residuals(&self, p: &DVector<f64>) -> Option<DVector<f64>> {
                Some(dvector![p[0]])
            }
        }
        let got = least_squares(&Edge, dvector![5.0], &Options::default()).unwrap();
        assert_eq!(got.ending, Ending::DerivativeUndefined);
        assert!((got.parameters[0] - 5.0).abs() < 1e-15);
        assert_eq!(least_squares(&Edge, dvector![1.0], &Options::default()).unwrap_err(), LeastSquaresError::StartOutsideDomain);
    }

    #[test]
    fn impatience_is_reported() {
        let options = Options { patience: 1, ..Options::default() };
        let got = least_squares(&Case(rosenbrock), dvector![-1.2, 1.0], &options).unwrap();
        assert_eq!(got.ending, Ending::PatienceLost);
        assert!(!got.ending.was_successful());
    }
}
