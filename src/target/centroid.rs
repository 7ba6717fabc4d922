//! Centroid of a dot's darkness at full resolution, with its covariance.

use super::{
    paper::small_f64,
    rim::{Disc, rim_place},
};
use crate::{
    frames::{PixelCovariance, PixelPoint},
    photo::Light,
};

/// Where a dot is expected, and how the grid lies around it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Expected {
    /// Predicted centroid.
    pub(super) at: PixelPoint,
    /// Displacements of one pitch along X and Y, px.
    pub(super) steps_px: [[f64; 2]; 2],
    /// Radius of the dot, pitches.
    pub(super) radius_pitches: f64,
    /// Radii of the eight neighbours at (-1..=1, -1..=1), row by row; the middle one is not used.
    pub(super) neighbours_pitches: [f64; 9],
    /// Width of the blur (standard deviation), px.
    pub(super) blur_px: f64,
}

/// What the darkness of one dot says.
#[derive(Debug, Clone, Copy)]
pub(super) struct Darkness {
    pub(super) at: PixelPoint,
    pub(super) covariance: PixelCovariance,
    /// Sum of darkness, px² of complete black.
    pub(super) sum_px2: f64,
    /// Mean darkness of the dot's core: 1 - ink / paper.
    pub(super) contrast: f64,
    /// Width of its edge (standard deviation of the blur), px.
    pub(super) blur_px: f64,
    /// Area of one pitch square here, px².
    pub(super) cell_px2: f64,
    noise: PixelNoise,
}

/// Paper around the dot as a plane, and its scatter.
pub(super) struct Ground {
    /// Level at the expected place and slopes per px.
    plane: [f64; 3],
    /// Relative variance of one pixel of paper.
    variance: f64,
    /// Standard uncertainty of the relative slopes, per px.
    pub(super) u_slope: [f64; 2],
}

/// Map from displacement in px to displacement in pitches.
#[derive(Debug, Clone, Copy)]
pub(super) struct ToPitches([f64; 4]);

/// The neighbours in the order of [`Expected::neighbours_pitches`]; the middle one is put out of the way.
const AROUND: [[f64; 2]; 9] =
    [[-1.0, -1.0], [0.0, -1.0], [1.0, -1.0], [-1.0, 0.0], [f64::MAX, 0.0], [1.0, 0.0], [-1.0, 1.0], [0.0, 1.0], [1.0, 1.0]];

/// Most pixels of paper that are looked at for one dot; more are thinned out.
const ENOUGH_PAPER_PX: f64 = 600.0;

/// Paler spots than this (1 - ink / paper) are no printed dots.
const LEAST_CONTRAST: f64 = 0.05;

/// Least number of paper pixels that carry a plane.
const LEAST_PAPER_PX: f64 = 12.0;

/// Centroid of the darkness 1 - I / paper inside a round window that follows the obliquity of the view.
///
/// Darkness relative to a *plane* of paper is not pulled by a gradient of the light; the window is
/// centred on the result, so noise and a constant error of the paper level do not pull it either. Blur
/// that is symmetric leaves a centroid where it is. The covariance holds the scatter of paper and ink as
/// seen in this photo (or the noise model of the plane if that is larger) and the slope of the paper level.
///
/// `None` when the window leaves the photo, the paper around is hidden, or there is no darkness.
pub(super) fn darkness(light: &Light, expected: &Expected) -> Option<Darkness> {
    let map = ToPitches::of(expected.steps_px)?;
    let mut window = Window::of(expected, expected.at, &map);
    for _ in 0..3 {
        if !window.inside(light) {
            return None;
        }
        let ground = paper_plane(light, &window, expected)?;
        let found = window_sums(light, &window, &ground, expected)?;
        if found.at.distance_px(expected.at) > window.radius_px {
            return None;
        }
        // The window ends where the darkness has ended: a small offset of its centre changes nothing.
        if found.at.distance_px(window.at) < 0.25 {
            return Some(found.at_its_rim(light, &window, &ground, expected));
        }
        window.at = found.at;
    }
    None
}

