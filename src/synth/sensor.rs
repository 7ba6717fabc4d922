//! From light to stored samples: mosaic, noise, clipping, demosaicing, tone curve.

use super::{
    orders::{Purpose, random},
    pixels::{floor_index, single, to_u8, to_u16},
    scene::{FileKind, Scene, Sensor, SensorColour},
};
use crate::photo::Samples;
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};
use rayon::prelude::*;

/// Which colour a place of the mosaic sees: red, green, green, blue.
fn mosaic_channel(x: usize, y: usize) -> usize {
    (x % 2) + (y % 2)
}

/// Number of channels of the photo.
pub(super) fn channels(sensor: &Sensor) -> usize {
    match sensor.colour {
        SensorColour::Bayer => 3,
        SensorColour::Mono => 1,
    }
}

/// Exposes the sensor and develops the photo.
///
/// - `level`: light at (x, y) in a channel after white balance, 1 = the photo clips
/// - `picture`: tells the noise of several photos of one scene apart
pub(super) fn expose(scene: &Scene, picture: u32, level: impl Fn(usize, usize, usize) -> f64 + Sync) -> Samples {
    let (width, height) = (scene.file.width_px as usize, scene.file.height_px as usize);
    let mut raw = vec![0.0_f32; width * height];
    raw.par_chunks_mut(width).enumerate().for_each(|(y, row)| {
        let mut generator = random(scene.seed, Purpose::Noise, (u64::from(picture) << 32) | y as u64);
        for (x, value) in row.iter_mut().enumerate() {
            let (channel, gain) = match scene.sensor.colour {
                SensorColour::Bayer => (mosaic_channel(x, y), scene.sensor.white_balance[mosaic_channel(x, y)]),
                SensorColour::Mono => (0, 1.0),
            };
            let light = level(x, y, channel) / gain;
            *value = single(read_out(&scene.sensor, light, StandardNormal.sample(&mut generator)));
        }
    });
    add_hot_pixels(scene, &mut raw, width, height);
    develop(scene, &raw, width, height)
}

/// One pixel through well and converter: variance `N (light) + read²` electrons, clipped to 0..1 and rounded to the converter's steps.
///
/// The normal law stands in for the Poisson law; below ten electrons the read noise hides the difference.
fn read_out(sensor: &Sensor, light: f64, normal: f64) -> f64 {
    let noisy = match &sensor.noise {
        None => light,
        Some(noise) => {
            let electrons = light * noise.full_well_e;
            (electrons + normal * (electrons.max(0.0) + noise.read_noise_e.powi(2)).sqrt()) / noise.full_well_e
        }
    };
    let steps = f64::from((1_u32 << sensor.bits) - 1);
    ((noisy + sensor.black_level).clamp(0.0, 1.0) * steps).round() / steps
}

fn add_hot_pixels(scene: &Scene, raw: &mut [f32], width: usize, height: usize) {
    let mut generator = random(scene.seed, Purpose::HotPixels, 0);
    for _ in 0..scene.stray.hot_pixels {
        let at = generator.random_range(0..height) * width + generator.random_range(0..width);
        raw[at] = raw[at].max(single(generator.random_range(0.1..1.0)));
    }
}

fn develop(scene: &Scene, raw: &[f32], width: usize, height: usize) -> Samples {
    let channels = channels(&scene.sensor);
    let mosaic = Mosaic { raw, width, height };
    let value = |x: usize, y: usize, channel: usize| match scene.sensor.colour {
        SensorColour::Bayer => f64::from(mosaic.interpolated(x, y, channel)),
        SensorColour::Mono => f64::from(raw[y * width + x]),
    };
    let gain = |channel: usize| if channels == 1 { 1.0 } else { scene.sensor.white_balance[channel] };
    let black = scene.sensor.black_level;
    match scene.file.kind {
        FileKind::Jpeg { s_curve, .. } => {
            let curve = tone_curve(s_curve);
            Samples::U8(fill(width, height, channels, |x, y, channel| {
                let light = (value(x, y, channel) - black) * gain(channel);
                curve[floor_index(light * CURVE_STEPS + 0.5, curve.len() - 1)]
            }))
        }
        FileKind::Png16 => Samples::U16(fill(width, height, channels, |x, y, channel| {
            to_u16(((value(x, y, channel) - black) * gain(channel) + black) * 65535.0)
        })),
    }
}

