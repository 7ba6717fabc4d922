//! In: indexed spots, target dots, priors. Out: parameters with their full covariance.
//! Must never know: photos as pixels, files, reports.
//! Start reading at [`Joint`], then [`solve()`].

mod cell;
mod correlated;
mod joint;
mod model;
mod observation;
mod parameter;
pub mod setup;
mod solve;
mod source;
mod trials;

pub use cell::{Cell, Derived, cell};
pub use correlated::{CorrelatedPrior, Marginal};
pub use joint::Joint;
pub use model::{PhotoShape, Shape, camera_at};
pub use observation::{Knowledge, PrintObservation, PrintPlace, Sharpness, SheetEdge, SpotObservation};
pub use parameter::{Entry, Layout, Parameter, Prior};
pub use solve::{Fit, Outliers, approach, solve};
pub use source::Source;
pub use trials::trials;

/// Why the joint fit gives no pitch.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum FitError {
    /// Fewer spots carry an order than the lattice has unknowns to fix.
    #[error("{indexed} spots carry an order, the fit needs at least {needed}; photograph more of the pattern, or expose longer")]
    TooFewSpots {
        /// Spots with an order.
        indexed: usize,
        /// Needed.
        needed: usize,
    },
    /// The solver stopped before a minimum.
    #[error("the fit found no minimum ({ending}); check throw, target pitch and incidence in the bench file against the photo")]
    NotConverged {
        /// How it ended.
        ending: String,
    },
}