impl Darkness {
    /// The same with the place from the rim, where the rim gives one.
    fn at_its_rim(self, light: &Light, window: &Window, ground: &Ground, expected: &Expected) -> Self {
        let disc = Disc {
            start: self.at,
            radius_pitches: (self.sum_px2 / (self.contrast * std::f64::consts::PI * self.cell_px2)).sqrt(),
            contrast: self.contrast,
            blur_px: expected.blur_px,
            noise: &self.noise,
        };
        match rim_place(light, window, ground, &disc) {
            Some((at, covariance)) => Self { at, covariance, ..self },
            None => self,
        }
    }
}

impl ToPitches {
    fn of([x, y]: [[f64; 2]; 2]) -> Option<Self> {
        let det = x[0] * y[1] - y[0] * x[1];
        let map = [y[1] / det, -y[0] / det, -x[1] / det, x[0] / det];
        map.iter().all(|v| v.is_finite()).then_some(Self(map))
    }

    pub(super) fn transposed(&self, v: [f64; 2]) -> [f64; 2] {
        [self.0[0] * v[0] + self.0[2] * v[1], self.0[1] * v[0] + self.0[3] * v[1]]
    }

    pub(super) fn apply(&self, dx: f64, dy: f64) -> [f64; 2] {
        [self.0[0] * dx + self.0[1] * dy, self.0[2] * dx + self.0[3] * dy]
    }
}

/// The places that are summed, as ellipses around `at`.
pub(super) struct Window {
    pub(super) at: PixelPoint,
    pub(super) map: ToPitches,
    /// Rim of the darkness window and of the paper around it, pitches.
    pub(super) rim_pitches: f64,
    outer_pitches: f64,
    /// Short side of the cell as px per pitch, for margins.
    pub(super) px_per_pitch: f64,
    radius_px: f64,
    /// Half width and height of the darkness window and of the outer ellipse, px.
    pub(super) half_px: [f64; 2],
    /// Of a large dot only every so many-th pixel and row is summed: the rim gives its place.
    stride: usize,
    outer_half_px: [f64; 2],
}

impl Window {
    fn of(expected: &Expected, at: PixelPoint, map: &ToPitches) -> Self {
        let [x, y] = expected.steps_px;
        let px_per_pitch = least_stretch(x, y);
        let r = expected.radius_pitches;
        let margin = (3.2 * expected.blur_px + 1.0) / px_per_pitch;
        // Half way into the gap to the nearest neighbour.
        let widest = [1, 3, 5, 7].iter().map(|n| expected.neighbours_pitches[*n]).fold(0.0, f64::max);
        let gap = ((1.0 + r - widest) / 2.0).max(r);
        let rim_pitches = (r + margin).min(gap);
        let outer_pitches = (rim_pitches + (4.0 / px_per_pitch).max(0.12)).clamp(0.62, 0.75);
        let extent = |c: usize| x[c].hypot(y[c]);
        let (ex, ey) = (extent(0), extent(1));
        Self {
            at,
            map: *map,
            rim_pitches,
            outer_pitches,
            px_per_pitch,
            radius_px: r * px_per_pitch,
            stride: stride_for((r * px_per_pitch / 12.0).powi(2)).min(4),
            half_px: [rim_pitches * ex + 1.0, rim_pitches * ey + 1.0],
            outer_half_px: [outer_pitches * ex, outer_pitches * ey],
        }
    }

    fn inside(&self, light: &Light) -> bool {
        let fits = |centre: f64, half: f64, size: usize| centre - half >= 0.0 && centre + half <= small_f64(size) - 1.0;
        fits(self.at.x_px, self.half_px[0], light.width) && fits(self.at.y_px, self.half_px[1], light.height)
    }
}

/// Smallest singular value of the matrix with these two columns.
fn least_stretch(x: [f64; 2], y: [f64; 2]) -> f64 {
    let det = (x[0] * y[1] - x[1] * y[0]).abs();
    let sum = x[0] * x[0] + x[1] * x[1] + y[0] * y[0] + y[1] * y[1];
    let largest = ((sum + (sum * sum - 4.0 * det * det).max(0.0).sqrt()) / 2.0).sqrt();
    (det / largest).max(1e-6)
}

