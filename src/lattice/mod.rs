//! In: plain points of a plane (dimensionless). Out: the lattice they lie on, each point's order (h, k), and what speaks for it.
//! Must never know: brightness in pixels, cameras, screens, wavelengths.
//! Start reading at [`index`].

mod cell;
mod contest;
mod copies;
mod evidence;
mod grow;
mod indexed;
mod indexing;
mod kind;
mod point;
mod rejected;
mod relatives;
mod seed;
mod trim;
mod warp;
mod zero;

#[cfg(test)]
mod corpus_test;
#[cfg(test)]
mod pattern_test;

pub use cell::{Cell, Reduced, Reduction, dual, reduce};
pub use indexed::{Evidence, Indexed, Reason, RunnerUp, Shape, Warning};
pub use indexing::index;

pub use kind::{CellEstimate, KindOptions, KindStatement, LatticeKind, SymmetryTest, kind_of_lattice};
pub use point::{Expected, IndexOptions, Point, ZeroHint};

/// Why points form no lattice.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LatticeError {
    /// Fewer usable points than any lattice needs.
    #[error(
        "{found} usable spots; a line pattern needs at least {needed} and a plane pattern 4; include more of the pattern or expose longer"
    )]
    TooFewSpots {
        /// Spots with finite place and positive weight.
        found: usize,
        /// Least number for the expected pattern.
        needed: usize,
    },
    /// Chance explains the points as well as the best lattice does.
    #[error(
        "no lattice: the best candidate puts {explained} of {spots} spots on a lattice, evidence {evidence:.1} where {needed:.1} is needed to rule out chance; check that the photo shows the pattern and not clutter, and that the rough geometry is right"
    )]
    NoLattice {
        /// Number of usable spots.
        spots: usize,
        /// Spots on the best candidate.
        explained: usize,
        /// Its log evidence over chance, nats.
        evidence: f64,
        /// Evidence that is asked for, nats.
        needed: f64,
    },
    /// The two vectors of a cell are parallel or not finite.
    #[error("the two lattice vectors span no cell (area {area:e}); give two vectors that are not parallel")]
    FlatCell {
        /// Area seen.
        area: f64,
    },
    /// A covariance that is not finite, symmetric and non-negative.
    #[error("the covariance of the cell is not usable (smallest variance {variance:e}); variances must be finite and not negative")]
    BadCovariance {
        /// Smallest diagonal element seen.
        variance: f64,
    },
}
