//! The elliptical Gaussian on a sloping background that every spot is fitted with.

use nalgebra::{SMatrix, SVector};

use super::window::{Cell, Window};

/// Parameters of the fit: height, centre, inverse shape, background and its slope.
const COUNT: usize = 9;
/// Position of the centre among them.
const X: usize = 1;
const Y: usize = 2;
const MAX_STEPS: usize = 16;
/// Residuals beyond so many standard deviations lose weight (Huber): lines, dust and undetected neighbours.
const HUBER: f64 = 4.0;

type Vector = SVector<f64, COUNT>;
type Matrix = SMatrix<f64, COUNT, COUNT>;

/// `height exp(-½ d' P d) + background + slope_x dx + slope_y dy`, d = place - centre, places in px from the window's middle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Profile {
    /// Above background.
    pub(super) height: f64,
    /// Centre, px from the window's middle.
    pub(super) x_px: f64,
    /// Centre, px from the window's middle.
    pub(super) y_px: f64,
    /// P, the inverse of the second moments: xx, xy, yy, per px².
    pub(super) inverse_shape: [f64; 3],
    /// Light below the centre of the window.
    pub(super) background: f64,
    /// Light per px.
    pub(super) slope: [f64; 2],
}

/// What is known of the noise before the fit.
#[derive(Debug, Clone, Copy)]
pub(super) struct PixelNoise {
    /// Variance of a pixel of the background.
    pub(super) background: f64,
    /// Shot noise: variance per unit of light above the background.
    pub(super) per_light: f64,
    /// Speckle: variance relative to the square of the spot's light, times the area (px²) over which it is correlated.
    pub(super) speckle: f64,
}

/// A profile and how well it is known.
#[derive(Debug, Clone, Copy)]
pub(super) struct Fitted {
    pub(super) profile: Profile,
    /// Covariance of the centre (xx, xy, yy), px², before any scaling.
    pub(super) covariance: [f64; 3],
    /// Standard uncertainties of xx - yy and 2 xy of the inverse shape, per px².
    pub(super) u_departure: [f64; 2],
    /// Sum of squared residuals over their variance, per degree of freedom.
    pub(super) chi2: f64,
}

impl Profile {
    /// Round profile.
    pub(super) fn round(height: f64, sigma_px: f64, background: f64) -> Self {
        let p = 1.0 / (sigma_px * sigma_px);
        Self { height, x_px: 0.0, y_px: 0.0, inverse_shape: [p, 0.0, p], background, slope: [0.0; 2] }
    }

    /// Light of the spot alone.
    pub(super) fn spot(&self, x_px: f64, y_px: f64) -> f64 {
        let (dx, dy) = (x_px - self.x_px, y_px - self.y_px);
        let [xx, xy, yy] = self.inverse_shape;
        self.height * (-0.5 * (xx * dx * dx + 2.0 * xy * dx * dy + yy * dy * dy)).exp()
    }

    /// Second moments xx, xy, yy, px².
    pub(super) fn shape(&self) -> [f64; 3] {
        let [xx, xy, yy] = self.inverse_shape;
        let determinant = xx * yy - xy * xy;
        [yy / determinant, -xy / determinant, xx / determinant]
    }

    /// Standard deviations along the long and the short axis, px.
    pub(super) fn axes_px(&self) -> [f64; 2] {
        let [xx, xy, yy] = self.shape();
        let (mean, half) = (0.5 * (xx + yy), (0.25 * (xx - yy).powi(2) + xy * xy).sqrt());
        [(mean + half).max(0.0).sqrt(), (mean - half).max(0.0).sqrt()]
    }

    fn shifted(&self, step: &Vector) -> Option<Self> {
        let [xx, xy, yy] = self.inverse_shape;
        let moved = Self {
            height: self.height + step[0],
            x_px: self.x_px + step[X],
            y_px: self.y_px + step[Y],
            inverse_shape: [xx + step[3], xy + step[4], yy + step[5]],
            background: self.background + step[6],
            slope: [self.slope[0] + step[7], self.slope[1] + step[8]],
        };
        let [xx, xy, yy] = moved.inverse_shape;
        let is_ellipse = xx > 0.0 && yy > 0.0 && xx * yy - xy * xy > 1e-3 * xx * yy;
        (is_ellipse && moved.height > 0.0 && moved.height.is_finite()).then_some(moved)
    }

    fn value_and_gradient(&self, cell: &Cell) -> (f64, f64, [f64; COUNT]) {
        let (dx, dy) = (cell.x_px - self.x_px, cell.y_px - self.y_px);
        let [xx, xy, yy] = self.inverse_shape;
        let (px, py) = (xx * dx + xy * dy, xy * dx + yy * dy);
        let bell = (-0.5 * (px * dx + py * dy)).exp();
        let spot = self.height * bell;
        let value = spot + self.background + self.slope[0] * cell.x_px + self.slope[1] * cell.y_px;
        let gradient =
            [bell, spot * px, spot * py, -0.5 * spot * dx * dx, -spot * dx * dy, -0.5 * spot * dy * dy, 1.0, cell.x_px, cell.y_px];
        (value, spot, gradient)
    }
}

impl PixelNoise {
    fn variance(&self, spot: f64, cell: &Cell, pixels: f64) -> f64 {
        (self.background + self.per_light * (spot + cell.neighbours) + self.speckle * spot * spot) / pixels + cell.neighbours_variance
    }
}