/// Whole pixels from `centre - half` to `centre + half`, inside the photo.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to 0..=size, NaN gives 0")]
pub(super) fn pixels(centre: f64, half: f64, size: usize) -> std::ops::Range<usize> {
    let end = small_f64(size);
    let start = (centre - half).ceil().clamp(0.0, end) as usize;
    start..((centre + half).floor() + 1.0).clamp(0.0, end) as usize
}

/// Fits a plane to the paper around the dot, pixels far off the plane left out.
fn paper_plane(light: &Light, window: &Window, expected: &Expected) -> Option<Ground> {
    let area = 4.0 * window.outer_half_px[0] * window.outer_half_px[1];
    let stride = stride_for(area / 2.0 / ENOUGH_PAPER_PX);
    let margin = (2.0 * expected.blur_px + 0.5) / window.px_per_pitch;
    let reach2 = expected.neighbours_pitches.map(|radius| (radius + margin).powi(2));
    // Nearer to the middle than this no neighbour reaches.
    let farthest = expected.neighbours_pitches.iter().copied().fold(0.0, f64::max) + margin;
    let free2 = (1.0 - farthest).max(0.0).powi(2);
    let clear = |v: [f64; 2]| reach2.iter().zip(AROUND).all(|(reach2, [i, j])| (v[0] - i).powi(2) + (v[1] - j).powi(2) > *reach2);
    let inner = window.rim_pitches.min(expected.radius_pitches + margin.max(0.0));
    let mut samples: Vec<[f64; 3]> = Vec::new();
    for y in pixels(window.at.y_px, window.outer_half_px[1], light.height).step_by(stride) {
        for x in pixels(window.at.x_px, window.outer_half_px[0], light.width).step_by(stride) {
            let (dx, dy) = (small_f64(x) - window.at.x_px, small_f64(y) - window.at.y_px);
            let v = window.map.apply(dx, dy);
            let rho2 = v[0] * v[0] + v[1] * v[1];
            if rho2 > inner * inner && rho2 < window.outer_pitches * window.outer_pitches && (rho2 < free2 || clear(v)) {
                samples.push([dx, dy, sample(light, x, y)]);
            }
        }
    }
    robust_plane(&samples)
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to 1..=64")]
fn stride_for(excess: f64) -> usize {
    excess.max(1.0).sqrt().round().min(64.0) as usize
}

fn sample(light: &Light, x: usize, y: usize) -> f64 {
    let v = f64::from(light.value[y * light.width + x]);
    if v.is_finite() { v.max(0.0) } else { 0.0 }
}

/// Plane by least squares, twice with samples beyond three standard deviations left out.
fn robust_plane(samples: &[[f64; 3]]) -> Option<Ground> {
    let mut limit = f64::INFINITY;
    let mut plane = [0.0; 3];
    // Start from the median: neighbouring ink or a laser spot must not tilt the first plane.
    let mut levels: Vec<f64> = samples.iter().map(|s| s[2]).collect();
    plane[0] = super::median(&mut levels)?;
    let mut spreads: Vec<f64> = samples.iter().map(|s| (s[2] - plane[0]).abs()).collect();
    let spread = 1.4826 * super::median(&mut spreads)?;
    if spread > 0.0 {
        limit = 5.0 * spread + 0.05 * plane[0];
    }
    let mut ground = None;
    for _ in 0..3 {
        let kept = samples.iter().filter(|s| (s[2] - plane[0] - plane[1] * s[0] - plane[2] * s[1]).abs() <= limit);
        let fit = PlaneFit::of(kept)?;
        if fit.n < LEAST_PAPER_PX || fit.plane[0] <= 0.0 {
            return None;
        }
        plane = fit.plane;
        limit = 3.5 * fit.variance.sqrt() + 1e-9;
        let level = plane[0];
        ground = Some(Ground { plane, variance: fit.variance / (level * level), u_slope: fit.u_slope.map(|u| u / level) });
    }
    ground
}

struct PlaneFit {
    n: f64,
    plane: [f64; 3],
    variance: f64,
    u_slope: [f64; 2],
}

impl PlaneFit {
    fn of<'a>(samples: impl Iterator<Item = &'a [f64; 3]> + Clone) -> Option<Self> {
        let (mut n, mut x, mut y, mut z) = (0.0, 0.0, 0.0, 0.0);
        for s in samples.clone() {
            n += 1.0;
            x += s[0];
            y += s[1];
            z += s[2];
        }
        if n < LEAST_PAPER_PX {
            return None;
        }
        let (x, y, z) = (x / n, y / n, z / n);
        let (mut xx, mut xy, mut yy, mut xz, mut yz) = (0.0, 0.0, 0.0, 0.0, 0.0);
        for s in samples.clone() {
            let (dx, dy, dz) = (s[0] - x, s[1] - y, s[2] - z);
            xx += dx * dx;
            xy += dx * dy;
            yy += dy * dy;
            xz += dx * dz;
            yz += dy * dz;
        }
        let det = xx * yy - xy * xy;
        let (gx, gy) = ((xz * yy - yz * xy) / det, (yz * xx - xz * xy) / det);
        let plane = [z - gx * x - gy * y, gx, gy];
        let rest: f64 = samples.map(|s| (s[2] - plane[0] - gx * s[0] - gy * s[1]).powi(2)).sum();
        let variance = rest / (n - 3.0);
        let u_slope = [(variance * yy / det).sqrt(), (variance * xx / det).sqrt()];
        plane.iter().chain(&u_slope).all(|v| v.is_finite()).then_some(Self { n, plane, variance, u_slope })
    }
}