fn fill<T: Copy + Default + Send>(
    width: usize,
    height: usize,
    channels: usize,
    sample: impl Fn(usize, usize, usize) -> T + Sync,
) -> Vec<T> {
    let mut samples = vec![T::default(); width * height * channels];
    samples.par_chunks_mut(width * channels).enumerate().for_each(|(y, row)| {
        for (i, value) in row.iter_mut().enumerate() {
            *value = sample(i / channels, y, i % channels);
        }
    });
    samples
}

/// Entries of the tone curve less one.
const CURVE_STEPS: f64 = 65535.0;

/// Linear light to 8 bit: sRGB (IEC 61966-2-1), then `y + s (3y² − 2y³ − y)`.
fn tone_curve(s_curve: f64) -> Vec<u8> {
    (0..=u16::MAX)
        .map(|step| {
            let light = f64::from(step) / CURVE_STEPS;
            let coded = if light <= 0.003_130_8 { 12.92 * light } else { 1.055 * light.powf(1.0 / 2.4) - 0.055 };
            to_u8(255.0 * (coded + s_curve * (coded * coded * (3.0 - 2.0 * coded) - coded)))
        })
        .collect()
}

/// The raw mosaic, red in the top left corner.
struct Mosaic<'a> {
    raw: &'a [f32],
    width: usize,
    height: usize,
}

impl Mosaic<'_> {
    /// Bilinear: the mean of the nearest places that see the channel. At the border the mosaic is mirrored, which keeps its colours.
    fn interpolated(&self, x: usize, y: usize, channel: usize) -> f32 {
        let own = mosaic_channel(x, y);
        if own == channel {
            return self.raw[y * self.width + x];
        }
        if channel == 1 {
            return self.mean(x, y, &[(-1, 0), (1, 0), (0, -1), (0, 1)]);
        }
        if own != 1 {
            return self.mean(x, y, &[(-1, -1), (1, -1), (-1, 1), (1, 1)]);
        }
        // A green place: red lies beside it in even rows, blue in odd ones.
        if y.is_multiple_of(2) == (channel == 0) { self.mean(x, y, &[(-1, 0), (1, 0)]) } else { self.mean(x, y, &[(0, -1), (0, 1)]) }
    }

    fn mean(&self, x: usize, y: usize, steps: &[(isize, isize)]) -> f32 {
        let sum: f32 =
            steps.iter().map(|&(dx, dy)| self.raw[mirrored(y, dy, self.height) * self.width + mirrored(x, dx, self.width)]).sum();
        sum / steps.len() as f32
    }
}

fn mirrored(index: usize, step: isize, length: usize) -> usize {
    match index.checked_add_signed(step) {
        None => 1,
        Some(next) if next >= length => length - 2,
        Some(next) => next,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn demosaicing_keeps_a_plane_of_even_colour() {
        let (width, height) = (6, 4);
        let colour = [0.2_f32, 0.5, 0.8];
        let raw: Vec<f32> = (0..width * height).map(|i| colour[mosaic_channel(i % width, i / width)]).collect();
        let mosaic = Mosaic { raw: &raw, width, height };
        for y in 0..height {
            for x in 0..width {
                for (channel, &want) in colour.iter().enumerate() {
                    assert!((mosaic.interpolated(x, y, channel) - want).abs() < 1e-6, "{x} {y} {channel}");
                }
            }
        }
    }

    #[test]
    fn demosaicing_keeps_a_slope_inside() {
        let (width, height) = (8, 8);
        let slope = |x: usize, y: usize| 0.01 * x as f32 + 0.02 * y as f32;
        let raw: Vec<f32> = (0..width * height).map(|i| slope(i % width, i / width)).collect();
        let mosaic = Mosaic { raw: &raw, width, height };
        for (x, y) in (1..7).flat_map(|x| (1..7).map(move |y| (x, y))) {
            assert!((0..3).all(|channel| (mosaic.interpolated(x, y, channel) - slope(x, y)).abs() < 1e-6));
        }
    }

    /// sRGB of 0.5 linear is 188 (IEC 61966-2-1).
    #[test]
    fn the_tone_curve_is_srgb() {
        let curve = tone_curve(0.0);
        assert_eq!((curve[0], curve[32768], curve[65535]), (0, 188, 255));
    }

    #[test]
    fn read_out_clips_at_both_ends() {
        let sensor = Sensor { colour: SensorColour::Mono, noise: None, bits: 12, black_level: 0.0, white_balance: [1.0; 3] };
        assert!(read_out(&sensor, -0.2, 0.0).abs() < 1e-15 && (read_out(&sensor, 7.0, 0.0) - 1.0).abs() < 1e-15);
    }
}
