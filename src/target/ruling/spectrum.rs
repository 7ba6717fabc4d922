//! The first look: where in the photo the lines are clearest, how far apart they are, and in which directions they repeat.

use super::wave::{Patch, Window};
use crate::{
    math::{count, robust},
    photo::Light,
};
use nalgebra::Vector2;
use rayon::prelude::*;
use rustfft::{FftPlanner, num_complex::Complex32};

/// Where the ruling is clearest.
pub(super) struct First {
    pub(super) centre: [f64; 2],
    /// Frequencies of one or two families, lines per pixel, the stronger first.
    pub(super) waves: Vec<Vector2<f64>>,
}

/// Side of the windows that are transformed, px.
const SIDE: usize = 256;
/// Windows tried each way.
const TRIED: usize = 5;
/// Lines closer than this are left to noise and the raster of the sensor, px.
const FINEST_PX: f64 = 2.5;
/// A window has to show this many lines.
const LEAST_LINES: f64 = 6.0;
/// A family stands out of the window's spectrum by this factor over its median.
const STANDS_OUT: f64 = 12.0;
/// Families are at least this far from parallel: cosine of 60°.
const CROSS_COSINE: f64 = 0.5;
/// Perspective stretches one family against the other by no more than this.
const STRETCH: f64 = 1.7;
/// Finer lines between heavier ones show where the wave at a multiple is stronger than the multiples beside it by this factor.
const FINER: f64 = 1.3;
/// A thin line's second wave may be as strong as its first, never much stronger.
const SAME: f64 = 0.6;

/// The window where a wave stands out most, over a raster of windows.
pub(super) fn strongest(light: &Light) -> Option<First> {
    let side = SIDE.min(light.width.min(light.height) / 2 * 2);
    let place = |n: usize, length: usize| count(side) / 2.0 + (count(length) - count(side)) * count(n) / count(TRIED - 1);
    let windows: Vec<[f64; 2]> = (0..TRIED * TRIED).map(|n| [place(n % TRIED, light.width), place(n / TRIED, light.height)]).collect();
    let best = windows.into_par_iter().filter_map(|centre| Spectrum::of(light, centre, side)).filter_map(|spectrum| {
        let peak = spectrum.peak(&|_| true)?;
        Some((peak.1, spectrum))
    });
    let (_, spectrum) = best.max_by(|a, b| a.0.total_cmp(&b.0)).filter(|(stands_out, _)| *stands_out > STANDS_OUT)?;
    spectrum.families()
}

/// Amplitudes over the upper half of the frequency plane.
struct Spectrum {
    patch: Patch,
    centre: [f64; 2],
    side: usize,
    amplitude: Vec<f64>,
    median: f64,
}

impl Spectrum {
    fn of(light: &Light, centre: [f64; 2], side: usize) -> Option<Self> {
        let half = side / 2 - 1;
        let bounded = |c: f64, length: usize| c.round().clamp(count(half), count(length - 1 - half));
        let centre = [bounded(centre[0], light.width), bounded(centre[1], light.height)];
        let patch = Patch::of(light, Window { centre, half })?;
        let mut plane = patch.weighed(side);
        let plan = FftPlanner::new().plan_fft_forward(side);
        plane.chunks_exact_mut(side).for_each(|row| plan.process(row));
        let mut turned = transposed(&plane, side);
        turned.chunks_exact_mut(side).for_each(|row| plan.process(row));
        let plane = transposed(&turned, side);
        let amplitude: Vec<f64> = plane.iter().map(|z| f64::from(z.norm())).collect();
        let median = robust::median(&amplitude)?;
        (median > 0.0).then_some(Self { patch, centre, side, amplitude, median })
    }

    fn frequency(&self, n: usize) -> Vector2<f64> {
        let side = self.side;
        let signed = |k: usize| if k > side / 2 { count(k) - count(side) } else { count(k) } / count(side);
        Vector2::new(signed(n % side), signed(n / side))
    }

    /// The strongest frequency among those allowed, and how far it stands out of the median.
    fn peak(&self, allowed: &dyn Fn(Vector2<f64>) -> bool) -> Option<(Vector2<f64>, f64)> {
        let band = LEAST_LINES / count(self.side)..1.0 / FINEST_PX;
        let each = (0..self.amplitude.len()).map(|n| (self.frequency(n), self.amplitude[n] / self.median));
        let candidates = each.filter(|(f, _)| (f.x > 0.0 || (f.x == 0.0 && f.y > 0.0)) && band.contains(&f.norm()) && allowed(*f));
        candidates.max_by(|a, b| a.1.total_cmp(&b.1))
    }

    fn families(&self) -> Option<First> {
        let (first, _) = self.peak(&|_| true)?;
        let first = self.finest(self.refined(first));
        let crosswise = |f: Vector2<f64>| f.dot(&first).abs() < CROSS_COSINE * f.norm() * first.norm();
        let alike = |f: Vector2<f64>| (1.0 / STRETCH..STRETCH).contains(&(f.norm() / first.norm()));
        let second = self.peak(&|f| crosswise(f) && alike(f)).filter(|(_, stands_out)| *stands_out > STANDS_OUT / 2.0);
        let mut waves = vec![first];
        waves.extend(second.map(|(f, _)| self.refined(f)));
        Some(First { centre: self.centre, waves })
    }

    fn refined(&self, near: Vector2<f64>) -> Vector2<f64> {
        self.patch.wave(near, 3.0 / count(self.side)).map_or(near, |wave| wave.frequency)
    }

    /// From any wave of the ruling to that of its finest lines: heavier lines at every fifth or tenth place repeat at a fifth or a tenth of
    /// the frequency and at all multiples; thin lines also at twice and three times their own.
    fn finest(&self, found: Vector2<f64>) -> Vector2<f64> {
        let amplitude = |f: Vector2<f64>| self.patch.amplitude(f);
        let mut base = found;
        for divisor in [2.0, 3.0] {
            while base.norm() / divisor > LEAST_LINES / count(self.side) && amplitude(base / divisor) > SAME * amplitude(base) {
                base /= divisor;
            }
        }
        let noise = self.patch.noise(base);
        for multiple in [10.0, 5.0] {
            let at = |k: f64| amplitude(base * k);
            let fine = base * multiple;
            if fine.norm() > 1.0 / FINEST_PX {
                continue;
            }
            let beside = at(multiple - 1.0).max(at(multiple + 1.0)).max(3.0 * noise);
            if at(multiple) > FINER * beside {
                return self.refined(fine);
            }
        }
        self.refined(base)
    }
}

impl Patch {
    /// The weighed window in a square of `side` for the transform.
    #[expect(clippy::cast_possible_truncation, reason = "single precision is enough for a first look")]
    fn weighed(&self, side: usize) -> Vec<Complex32> {
        let mut plane = vec![Complex32::new(0.0, 0.0); side * side];
        self.for_each_weighed(|column, row, value| plane[row * side + column] = Complex32::new(value as f32, 0.0));
        plane
    }
}

fn transposed(plane: &[Complex32], side: usize) -> Vec<Complex32> {
    (0..side * side).map(|n| plane[(n % side) * side + n / side]).collect()
}
