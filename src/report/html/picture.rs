//! The overlay as a picture small enough to be mailed within a page.

use image::{
    ImageError, RgbImage,
    codecs::jpeg::JpegEncoder,
    imageops::{FilterType, resize},
};

/// Widest picture in a page, px: 170 mm of paper at 240 dots per inch.
const WIDEST: u32 = 1600;

/// Quality at which the thin lines of the overlay stay clean.
const QUALITY: u8 = 88;

/// A picture ready for embedding.
#[derive(Debug, Clone, Copy)]
pub struct Picture<'a> {
    /// The file.
    pub bytes: &'a [u8],
    /// Its media type, such as `image/png`.
    pub media_type: &'static str,
}

/// A picture that owns its bytes.
#[derive(Debug, Clone)]
pub struct Embeddable {
    bytes: Vec<u8>,
}

impl Embeddable {
    /// As the report takes it.
    #[must_use]
    pub fn as_picture(&self) -> Picture<'_> {
        Picture { bytes: &self.bytes, media_type: "image/jpeg" }
    }
}

/// The overlay for a page: at most 1600 px wide, JPEG.
///
/// # Errors
/// When the picture has no pixels.
pub fn embeddable(overlay: RgbImage) -> Result<Embeddable, ImageError> {
    let [width, height] = [overlay.width(), overlay.height()];
    let fitting = if width > WIDEST {
        let height = u32::try_from(u64::from(height) * u64::from(WIDEST) / u64::from(width)).unwrap_or(1).max(1);
        resize(&overlay, WIDEST, height, FilterType::Triangle)
    } else {
        overlay
    };
    let mut bytes = vec![];
    fitting.write_with_encoder(JpegEncoder::new_with_quality(&mut bytes, QUALITY))?;
    Ok(Embeddable { bytes })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wide_pictures_shrink_in_proportion() {
        let picture = embeddable(RgbImage::new(4000, 3000)).unwrap();
        let read = image::load_from_memory(picture.as_picture().bytes).unwrap();
        assert_eq!((read.width(), read.height()), (1600, 1200));
        assert!(embeddable(RgbImage::new(300, 20)).is_ok());
    }
}
