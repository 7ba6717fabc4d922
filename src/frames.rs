//! The shared words for *where*. A place in a frame is a type of its own, so that a pixel is never
//! taken for a millimetre.
//!
//! ```text
//!   sample plane          bench B                  screen plane             photo
//!   x_s, y_s, normal n    z along the zero order   r right, v up (viewer)   x right, y DOWN
//!          \              y up, x = z's left       X right, Y up (print)    integer = pixel centre
//!           O ----- zero order, throw L ----------> Z0
//! ```

/// A place in a photo as displayed (after its EXIF orientation).
///
/// x to the right, y **down**, in pixels; an integer coordinate is a pixel centre and (0, 0) is the
/// centre of the top left pixel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PixelPoint {
    /// To the right, px.
    pub x_px: f64,
    /// Downwards, px.
    pub y_px: f64,
}

/// From where the camera looks at the screen.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// At the lit face.
    Front,
    /// Through a translucent screen.
    Behind,
}

/// A place in the plane of the screen, in the axes of the printed target as its reader sees them.
///
/// X to the right, Y **up**, in metres, from the origin mark of the print.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TargetPoint {
    /// To the right, m.
    pub x_m: f64,
    /// Upwards, m.
    pub y_m: f64,
}

/// Symmetric 2×2 covariance of a place in a photo, px².
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PixelCovariance {
    /// Variance along x, px².
    pub xx: f64,
    /// Covariance of x and y, px².
    pub xy: f64,
    /// Variance along y, px².
    pub yy: f64,
}

impl PixelPoint {
    /// Distance to another place of the same photo, px.
    #[must_use]
    pub fn distance_px(self, other: Self) -> f64 {
        (self.x_px - other.x_px).hypot(self.y_px - other.y_px)
    }
}

impl PixelCovariance {
    /// The same standard uncertainty `u_px` in every direction.
    #[must_use]
    pub fn isotropic(u_px: f64) -> Self {
        Self { xx: u_px * u_px, xy: 0.0, yy: u_px * u_px }
    }

    /// Standard uncertainty along x and along y, px.
    #[must_use]
    pub fn u_px(self) -> [f64; 2] {
        [self.xx.sqrt(), self.yy.sqrt()]
    }
}
