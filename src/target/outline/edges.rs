//! Where exactly an edge runs: profiles across it at full resolution.

use super::EdgePoint;
use crate::{
    frames::PixelPoint,
    math::{
        count,
        robust::{TUKEY_BOUND, mad_scale, median},
    },
    photo::Light,
};
use nalgebra::{Matrix3, Vector3};

/// Profiles along an edge.
const PROFILES: usize = 80;
/// Share of a side left out at each end, where corners are bent or rounded.
const ENDS: f64 = 0.03;
/// Step along a profile, px.
const STEP: f64 = 0.5;
/// Width of the plateaus on both sides, px.
const PLATEAU: f64 = 3.0;
/// A point farther from the smooth run of its edge than this many standard deviations does not belong to it.
const OFF_THE_RUN: f64 = 4.0;
/// Share of the usual contrast that a profile may differ by, both ways.
const CONTRAST: f64 = 2.0;
/// Fewest points of an edge.
const LEAST_POINTS: usize = PROFILES / 4;
/// No edge of paper in a photo is known better than this, px.
const LEAST_U_PX: f64 = 0.01;

/// A straight side, `from` to `to`, clockwise around the sheet as displayed.
struct Side<'a> {
    light: &'a Light,
    from: [f64; 2],
    along: [f64; 2],
    length: f64,
}

/// A place along the side (share of its length) with the distance of the edge, outwards, px.
#[derive(Clone, Copy)]
struct Step {
    t: f64,
    outward: f64,
    contrast: f64,
    /// From the noise of the pixels, px.
    u: f64,
}

/// Points of the edge near the line between two corners; none when the edge cannot be followed.
pub(super) fn points(light: &Light, from: [f64; 2], to: [f64; 2], within_px: f64) -> Vec<EdgePoint> {
    let length = (to[0] - from[0]).hypot(to[1] - from[1]);
    let side = Side { light, from, along: [(to[0] - from[0]) / length, (to[1] - from[1]) / length], length };
    let rough: Vec<Step> = places().filter_map(|t| side.steepest(t, within_px)).collect();
    let Some(run) = Run::of(&rough) else { return vec![] };
    let half = side.half_width(&run);
    let fine: Vec<Step> = places().filter_map(|t| side.step(t, run.at(t), half)).collect();
    let usual = median(&fine.iter().map(|step| step.contrast).collect::<Vec<_>>()).unwrap_or(0.0);
    let fine: Vec<Step> = fine.into_iter().filter(|s| s.contrast < CONTRAST * usual && s.contrast > usual / CONTRAST).collect();
    let Some(run) = Run::of(&fine) else { return vec![] };
    let kept: Vec<Step> = fine.into_iter().filter(|step| (step.outward - run.at(step.t)).abs() <= OFF_THE_RUN * run.scatter).collect();
    let reach = reach(&kept.iter().map(|step| step.outward - run.at(step.t)).collect::<Vec<_>>());
    let point = |step: &Step| side.point(step, &run, reach);
    if kept.len() < LEAST_POINTS { vec![] } else { kept.iter().map(point).collect() }
}

fn places() -> impl Iterator<Item = f64> {
    (0..PROFILES).map(|n| ENDS + (1.0 - 2.0 * ENDS) * (count(n) + 0.5) / count(PROFILES))
}

