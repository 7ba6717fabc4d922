//! In: the bytes of a photo. Out: [`Photo`], upright, with its metadata, and planes of linear light.
//! Must never know: files, lattices, what the spots mean.
//! Start reading at [`decode()`].

mod clip;
mod decode;
mod error;
mod half;
mod jpeg_walk;
mod light;
mod linear;
mod metadata;
mod noise;
mod orient;
mod tone;

pub use decode::{MAX_MEGA_PX, MIN_SIDE_PX, decode};
pub use error::PhotoError;
pub use half::{HalfPlanes, Plane};
pub use light::LUMINANCE;
pub use linear::LinearPhoto;

/// Decoded photo, upright (its EXIF orientation applied), samples as stored.
#[derive(Debug, Clone)]
pub struct Photo {
    /// Width as displayed, px.
    pub width: usize,
    /// Height as displayed, px.
    pub height: usize,
    /// 1 (grey) or 3 (red, green, blue); alpha is dropped.
    pub channels: usize,
    /// Row-major, channels interleaved.
    pub samples: Samples,
    /// What the file says of the camera.
    pub exif: Exif,
}

/// Samples as stored in the file.
///
/// The two forms fix the tone curve: a 16-bit file that is tagged with a tone curve has it undone while it is
/// decoded, and an 8-bit file that is tagged as linear is widened to 16 bit.
#[derive(Debug, Clone)]
pub enum Samples {
    /// 8 bit, sRGB-coded.
    U8(Vec<u8>),
    /// 16 bit, linear light.
    U16(Vec<u16>),
}

/// Camera data from the file, all optional.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Exif {
    /// Focal length of the lens, m.
    pub focal_length_m: Option<f64>,
    /// 35-mm-equivalent focal length, m (on a frame whose diagonal is 43.27 mm).
    pub focal_length_35mm_m: Option<f64>,
    /// Exposure time, s.
    pub exposure_s: Option<f64>,
    /// ISO speed.
    pub iso: Option<f64>,
    /// f-number.
    pub f_number: Option<f64>,
    /// Maker and model as written in the file.
    pub camera: Option<String>,
    /// EXIF orientation tag, 1..=8 (1 when absent).
    pub orientation: u8,
}

/// One plane of linear light, 1.0 = the level at which the sensor or file clips.
#[derive(Debug, Clone)]
pub struct Light {
    /// Width, px.
    pub width: usize,
    /// Height, px.
    pub height: usize,
    /// Row-major linear light.
    pub value: Vec<f32>,
    /// Variance of one pixel: `a + b * signal`.
    pub noise: Noise,
}

/// Noise of one pixel as a function of its linear light: variance = `a + b * signal`.
///
/// Estimated on means of 4×4 pixels (then scaled by 16): demosaicing and JPEG tie neighbours together, so the
/// scatter between adjacent pixels would promise a fit over many of them far too much.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Noise {
    /// Variance at zero light.
    pub a: f64,
    /// Variance per unit of light.
    pub b: f64,
}

impl Noise {
    /// Variance of a pixel that carries `signal` units of linear light (below zero counts as zero).
    #[must_use]
    pub fn variance(self, signal: f64) -> f64 {
        self.a + self.b * signal.max(0.0)
    }
}
