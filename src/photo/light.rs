//! Full-resolution planes of light.

use rayon::prelude::*;

use super::{Light, LinearPhoto, Photo, Plane, Samples, noise};

/// Weights of red, green and blue in luminance (IEC 61966-2-1:1999, third decimal places of ITU-R BT.709).
pub const LUMINANCE: [f64; 3] = [0.2126, 0.7152, 0.0722];

impl Photo {
    /// One plane of light, the sum of `weights[c]` times channel c (a grey photo has one channel and ignores the weights).
    ///
    /// Weights that sum to 1 keep 1.0 as the level at which a white pixel clips.
    #[must_use]
    pub fn light(&self, weights: [f64; 3]) -> Light {
        let linear = self.linear();
        let mut value = vec![0.0; self.width * self.height];
        match &self.samples {
            Samples::U8(codes) => fill(&mut value, codes, &linear, weights),
            Samples::U16(codes) => fill(&mut value, codes, &linear, weights),
        }
        let plane = Plane { width: self.width, height: self.height, value };
        let noise = noise::of_cells(&plane.halved().halved(), 16.0);
        Light { width: self.width, height: self.height, value: plane.value, noise }
    }

    /// Luminance: the plane in which printed dots are dark.
    #[must_use]
    pub fn grey(&self) -> Light {
        self.light(LUMINANCE)
    }
}

/// Pixels that one task takes; large enough to hide its start, small enough for two cores to share a small photo.
const TASK_PX: usize = 1 << 15;

#[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
fn fill<T: Copy + Into<u16> + Sync>(value: &mut [f32], codes: &[T], linear: &LinearPhoto, weights: [f64; 3]) {
    // The weights go into the tables, which leaves one look-up and one sum per sample.
    let weighted = |weight: f64| linear.table().iter().map(|light| light * weight as f32).collect::<Vec<f32>>();
    if linear.channels() == 1 {
        fill_pixels(value, codes, &[weighted(1.0)]);
    } else {
        fill_pixels(value, codes, &weights.map(weighted));
    }
}

fn fill_pixels<T: Copy + Into<u16> + Sync, const CHANNELS: usize>(value: &mut [f32], codes: &[T], tables: &[Vec<f32>; CHANNELS]) {
    let tasks = value.par_chunks_mut(TASK_PX).zip(codes.par_chunks(TASK_PX * CHANNELS));
    tasks.for_each(|(value, codes)| {
        for (value, pixel) in value.iter_mut().zip(codes.as_chunks::<CHANNELS>().0) {
            *value = (0..CHANNELS).map(|channel| tables[channel][usize::from(pixel[channel].into())]).sum();
        }
    });
}

#[cfg(test)]
mod tests {
    use crate::photo::{Exif, Photo, Samples};

    fn colour_photo() -> Photo {
        let samples = [255, 128, 0].repeat(64 * 64);
        Photo { width: 64, height: 64, channels: 3, samples: Samples::U8(samples), exif: Exif::default() }
    }

    #[test]
    fn weights_pick_the_channel() {
        let photo = colour_photo();
        let red = photo.light([1.0, 0.0, 0.0]);
        assert!((red.value[7] - 1.0).abs() < 1e-6);
        let green = photo.light([0.0, 1.0, 0.0]);
        // sRGB code 128 is 0.2158605 (IEC 61966-2-1).
        assert!((green.value[7] - 0.215_860_5).abs() < 1e-6);
    }

    #[test]
    fn grey_is_luminance() {
        let light = colour_photo().grey();
        assert!((light.value[9] - (0.2126 + 0.7152 * 0.215_860_5)).abs() < 1e-6);
    }
}
