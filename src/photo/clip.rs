//! The code at and above which a channel counts as clipped.

use rayon::prelude::*;

use super::{Photo, Samples};

/// Share of the range within which JPEG ringing keeps the samples of a clipped plateau.
const PLATEAU_DEPTH: f64 = 0.02;
/// Fewest samples that make a plateau.
const PLATEAU_MIN_SAMPLES: usize = 12;
/// A plateau is less than this part (one fourth) of the photo; more is a flat picture, not a clipped one.
const PLATEAU_MAX_SHARE: usize = 4;

/// Clip code per channel (a grey photo repeats its one channel).
///
/// Where the channel reaches the top of the file's range the code is 2 % below that; where it stops short of it, the samples
/// near the channel's own maximum are counted: a plateau holds several times more of them than the slice just below it, the
/// top of an unclipped spot holds about as many. A channel that does neither clips nowhere (its code is then the file's maximum).
pub(super) fn codes(photo: &Photo) -> [u16; 3] {
    match &photo.samples {
        Samples::U8(codes) => of_samples(codes, photo.channels, u16::from(u8::MAX)),
        Samples::U16(codes) => of_samples(codes, photo.channels, u16::MAX),
    }
}

fn of_samples<T: Copy + Into<u16> + Ord + Default + Send + Sync>(samples: &[T], channels: usize, full: u16) -> [u16; 3] {
    let top = maxima(samples, channels);
    let mut codes = [full; 3];
    for channel in 0..channels.min(3) {
        let top: u16 = top[channel].into();
        codes[channel] = if f64::from(top) >= f64::from(full) * (1.0 - PLATEAU_DEPTH) {
            below(full, f64::from(full))
        } else {
            plateau(samples, channels, channel, top).unwrap_or(full)
        };
    }
    if channels == 1 { [codes[0]; 3] } else { codes }
}

fn maxima<T: Copy + Ord + Default + Send + Sync>(samples: &[T], channels: usize) -> [T; 3] {
    // Blocks of 48 samples hold whole pixels of one or three channels, and compare side by side in the processor.
    let of_chunk = |chunk: &[T]| {
        let (blocks, rest) = chunk.as_chunks::<48>();
        let mut block_top = [T::default(); 48];
        for block in blocks {
            block_top.iter_mut().zip(block).for_each(|(top, &sample)| *top = sample.max(*top));
        }
        let mut top = [T::default(); 3];
        for (at, &sample) in block_top.iter().chain(rest).enumerate() {
            let top = &mut top[at % channels.min(3)];
            *top = sample.max(*top);
        }
        top
    };
    let join = |a: [T; 3], b: [T; 3]| [a[0].max(b[0]), a[1].max(b[1]), a[2].max(b[2])];
    samples.par_chunks(3 << 16).map(of_chunk).reduce(|| [T::default(); 3], join)
}

fn plateau<T: Copy + Into<u16> + Sync>(samples: &[T], channels: usize, channel: usize, top: u16) -> Option<u16> {
    let edge = below(top, f64::from(top));
    let lower = below(edge, f64::from(top));
    let count = |chunk: &[T]| {
        let codes = chunk.iter().skip(channel).step_by(channels).map(|&sample| sample.into());
        codes.fold((0, 0), |(high, low), code| match code {
            code if code >= edge => (high + 1, low),
            code if code >= lower => (high, low + 1),
            _ => (high, low),
        })
    };
    // Chunks hold whole pixels, for one and for three channels.
    let (high, low) = samples.par_chunks(3 << 16).map(count).reduce(|| (0, 0), |a, b| (a.0 + b.0, a.1 + b.1));
    let is_rare = high < samples.len() / channels / PLATEAU_MAX_SHARE;
    (high >= PLATEAU_MIN_SAMPLES && high > 3 * low && is_rare).then_some(edge)
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a share of a u16")]
fn below(code: u16, range: f64) -> u16 {
    code.saturating_sub((range * PLATEAU_DEPTH).ceil() as u16)
}

#[cfg(test)]
mod tests {
    use super::of_samples;

    #[test]
    fn full_range_clips_just_below_its_maximum() {
        assert_eq!(of_samples(&[3u8, 255, 7, 9], 1, 255), [249; 3]);
    }

    #[test]
    fn sensor_plateau_below_the_file_maximum_is_found() {
        let mut samples: Vec<u16> = (0..4000).collect();
        samples.extend([4095; 400]);
        // 2 % below 4095.
        assert_eq!(of_samples(&samples, 1, u16::MAX)[0], 4095 - 82);
    }

    #[test]
    fn smooth_top_is_no_plateau() {
        let samples: Vec<u16> = (0..4095).collect();
        assert_eq!(of_samples(&samples, 1, u16::MAX)[0], u16::MAX);
    }

    #[test]
    fn channels_are_judged_apart() {
        let mut samples = vec![10u8, 255, 20];
        for _ in 0..20 {
            samples.extend([100, 200, 230]);
            samples.extend([9; 12]);
        }
        assert_eq!(of_samples(&samples, 3, 255), [98, 249, 225]);
    }
}
