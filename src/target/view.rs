//! A smooth view of the flat target: homography, lens distortion, and where the centroid of a disc falls.
//!
//! This is no camera model (pose and focal length are not told apart); it predicts places well enough to
//! weed out wrong dots and to judge the scatter of the rest.

use nalgebra::{SMatrix, SVector};

use super::homography::homography;
use crate::frames::PixelPoint;

/// Grid coordinates to pixels: a homography, then radial and tangential distortion about the middle of the photo.
#[derive(Debug, Clone)]
pub(super) struct View {
    centre_px: [f64; 2],
    scale_px: f64,
    /// Homography h11 .. h32 (h33 = 1) to coordinates u = (pixel - centre) / scale.
    h: [f64; 8],
    /// k1, k2, p1, p2 on u.
    distortion: [f64; 4],
}

/// One dot for the fit of a [`View`].
#[derive(Debug, Clone, Copy)]
pub(super) struct Seen {
    /// Grid coordinates, pitches.
    pub(super) index: [f64; 2],
    /// Radius of the printed disc, pitches.
    pub(super) radius_pitches: f64,
    /// Where its centroid was found.
    pub(super) at: PixelPoint,
    /// Standard uncertainty of either coordinate, px.
    pub(super) u_px: f64,
}

/// Most parameters: eight of the homography, four of distortion.
const MOST_PARAMETERS: usize = 12;

/// Tukey's biweight constant, 95 % efficient for normal residuals (Beaton & Tukey 1974, common practice).
const TUKEY: f64 = 4.685;

/// Steps after which the fit is taken as it is.
const MOST_ROUNDS: usize = 15;

/// The fit has settled when no dot moves by more than this share of its uncertainty.
const SETTLED: f64 = 0.02;

impl View {
    /// Robust fit to the dots (iteratively reweighted least squares with Tukey's biweight).
    ///
    /// The lens terms are fitted only where the dots can carry them: k1 from 14 dots, k2, p1, p2 from 24.
    /// `None` when the dots do not fix a homography.
    pub(super) fn fit(seen: &[Seen], width_px: f64, height_px: f64) -> Option<Self> {
        let centre_px = [(width_px - 1.0) / 2.0, (height_px - 1.0) / 2.0];
        let scale_px = width_px.hypot(height_px) / 2.0;
        let normal = |p: PixelPoint| [(p.x_px - centre_px[0]) / scale_px, (p.y_px - centre_px[1]) / scale_px];
        let pairs: Vec<_> = seen.iter().map(|dot| (dot.index, normal(dot.at))).collect();
        let [[a, b, c], [d, e, f], [g, h, _]] = homography(&pairs)?;
        let mut view = Self { centre_px, scale_px, h: [a, b, c, d, e, f, g, h], distortion: [0.0; 4] };
        let parameters = match seen.len() {
            0..14 => 8,
            14..24 => 9,
            _ => MOST_PARAMETERS,
        };
        let mut weights = vec![1.0; seen.len()];
        for round in 0..MOST_ROUNDS {
            let next = view.step(seen, &weights, parameters)?;
            let moved = seen.iter().map(|dot| next.moved_px(&view, dot) / dot.u_px).fold(0.0, f64::max);
            view = next;
            if round > 1 {
                weights = view.tukey_weights(seen);
            }
            if round > 3 && moved < SETTLED {
                break;
            }
        }
        Some(view)
    }

    /// Where the centroid of the darkness of a disc with this radius falls.
    ///
    /// The image of a circle under a homography is an ellipse, and a uniform ellipse has its centroid in
    /// its centre, which is not the image of the circle's centre: with the dual conic of the circle
    /// C* = c cᵀ - r² diag(1, 1, 0), its image D = H C* Hᵀ has the centre (D13, D23) / D33
    /// (Hartley & Zisserman, 2nd ed., result 2.14). Distortion within the dot is left out (below 0.002 px
    /// for |k1| = 0.3 and dots up to 2 % of the photo).
    pub(super) fn disc_centroid(&self, index: [f64; 2], radius_pitches: f64) -> PixelPoint {
        let [a, b, c, d, e, f, g, h] = self.h;
        let [i, j] = index;
        let r2 = radius_pitches * radius_pitches;
        let (x, y, w) = (a * i + b * j + c, d * i + e * j + f, g * i + h * j + 1.0);
        let depth = w * w - r2 * (g * g + h * h);
        let u = [(x * w - r2 * (a * g + b * h)) / depth, (y * w - r2 * (d * g + e * h)) / depth];
        self.pixel(u)
    }