/// Sums over the window, d = darkness, w = weight of the pixel, x, y = place against the window's centre.
#[derive(Debug, Default)]
struct Sums {
    w: f64,
    d: f64,
    dd: f64,
    dx: f64,
    dy: f64,
    /// w² (xx, xy, yy), and the same times d.
    second: [f64; 3],
    dark_second: [f64; 3],
    /// w (xx, yy) (1 - d).
    lever: [f64; 2],
    core_n: f64,
    core_d: f64,
    core_dd: f64,
}

impl Sums {
    fn over(light: &Light, window: &Window, ground: &Ground, expected: &Expected) -> Self {
        let mut sums = Self::default();
        let blur_pitches = expected.blur_px / window.px_per_pitch;
        let core = (expected.radius_pitches - 2.0 * blur_pitches).max(0.45 * expected.radius_pitches);
        let full = (window.rim_pitches - 0.5 / window.px_per_pitch).max(0.0);
        let end = window.rim_pitches + 0.5 / window.px_per_pitch;
        let (core2, full2, end2) = (core * core, full * full, end * end);
        for y in pixels(window.at.y_px, window.half_px[1], light.height).step_by(window.stride) {
            let dy = small_f64(y) - window.at.y_px;
            for x in pixels(window.at.x_px, window.half_px[0], light.width).step_by(window.stride) {
                let dx = small_f64(x) - window.at.x_px;
                let v = window.map.apply(dx, dy);
                let rho2 = v[0] * v[0] + v[1] * v[1];
                if rho2 >= end2 {
                    continue;
                }
                let dark = dark_share(light, ground, window, x, y);
                // A soft rim, one pixel wide.
                let weight = if rho2 <= full2 { 1.0 } else { (end - rho2.sqrt()) * window.px_per_pitch };
                sums.add(dx, dy, dark, weight);
                if rho2 < core2 {
                    sums.core_n += 1.0;
                    sums.core_d += dark;
                    sums.core_dd += dark * dark;
                }
            }
        }
        sums
    }

    fn add(&mut self, x: f64, y: f64, dark: f64, weight: f64) {
        let wd = weight * dark;
        self.w += weight;
        self.d += wd;
        self.dd += wd * dark;
        self.dx += wd * x;
        self.dy += wd * y;
        let w2 = weight * weight;
        let second = [w2 * x * x, w2 * x * y, w2 * y * y];
        for ((plain, times_dark), s) in self.second.iter_mut().zip(&mut self.dark_second).zip(second) {
            *plain += s;
            *times_dark += s * dark;
        }
        self.lever[0] += (weight - wd) * x * x;
        self.lever[1] += (weight - wd) * y * y;
    }
}

