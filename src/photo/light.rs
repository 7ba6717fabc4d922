//! Full-resolution planes of light.

use rayon::prelude::*;

use super::{Light, LinearPhoto, Photo, Plane, Samples, noise};

/// Weights of red, green and blue in luminance (IEC 61966-2-1:1999, third decimal places of ITU-R BT.709).
pub const LUMINANCE: [f64; 3] = [0.2126, 0.7152, 0.0722];

impl Photo {
    /// One plane of light, the sum of `weights[c]` times channel c (a grey photo has one channel and ignores the weights).
    ///
    /// Weights that sum to 1 keep 1.0 as the level at which a white pixel clips. A pixel counts as clipped where any channel
    /// of non-zero weight clips.
    #[must_use]
    pub fn light(&self, weights: [f64; 3]) -> Light {
        let linear = self.linear();
        let mut value = vec![0.0; self.width * self.height];
        let mut clipped = vec![0; self.width * self.height];
        match &self.samples {
            Samples::U8(codes) => fill(&mut value, &mut clipped, codes, &linear, weights),
            Samples::U16(codes) => fill(&mut value, &mut clipped, codes, &linear, weights),
        }
        let plane = Plane { width: self.width, height: self.height, value };
        let noise = noise::of_cells(&plane.halved().halved(), 16.0);
        Light { width: self.width, height: self.height, value: plane.value, clipped, noise }
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
fn fill<T: Copy + Into<u16> + Sync>(value: &mut [f32], clipped: &mut [u8], codes: &[T], linear: &LinearPhoto, weights: [f64; 3]) {
    let channels = linear.channels();
    let weights = if channels == 1 { [1.0, 0.0, 0.0] } else { weights.map(|weight| weight as f32) };
    let used: Vec<usize> = (0..channels).filter(|&channel| weights[channel] != 0.0).collect();
    let clip_code = linear.clip_code();
    // The weights go into the tables, which leaves one look-up and one sum per sample.
    let tables = weights.map(|weight| linear.table().iter().map(|light| light * weight).collect::<Vec<f32>>());
    let tasks = value.par_chunks_mut(TASK_PX).zip(clipped.par_chunks_mut(TASK_PX)).zip(codes.par_chunks(TASK_PX * channels));
    tasks.for_each(|((value, clipped), codes)| {
        for ((value, clipped), pixel) in value.iter_mut().zip(clipped).zip(codes.chunks_exact(channels)) {
            for &channel in &used {
                let code: u16 = pixel[channel].into();
                *value += tables[channel][usize::from(code)];
                *clipped |= u8::from(code >= clip_code[channel]);
            }
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
    fn weights_pick_the_channel_and_its_clipping() {
        let photo = colour_photo();
        let red = photo.light([1.0, 0.0, 0.0]);
        assert!((red.value[7] - 1.0).abs() < 1e-6);
        assert_eq!(red.clipped[7], 1);
        let green = photo.light([0.0, 1.0, 0.0]);
        // sRGB code 128 is 0.2158605 (IEC 61966-2-1).
        assert!((green.value[7] - 0.215_860_5).abs() < 1e-6);
        assert_eq!(green.clipped[7], 0);
    }

    #[test]
    fn grey_is_luminance() {
        let light = colour_photo().grey();
        assert!((light.value[9] - (0.2126 + 0.7152 * 0.215_860_5)).abs() < 1e-6);
    }
}
