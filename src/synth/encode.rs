//! The bytes of a photo file.

use super::{
    SynthError, exif,
    render::RenderedPhoto,
    scene::{FileKind, Scene},
};
use crate::photo::Samples;
use image::{
    DynamicImage, ImageBuffer, ImageEncoder, ImageFormat,
    codecs::jpeg::JpegEncoder,
    error::{ImageError, ParameterError, ParameterErrorKind},
    metadata::Orientation,
};

/// Encodes a rendered photo as its scene says: JPEG with EXIF data, or 16-bit PNG.
///
/// # Errors
/// When the image encoder refuses, which a checked scene does not cause.
pub fn encode(scene: &Scene, rendered: &RenderedPhoto) -> Result<Vec<u8>, SynthError> {
    let mut image = image_of(rendered).ok_or_else(|| ImageError::Parameter(ParameterError::from_kind(ParameterErrorKind::DimensionMismatch)))?;
    let mut bytes = Vec::new();
    match scene.file.kind {
        FileKind::Png16 => image.write_to(&mut std::io::Cursor::new(&mut bytes), ImageFormat::Png)?,
        FileKind::Jpeg { quality, .. } => {
            if let Some(exif) = &scene.file.exif {
                image.apply_orientation(undoing(exif.orientation));
            }
            JpegEncoder::new_with_quality(&mut bytes, quality).write_image(image.as_bytes(), image.width(), image.height(), image.color().into())?;
            if let Some(exif) = &scene.file.exif {
                bytes = with_exif(&bytes, &exif::tiff(scene, exif));
            }
        }
    }
    Ok(bytes)
}

/// What to do to an upright photo so that the tag sets it upright again.
fn undoing(orientation: u8) -> Orientation {
    let inverse = match orientation {
        6 => 8,
        8 => 6,
        own => own,
    };
    Orientation::from_exif(inverse).unwrap_or(Orientation::NoTransforms)
}

fn image_of(rendered: &RenderedPhoto) -> Option<DynamicImage> {
    let photo = &rendered.photo;
    let (width, height) = (u32::try_from(photo.width).ok()?, u32::try_from(photo.height).ok()?);
    Some(match (&photo.samples, photo.channels) {
        (Samples::U8(samples), 1) => DynamicImage::ImageLuma8(ImageBuffer::from_raw(width, height, samples.clone())?),
        (Samples::U8(samples), _) => DynamicImage::ImageRgb8(ImageBuffer::from_raw(width, height, samples.clone())?),
        (Samples::U16(samples), 1) => DynamicImage::ImageLuma16(ImageBuffer::from_raw(width, height, samples.clone())?),
        (Samples::U16(samples), _) => DynamicImage::ImageRgb16(ImageBuffer::from_raw(width, height, samples.clone())?),
    })
}

/// Puts an APP1 segment behind the start marker of a JPEG file.
fn with_exif(jpeg: &[u8], tiff: &[u8]) -> Vec<u8> {
    const MARK: &[u8] = b"Exif\0\0";
    let length = u16::try_from(2 + MARK.len() + tiff.len()).unwrap_or(u16::MAX);
    let (start, rest) = jpeg.split_at(2);
    [start, &[0xff, 0xe1], &length.to_be_bytes(), MARK, tiff, rest].concat()
}
