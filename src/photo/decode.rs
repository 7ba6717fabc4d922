//! From bytes to an upright [`Photo`], with every refusal said in its own words.

use std::io::Cursor;

use image::{DynamicImage, ImageDecoder, ImageError, Limits, codecs, error::ImageFormatHint};

use super::{Photo, PhotoError, Samples, jpeg_walk, metadata, orient, tone};

/// Most pixels that are decoded, in megapixels; progressive JPEG, which needs its coefficients in memory, is held to half of it.
pub const MAX_MEGA_PX: u64 = 200;
/// Most bytes that a decoder may take for its output.
const MAX_DECODED_BYTES: u64 = 640 << 20;
/// Shortest side of a picture in which anything can be measured, px.
pub const MIN_SIDE_PX: u32 = 32;

#[derive(Clone, Copy)]
enum Format {
    Jpeg,
    Png,
    Tiff,
}

impl Format {
    fn name(self) -> &'static str {
        match self {
            Self::Jpeg => "JPEG",
            Self::Png => "PNG",
            Self::Tiff => "TIFF",
        }
    }
}

/// Decodes a JPEG, PNG or TIFF photo; the kind is read from the content, never from a name.
///
/// 8 and 16 bit; grey, RGB, with or without alpha (dropped), palette (PNG). The EXIF orientation is applied, so
/// pixel (0, 0) is the top left corner of the picture as displayed.
///
/// # Errors
/// Every reason of [`PhotoError`]. A JPEG that ends before its end marker is refused although a lenient decoder
/// would fill the rest with grey. Limits against decompression bombs: [`MAX_MEGA_PX`] and 640 MiB of samples.
pub fn decode(bytes: &[u8]) -> Result<Photo, PhotoError> {
    let format = sniff(bytes)?;
    let exif = metadata::read(bytes);
    let limit_mega_px = match format {
        Format::Jpeg => jpeg_limit_mega_px(bytes)?,
        _ => MAX_MEGA_PX,
    };
    let reader = Cursor::new(bytes);
    let fail = |error| explain(error, format, bytes.len());
    let (picture, curve) = match format {
        Format::Jpeg => read(codecs::jpeg::JpegDecoder::new(reader).map_err(fail)?, format, limit_mega_px, bytes),
        Format::Png => read(codecs::png::PngDecoder::with_limits(reader, limits()).map_err(fail)?, format, limit_mega_px, bytes),
        Format::Tiff => read(codecs::tiff::TiffDecoder::new(reader).map_err(fail)?, format, limit_mega_px, bytes),
    }?;
    let (width, height) = (picture.width() as usize, picture.height() as usize);
    let (channels, samples) = tone::settle(samples_of(picture, format)?, curve);
    Ok(orient::upright(Photo { width, height, channels, samples, exif }))
}

fn limits() -> Limits {
    let mut limits = Limits::default();
    limits.max_alloc = Some(MAX_DECODED_BYTES);
    limits
}

fn read<D: ImageDecoder>(
    mut decoder: D,
    format: Format,
    limit_mega_px: u64,
    bytes: &[u8],
) -> Result<(DynamicImage, Option<tone::Curve>), PhotoError> {
    let (width, height) = decoder.dimensions();
    let pixels = u64::from(width) * u64::from(height);
    if pixels > limit_mega_px * 1_000_000 || decoder.total_bytes() > MAX_DECODED_BYTES {
        return Err(PhotoError::TooLarge { width, height, limit_mega_px });
    }
    if width < MIN_SIDE_PX || height < MIN_SIDE_PX {
        return Err(PhotoError::TooSmall { width, height, min_px: MIN_SIDE_PX });
    }
    let fail = |error| explain(error, format, bytes.len());
    decoder.set_limits(limits()).map_err(fail)?;
    let profile = decoder.icc_profile().unwrap_or_default();
    let curve = match (profile, format) {
        (Some(profile), _) => tone::of_profile(&profile),
        (None, Format::Png) => tone::of_png_chunks(bytes),
        (None, _) => None,
    };
    DynamicImage::from_decoder(decoder).map(|picture| (picture, curve)).map_err(fail)
}

fn jpeg_limit_mega_px(bytes: &[u8]) -> Result<u64, PhotoError> {
    let walk = jpeg_walk::walk(bytes);
    if !walk.complete {
        return Err(PhotoError::CutOff { format: "JPEG", bytes: bytes.len() });
    }
    Ok(if walk.progressive { MAX_MEGA_PX / 2 } else { MAX_MEGA_PX })
}

