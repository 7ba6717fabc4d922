//! The smooth map from order (h, k) to place: affine at the middle, bent a little further out because the geometry is only rough.
//!
//! Bayesian least squares. The affine part is free (prior as wide as the picture); quadratic and cubic terms have priors of
//! the size that the stated bend allows. So the map is as stiff as the knowledge: few points give an affine map whose
//! stated spread grows outwards, many points bend it. Both coordinates share one design matrix and one covariance.

use nalgebra::{Cholesky, SMatrix, SVector};

/// Terms 1, h, k, h², hk, k², h³, h²k, hk², k³.
const TERMS: usize = 10;
type Vector = SVector<f64, TERMS>;
type Matrix = SMatrix<f64, TERMS, TERMS>;

/// A point taken as the image of a node.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sighting {
    /// Node.
    pub node: (i32, i32),
    /// Place.
    pub at: [f64; 2],
    /// Standard deviation per axis.
    pub sd: f64,
}

/// Scale of the map: what sizes its priors.
#[derive(Debug, Clone, Copy)]
pub(super) struct WarpScale {
    /// Place about which the constant term is uncertain.
    pub centre: [f64; 2],
    /// Extent of the picture: prior standard deviation of place and steps.
    pub extent: f64,
    /// Lengths of the two steps.
    pub steps: [f64; 2],
    /// Change of local scale per unit length.
    pub bend: f64,
}

/// The fitted map.
#[derive(Debug, Clone)]
pub(super) struct Warp {
    centre: [f64; 2],
    prior_sd: [f64; TERMS],
    coefficients: [Vector; 2],
    covariance: Matrix,
    line: bool,
}

/// A fit with its marginal likelihood.
#[derive(Debug, Clone)]
pub(super) struct WarpFit {
    /// The map.
    pub warp: Warp,
    /// Log marginal likelihood of all sightings (both axes), natural log of a density per area^n.
    pub log_likelihood: f64,
}

impl Warp {
    /// Fits the map to the sightings. None where the numbers do not allow it.
    pub(super) fn fit(sightings: &[Sighting], scale: &WarpScale, line: bool) -> Option<WarpFit> {
        let prior_sd = prior_sd(scale);
        let mut normal = Matrix::identity();
        let mut right = [Vector::zeros(), Vector::zeros()];
        let (mut log_sd, mut squares) = (0.0, 0.0);
        for s in sightings {
            let row = terms(f64::from(s.node.0), f64::from(s.node.1), &prior_sd);
            let w = 1.0 / (s.sd * s.sd);
            normal.ger(w, &row, &row, 1.0);
            for (axis, r) in right.iter_mut().enumerate() {
                let y = s.at[axis] - scale.centre[axis];
                r.axpy(w * y, &row, 1.0);
                squares += w * y * y;
            }
            log_sd += s.sd.ln();
        }
        let factor = Cholesky::new(normal)?;
        let coefficients = [factor.solve(&right[0]), factor.solve(&right[1])];
        let misfit = (squares - right[0].dot(&coefficients[0]) - right[1].dot(&coefficients[1])).max(0.0);
        let log_det = 2.0 * factor.l_dirty().diagonal().iter().take(TERMS).map(|d| d.ln()).sum::<f64>();
        #[expect(clippy::cast_precision_loss, reason = "counts of points are small")]
        let n = sightings.len() as f64;
        let log_likelihood = -2.0 * log_sd - log_det - 0.5 * misfit - n * std::f64::consts::TAU.ln();
        let warp = Self { centre: scale.centre, prior_sd, coefficients, covariance: factor.inverse(), line };
        log_likelihood.is_finite().then_some(WarpFit { warp, log_likelihood })
    }

    /// Place of a (real-valued) order.
    pub(super) fn place(&self, h: f64, k: f64) -> [f64; 2] {
        let row = terms(h, k, &self.prior_sd);
        [self.centre[0] + row.dot(&self.coefficients[0]), self.centre[1] + row.dot(&self.coefficients[1])]
    }

    /// Variance of [`Self::place`] per axis.
    pub(super) fn variance(&self, h: f64, k: f64) -> f64 {
        let row = terms(h, k, &self.prior_sd);
        row.dot(&(self.covariance * row)).max(0.0)
    }

    /// Local steps per order: change of place per unit of h and of k.
    pub(super) fn steps(&self, h: f64, k: f64) -> [[f64; 2]; 2] {
        let (along_h, along_k) = slopes(h, k, &self.prior_sd);
        let step = |row: &Vector| [row.dot(&self.coefficients[0]), row.dot(&self.coefficients[1])];
        [step(&along_h), step(&along_k)]
    }

