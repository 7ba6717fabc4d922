//! Smooth-edged strokes and letters on a picture, each with a dark outline that keeps it readable on any ground.

use image::{Rgb, RgbImage};
use imageproc::{drawing::draw_filled_rect_mut, rect::Rect};

use super::face::{ADVANCE, Face, LETTER_HEIGHT};

/// A place on the canvas, px; integer = pixel centre, y down.
pub(super) type Place = [f64; 2];

/// Outline of strokes and letters.
const OUTLINE: Rgb<u8> = Rgb([8, 8, 12]);

/// Pieces of a long line, px: keeps the box of pixels visited around a slanting line small.
const PIECE_PX: f64 = 48.0;

/// What a stroke follows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Shape {
    /// A straight line between two places.
    Line(Place, Place),
    /// A circle: centre and radius.
    Ring(Place, f64),
}

/// Colour and width of a stroke, px.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Pen {
    pub(super) colour: Rgb<u8>,
    pub(super) width_px: f64,
}

/// A picture being drawn on.
#[derive(Debug)]
pub(super) struct Canvas {
    pub(super) image: RgbImage,
    face: Face,
    /// Screen pixels per pixel of a letter, and the unit of every mark.
    pub(super) scale: u32,
}

impl Canvas {
    pub(super) fn new(image: RgbImage, scale: u32) -> Self {
        Self { image, face: Face::new(), scale: scale.max(1) }
    }

    /// Draws shapes as one figure: first the dark outline of all, then the colour. Parts outside the picture are left out.
    pub(super) fn stroke(&mut self, shapes: &[Shape], pen: Pen) {
        let outline = Pen { colour: OUTLINE, width_px: pen.width_px + 1.2 * f64::from(self.scale) };
        for pen in [outline, pen] {
            for &shape in shapes {
                match shape {
                    Shape::Line(from, to) => self.line(from, to, pen),
                    Shape::Ring(..) => self.cover(shape, pen),
                }
            }
        }
    }

    /// Draws one line of letters with its top left corner at `at`.
    pub(super) fn letters(&mut self, text: &str, at: Place, colour: Rgb<u8>) {
        let dot = f64::from(self.scale);
        let ink: Vec<Place> = text
            .chars()
            .enumerate()
            .flat_map(|(i, letter)| self.face.ink(letter).map(move |(column, row)| (i * ADVANCE + column, row)))
            .map(|(column, row)| [at[0] + column as f64 * dot, at[1] + row as f64 * dot])
            .collect();
        let rim = dot;
        for &[x, y] in &ink {
            self.fill([x - rim, y - rim], [x + dot + rim, y + dot + rim], OUTLINE);
        }
        for &[x, y] in &ink {
            self.fill([x, y], [x + dot, y + dot], colour);
        }
    }

    /// Width and height of a line of letters, px.
    pub(super) fn letters_size(&self, text: &str) -> [f64; 2] {
        let dot = f64::from(self.scale);
        [(text.chars().count() * ADVANCE) as f64 * dot, LETTER_HEIGHT as f64 * dot]
    }

    /// Fills a rectangle, far edges excluded.
    fn fill(&mut self, from: Place, to: Place, colour: Rgb<u8>) {
        let (width, height) = self.image.dimensions();
        let [x, y] = [index(from[0].round(), width), index(from[1].round(), height)];
        let [columns, rows] = [index(to[0].round(), width) - x, index(to[1].round(), height) - y];
        if columns > 0 && rows > 0 {
            draw_filled_rect_mut(&mut self.image, Rect::at(x.cast_signed(), y.cast_signed()).of_size(columns, rows), colour);
        }
    }

    fn line(&mut self, from: Place, to: Place, pen: Pen) {
        let Some([from, to]) = self.inside(from, to, pen.width_px + 2.0) else { return };
        let length = (to[0] - from[0]).hypot(to[1] - from[1]);
        let pieces = (length / PIECE_PX).ceil().max(1.0);
        let at = |t: f64| [from[0] + t * (to[0] - from[0]), from[1] + t * (to[1] - from[1])];
        for piece in 0..index(pieces, u32::MAX) {
            let t = f64::from(piece);
            self.cover(Shape::Line(at(t / pieces), at((t + 1.0) / pieces)), pen);
        }
    }

    /// The part of a line within the picture and a margin around it; `None` when nothing is, or the line has no place.
    fn inside(&self, from: Place, to: Place, margin_px: f64) -> Option<[Place; 2]> {
        let size = [f64::from(self.image.width()), f64::from(self.image.height())];
        let (mut start, mut end) = (0.0_f64, 1.0_f64);
        for axis in 0..2 {
            let step = to[axis] - from[axis];
            if !step.is_finite() || !from[axis].is_finite() {
                return None;
            }
            let (low, high) = (-margin_px - from[axis], size[axis] + margin_px - from[axis]);
            if step.abs() < 1e-9 {
                if low > 0.0 || high < 0.0 {
                    return None;
                }
                continue;
            }
            let (enter, leave) = if step > 0.0 { (low / step, high / step) } else { (high / step, low / step) };
            (start, end) = (start.max(enter), end.min(leave));
        }
        let at = |t: f64| [from[0] + t * (to[0] - from[0]), from[1] + t * (to[1] - from[1])];
        (start <= end).then(|| [at(start), at(end)])
    }

