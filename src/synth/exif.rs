//! The EXIF segment of a JPEG file, written by hand: a little-endian TIFF with two directories.

use super::{
    pixels::{to_u16, to_u32},
    scene::{ExifData, Scene},
};

/// One directory entry of at most two values.
enum Field {
    Short(u16),
    Long(u32),
    /// Numerator and denominator.
    Rational(u32, u32),
    /// Four bytes as they are.
    Undefined([u8; 4]),
}

/// Header (8 bytes), first directory of two entries (2 + 24 + 4).
const EXIF_DIRECTORY: u32 = 8 + 30;

/// Diagonal of the 35 mm frame (36 mm × 24 mm), m.
const FRAME_DIAGONAL_M: f64 = 0.043_267;

/// TIFF payload (without the `Exif` mark in front): orientation, exposure, f-number, ISO speed, focal length, its 35-mm equivalent.
///
/// The equivalent is `f_px / photo diagonal in px × 43.267 mm`, rounded to whole millimetres as the standard has it.
/// Source: EXIF 2.32 (CIPA DC-008), sections 4.6.4 to 4.6.5; TIFF 6.0.
pub(super) fn tiff(scene: &Scene, exif: &ExifData) -> Vec<u8> {
    let diagonal_px = f64::from(scene.file.width_px).hypot(f64::from(scene.file.height_px));
    let equivalent_mm = scene.camera.lens.focal_px / diagonal_px * FRAME_DIAGONAL_M * 1e3;
    let mut bytes = vec![b'I', b'I', 42, 0, 8, 0, 0, 0];
    write_directory(&mut bytes, &[(0x0112, Field::Short(u16::from(exif.orientation))), (0x8769, Field::Long(EXIF_DIRECTORY))]);
    let (numerator, denominator) = exposure(exif.exposure_s);
    write_directory(
        &mut bytes,
        &[
            (0x829a, Field::Rational(numerator, denominator)),
            (0x829d, Field::Rational(to_u32(exif.f_number * 10.0), 10)),
            (0x8827, Field::Short(exif.iso)),
            (0x9000, Field::Undefined(*b"0232")),
            (0x920a, Field::Rational(to_u32(exif.focal_length_m * 1e5), 100)),
            (0xa405, Field::Short(to_u16(equivalent_mm))),
        ],
    );
    bytes
}

/// `1/60 s` as photographers write it, longer times in tenths.
fn exposure(exposure_s: f64) -> (u32, u32) {
    if exposure_s < 0.5 { (1, to_u32(1.0 / exposure_s)) } else { (to_u32(exposure_s * 10.0), 10) }
}

fn write_directory(bytes: &mut Vec<u8>, entries: &[(u16, Field)]) {
    let count = u16::try_from(entries.len()).unwrap_or(0);
    bytes.extend(count.to_le_bytes());
    let mut beyond = u32::try_from(bytes.len() + 12 * entries.len() + 4).unwrap_or(0);
    let mut tail = Vec::new();
    for (tag, field) in entries {
        bytes.extend(tag.to_le_bytes());
        let (kind, count, value): (u16, u32, [u8; 4]) = match *field {
            Field::Short(value) => (3, 1, u32::from(value).to_le_bytes()),
            Field::Long(value) => (4, 1, value.to_le_bytes()),
            Field::Undefined(value) => (7, 4, value),
            Field::Rational(numerator, denominator) => {
                tail.extend(numerator.to_le_bytes());
                tail.extend(denominator.to_le_bytes());
                beyond += 8;
                (5, 1, (beyond - 8).to_le_bytes())
            }
        };
        bytes.extend(kind.to_le_bytes());
        bytes.extend(count.to_le_bytes());
        bytes.extend(value);
    }
    bytes.extend(0_u32.to_le_bytes());
    bytes.extend(tail);
}
