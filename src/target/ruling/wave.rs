//! One family of lines in one window: frequency, phase and strength of its wave.

use crate::{
    math::{count, robust},
    photo::Light,
};
use nalgebra::Vector2;
use rustfft::num_complex::Complex64;
use std::f64::consts::TAU;

/// A square part of a photo, its middle at a place, its side an odd number of pixels, weighed with a raised cosine each way.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Window {
    pub(super) centre: [f64; 2],
    pub(super) half: usize,
}

/// The wave of a family of lines.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Wave {
    pub(super) window: Window,
    /// Lines per pixel, along x and along y.
    pub(super) frequency: Vector2<f64>,
    /// Lines up to the middle of the window, whole ones where a line's darkest place is there.
    pub(super) count: f64,
    /// Standard uncertainty of `count`.
    pub(super) u_count: f64,
    /// Amplitude against what the window shows at other frequencies.
    pub(super) strength: f64,
}

/// Light of a window against its usual light, darkness positive, without wild values, and its weights.
pub(super) struct Patch {
    window: Window,
    darkness: Vec<f64>,
    weight: Vec<f64>,
    /// Sum of the weights of all pixels.
    total: f64,
}

/// Values farther from the median than this many standard deviations are cut: pencil, magnets, spots.
const CUT: f64 = 3.0;
/// Steps that bring the frequency to the maximum.
const STEPS: usize = 6;
/// Turns at which a window of this ruling shows nothing but its noise, degrees.
const ASIDE_DEG: [f64; 6] = [-38.0, -27.0, -16.0, 16.0, 27.0, 38.0];

impl Window {
    /// Second moment of the weights along each axis, px².
    pub(super) fn moment(self) -> f64 {
        // Of a raised cosine over ±h: h² (1/3 − 2/π²).
        (count(self.half) + 1.0).powi(2) * (1.0 / 3.0 - 2.0 / std::f64::consts::PI.powi(2))
    }
}

impl Patch {
    /// `None` where the window leaves the photo or shows nothing.
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "places in a photo, checked against its size")]
    pub(super) fn of(light: &Light, window: Window) -> Option<Self> {
        let Window { centre: [x, y], half } = window;
        let (column, row) = (x.round(), y.round());
        let reach = count(half);
        let inside = column >= reach && row >= reach && column + reach < count(light.width) && row + reach < count(light.height);
        if !inside {
            return None;
        }
        let (left, top, side) = (column as usize - half, row as usize - half, 2 * half + 1);
        let raw: Vec<f64> = (0..side * side).map(|n| f64::from(light.value[(top + n / side) * light.width + left + n % side])).collect();
        let middle = robust::median(&raw)?;
        let spread = robust::mad_scale(&raw)?;
        if !(middle > 1e-6 && spread > 0.0) {
            return None;
        }
        let weight: Vec<f64> = (0..side).map(|n| (TAU * (count(n) + 1.0) / count(side + 1)).cos()).map(|c| 0.5 - 0.5 * c).collect();
        let mut darkness: Vec<f64> = raw.iter().map(|v| (-(v - middle)).clamp(-CUT * spread, CUT * spread) / middle).collect();
        let of = |n: usize| weight[n % side] * weight[n / side];
        let total = weight.iter().sum::<f64>().powi(2);
        let mean = darkness.iter().enumerate().map(|(n, d)| of(n) * d).sum::<f64>() / total;
        darkness.iter_mut().for_each(|d| *d -= mean);
        Some(Self { window: Window { centre: [column, row], half }, darkness, weight, total })
    }

    /// Amplitude at a frequency, with its first moments along x and y, all against the middle of the window.
    fn moments(&self, frequency: Vector2<f64>) -> [Complex64; 3] {
        let half = count(self.window.half);
        let turn = |f: f64| -> Vec<Complex64> {
            self.weight.iter().enumerate().map(|(n, w)| Complex64::from_polar(*w, -TAU * f * (count(n) - half))).collect()
        };
        let (across, down) = (turn(frequency.x), turn(frequency.y));
        let mut sums = [Complex64::new(0.0, 0.0); 3];
        for ((row, line), dy) in self.darkness.chunks_exact(self.weight.len()).enumerate().zip(&down) {
            let (mut sum, mut first) = (Complex64::new(0.0, 0.0), Complex64::new(0.0, 0.0));
            for (n, (d, dx)) in line.iter().zip(&across).enumerate() {
                let part = dx * *d;
                sum += part;
                first += part * (count(n) - half);
            }
            sums[0] += sum * dy;
            sums[1] += first * dy;
            sums[2] += sum * dy * (count(row) - half);
        }
        sums.map(|sum| sum / self.total)
    }

    /// Column, row and weighed darkness of every pixel.
    pub(super) fn for_each_weighed(&self, mut each: impl FnMut(usize, usize, f64)) {
        let side = self.weight.len();
        for (n, darkness) in self.darkness.iter().enumerate() {
            each(n % side, n / side, darkness * self.weight[n % side] * self.weight[n / side]);
        }
    }

    pub(super) fn amplitude(&self, frequency: Vector2<f64>) -> f64 {
        self.moments(frequency)[0].norm()
    }

    /// What the window shows aside from its lines, root mean square.
    pub(super) fn noise(&self, frequency: Vector2<f64>) -> f64 {
        let aside = |degrees: f64| self.amplitude(nalgebra::Rotation2::new(degrees.to_radians()) * frequency).powi(2);
        (ASIDE_DEG.into_iter().map(aside).sum::<f64>() / count(ASIDE_DEG.len())).sqrt()
    }

    /// The wave near a frequency; `None` when there is none within `reach` lines per pixel.
    ///
    /// At a frequency that is off by Δ the first moments are i 2π Δ σ² times the amplitude, σ² the second moment of the weights.
    pub(super) fn wave(&self, near: Vector2<f64>, reach: f64) -> Option<Wave> {
        let mut frequency = near;
        for _ in 0..STEPS {
            let [sum, x, y] = self.moments(frequency);
            let off = Vector2::new((x / sum).im, (y / sum).im) / (TAU * self.window.moment());
            frequency += off.cap_magnitude(0.5 / (2.0 * count(self.window.half)));
            let off = (frequency - near).norm();
            if off.is_nan() || off >= reach {
                return None;
            }
        }
        let sum = self.moments(frequency)[0];
        let noise = self.noise(frequency);
        // Half of the noise lies across the wave's own phase.
        let u_count = noise / (std::f64::consts::SQRT_2 * sum.norm() * TAU);
        let strength = sum.norm() / noise;
        (strength.is_finite()).then_some(Wave { window: self.window, frequency, count: sum.arg() / TAU, u_count, strength })
    }
}