    /// Blends the pen into every pixel by how much of it the stroke covers (distance to the shape, one pixel soft).
    fn cover(&mut self, shape: Shape, pen: Pen) {
        let half = pen.width_px / 2.0;
        let Some((low, high)) = bounds(shape, half + 1.0) else { return };
        let (width, height) = self.image.dimensions();
        for y in index(low[1].floor(), height)..index(high[1].ceil() + 1.0, height) {
            for x in index(low[0].floor(), width)..index(high[0].ceil() + 1.0, width) {
                let share = (half + 0.5 - distance_px(shape, [f64::from(x), f64::from(y)])).clamp(0.0, 1.0);
                if share > 0.0 {
                    let pixel = self.image.get_pixel_mut(x, y);
                    *pixel = blend(*pixel, pen.colour, share);
                }
            }
        }
    }
}

fn bounds(shape: Shape, margin_px: f64) -> Option<(Place, Place)> {
    let (low, high) = match shape {
        Shape::Line(a, b) => ([a[0].min(b[0]), a[1].min(b[1])], [a[0].max(b[0]), a[1].max(b[1])]),
        Shape::Ring(c, r) => ([c[0] - r, c[1] - r], [c[0] + r, c[1] + r]),
    };
    let finite = low.iter().chain(&high).all(|x| x.is_finite());
    finite.then(|| (low.map(|x| x - margin_px), high.map(|x| x + margin_px)))
}

fn distance_px(shape: Shape, at: Place) -> f64 {
    match shape {
        Shape::Ring(centre, radius) => ((at[0] - centre[0]).hypot(at[1] - centre[1]) - radius).abs(),
        Shape::Line(from, to) => {
            let along = [to[0] - from[0], to[1] - from[1]];
            let length2 = along[0] * along[0] + along[1] * along[1];
            let t = if length2 > 0.0 { ((at[0] - from[0]) * along[0] + (at[1] - from[1]) * along[1]) / length2 } else { 0.0 };
            let t = t.clamp(0.0, 1.0);
            (at[0] - from[0] - t * along[0]).hypot(at[1] - from[1] - t * along[1])
        }
    }
}

fn blend(under: Rgb<u8>, over: Rgb<u8>, share: f64) -> Rgb<u8> {
    let mix = |i: usize| level(f64::from(under.0[i]) * (1.0 - share) + f64::from(over.0[i]) * share);
    Rgb([mix(0), mix(1), mix(2)])
}

/// A grey level from 0 to 255.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range of the type")]
pub(super) fn level(value: f64) -> u8 {
    value.round().clamp(0.0, 255.0) as u8
}

/// A whole number of pixels from 0 to `limit`; what is no number becomes 0.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the range of the type")]
pub(super) fn index(value: f64, limit: u32) -> u32 {
    value.clamp(0.0, f64::from(limit)) as u32
}

#[cfg(test)]
mod tests {
    use super::*;

    const WHITE: Pen = Pen { colour: Rgb([255, 255, 255]), width_px: 1.0 };

    fn canvas() -> Canvas {
        Canvas::new(RgbImage::new(40, 30), 1)
    }

    #[test]
    fn a_line_covers_its_pixels() {
        let mut canvas = canvas();
        canvas.stroke(&[Shape::Line([5.0, 10.0], [20.0, 10.0])], WHITE);
        assert_eq!(canvas.image.get_pixel(12, 10).0, [255; 3]);
        assert_eq!(canvas.image.get_pixel(12, 15).0, [0; 3]);
        // The outline is 1.1 px wide on each side and soft, so that only part of it covers the neighbouring pixel.
        assert_ne!(canvas.image.get_pixel(12, 11).0, [0; 3]);
    }

    #[test]
    fn a_ring_is_empty_inside() {
        let mut canvas = canvas();
        canvas.stroke(&[Shape::Ring([20.0, 15.0], 8.0)], WHITE);
        assert_eq!(canvas.image.get_pixel(28, 15).0, [255; 3]);
        assert_eq!(canvas.image.get_pixel(20, 15).0, [0; 3]);
    }

    #[test]
    fn what_lies_outside_or_nowhere_is_left_out() {
        let mut canvas = canvas();
        for far in [1e12, -1e12, 1e300, f64::NAN, f64::INFINITY] {
            canvas.stroke(&[Shape::Line([far, 3.0], [far, far]), Shape::Ring([far, far], 5.0), Shape::Ring([0.0, 0.0], far)], WHITE);
            canvas.letters("(1,0)", [far, far], WHITE.colour);
        }
        canvas.stroke(&[Shape::Line([-1e9, 10.0], [1e9, 10.0])], WHITE);
        assert_eq!(canvas.image.get_pixel(39, 10).0, [255; 3]);
    }
}