impl Side<'_> {
    /// Out of the sheet: the sheet lies to the right of a clockwise side (y down).
    fn outward(&self) -> [f64; 2] {
        [self.along[1], -self.along[0]]
    }

    fn place(&self, t: f64, outward: f64) -> [f64; 2] {
        let normal = self.outward();
        [0, 1].map(|c| self.from[c] + t * self.length * self.along[c] + outward * normal[c])
    }

    /// Pixels that a profile averages along the edge, each way.
    fn half_band(&self) -> i32 {
        #[expect(clippy::cast_possible_truncation, reason = "at most 4")]
        let half = (self.length / count(PROFILES) / 2.0).min(4.0) as i32;
        half
    }

    /// Light at a distance from the line, averaged along the edge; `None` beyond the photo.
    fn sample(&self, t: f64, outward: f64) -> Option<f64> {
        let half = self.half_band();
        let [x, y] = self.place(t, outward);
        let mut sum = 0.0;
        for n in -half..=half {
            sum += bilinear(self.light, x + f64::from(n) * self.along[0], y + f64::from(n) * self.along[1])?;
        }
        Some(sum / f64::from(2 * half + 1))
    }

    fn profile(&self, t: f64, from: f64, to: f64) -> Option<Vec<f64>> {
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "some ten pixels")]
        let steps = ((to - from) / STEP).round() as usize;
        (0..=steps).map(|n| self.sample(t, from + STEP * count(n))).collect()
    }

    /// The steepest fall of light outwards: means of two pixels and a half on both sides compared.
    fn steepest(&self, t: f64, within_px: f64) -> Option<Step> {
        const ARM: usize = 5;
        let start = -within_px - STEP * count(ARM);
        let profile = self.profile(t, start, -start)?;
        let mean = |part: &[f64]| part.iter().sum::<f64>() / count(part.len());
        let fall = |n: usize| mean(&profile[n - ARM..n]) - mean(&profile[n + 1..=n + ARM]);
        let (n, contrast) =
            (ARM..profile.len() - ARM).map(|n| (n, fall(n))).max_by(|a, b| a.1.total_cmp(&b.1)).filter(|(_, fall)| *fall > 0.0)?;
        Some(Step { t, outward: start + STEP * count(n), contrast, u: 1.0 })
    }

    /// Half the width of the step that profiles have to span, px: three standard deviations of the blur that the median profile shows.
    fn half_width(&self, run: &Run) -> f64 {
        const SEARCH: f64 = 12.0;
        let profiles: Vec<Vec<f64>> = places().filter_map(|t| self.profile(t, run.at(t) - SEARCH, run.at(t) + SEARCH)).collect();
        let samples = profiles.first().map_or(0, Vec::len);
        let usual: Vec<f64> = (0..samples).filter_map(|n| median(&profiles.iter().map(|p| p[n]).collect::<Vec<_>>())).collect();
        let (Some(bright), Some(dark)) = (usual.first(), usual.last()) else { return 4.0 };
        // Outwards from inside: the last sample above a level.
        let beyond = |share: f64| usual.iter().rposition(|v| *v > dark + share * (bright - dark)).map_or(0.0, |n| STEP * count(n));
        let sigma = (beyond(0.16) - beyond(0.84)).abs() / 2.0;
        (3.0 * sigma + 1.0).clamp(3.0, SEARCH - PLATEAU)
    }

    /// The edge as the place that parts the light between both plateaus as a sharp step would (Tabatabai & Mitchell 1984 keep three moments;
    /// with known plateaus the first is enough, and equals the centroid of the gradient).
    fn step(&self, t: f64, near: f64, half: f64) -> Option<Step> {
        let mut centre = near;
        let mut found = None;
        for _ in 0..3 {
            let outer = half + PLATEAU;
            let profile = self.profile(t, centre - outer, centre + outer)?;
            #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a few pixels")]
            let flat = (PLATEAU / STEP) as usize;
            let mean = |part: &[f64]| part.iter().sum::<f64>() / count(part.len());
            let (bright, dark) = (mean(&profile[..flat]), mean(&profile[profile.len() - flat..]));
            let contrast = bright - dark;
            if contrast <= 0.0 {
                return None;
            }
            let slope = &profile[flat..profile.len() - flat];
            let trapezium = slope.iter().sum::<f64>() - (slope[0] + slope[slope.len() - 1]) / 2.0;
            let area = STEP * (trapezium - dark * count(slope.len() - 1)) / contrast;
            let width = STEP * count(slope.len() - 1);
            let band = f64::from(2 * self.half_band() + 1);
            let variance = self.light.noise.variance(f64::midpoint(bright, dark).max(0.0)) / band;
            let u = (variance * (width + width * width / (2.0 * PLATEAU))).sqrt() / contrast;
            centre += area - width / 2.0;
            if (centre - near).abs() > half {
                return None;
            }
            found = Some(Step { t, outward: centre, contrast, u });
        }
        found
    }

    fn point(&self, step: &Step, run: &Run, reach: f64) -> EdgePoint {
        let [x_px, y_px] = self.place(step.t, step.outward);
        let (normal, slope) = (self.outward(), run.slope(step.t) / self.length);
        let across = [0, 1].map(|c| normal[c] - slope * self.along[c]);
        let length = across[0].hypot(across[1]);
        let u_px = step.u.max(run.scatter).max(LEAST_U_PX) * reach.sqrt();
        EdgePoint { at: PixelPoint { x_px, y_px }, across: across.map(|c| c / length), u_px }
    }
}