/// Weighted least squares from a start, Levenberg-Marquardt with the weights following the model.
///
/// `None` where fewer cells than parameters are free, the normal matrix is singular, or the profile leaves the window.
///
/// - `tolerance_px`: the centre is settled when a step moves it by less
pub(super) fn fit(window: &Window, start: Profile, noise: &PixelNoise, tolerance_px: f64) -> Option<Fitted> {
    if window.cells.len() <= COUNT + 3 {
        return None;
    }
    let mut profile = start;
    let mut weights = vec![0.0; window.cells.len()];
    let mut state = evaluate(window, &profile, noise, &mut weights);
    let mut next_weights = weights.clone();
    let mut damping = 1e-2;
    for step_number in 0..MAX_STEPS {
        let step = damped_step(&state, damping);
        let tried = step.and_then(|step| profile.shifted(&step)).filter(|tried| tried.x_px.hypot(tried.y_px) < window.reach_px);
        let Some((tried, step)) = tried.zip(step) else {
            damping *= 8.0;
            continue;
        };
        next_weights.copy_from_slice(&weights);
        let next = evaluate(window, &tried, noise, &mut next_weights);
        if next.cost_before <= state.cost {
            let is_settled = step[X].hypot(step[Y]) < tolerance_px && state.cost - next.cost_before < 0.1 * tolerance_px * state.cost;
            (profile, state) = (tried, next);
            std::mem::swap(&mut weights, &mut next_weights);
            damping = (damping * 0.2).max(1e-9);
            if is_settled && step_number > 1 {
                break;
            }
        } else {
            damping *= 8.0;
            if damping > 1e6 {
                break;
            }
        }
    }
    finish(window, profile, &state)
}

struct State {
    normal: Matrix,
    gradient: Vector,
    /// With the weights of this profile.
    cost: f64,
    /// With the weights of the profile before, which alone can be compared with its cost.
    cost_before: f64,
}

/// Cells that are taken together, so that their sums run side by side in the processor.
const LANES: usize = 4;

/// One pass over the cells: the normal equations with the weights that this profile deserves.
///
/// - `weights`: those of the profile before; replaced by the new ones
fn evaluate(window: &Window, profile: &Profile, noise: &PixelNoise, weights: &mut [f64]) -> State {
    let mut normal = [[[0.0; LANES]; COUNT]; COUNT];
    let mut gradient = [[0.0; LANES]; COUNT];
    let (mut cost, mut cost_before) = (0.0, 0.0);
    for (cells, weights) in window.cells.chunks(LANES).zip(weights.chunks_mut(LANES)) {
        // Lanes beyond the last cell stay zero and add nothing.
        let mut slopes = [[0.0; LANES]; COUNT];
        let mut residuals = [0.0; LANES];
        let mut lane_weights = [0.0; LANES];
        for (lane, (cell, weight)) in cells.iter().zip(weights).enumerate() {
            let (value, spot, slope) = profile.value_and_gradient(cell);
            let residual = cell.value - value;
            cost_before += *weight * residual * residual;
            *weight = cell_weight(residual, noise.variance(spot, cell, window.pixels_per_cell));
            cost += *weight * residual * residual;
            residuals[lane] = residual;
            lane_weights[lane] = *weight;
            (0..COUNT).for_each(|i| slopes[i][lane] = slope[i]);
        }
        for i in 0..COUNT {
            let weighted: [f64; LANES] = std::array::from_fn(|lane| lane_weights[lane] * slopes[i][lane]);
            for lane in 0..LANES {
                gradient[i][lane] += weighted[lane] * residuals[lane];
            }
            for j in 0..=i {
                for lane in 0..LANES {
                    normal[i][j][lane] += weighted[lane] * slopes[j][lane];
                }
            }
        }
    }
    let sum = |lanes: &[f64; LANES]| lanes.iter().sum::<f64>();
    let normal = Matrix::from_fn(|i, j| if j <= i { sum(&normal[i][j]) } else { sum(&normal[j][i]) });
    State { normal, gradient: Vector::from_fn(|i, _| sum(&gradient[i])), cost, cost_before }
}

/// Inverse variance, less for outliers.
fn cell_weight(residual: f64, variance: f64) -> f64 {
    let variance = variance.max(1e-14);
    let limit2 = HUBER * HUBER * variance;
    let residual2 = residual * residual;
    if residual2 > limit2 { (limit2 / residual2).sqrt() / variance } else { 1.0 / variance }
}

fn damped_step(state: &State, damping: f64) -> Option<Vector> {
    let mut normal = state.normal;
    for i in 0..COUNT {
        normal[(i, i)] *= 1.0 + damping;
    }
    normal.cholesky().map(|factor| factor.solve(&state.gradient))
}

fn finish(window: &Window, profile: Profile, state: &State) -> Option<Fitted> {
    // Scaling to a unit diagonal first: the parameters differ by many powers of ten.
    let scale = state.normal.diagonal().map(|d| if d > 0.0 { 1.0 / d.sqrt() } else { 0.0 });
    let scaled = Matrix::from_fn(|i, j| state.normal[(i, j)] * scale[i] * scale[j]);
    let inverse = scaled.cholesky()?.inverse();
    let covariance = |i: usize, j: usize| inverse[(i, j)] * scale[i] * scale[j];
    let fitted = Fitted {
        profile,
        covariance: [covariance(X, X), covariance(X, Y), covariance(Y, Y)],
        u_departure: [(covariance(3, 3) + covariance(5, 5) - 2.0 * covariance(3, 5)).sqrt(), 2.0 * covariance(4, 4).sqrt()],
        chi2: state.cost / (window.cells.len() - COUNT) as f64,
    };
    (fitted.covariance.iter().all(|c| c.is_finite()) && fitted.u_departure.iter().all(|u| u.is_finite() && *u > 0.0)).then_some(fitted)
}
