//! Random fields with a grain: laser speckle and the texture of paper.

use super::{
    orders::{Purpose, random},
    pixels::single,
};
use rand_distr::{Distribution, StandardNormal};
use rayon::prelude::*;
use rustfft::{FftPlanner, num_complex::Complex32};

/// Edge of a tile, px; the tile repeats without a seam.
const EDGE: usize = 1024;

/// Fields added for weak speckle; beyond this the mean is blended in instead.
const MOST_FIELDS: u32 = 16;

/// A square of random numbers that repeats without a seam.
#[derive(Debug)]
pub(super) struct Tile {
    value: Vec<f32>,
}

impl Tile {
    /// Value at a place, wrapped.
    pub(super) fn at(&self, x: usize, y: usize) -> f32 {
        self.value[(y % EDGE) * EDGE + x % EDGE]
    }

    /// Speckle: mean 1, standard deviation `contrast`, never negative.
    ///
    /// The intensity of a circular Gaussian field behind a round pupil has an autocorrelation `|2 J1(πDr)/(πDr)|²` whose full width at
    /// half maximum is 1.03/D. Adding n independent intensities gives the contrast 1/√n (n = ⌊1/C²⌋); the rest of the way the mean is
    /// blended in. Source: Goodman, Speckle Phenomena in Optics, sections 3.3 and 4.4.
    pub(super) fn speckle(seed: u64, contrast: f64, grain_px: f64) -> Self {
        let pupil_radius = (1.03 / grain_px / 2.0).min(0.5);
        let fields = super::pixels::to_u32((1.0 / (contrast * contrast)).floor()).clamp(1, MOST_FIELDS);
        let mut value = vec![0.0_f32; EDGE * EDGE];
        for part in 0..fields {
            let field = gaussian_field(seed, Purpose::Speckle, part, |frequency| if frequency < pupil_radius { 1.0 } else { 0.0 });
            value.par_iter_mut().zip(&field).for_each(|(sum, amplitude)| *sum += amplitude.norm_sqr());
        }
        let mut tile = Self { value };
        tile.scale_to(1.0, contrast);
        tile.value.iter_mut().for_each(|value| *value = value.max(0.0));
        tile
    }

    /// Paper: mean 1, relative standard deviation `texture`; fibres over cloudiness.
    pub(super) fn paper(seed: u64, texture: f64) -> Self {
        let bell = |grain_px: f64| move |frequency: f64| (-(frequency * grain_px).powi(2) * 4.0).exp();
        let fine = gaussian_field(seed, Purpose::PaperFine, 0, bell(2.0));
        let coarse = gaussian_field(seed, Purpose::PaperCoarse, 0, bell(40.0));
        let (fine, coarse) = (Self::of_real_part(&fine), Self::of_real_part(&coarse));
        let value = fine.value.iter().zip(&coarse.value).map(|(a, b)| a + b).collect();
        let mut tile = Self { value };
        tile.scale_to(1.0, texture);
        tile
    }

    fn of_real_part(field: &[Complex32]) -> Self {
        let mut tile = Self { value: field.iter().map(|amplitude| amplitude.re).collect() };
        tile.scale_to(0.0, 1.0);
        tile
    }

    fn scale_to(&mut self, mean: f64, deviation: f64) {
        let count = self.value.len() as f64;
        let old_mean = self.value.iter().map(|&v| f64::from(v)).sum::<f64>() / count;
        let variance = self.value.iter().map(|&v| (f64::from(v) - old_mean).powi(2)).sum::<f64>() / count;
        let gain = deviation / variance.sqrt().max(f64::MIN_POSITIVE);
        self.value.iter_mut().for_each(|v| *v = single(mean + (f64::from(*v) - old_mean) * gain));
    }
}