    /// Displacements in the photo of one pitch along X and along Y, px.
    pub(super) fn steps(&self, index: [f64; 2]) -> [[f64; 2]; 2] {
        let half = 1e-3;
        [[half, 0.0], [0.0, half]].map(|d| {
            let ahead = self.disc_centroid([index[0] + d[0], index[1] + d[1]], 0.0);
            let behind = self.disc_centroid([index[0] - d[0], index[1] - d[1]], 0.0);
            [(ahead.x_px - behind.x_px) / (2.0 * half), (ahead.y_px - behind.y_px) / (2.0 * half)]
        })
    }

    /// Grid coordinates of a pixel, by Newton steps from the undistorted start. `None` when they do not settle.
    pub(super) fn index_of(&self, at: PixelPoint) -> Option<[f64; 2]> {
        let [a, b, c, d, e, f, g, h] = self.h;
        let u = [(at.x_px - self.centre_px[0]) / self.scale_px, (at.y_px - self.centre_px[1]) / self.scale_px];
        // (a - u g) i + (b - u h) j = u - c, and the same along y.
        let mut index = solve_2x2([a - u[0] * g, b - u[0] * h, d - u[1] * g, e - u[1] * h], [u[0] - c, u[1] - f])?;
        for _ in 0..20 {
            let here = self.disc_centroid(index, 0.0);
            let [sx, sy] = self.steps(index);
            let step = solve_2x2([sx[0], sy[0], sx[1], sy[1]], [at.x_px - here.x_px, at.y_px - here.y_px])?;
            index = [index[0] + step[0], index[1] + step[1]];
            if step[0].hypot(step[1]) < 1e-6 {
                return Some(index);
            }
        }
        None
    }

    /// Found minus predicted place, px.
    pub(super) fn residual_px(&self, dot: &Seen) -> [f64; 2] {
        let predicted = self.disc_centroid(dot.index, dot.radius_pitches);
        [dot.at.x_px - predicted.x_px, dot.at.y_px - predicted.y_px]
    }

    /// Robust standard deviation of the residuals in units of their stated uncertainty (1.4826 × median
    /// absolute value; the fitted parameters are allowed for).
    pub(super) fn scatter(&self, seen: &[Seen]) -> f64 {
        let mut sizes: Vec<f64> =
            seen.iter().flat_map(|dot| self.residual_px(dot).map(|r| (r / dot.u_px).abs())).filter(|v| v.is_finite()).collect();
        let spare = (2.0 * super::paper::small_f64(seen.len()) - 12.0).max(2.0);
        1.4826 * super::median(&mut sizes).unwrap_or(0.0) * (2.0 * super::paper::small_f64(seen.len()) / spare).sqrt()
    }

    fn moved_px(&self, before: &Self, dot: &Seen) -> f64 {
        self.disc_centroid(dot.index, 0.0).distance_px(before.disc_centroid(dot.index, 0.0))
    }

    fn pixel(&self, u: [f64; 2]) -> PixelPoint {
        let [k1, k2, p1, p2] = self.distortion;
        let [x, y] = u;
        let r2 = x * x + y * y;
        let radial = 1.0 + r2 * (k1 + r2 * k2);
        let x_d = x * radial + 2.0 * p1 * x * y + p2 * (r2 + 2.0 * x * x);
        let y_d = y * radial + p1 * (r2 + 2.0 * y * y) + 2.0 * p2 * x * y;
        PixelPoint { x_px: self.centre_px[0] + self.scale_px * x_d, y_px: self.centre_px[1] + self.scale_px * y_d }
    }

    fn tukey_weights(&self, seen: &[Seen]) -> Vec<f64> {
        // A floor keeps perfect data from making every rounding error an outlier.
        let scale = self.scatter(seen).max(1e-6);
        let weight = |dot: &Seen| {
            let [x, y] = self.residual_px(dot);
            let t = x.hypot(y) / (dot.u_px * scale * TUKEY);
            if t < 1.0 { (1.0 - t * t).powi(2) } else { 0.0 }
        };
        seen.iter().map(weight).collect()
    }