fn sniff(bytes: &[u8]) -> Result<Format, PhotoError> {
    match bytes {
        [] => Err(PhotoError::Empty),
        [0xFF, 0xD8, 0xFF, ..] => Ok(Format::Jpeg),
        [0x89, b'P', b'N', b'G', b'\r', b'\n', 0x1A, b'\n', ..] => Ok(Format::Png),
        [b'I', b'I', 42, 0, ..] | [b'M', b'M', 0, 42, ..] | [b'I', b'I', 43, 0, ..] | [b'M', b'M', 0, 43, ..] => Ok(Format::Tiff),
        _ => Err(PhotoError::NotAPhoto { looks_like: looks_like(bytes).to_owned() }),
    }
}

/// What a file that is no photo is, so that the user sees which one was taken by mistake.
fn looks_like(bytes: &[u8]) -> &'static str {
    let head = &bytes[..bytes.len().min(512)];
    match head {
        [b'%', b'P', b'D', b'F', ..] => "a PDF",
        [b'G', b'I', b'F', b'8', ..] => "a GIF",
        [b'B', b'M', ..] => "a BMP",
        [b'R', b'I', b'F', b'F', _, _, _, _, b'W', b'E', b'B', b'P', ..] => "a WebP picture",
        [_, _, _, _, b'f', b't', b'y', b'p', ..] => "a HEIF/AVIF picture or a film",
        [b'P', b'K', 3, 4, ..] => "a ZIP archive",
        _ if head.iter().all(|&byte| byte == b'\t' || byte == b'\n' || byte == b'\r' || byte >= 0x20) => "a text",
        _ => "of an unknown kind",
    }
}

fn samples_of(picture: DynamicImage, format: Format) -> Result<(usize, Samples), PhotoError> {
    Ok(match picture {
        DynamicImage::ImageLuma8(p) => (1, Samples::U8(p.into_raw())),
        DynamicImage::ImageLumaA8(p) => (1, Samples::U8(without_alpha(p.into_raw(), 2))),
        DynamicImage::ImageRgb8(p) => (3, Samples::U8(p.into_raw())),
        DynamicImage::ImageRgba8(p) => (3, Samples::U8(without_alpha(p.into_raw(), 4))),
        DynamicImage::ImageLuma16(p) => (1, Samples::U16(p.into_raw())),
        DynamicImage::ImageLumaA16(p) => (1, Samples::U16(without_alpha(p.into_raw(), 2))),
        DynamicImage::ImageRgb16(p) => (3, Samples::U16(p.into_raw())),
        DynamicImage::ImageRgba16(p) => (3, Samples::U16(without_alpha(p.into_raw(), 4))),
        _ => return Err(PhotoError::UnsupportedForm { format: format.name(), reason: "floating-point samples".to_owned() }),
    })
}

/// Drops every `stride`-th sample, in place: a bomb-sized picture must not be held twice.
fn without_alpha<T: Copy>(mut samples: Vec<T>, stride: usize) -> Vec<T> {
    let pixels = samples.len() / stride;
    let kept = stride - 1;
    for pixel in 0..pixels {
        samples.copy_within(pixel * stride..pixel * stride + kept, pixel * kept);
    }
    samples.truncate(pixels * kept);
    samples
}

