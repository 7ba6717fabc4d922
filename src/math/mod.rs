//! In: numbers. Out: numbers. Least squares, covariance, GUM combination, robust statistics, rotation.
//! Must never know: optics, photos, units.
//! Start reading at `least_squares`.

pub mod rotation;
