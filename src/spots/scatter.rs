//! How much the fitted shapes scatter from spot to spot, against what the fits expect.
//!
//! All spots of a photo are pictures of one beam, so their shapes differ by a slow trend only; what they scatter beyond it is
//! speckle, demosaicing, JPEG: the same causes that move their centres, through the same fit. The scatter of the shapes
//! therefore tells how far to trust the centres, without knowing where those should be.

use nalgebra::{Matrix3, Vector3};

/// One shape: where, and its two departures from a circle (xx - yy and 2 xy) in units of their expected standard deviation.
#[derive(Debug, Clone, Copy)]
pub(super) struct Shape {
    /// Place, in units of the photo's size.
    pub(super) x: f64,
    /// Place, in units of the photo's size.
    pub(super) y: f64,
    /// Departures, per px².
    pub(super) departure: [f64; 2],
    /// Expected standard deviations, per px².
    pub(super) u: [f64; 2],
}

/// Number of shapes that a prior scatter is worth: with few shapes the estimate leans on it.
const PRIOR_WORTH: f64 = 4.0;

/// Variance of the shapes about a linear trend, relative to what was expected; 1 where the fits are right.
///
/// Robust (median of squares over 0.4549, that of a squared standard normal), and drawn towards `prior` with the worth
/// of four shapes.
pub(super) fn excess(shapes: &[Shape], prior: f64) -> f64 {
    let mut squares: Vec<f64> = (0..2).flat_map(|axis| trend_residuals(shapes, axis)).map(|z| z * z).collect();
    if squares.is_empty() {
        return prior;
    }
    let count = shapes.len() as f64;
    let middle = squares.len() / 2;
    let median = *squares.select_nth_unstable_by(middle, f64::total_cmp).1;
    let freedom = (count - 3.0).max(0.0);
    // The trend takes three degrees of freedom per axis.
    let seen = if freedom > 0.0 { median / 0.4549 * count / freedom } else { prior };
    (freedom * seen + PRIOR_WORTH * prior) / (freedom + PRIOR_WORTH)
}

/// Residuals of one departure about its trend, in expected standard deviations; the fit is reweighted against outliers.
fn trend_residuals(shapes: &[Shape], axis: usize) -> Vec<f64> {
    let mut trend = Vector3::zeros();
    for _ in 0..6 {
        let mut normal = Matrix3::identity() * 1e-9;
        let mut right = Vector3::zeros();
        for shape in shapes {
            let place = Vector3::new(1.0, shape.x, shape.y);
            let z = (shape.departure[axis] - trend.dot(&place)) / shape.u[axis];
            let weight = 1.0 / (shape.u[axis].powi(2) * (1.0 + 0.1 * z * z));
            normal += place * place.transpose() * weight;
            right += place * (weight * shape.departure[axis]);
        }
        let Some(factor) = normal.cholesky() else { break };
        trend = factor.solve(&right);
    }
    shapes.iter().map(|shape| (shape.departure[axis] - trend.dot(&Vector3::new(1.0, shape.x, shape.y))) / shape.u[axis]).collect()
}

#[cfg(test)]
mod tests {
    use rand::{Rng, SeedableRng};
    use rand_distr::StandardNormal;

    use super::{Shape, excess};

    #[test]
    fn scatter_twice_as_wide_is_found_on_a_trend() {
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(1);
        let mut shapes = Vec::new();
        for _ in 0..400 {
            let (x, y): (f64, f64) = (random.random(), random.random());
            let mut departure = || 0.3 + 0.5 * x - 0.2 * y + 0.2 * random.sample::<f64, _>(StandardNormal);
            shapes.push(Shape { x, y, departure: [departure(), departure()], u: [0.1; 2] });
        }
        // (0.2 / 0.1)² = 4; the median of 800 squares is good to 7 %.
        assert!((excess(&shapes, 1.0) - 4.0).abs() < 0.8);
    }

    #[test]
    fn few_shapes_lean_on_the_prior() {
        assert!((excess(&[], 2.0) - 2.0).abs() < 1e-12);
        let one = Shape { x: 0.5, y: 0.5, departure: [9.0, 9.0], u: [1.0; 2] };
        assert!((excess(&[one; 3], 2.0) - 2.0).abs() < 1e-12);
    }
}
