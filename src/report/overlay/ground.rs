//! The photo as a dim grey ground, tones lifted so that faint spots show beside bright ones.

use image::{Rgb, RgbImage};

use super::canvas::{index, level};
use crate::photo::{Photo, Samples};

/// Grey of the brightest pixel: marks in light colours still stand out.
const BRIGHTEST: f64 = 165.0;
/// Grey of the darkest pixel.
const DARKEST: f64 = 14.0;
/// Steps between greys: noise in finer steps would make the PNG several times as large and show nothing more.
const STEP: f64 = 8.0;
/// Pixels that the tone curve is taken from.
const SAMPLED: usize = 400_000;

/// The photo in grey, each pixel repeated `enlarge` times in both directions.
pub(super) fn ground(photo: &Photo, enlarge: u32) -> RgbImage {
    let enlarge = enlarge.max(1);
    let tone = Tone::of(photo);
    let size = |side: usize| u32::try_from(side).unwrap_or(0).saturating_mul(enlarge);
    let curve = tone.table();
    RgbImage::from_fn(size(photo.width), size(photo.height), |x, y| {
        let (x, y) = (usize::try_from(x / enlarge).unwrap_or(0), usize::try_from(y / enlarge).unwrap_or(0));
        let grey = curve.get(usize::from(stored(photo, y * photo.width + x))).copied().unwrap_or(0);
        Rgb([grey; 3])
    })
}

/// Brightest channel of a pixel as stored, 0 where the samples end early. A laser often fills one channel only.
fn stored(photo: &Photo, pixel: usize) -> u16 {
    let channels = pixel * photo.channels..(pixel + 1) * photo.channels;
    match &photo.samples {
        Samples::U8(samples) => samples.get(channels).and_then(|values| values.iter().max()).map_or(0, |&value| u16::from(value)),
        Samples::U16(samples) => samples.get(channels).and_then(|values| values.iter().max()).copied().unwrap_or(0),
    }
}

/// Curve from stored level to grey: linear in the noise of the ground, logarithmic above it.
struct Tone {
    black: f64,
    knee: f64,
    white: f64,
}

impl Tone {
    fn of(photo: &Photo) -> Self {
        let pixels = photo.width * photo.height;
        let mut levels: Vec<u16> = (0..pixels).step_by((pixels / SAMPLED).max(1)).map(|pixel| stored(photo, pixel)).collect();
        levels.sort_unstable();
        let at = |share: f64| {
            let last = u32::try_from(levels.len().saturating_sub(1)).unwrap_or(u32::MAX);
            let place = usize::try_from(index(share * f64::from(last), last)).unwrap_or(0);
            levels.get(place).map_or(0.0, |&level| f64::from(level))
        };
        let (middle, spread, white) = (at(0.5), (at(0.84) - at(0.5)).max(1.0), at(0.9999));
        Self { black: middle - 1.5 * spread, knee: 3.0 * spread, white: white.max(middle + 1.0) }
    }

    /// Grey for every level that can be stored.
    fn table(&self) -> Vec<u8> {
        let full = ((self.white - self.black) / self.knee).asinh();
        let grey = |stored: u16| {
            let lifted = ((f64::from(stored) - self.black).max(0.0) / self.knee).asinh() / full;
            level(DARKEST + STEP * ((BRIGHTEST - DARKEST) * lifted.clamp(0.0, 1.0) / STEP).round())
        };
        (0..=u16::MAX).map(grey).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::photo::Exif;

    fn photo(samples: Samples) -> Photo {
        Photo { width: 4, height: 2, channels: 1, samples, exif: Exif::default() }
    }

    #[test]
    fn brighter_stays_brighter_and_below_the_marks() {
        let image = ground(&photo(Samples::U16(vec![0, 10, 20, 30, 300, 3000, 30_000, 60_000])), 1);
        let greys: Vec<u8> = image.pixels().map(|pixel| pixel.0[0]).collect();
        assert!(greys.is_sorted(), "{greys:?}");
        assert!(greys.iter().all(|&grey| f64::from(grey) <= BRIGHTEST + STEP), "{greys:?}");
    }

    #[test]
    fn enlarged_flat_and_short_photos() {
        assert_eq!(ground(&photo(Samples::U8(vec![7; 8])), 3).dimensions(), (12, 6));
        assert_eq!(ground(&photo(Samples::U8(vec![7; 3])), 1).dimensions(), (4, 2));
    }
}
