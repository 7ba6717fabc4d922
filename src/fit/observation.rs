//! What was seen: each observation compares a pixel with a prediction, or a derived value with what is known of it.

use crate::frames::{PixelCovariance, PixelPoint};

/// A spot with its order.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SpotObservation {
    /// Which photo of the pattern.
    pub photo: usize,
    /// Index of the spot in that photo's list.
    pub spot: usize,
    /// Centroid.
    pub at: PixelPoint,
    /// Covariance of the centroid, px².
    pub covariance: PixelCovariance,
    /// Order (h, k); k is 0 for a line grating.
    pub order: (i32, i32),
    /// Robust weight, 0 (rejected) to 1.
    pub weight: f64,
}

/// A point of the print with its pixel: a dot of the target or a known mark.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrintObservation {
    /// Which view.
    pub view: usize,
    /// Pixel, corrected for the difference between a disc's centroid and its projected centre.
    pub at: PixelPoint,
    /// Covariance, px².
    pub covariance: PixelCovariance,
    /// Where on the print.
    pub place: PrintPlace,
    /// Robust weight, 0 (rejected) to 1.
    pub weight: f64,
}

impl PrintObservation {
    /// Whether it is a dot of the printed target.
    #[must_use]
    pub fn is_dot(&self) -> bool {
        matches!(self.place, PrintPlace::Pitches(_))
    }
}

/// Where on the print a point is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PrintPlace {
    /// In units of the target's pitch, which is a parameter.
    Pitches([f64; 2]),
    /// In metres, exactly.
    Metres([f64; 2]),
    /// One end of a known distance; its place is a parameter.
    ScaleEnd(usize),
}

/// A value that follows from the parameters and was measured by the operator.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Knowledge {
    /// Length of a direct lattice vector of a reduced cell (or the pitch of a line grating), m: `which` 0 or 1.
    Pitch {
        /// Which sample.
        sample: usize,
        /// Shorter (0) or longer (1) vector.
        which: usize,
        /// Mean, m.
        mean_m: f64,
        /// Standard uncertainty, m.
        u_m: f64,
    },
    /// Angle between the two vectors, rad.
    LatticeAngle {
        /// Which sample.
        sample: usize,
        /// Mean, rad.
        mean_rad: f64,
        /// Standard uncertainty, rad.
        u_rad: f64,
    },
    /// Distance of the two scale ends, m.
    Distance {
        /// Mean, m.
        mean_m: f64,
        /// Standard uncertainty, m.
        u_m: f64,
    },
    /// Lean of the line from screen to camera (the optical axis, reversed) from the screen's normal, rad: `axis` 0 right, 1 up.
    SquareOn {
        /// Which view.
        view: usize,
        /// To the right or up.
        axis: usize,
        /// Mean, rad.
        mean_rad: f64,
        /// Standard uncertainty, rad.
        u_rad: f64,
    },
}

impl SpotObservation {
    /// Length of an offset (x, y in px) in units of the spot's stated uncertainty.
    #[must_use]
    pub fn length(&self, offset_px: [f64; 2]) -> Option<f64> {
        whitened_length(self.covariance, offset_px)
    }
}

/// Length of a pixel offset in units of its uncertainty; `None` when the covariance is not positive definite.
pub(super) fn whitened_length(covariance: PixelCovariance, [dx, dy]: [f64; 2]) -> Option<f64> {
    let white = whitening(covariance)?;
    Some((white[0] * dx).hypot(white[1] * dx + white[2] * dy))
}

/// Lower Cholesky factor inverted: whitens a pixel residual. `None` when the covariance is not positive definite.
#[must_use]
pub(super) fn whitening(covariance: PixelCovariance) -> Option<[f64; 3]> {
    let l00 = covariance.xx.sqrt();
    let l10 = covariance.xy / l00;
    let rest = covariance.yy - l10 * l10;
    if !(covariance.xx > 0.0 && rest > 0.0) {
        return None;
    }
    let l11 = rest.sqrt();
    Some([1.0 / l00, -l10 / (l00 * l11), 1.0 / l11])
}