/// The smooth run of an edge: a parabola, which is what a lens makes of a line.
struct Run {
    coefficients: Vector3<f64>,
    /// Standard deviation of the points about it, px.
    scatter: f64,
}

impl Run {
    fn of(steps: &[Step]) -> Option<Self> {
        if steps.len() < LEAST_POINTS {
            return None;
        }
        let start = median(&steps.iter().map(|step| step.outward).collect::<Vec<_>>())?;
        let mut run = Self { coefficients: Vector3::new(start, 0.0, 0.0), scatter: f64::INFINITY };
        for pass in 0..12 {
            let offs: Vec<f64> = steps.iter().map(|step| step.outward - run.at(step.t)).collect();
            run.scatter = mad_scale(&offs)?.max(1e-3);
            let bound = TUKEY_BOUND * run.scatter;
            let (mut normal, mut right) = (Matrix3::zeros(), Vector3::zeros());
            for (step, off) in steps.iter().zip(&offs) {
                let weight = (1.0 - (off / bound).powi(2)).max(0.0).powi(2);
                // First a straight line: clutter would bend a parabola from a bad start.
                let row = Vector3::new(1.0, step.t - 0.5, if pass < 4 { 0.0 } else { (step.t - 0.5).powi(2) });
                normal += weight * row * row.transpose();
                right += weight * row * step.outward;
            }
            if pass < 4 {
                normal[(2, 2)] = 1.0;
            }
            run.coefficients = normal.lu().solve(&right)?;
        }
        Some(run)
    }

    fn at(&self, t: f64) -> f64 {
        let s = t - 0.5;
        self.coefficients[0] + s * (self.coefficients[1] + s * self.coefficients[2])
    }

    /// Per share of the side.
    fn slope(&self, t: f64) -> f64 {
        self.coefficients[1] + 2.0 * (t - 0.5) * self.coefficients[2]
    }
}

/// How many neighbouring points err in common: 1 + 2 × the sum of their correlations, up to where these end.
///
/// Paper is not straight, and its waves reach over many points; taken for independent they would promise too much.
fn reach(offs: &[f64]) -> f64 {
    const ENDED: f64 = 0.1;
    let square: f64 = offs.iter().map(|o| o * o).sum::<f64>().max(1e-30);
    let correlation = |lag: usize| offs.iter().zip(&offs[lag..]).map(|(a, b)| a * b).sum::<f64>() / square;
    1.0 + 2.0 * (1..offs.len() / 4).map(correlation).take_while(|c| *c > ENDED).sum::<f64>()
}

/// Light between pixels; `None` beyond the photo.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "checked against the size")]
fn bilinear(light: &Light, x: f64, y: f64) -> Option<f64> {
    if !(x >= 0.0 && y >= 0.0 && x < count(light.width) - 1.0 && y < count(light.height) - 1.0) {
        return None;
    }
    let (column, row) = (x as usize, y as usize);
    let (u, v) = (x - count(column), y - count(row));
    let at = |dx: usize, dy: usize| f64::from(light.value[(row + dy) * light.width + column + dx]);
    let value = (1.0 - v) * ((1.0 - u) * at(0, 0) + u * at(1, 0)) + v * ((1.0 - u) * at(0, 1) + u * at(1, 1));
    value.is_finite().then_some(value)
}