/// Circular Gaussian field whose spectrum has the amplitude `spectrum(|frequency|)`, cycles per px.
fn gaussian_field(seed: u64, purpose: Purpose, part: u32, spectrum: impl Fn(f64) -> f64) -> Vec<Complex32> {
    let mut generator = random(seed, purpose, u64::from(part));
    let mut field = vec![Complex32::default(); EDGE * EDGE];
    for row in 0..EDGE {
        for column in 0..EDGE {
            let amplitude = spectrum(signed_frequency(row).hypot(signed_frequency(column)));
            if amplitude > 1e-4 {
                let (re, im): (f64, f64) = (StandardNormal.sample(&mut generator), StandardNormal.sample(&mut generator));
                field[row * EDGE + column] = Complex32::new(single(re * amplitude), single(im * amplitude));
            }
        }
    }
    transform_rows(&mut field);
    let mut turned = transposed(&field);
    transform_rows(&mut turned);
    turned
}

/// Frequency of a bin, cycles per px.
fn signed_frequency(bin: usize) -> f64 {
    let bin = if bin < EDGE / 2 { bin as f64 } else { bin as f64 - EDGE as f64 };
    bin / EDGE as f64
}

fn transform_rows(field: &mut [Complex32]) {
    let plan = FftPlanner::new().plan_fft_inverse(EDGE);
    field.par_chunks_mut(EDGE).for_each(|row| plan.process(row));
}

fn transposed(field: &[Complex32]) -> Vec<Complex32> {
    (0..EDGE * EDGE).into_par_iter().map(|i| field[(i % EDGE) * EDGE + i / EDGE]).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn mean_and_deviation(tile: &Tile) -> (f64, f64) {
        let count = tile.value.len() as f64;
        let mean = tile.value.iter().map(|&v| f64::from(v)).sum::<f64>() / count;
        let variance = tile.value.iter().map(|&v| (f64::from(v) - mean).powi(2)).sum::<f64>() / count;
        (mean, variance.sqrt())
    }

    #[test]
    fn speckle_has_the_contrast_and_grain_asked_for() {
        for (contrast, grain_px) in [(0.9, 2.0), (0.45, 3.0), (0.15, 1.5)] {
            let tile = Tile::speckle(3, contrast, grain_px);
            let (mean, deviation) = mean_and_deviation(&tile);
            assert!((mean - 1.0).abs() < 1e-4 && (deviation - contrast).abs() < 1e-3, "{mean} {deviation}");
            assert!(tile.value.iter().all(|&v| v >= 0.0));
            // Half a grain away the autocorrelation is half; interpolated between whole pixels.
            let correlation = |shift: usize| {
                let sum: f64 = (0..EDGE * EDGE)
                    .map(|i| (i % EDGE, i / EDGE))
                    .map(|(x, y)| f64::from(tile.at(x, y) - 1.0) * f64::from(tile.at(x + shift, y) - 1.0))
                    .sum();
                sum / (EDGE * EDGE) as f64 / (deviation * deviation)
            };
            let half = grain_px / 2.0;
            let low = super::super::pixels::floor_index(half, 10);
            let share = half - low as f64;
            let between = correlation(low) * (1.0 - share) + correlation(low + 1) * share;
            // Chords over a convex/concave curve: within 0.12 of one half.
            assert!((between - 0.5).abs() < 0.12, "grain {grain_px}: {between}");
        }
    }

    #[test]
    fn fully_developed_speckle_is_exponential() {
        let tile = Tile::speckle(9, 1.0, 2.0);
        let dark = tile.value.iter().filter(|&&v| v < 0.1).count() as f64 / tile.value.len() as f64;
        // 1 - exp(-0.1) = 0.0952; about 2e5 independent grains.
        assert!((dark - 0.0952).abs() < 0.005, "{dark}");
    }

    #[test]
    fn paper_keeps_its_mean() {
        let (mean, deviation) = mean_and_deviation(&Tile::paper(1, 0.02));
        assert!((mean - 1.0).abs() < 1e-5 && (deviation - 0.02).abs() < 1e-4);
    }
}
