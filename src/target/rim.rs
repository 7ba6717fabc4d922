//! The place of a dot from its rim alone.

use super::{
    centroid::{Ground, PixelNoise, Window, dark_share, pixels},
    paper::small_f64,
};
use crate::{
    frames::{PixelCovariance, PixelPoint},
    photo::Light,
};

/// A step this small is the last: the template is even, so the error that is left is of third order in the step
/// (step³ / blur², below 3e-4 px).
const LAST_STEP_PX: f64 = 0.05;

/// What is known of the dot whose rim is looked at.
pub(super) struct Disc<'a> {
    pub(super) start: PixelPoint,
    pub(super) radius_pitches: f64,
    pub(super) contrast: f64,
    pub(super) blur_px: f64,
    pub(super) noise: &'a PixelNoise,
}

/// Narrowest rim that is sampled well enough by whole pixels, px (standard deviation).
const LEAST_BLUR_PX: f64 = 0.7;

/// The rim is looked at out to this many standard deviations of the blur.
const REACH: f64 = 3.5;

/// Place of a dot from its rim, by least squares of a blurred ellipse with the centre free.
///
/// With the template T = Φ(distance inside the rim / blur) and its slope g = ∂T/∂(centre), the Gauss-Newton step is
/// δ = (Σ g gᵀ)⁻¹ Σ g (d / contrast - T). g is odd and T even about the centre, so neither a wrong radius nor a wrong
/// contrast, blur or paper level moves the result: it is the centre of symmetry of the rim, which for the image of a disc
/// (an ellipse) is also the centroid of its darkness. Only pixels near the rim count; structure of paper and ink elsewhere,
/// which pulls a plain centroid with its whole lever, does not.
///
/// `None` when the steps do not settle within a pixel of `start`.
pub(super) fn rim_place(light: &Light, window: &Window, ground: &Ground, disc: &Disc) -> Option<(PixelPoint, PixelCovariance)> {
    let mut at = disc.start;
    for _ in 0..4 {
        let sums = Sums::over(light, window, ground, disc, at);
        let inverse = inverse(sums.normal)?;
        let [dx, dy] = times(inverse, sums.right);
        at = PixelPoint { x_px: at.x_px + dx, y_px: at.y_px + dy };
        let off_px = at.distance_px(disc.start);
        if off_px.is_nan() || off_px > 1.0 {
            return None;
        }
        if dx.hypot(dy) < LAST_STEP_PX {
            return Some((at, sums.covariance(inverse, ground, disc.contrast)));
        }
    }
    None
}

/// Sums over the rim; g = slope of the template, d = darkness.
#[derive(Default)]
struct Sums {
    /// Σ g gᵀ: xx, xy, yy.
    normal: [f64; 3],
    /// Σ var(d) g gᵀ.
    noise: [f64; 3],
    /// Σ g (d / contrast - T).
    right: [f64; 2],
    /// Σ x g (1 - d) along x, Σ y g (1 - d) along y: what a slope of the paper level does.
    lever: [f64; 2],
}

impl Sums {
    fn over(light: &Light, window: &Window, ground: &Ground, disc: &Disc, at: PixelPoint) -> Self {
        let blur = disc.blur_px.max(LEAST_BLUR_PX);
        // No rim beyond these, whatever the direction.
        let reach = REACH * blur / window.px_per_pitch;
        let nearest2 = (disc.radius_pitches - reach).max(0.0).powi(2);
        let farthest2 = (disc.radius_pitches + reach).min(window.rim_pitches).powi(2);
        let mut sums = Self::default();
        for y in pixels(window.at.y_px, window.half_px[1], light.height) {
            for x in pixels(window.at.x_px, window.half_px[0], light.width) {
                let (dx, dy) = (small_f64(x) - at.x_px, small_f64(y) - at.y_px);
                let v = window.map.apply(dx, dy);
                let rho2 = v[0] * v[0] + v[1] * v[1];
                if rho2 >= farthest2 || rho2 <= nearest2 {
                    continue;
                }
                let rho = rho2.sqrt();
                let slope = window.map.transposed(v).map(|s| s / rho);
                let steep = slope[0].hypot(slope[1]);
                let z = (disc.radius_pitches - rho) / (steep * blur);
                if z.abs() > REACH {
                    continue;
                }
                let (inside, density) = normal(z);
                let g = slope.map(|s| s / steep * density / blur);
                let dark = dark_share(light, ground, window, x, y);
                let share = dark / disc.contrast;
                let variance = disc.noise.at(share.clamp(0.0, 1.0));
                let misfit = share - inside;
                for (n, gg) in [g[0] * g[0], g[0] * g[1], g[1] * g[1]].into_iter().enumerate() {
                    sums.normal[n] += gg;
                    sums.noise[n] += gg * variance;
                }
                for (axis, d) in [dx, dy].into_iter().enumerate() {
                    sums.right[axis] += g[axis] * misfit;
                    sums.lever[axis] += g[axis] * d * (1.0 - dark);
                }
            }
        }
        sums
    }

    /// N⁻¹ (Σ var g gᵀ + paper slope) N⁻¹ / contrast².
    fn covariance(&self, inverse: [f64; 3], ground: &Ground, contrast: f64) -> PixelCovariance {
        let c2 = contrast * contrast;
        let [xx, xy, yy] = self.noise;
        let middle = [xx + (self.lever[0] * ground.u_slope[0]).powi(2), xy, yy + (self.lever[1] * ground.u_slope[1]).powi(2)];
        let [a, b, d] = inverse;
        let left = [
            [a * middle[0] + b * middle[1], a * middle[1] + b * middle[2]],
            [b * middle[0] + d * middle[1], b * middle[1] + d * middle[2]],
        ];
        PixelCovariance {
            xx: (left[0][0] * a + left[0][1] * b) / c2,
            xy: (left[0][0] * b + left[0][1] * d) / c2,
            yy: (left[1][0] * b + left[1][1] * d) / c2,
        }
    }
}

fn inverse([xx, xy, yy]: [f64; 3]) -> Option<[f64; 3]> {
    let det = xx * yy - xy * xy;
    (det > 1e-9 * xx * yy).then(|| [yy / det, -xy / det, xx / det])
}

fn times([xx, xy, yy]: [f64; 3], v: [f64; 2]) -> [f64; 2] {
    [xx * v[0] + xy * v[1], xy * v[0] + yy * v[1]]
}

/// Normal distribution and density. The distribution by Abramowitz & Stegun 26.2.16 (error below 1e-5, without effect here:
/// the template only has to be even about the centre).
fn normal(z: f64) -> (f64, f64) {
    let density = (-0.5 * z * z).exp() * 0.398_942_280_401;
    let t = 1.0 / (1.0 + 0.332_67 * z.abs());
    let tail = density * t * (0.436_183_6 + t * (-0.120_167_6 + t * 0.937_298_0));
    (if z > 0.0 { 1.0 - tail } else { tail }, density)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn normal_distribution_against_the_table() {
        // Abramowitz & Stegun table 26.1.
        for (z, p) in [(0.0, 0.5), (1.0, 0.841_344_7), (-1.0, 0.158_655_3), (2.0, 0.977_249_9), (3.0, 0.998_650_1)] {
            assert!((normal(z).0 - p).abs() < 2e-5, "{z}: {} {p}", normal(z).0);
        }
    }
}