fn explain(error: ImageError, format: Format, bytes: usize) -> PhotoError {
    let format = format.name();
    match error {
        ImageError::IoError(io) if io.kind() == std::io::ErrorKind::UnexpectedEof => PhotoError::CutOff { format, bytes },
        ImageError::Unsupported(what) if !matches!(what.format_hint(), ImageFormatHint::Unknown) => {
            PhotoError::UnsupportedForm { format, reason: what.to_string() }
        }
        ImageError::Limits(what) => PhotoError::UnsupportedForm { format, reason: format!("more memory than allowed ({what})") },
        other => {
            let reason = other.to_string();
            let at_end = ["end of file", "unexpected eof", "fill whole buffer", "exhausted data"];
            if at_end.iter().any(|words| reason.to_lowercase().contains(words)) {
                PhotoError::CutOff { format, bytes }
            } else {
                PhotoError::Damaged { format, reason }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use std::io::Cursor;

    use image::{ExtendedColorType, ImageEncoder, codecs};

    use super::{PhotoError, decode};
    use crate::photo::{Photo, Samples};

    fn jpeg(width: u32, height: u32) -> Vec<u8> {
        let mut bytes = Vec::new();
        let pixels: Vec<u8> = (0..width * height * 3).map(|i| (i * 7 % 251) as u8).collect();
        codecs::jpeg::JpegEncoder::new_with_quality(&mut bytes, 90).write_image(&pixels, width, height, ExtendedColorType::Rgb8).unwrap();
        bytes
    }

    fn png(pixels: &[u8], side: u32, form: ExtendedColorType) -> Photo {
        let mut bytes = Vec::new();
        codecs::png::PngEncoder::new(&mut bytes).write_image(pixels, side, side, form).unwrap();
        decode(&bytes).unwrap()
    }

    #[test]
    fn every_shortened_jpeg_is_refused() {
        let whole = jpeg(40, 40);
        assert_eq!(decode(&whole).unwrap().width, 40);
        for length in (3..whole.len()).step_by(whole.len() / 40) {
            let error = decode(&whole[..length]).unwrap_err();
            assert!(matches!(error, PhotoError::CutOff { .. }), "{length}: {error}");
        }
    }

    #[test]
    fn shortened_png_and_tiff_are_refused() {
        let pixels = vec![77; 64 * 64];
        let mut png = Vec::new();
        codecs::png::PngEncoder::new(&mut png).write_image(&pixels, 64, 64, ExtendedColorType::L8).unwrap();
        let mut tiff = Cursor::new(Vec::new());
        codecs::tiff::TiffEncoder::new(&mut tiff).write_image(&pixels, 64, 64, ExtendedColorType::L8).unwrap();
        for whole in [png, tiff.into_inner()] {
            assert_eq!(decode(&whole).unwrap().height, 64);
            assert!(decode(&whole[..whole.len() / 2]).is_err());
        }
    }

    #[test]
    fn refusals_name_what_is_there() {
        assert_eq!(decode(b"").unwrap_err(), PhotoError::Empty);
        assert!(decode(b"throw = 812 mm\n").unwrap_err().to_string().contains("a text"));
        assert!(decode(b"%PDF-1.7").unwrap_err().to_string().contains("a PDF"));
        assert!(matches!(decode(&jpeg(1, 1)).unwrap_err(), PhotoError::TooSmall { width: 1, .. }));
    }

    #[test]
    fn alpha_is_dropped_and_depth_kept() {
        let rgba: Vec<u8> = [1, 2, 3, 9].repeat(32 * 32);
        let photo = png(&rgba, 32, ExtendedColorType::Rgba8);
        let Samples::U8(samples) = photo.samples else { panic!("depth changed") };
        assert_eq!((photo.channels, samples.len(), &samples[3..6]), (3, 32 * 32 * 3, &[1, 2, 3][..]));
        let grey = png(&0x1234_u16.to_ne_bytes().repeat(32 * 32), 32, ExtendedColorType::L16);
        let Samples::U16(samples) = grey.samples else { panic!("depth changed") };
        assert_eq!((grey.channels, samples[5]), (1, 0x1234));
    }

    #[test]
    fn huge_picture_is_refused_before_it_is_decoded() {
        // A TIFF directory of 50 000 x 50 000 grey pixels and no data.
        let mut bytes = b"II*\0\x08\0\0\0\x08\0".to_vec();
        for (tag, kind, value) in [(256_u16, 4_u16, 50_000_u32), (257, 4, 50_000), (258, 3, 8), (259, 3, 1), (262, 3, 1), (273, 4, 8)] {
            bytes.extend(tag.to_le_bytes().into_iter().chain(kind.to_le_bytes()).chain(1_u32.to_le_bytes()).chain(value.to_le_bytes()));
        }
        for (tag, kind, value) in [(278_u16, 4_u16, 50_000_u32), (279, 4, 10)] {
            bytes.extend(tag.to_le_bytes().into_iter().chain(kind.to_le_bytes()).chain(1_u32.to_le_bytes()).chain(value.to_le_bytes()));
        }
        bytes.extend([0; 4]);
        assert!(matches!(decode(&bytes).unwrap_err(), PhotoError::TooLarge { width: 50_000, .. }));
    }
}
