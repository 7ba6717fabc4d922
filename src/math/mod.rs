//! In: numbers. Out: numbers. Least squares, covariance, GUM combination, robust statistics, rotation.
//! Must never know: optics, photos, units.
//! Start reading at [`least_squares()`].

pub mod finite_difference;
pub mod gum;
pub mod least_squares;
pub mod monte_carlo;
pub mod normal_inverse;
pub mod robust;
pub mod rotation;
pub mod singular_values;
pub mod statistics;
pub mod variance_split;

pub use least_squares::{Ending, LeastSquaresError, Options, Problem, Solution, least_squares};
pub use normal_inverse::NormalInverse;
pub use variance_split::VarianceSplit;

/// A count as a number; exact below 2^53, which no count of ours reaches.
#[must_use]
#[expect(clippy::cast_precision_loss, reason = "counts stay far below 2^53")]
pub fn count(n: usize) -> f64 {
    n as f64
}