/// Darkness 1 - I / paper of one pixel.
pub(super) fn dark_share(light: &Light, ground: &Ground, window: &Window, x: usize, y: usize) -> f64 {
    let (dx, dy) = (small_f64(x) - window.at.x_px, small_f64(y) - window.at.y_px);
    let paper = ground.plane[0] + ground.plane[1] * dx + ground.plane[2] * dy;
    if paper > 0.0 { 1.0 - sample(light, x, y) / paper } else { 0.0 }
}

/// Variances of the darkness of one pixel of paper and of ink.
#[derive(Debug, Clone, Copy)]
pub(super) struct PixelNoise {
    paper: f64,
    ink: f64,
}

fn window_sums(light: &Light, window: &Window, ground: &Ground, expected: &Expected) -> Option<Darkness> {
    let sums = Sums::over(light, window, ground, expected);
    let contrast = sums.core_d / sums.core_n;
    if sums.core_n < 1.0 || sums.d <= 0.0 || contrast < LEAST_CONTRAST {
        return None;
    }
    let noise = PixelNoise::of(&sums, light, ground, contrast);
    let covariance = spread_of_centroid(&sums, &noise, ground, contrast);
    let [sx, sy] = expected.steps_px;
    // Sum of s (1 - s), s = share of ink, freed from what noise adds to it on average.
    let edge =
        sums.d / contrast - (sums.dd - (sums.w - sums.d / contrast) * noise.paper - sums.d / contrast * noise.ink) / (contrast * contrast);
    let (edge, sum_px2) = (edge * small_f64(window.stride).powi(2), sums.d * small_f64(window.stride).powi(2));
    let perimeter = 2.0 * (std::f64::consts::PI * sum_px2 / contrast).sqrt();
    let at = PixelPoint { x_px: window.at.x_px + sums.dx / sums.d, y_px: window.at.y_px + sums.dy / sums.d };
    let found = Darkness {
        at,
        covariance,
        sum_px2,
        contrast,
        // The integral of s (1 - s) across a step blurred by a Gaussian of width b is b / √π.
        blur_px: (std::f64::consts::PI.sqrt() * edge / perimeter).max(0.0),
        noise,
        cell_px2: (sx[0] * sy[1] - sx[1] * sy[0]).abs(),
    };
    [at.x_px, at.y_px, covariance.xx, covariance.yy, covariance.xy].iter().all(|v| v.is_finite()).then_some(found)
}

impl PixelNoise {
    /// Variance of a pixel that is ink by this share.
    pub(super) fn at(&self, share: f64) -> f64 {
        self.paper + share * (self.ink - self.paper)
    }

    fn of(sums: &Sums, light: &Light, ground: &Ground, contrast: f64) -> Self {
        let level = ground.plane[0];
        let (a, b) = (light.noise.a.max(0.0), light.noise.b.max(0.0));
        let model = |signal: f64| {
            let variance = (a + b * signal) / (level * level);
            if variance.is_finite() { variance } else { 0.0 }
        };
        let paper = ground.variance.max(model(level));
        // The core of a small dot is not flat: its scatter is noise only where it is below that of the paper.
        let scatter = (sums.core_dd - sums.core_d * contrast) / (sums.core_n - 1.0);
        let ink = if sums.core_n > 8.0 { scatter.clamp(0.0, paper) } else { paper };
        Self { paper, ink: ink.max(model(level * (1.0 - contrast))) }
    }
}

/// Covariance of the centroid: noise of each pixel with its lever, and the slope of the paper level, which
/// acts on the light that is left, 1 - d.
fn spread_of_centroid(sums: &Sums, noise: &PixelNoise, ground: &Ground, contrast: f64) -> PixelCovariance {
    let darker = (noise.ink - noise.paper) / contrast;
    let s2 = sums.d * sums.d;
    let [xx, xy, yy]: [f64; 3] = std::array::from_fn(|n| (noise.paper * sums.second[n] + darker * sums.dark_second[n]) / s2);
    let slope = |axis: usize| (sums.lever[axis] * ground.u_slope[axis]).powi(2) / s2;
    PixelCovariance { xx: xx + slope(0), xy, yy: yy + slope(1) }
}