    /// Real-valued order whose place is `at`; for a line the order of the nearest place on the row (k = 0).
    /// Newton's method from the affine map; none where it does not settle (folded map far outside).
    pub(super) fn order_at(&self, at: [f64; 2]) -> Option<[f64; 2]> {
        let (mut h, mut k) = (0.0_f64, 0.0_f64);
        for _ in 0..12 {
            let place = self.place(h, k);
            let miss = [at[0] - place[0], at[1] - place[1]];
            let [p, q] = self.steps(h, k);
            let (dh, dk) = if self.line { (along(p, miss)?, 0.0) } else { solve(p, q, miss)? };
            (h, k) = (h + dh, k + dk);
            if !(h.abs() < 1e6 && k.abs() < 1e6) {
                return None;
            }
            if dh.abs() + dk.abs() < 1e-6 {
                return Some([h, k]);
            }
        }
        None
    }
}

fn along(p: [f64; 2], miss: [f64; 2]) -> Option<f64> {
    let pp = p[0] * p[0] + p[1] * p[1];
    (pp > f64::MIN_POSITIVE).then(|| (p[0] * miss[0] + p[1] * miss[1]) / pp)
}

fn solve(p: [f64; 2], q: [f64; 2], miss: [f64; 2]) -> Option<(f64, f64)> {
    let area = p[0] * q[1] - p[1] * q[0];
    (area.abs() > f64::MIN_POSITIVE).then(|| ((miss[0] * q[1] - miss[1] * q[0]) / area, (p[0] * miss[1] - p[1] * miss[0]) / area))
}

/// Prior standard deviation of each term. A bend b changes the local scale by b x over a distance x, so it moves a node at
/// distance x by b x²/2. The cubic terms stand for odd distortions (wrong throw, lens): 5 b² lets b = 0.1 move a node at
/// x = 0.3 by 0.45 % of x (one standard deviation).
fn prior_sd(scale: &WarpScale) -> [f64; TERMS] {
    let [p, q] = scale.steps;
    let quadratic = 0.5 * scale.bend;
    let cubic = 5.0 * scale.bend * scale.bend;
    let e = scale.extent;
    [
        e,
        e,
        e,
        quadratic * p * p,
        quadratic * p * q,
        quadratic * q * q,
        cubic * p * p * p,
        cubic * p * p * q,
        cubic * p * q * q,
        cubic * q * q * q,
    ]
}

fn terms(h: f64, k: f64, sd: &[f64; TERMS]) -> Vector {
    Vector::from([
        sd[0],
        sd[1] * h,
        sd[2] * k,
        sd[3] * h * h,
        sd[4] * h * k,
        sd[5] * k * k,
        sd[6] * h * h * h,
        sd[7] * h * h * k,
        sd[8] * h * k * k,
        sd[9] * k * k * k,
    ])
}

fn slopes(h: f64, k: f64, sd: &[f64; TERMS]) -> (Vector, Vector) {
    let along_h = [0.0, sd[1], 0.0, 2.0 * sd[3] * h, sd[4] * k, 0.0, 3.0 * sd[6] * h * h, 2.0 * sd[7] * h * k, sd[8] * k * k, 0.0];
    let along_k = [0.0, 0.0, sd[2], 0.0, sd[4] * h, 2.0 * sd[5] * k, 0.0, sd[7] * h * h, 2.0 * sd[8] * h * k, 3.0 * sd[9] * k * k];
    (Vector::from(along_h), Vector::from(along_k))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scale() -> WarpScale {
        WarpScale { centre: [0.1, 0.0], extent: 0.5, steps: [0.05, 0.06], bend: 0.1 }
    }

    fn bent(h: i32, k: i32) -> [f64; 2] {
        let (x, y) = (0.05 * f64::from(h) + 0.01 * f64::from(k), 0.06 * f64::from(k));
        let shrink = 1.0 / (1.0 + 0.03 * x - 0.02 * y);
        [0.1 + x * shrink, y * shrink]
    }

    #[test]
    fn order_and_place_are_inverse_and_follow_a_projective_bend() {
        let sightings: Vec<_> = (-5..=5).flat_map(|h| (-5..=5).map(move |k| Sighting { node: (h, k), at: bent(h, k), sd: 1e-4 })).collect();
        let warp = Warp::fit(&sightings, &scale(), false).unwrap().warp;
        for (h, k) in [(0, 0), (5, -5), (-4, 3)] {
            let [x, y] = warp.order_at(bent(h, k)).unwrap();
            assert!((x - f64::from(h)).abs() < 2e-3 && (y - f64::from(k)).abs() < 2e-3, "({h},{k}) read as ({x},{y})");
        }
    }

    #[test]
    fn spread_grows_away_from_three_points() {
        let three = [(0, 0), (1, 0), (0, 1)].map(|node| Sighting { node, at: bent(node.0, node.1), sd: 5e-4 });
        let warp = Warp::fit(&three, &scale(), false).unwrap().warp;
        assert!(warp.variance(0.0, 0.0).sqrt() < 6e-4);
        assert!(warp.variance(8.0, 0.0) > 20.0 * warp.variance(1.0, 0.0));
    }
}
