//! In: indexed spots, target dots, priors. Out: parameters with their full covariance.
//! Must never know: photos as pixels, files, reports.

/// Why the joint fit gives no pitch.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum FitError {}
