//! The few conversions between real numbers and stored ones, each with its range.

/// Single precision is enough for light: 24 bits over a clipping level of 1.
#[expect(clippy::cast_possible_truncation, reason = "the loss of digits is what is asked for")]
pub(super) fn single(value: f64) -> f32 {
    value as f32
}

/// Rounds to 0..=255.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range first; NaN becomes 0")]
pub(super) fn to_u8(value: f64) -> u8 {
    value.round().clamp(0.0, 255.0) as u8
}

/// Rounds to 0..=65535.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range first; NaN becomes 0")]
pub(super) fn to_u16(value: f64) -> u16 {
    value.round().clamp(0.0, 65535.0) as u16
}

/// Rounds to 0..=4294967295.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range first; NaN becomes 0")]
pub(super) fn to_u32(value: f64) -> u32 {
    value.round().clamp(0.0, f64::from(u32::MAX)) as u32
}

/// Largest whole number not above `value`, clamped to 0..=limit.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range first; NaN becomes 0")]
pub(super) fn floor_index(value: f64, limit: usize) -> usize {
    value.floor().clamp(0.0, limit as f64) as usize
}

/// Smallest whole number not below `value`, clamped to 0..=100000.
#[expect(clippy::cast_possible_truncation, reason = "clamped to the range first; NaN becomes 0")]
pub(super) fn ceil_to_i32(value: f64) -> i32 {
    value.ceil().clamp(0.0, 1e5) as i32
}

/// Rows or columns that a stretch around `centre` covers, cut to 0..length.
pub(super) fn covered(centre: f64, reach: f64, length: usize) -> std::ops::Range<usize> {
    floor_index(centre - reach, length)..floor_index(centre + reach + 1.0, length)
}