    /// One Gauss-Newton step with a trace of damping; parameters from `parameters` on stay as they are.
    fn step(&self, seen: &[Seen], weights: &[f64], parameters: usize) -> Option<Self> {
        let mut normal = SMatrix::<f64, MOST_PARAMETERS, MOST_PARAMETERS>::zeros();
        let mut right = SVector::<f64, MOST_PARAMETERS>::zeros();
        for (dot, weight) in seen.iter().zip(weights).filter(|(_, weight)| **weight > 0.0) {
            let residual = self.residual_px(dot);
            let weight = weight / (dot.u_px * dot.u_px);
            for (row, residual) in self.derivatives(dot.index).into_iter().zip(residual) {
                let row = SVector::<f64, MOST_PARAMETERS>::from(row);
                right.axpy(weight * residual, &row, 1.0);
                normal.ger(weight, &row, &row, 1.0);
            }
        }
        for a in parameters..MOST_PARAMETERS {
            normal.row_mut(a).fill(0.0);
            normal.column_mut(a).fill(0.0);
            normal[(a, a)] = 1.0;
            right[a] = 0.0;
        }
        let change = scaled_solve(normal, right)?;
        let mut next = self.clone();
        for (value, change) in next.h.iter_mut().chain(next.distortion.iter_mut()).zip(change.iter()) {
            *value += change;
        }
        next.h.iter().chain(&next.distortion).all(|v| v.is_finite()).then_some(next)
    }

    /// Derivatives of the two pixel coordinates of a place by all parameters (the tiny effect of the disc's size left out).
    fn derivatives(&self, index: [f64; 2]) -> [[f64; MOST_PARAMETERS]; 2] {
        let [a, b, c, d, e, f, g, h] = self.h;
        let [k1, k2, p1, p2] = self.distortion;
        let [i, j] = index;
        let w = 1.0 / (g * i + h * j + 1.0);
        let (x, y) = ((a * i + b * j + c) * w, (d * i + e * j + f) * w);
        let r2 = x * x + y * y;
        let radial = 1.0 + r2 * (k1 + r2 * k2);
        let slope = 2.0 * (k1 + 2.0 * k2 * r2);
        let mixed = slope * x * y + 2.0 * p1 * x + 2.0 * p2 * y;
        let xx = radial + slope * x * x + 2.0 * p1 * y + 6.0 * p2 * x;
        let yy = radial + slope * y * y + 6.0 * p1 * y + 2.0 * p2 * x;
        let chain = |dx: f64, dy: f64| {
            let (ix, jx, wx) = (dx * i * w, dx * j * w, dx * w);
            let (iy, jy, wy) = (dy * i * w, dy * j * w, dy * w);
            let along = -(dx * x + dy * y) * w;
            [ix, jx, wx, iy, jy, wy, along * i, along * j]
        };
        let (for_x, for_y) = (chain(xx, mixed), chain(mixed, yy));
        let s = self.scale_px;
        let lens_x = [x * r2, x * r2 * r2, 2.0 * x * y, r2 + 2.0 * x * x];
        let lens_y = [y * r2, y * r2 * r2, r2 + 2.0 * y * y, 2.0 * x * y];
        let join = |h: [f64; 8], lens: [f64; 4]| std::array::from_fn(|n| s * if n < 8 { h[n] } else { lens[n - 8] });
        [join(for_x, lens_x), join(for_y, lens_y)]
    }
}

/// Solves a symmetric positive system after scaling its diagonal to 1 (and a trace more, against rounding).
fn scaled_solve(
    normal: SMatrix<f64, MOST_PARAMETERS, MOST_PARAMETERS>,
    right: SVector<f64, MOST_PARAMETERS>,
) -> Option<SVector<f64, MOST_PARAMETERS>> {
    let scale = normal.diagonal().map(|d| 1.0 / d.max(f64::MIN_POSITIVE).sqrt());
    let mut scaled = SMatrix::from_diagonal(&scale) * normal * SMatrix::from_diagonal(&scale);
    for a in 0..MOST_PARAMETERS {
        scaled[(a, a)] *= 1.0 + 1e-9;
    }
    Some(scaled.cholesky()?.solve(&right.component_mul(&scale)).component_mul(&scale))
}

/// Solves [m0 m1; m2 m3] v = r.
fn solve_2x2(m: [f64; 4], r: [f64; 2]) -> Option<[f64; 2]> {
    let det = m[0] * m[3] - m[1] * m[2];
    let v = [(r[0] * m[3] - m[1] * r[1]) / det, (m[0] * r[1] - m[2] * r[0]) / det];
    v.iter().all(|v| v.is_finite()).then_some(v)
}
