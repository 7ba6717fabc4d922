//! What was seen: each observation compares a pixel with a prediction, or a derived value with what is known of it.

use crate::{
    frames::{PixelCovariance, PixelPoint},
    math::statistics::normal_probability,
};
use num_dual::DualNum;

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

/// A point of the print with its pixel: a dot of the target, a point of a sheet's edge, a known mark.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrintObservation {
    /// Which view.
    pub view: usize,
    /// Pixel, corrected for the difference between a disc's centroid and its projected centre.
    pub at: PixelPoint,
    /// How well, and in which directions, the pixel is known.
    pub sharpness: Sharpness,
    /// Where on the print.
    pub place: PrintPlace,
    /// Robust weight, 0 (rejected) to 1.
    pub weight: f64,
}

impl PrintObservation {
    /// Whether it is one of the many points that the program reads by itself: dots, line crossings, points of an edge. Points that the
    /// operator states are few, and never left out.
    #[must_use]
    pub fn is_one_of_many(&self) -> bool {
        matches!(self.place, PrintPlace::Pitches(_) | PrintPlace::Lines(_) | PrintPlace::Sheet { .. })
    }
}

/// How well the place of a point of the print is known in the photo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Sharpness {
    /// In both directions: covariance, px².
    Point(PixelCovariance),
    /// A point of a line, known only across it. Along the line it may be any: the place on the print that it is compared with must lie on
    /// the line too, and a slip along the line counts for nothing.
    Line {
        /// Unit vector across the line (x, y).
        across: [f64; 2],
        /// Standard uncertainty across, px.
        u_px: f64,
    },
}

impl Sharpness {
    /// Coordinates that are known: 2 or 1.
    #[must_use]
    pub fn dimensions(self) -> usize {
        match self {
            Self::Point(_) => 2,
            Self::Line { .. } => 1,
        }
    }

    /// Turns a pixel residual into two numbers of unit variance, the second of them zero where one coordinate is known only.
    pub(super) fn whitening(self) -> Option<Whitening> {
        match self {
            Self::Point(covariance) => whitening(covariance),
            Self::Line { across: [x, y], u_px } => (u_px > 0.0).then(|| Whitening([[x / u_px, y / u_px], [0.0; 2]])),
        }
    }

    /// Length of a pixel offset in units of its uncertainty, on the scale of two coordinates: an offset from a line counts as the
    /// two-dimensional one that is exceeded as rarely.
    pub(super) fn length(self, offset_px: [f64; 2]) -> Option<f64> {
        let [a, b] = self.whitening()?.apply(offset_px);
        match self {
            Self::Point(_) => Some(a.hypot(b)),
            Self::Line { .. } => Some(as_rare_in_two_dimensions(a.abs())),
        }
    }
}

/// The radius R with exp(−R²/2) = P(|z| > a). Far out, where both vanish, the radius is the distance itself.
fn as_rare_in_two_dimensions(a: f64) -> f64 {
    const FAR: f64 = 8.0;
    if a > FAR {
        return a;
    }
    let inside = normal_probability(a).map_or(1.0, |below| 2.0 * below - 1.0);
    (-2.0 * (1.0 - inside).max(1e-300).ln()).max(0.0).sqrt()
}

/// A matrix that turns a pixel residual into numbers of unit variance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Whitening([[f64; 2]; 2]);

impl Whitening {
    pub(super) fn apply(self, [dx, dy]: [f64; 2]) -> [f64; 2] {
        self.0.map(|row| row[0] * dx + row[1] * dy)
    }
}

/// Where on the print a point is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PrintPlace {
    /// In units of the target's pitch, which is a parameter.
    Pitches([f64; 2]),
    /// In units of the distance of ruled lines, which is the same parameter.
    Lines([f64; 2]),
    /// On an edge of a sheet; its width, its height and the bow of the edge are parameters.
    Sheet {
        /// Which edge.
        edge: SheetEdge,
        /// Place along the edge as a share of its length, to the right or up.
        along: f64,
    },
    /// In metres, exactly.
    Metres([f64; 2]),
    /// One end of a known distance; its place is a parameter.
    ScaleEnd(usize),
}

/// Edges of a sheet whose origin is the lower left corner.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum SheetEdge {
    /// X = 0
    Left,
    /// X = width
    Right,
    /// Y = 0
    Bottom,
    /// Y = height
    Top,
}

impl SheetEdge {
    /// All four.
    pub const ALL: [Self; 4] = [Self::Left, Self::Right, Self::Bottom, Self::Top];

    /// Place on the print, m: `bow` is how far the middle of the edge stands out of the straight line between its ends.
    pub(super) fn place<D: DualNum<f64> + Copy>(self, along: f64, bow: D, [width, height]: [D; 2]) -> [D; 2] {
        let out = bow * (4.0 * along * (1.0 - along));
        match self {
            Self::Left => [-out, height * along],
            Self::Right => [width + out, height * along],
            Self::Bottom => [width * along, -out],
            Self::Top => [width * along, height + out],
        }
    }

    /// Which coordinate the edge fixes, and at which share of the side.
    #[must_use]
    pub fn level(self) -> (usize, f64) {
        match self {
            Self::Left => (0, 0.0),
            Self::Right => (0, 1.0),
            Self::Bottom => (1, 0.0),
            Self::Top => (1, 1.0),
        }
    }
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
        Sharpness::Point(self.covariance).length(offset_px)
    }
}

/// Lower Cholesky factor inverted: whitens a pixel residual. `None` when the covariance is not positive definite.
#[must_use]
pub(super) fn whitening(covariance: PixelCovariance) -> Option<Whitening> {
    let l00 = covariance.xx.sqrt();
    let l10 = covariance.xy / l00;
    let rest = covariance.yy - l10 * l10;
    if !(covariance.xx > 0.0 && rest > 0.0) {
        return None;
    }
    let l11 = rest.sqrt();
    Some(Whitening([[1.0 / l00, 0.0], [-l10 / (l00 * l11), 1.0 / l11]]))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Points of the chi-square distribution with two degrees of freedom against the normal law: 95 % lie within 1.960 and 2.448.
    #[test]
    fn a_line_and_a_point_are_left_out_equally_rarely() {
        for (one, two) in [(0.674_489_8, 1.177_410_0), (1.959_964, 2.447_747), (3.290_527, 3.716_922)] {
            assert!((as_rare_in_two_dimensions(one) - two).abs() < 1e-5, "{one}: {}", as_rare_in_two_dimensions(one));
        }
        assert!((as_rare_in_two_dimensions(7.99) - 7.99).abs() < 0.6 && as_rare_in_two_dimensions(0.0) == 0.0);
    }

    #[test]
    fn along_a_line_nothing_counts() {
        let line = Sharpness::Line { across: [0.6, 0.8], u_px: 0.5 };
        let white = line.whitening().unwrap();
        assert!(white.apply([-80.0, 60.0])[0].abs() < 1e-12);
        assert!((white.apply([0.3, 0.4])[0] - 1.0).abs() < 1e-12 && white.apply([0.3, 0.4])[1] == 0.0);
    }
}
