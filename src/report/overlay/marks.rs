//! What each finding looks like. Every kind has a shape of its own; colour only helps.

use image::Rgb;

use super::canvas::{Canvas, Pen, Place, Shape};

/// Spots with an order.
pub(super) const ORDER: Rgb<u8> = Rgb([140, 212, 255]);
/// Spots without an order.
pub(super) const REJECTED: Rgb<u8> = Rgb([255, 168, 56]);
/// Zero order and lattice axes.
pub(super) const AXIS: Rgb<u8> = Rgb([250, 236, 110]);
/// Residuals and plain text.
pub(super) const PLAIN: Rgb<u8> = Rgb([255, 255, 255]);

/// Where the ticks of the zero order begin and end, in radii: outside a double ring.
pub(super) const ZERO_ORDER_TICKS: [f64; 2] = [1.6, 2.3];

/// The kinds of finding.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    /// Ring: an order that took part in the fit.
    Used,
    /// Double ring: the same, core clipped.
    UsedClipped,
    /// Square: an order left out of the fit.
    Unused,
    /// Saltire cross: a spot without an order.
    Rejected,
    /// Four ticks: the zero order; a ring is added by its spot, if one was seen.
    ZeroOrder,
    /// Arrow: seen minus predicted, magnified.
    Residual,
    /// Arrow: a lattice axis.
    Axis,
}

impl Mark {
    pub(super) fn colour(self) -> Rgb<u8> {
        match self {
            Self::Used | Self::UsedClipped | Self::Unused => ORDER,
            Self::Rejected => REJECTED,
            Self::ZeroOrder | Self::Axis => AXIS,
            Self::Residual => PLAIN,
        }
    }

    /// Draws the mark; `radius_px` is that of an order's ring.
    pub(super) fn draw(self, canvas: &mut Canvas, at: Place, radius_px: f64) {
        let pen = Pen { colour: self.colour(), width_px: stroke_px(canvas) };
        let shapes = self.shapes(at, radius_px, 1.5 * f64::from(canvas.scale));
        canvas.stroke(&shapes, pen);
    }

    fn shapes(self, [x, y]: Place, r: f64, gap_px: f64) -> Vec<Shape> {
        let line = |x0: f64, y0: f64, x1: f64, y1: f64| Shape::Line([x + x0, y + y0], [x + x1, y + y1]);
        match self {
            Self::Used => vec![Shape::Ring([x, y], r)],
            Self::UsedClipped => vec![Shape::Ring([x, y], r), Shape::Ring([x, y], r + 2.0 * gap_px)],
            Self::Unused => vec![line(-r, -r, r, -r), line(r, -r, r, r), line(r, r, -r, r), line(-r, r, -r, -r)],
            Self::Rejected => vec![line(-r, -r, r, r), line(-r, r, r, -r)],
            Self::ZeroOrder => {
                let (from, to) = (ZERO_ORDER_TICKS[0] * r, ZERO_ORDER_TICKS[1] * r);
                vec![line(from, 0.0, to, 0.0), line(-from, 0.0, -to, 0.0), line(0.0, from, 0.0, to), line(0.0, -from, 0.0, -to)]
            }
            Self::Residual | Self::Axis => arrow_shapes([x - r, y], [x + r, y], 2.0 * gap_px),
        }
    }
}

/// Draws an arrow of this mark's colour.
pub(super) fn arrow(canvas: &mut Canvas, mark: Mark, from: Place, to: Place) {
    let width_px = stroke_px(canvas) * if mark == Mark::Axis { 1.0 } else { 0.7 };
    let shapes = arrow_shapes(from, to, 3.0 * f64::from(canvas.scale));
    canvas.stroke(&shapes, Pen { colour: mark.colour(), width_px });
}

fn stroke_px(canvas: &Canvas) -> f64 {
    f64::from(canvas.scale) * 0.9
}

/// Shaft and two barbs; the barbs shrink with a short shaft, so that the arrow never looks longer than it is.
fn arrow_shapes(from: Place, to: Place, barb_px: f64) -> Vec<Shape> {
    let along = [to[0] - from[0], to[1] - from[1]];
    let length = along[0].hypot(along[1]);
    if !length.is_finite() || length <= 0.0 {
        return vec![];
    }
    let [cx, cy] = along.map(|step| step / length * barb_px.min(0.5 * length));
    let barb = |side: f64| Shape::Line(to, [to[0] - cx - side * cy * 0.6, to[1] - cy + side * cx * 0.6]);
    vec![Shape::Line(from, to), barb(1.0), barb(-1.0)]
}
