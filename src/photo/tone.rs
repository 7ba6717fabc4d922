//! Which tone curve the samples carry, and what undoes it.

use super::Samples;

/// How light was turned into codes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Curve {
    /// The sRGB curve (or another gamma, which differs little where spots are measured).
    Srgb,
    /// Proportional to light.
    Linear,
}

/// Linear light of an sRGB code value, both in 0..=1 (IEC 61966-2-1:1999, inverse transfer function).
pub(super) fn srgb_to_linear(code: f64) -> f64 {
    if code <= 0.04045 { code / 12.92 } else { ((code + 0.055) / 1.055).powf(2.4) }
}

/// Tone curve of an ICC profile, from its red or grey reproduction curve; `None` where it has neither.
///
/// ICC.1:2022, 7.3 (tag table), 10.6 (`curv`: count 0 is the identity, count 1 a gamma in u8Fixed8), 10.18 (`para`).
pub(super) fn of_profile(profile: &[u8]) -> Option<Curve> {
    let word = |at: usize| profile.get(at..at + 4).and_then(|b| b.try_into().ok()).map(u32::from_be_bytes);
    let count = word(128)?.min(100);
    let entry = (0..count as usize).map(|i| 132 + 12 * i).find(|&at| matches!(profile.get(at..at + 4), Some(b"rTRC" | b"kTRC")))?;
    let curve = word(entry + 4)? as usize;
    let is_identity = match profile.get(curve..curve + 4)? {
        b"curv" => match word(curve + 8)? {
            0 => true,
            1 => profile.get(curve + 12..curve + 14)? == [1, 0],
            _ => false,
        },
        b"para" => profile.get(curve + 8..curve + 10)? == [0, 0] && word(curve + 12)? == 0x0001_0000,
        _ => return None,
    };
    Some(if is_identity { Curve::Linear } else { Curve::Srgb })
}

/// Tone curve that a PNG states in its `sRGB` or `gAMA` chunk (PNG third edition, 11.3.2), `None` where it is silent.
pub(super) fn of_png_chunks(bytes: &[u8]) -> Option<Curve> {
    let mut at = 8;
    loop {
        let length = u32::from_be_bytes(bytes.get(at..at + 4)?.try_into().ok()?) as usize;
        match bytes.get(at + 4..at + 8)? {
            b"sRGB" => return Some(Curve::Srgb),
            b"gAMA" => {
                let gamma = u32::from_be_bytes(bytes.get(at + 8..at + 12)?.try_into().ok()?);
                return Some(if gamma >= 95_000 { Curve::Linear } else { Curve::Srgb });
            }
            b"IDAT" | b"IEND" => return None,
            _ => at = at.checked_add(length)?.checked_add(12)?,
        }
    }
}

/// Brings samples into the two forms of [`Samples`]: 8 bit sRGB-coded, 16 bit linear.
pub(super) fn settle((channels, samples): (usize, Samples), curve: Option<Curve>) -> (usize, Samples) {
    let samples = match (samples, curve) {
        (Samples::U8(codes), Some(Curve::Linear)) => Samples::U16(codes.into_iter().map(|code| u16::from(code) * 257).collect()),
        (Samples::U16(mut codes), Some(Curve::Srgb)) => {
            let table: Vec<u16> = (0..=u16::MAX).map(|code| to_u16(srgb_to_linear(f64::from(code) / 65535.0))).collect();
            codes.iter_mut().for_each(|code| *code = table[usize::from(*code)]);
            Samples::U16(codes)
        }
        (samples, _) => samples,
    };
    (channels, samples)
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range first")]
fn to_u16(share: f64) -> u16 {
    (share.clamp(0.0, 1.0) * 65535.0).round() as u16
}

#[cfg(test)]
mod tests {
    use super::{Curve, of_png_chunks, of_profile, srgb_to_linear};

    /// IEC 61966-2-1:1999 evaluated independently to nine digits.
    #[test]
    fn srgb_curve_matches_published_values() {
        let table = [(0, 0.0), (1, 3.0353e-4), (10, 3.03527e-3), (11, 3.34654e-3), (64, 0.051_269_46), (128, 0.215_860_50)];
        for (code, light) in table.into_iter().chain([(188, 0.502_886_46), (200, 0.577_580_44), (254, 0.991_102_10)]) {
            let seen = srgb_to_linear(f64::from(code) / 255.0);
            // The printed values carry 5 to 8 digits.
            assert!((seen - light).abs() < 1e-8 + 1e-6 * light + if code == 1 { 1e-8 } else { 0.0 }, "{code}: {seen} {light}");
        }
    }

    fn profile(curve: &[u8]) -> Vec<u8> {
        let mut bytes = vec![0; 128];
        bytes.extend([0, 0, 0, 1]);
        bytes.extend(b"rTRC");
        bytes.extend([0, 0, 0, 144, 0, 0, 0, 14]);
        bytes.extend(curve);
        bytes
    }

    #[test]
    fn profile_with_identity_curve_is_linear() {
        assert_eq!(of_profile(&profile(b"curv\0\0\0\0\0\0\0\0")), Some(Curve::Linear));
        assert_eq!(of_profile(&profile(b"curv\0\0\0\0\0\0\0\x01\x01\0")), Some(Curve::Linear));
        assert_eq!(of_profile(&profile(b"curv\0\0\0\0\0\0\0\x01\x02\x33")), Some(Curve::Srgb));
        assert_eq!(of_profile(b"short"), None);
    }

    #[test]
    fn png_chunk_states_the_curve() {
        let mut bytes = b"\x89PNG\r\n\x1a\n\0\0\0\0abcd....".to_vec();
        bytes.extend(b"\0\0\0\x04gAMA\0\x01\x86\xa0....");
        assert_eq!(of_png_chunks(&bytes), Some(Curve::Linear));
        assert_eq!(of_png_chunks(&bytes[..20]), None);
    }
}
