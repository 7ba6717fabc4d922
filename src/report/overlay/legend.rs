//! The strip below the photo: the result, and what each mark means.

use image::{Rgb, RgbImage};

use super::{
    canvas::{Canvas, Place, index},
    face::{ADVANCE, LETTER_HEIGHT},
    marks::{Mark, PLAIN},
};
use crate::report::columns::wrapped;

const STRIP: Rgb<u8> = Rgb([22, 24, 30]);

/// One entry: a mark with its meaning, or a line of its own.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Entry {
    /// Drawn before the text.
    pub(super) mark: Option<Mark>,
    /// What is said.
    pub(super) text: String,
}

/// An entry's line of text at its place within the strip.
struct Placed {
    mark: Option<Mark>,
    text: String,
    at: Place,
}

/// The picture with a strip added below it; the pixels of the photo stay where they are.
pub(super) fn with_strip(picture: &RgbImage, scale: u32, entries: &[Entry]) -> RgbImage {
    let width = picture.width().max(40 * index(ADVANCE as f64, 100) * scale);
    let (placed, height) = flow(entries, f64::from(width), f64::from(scale));
    let mut whole = RgbImage::from_pixel(width, picture.height().saturating_add(index(height, 1 << 20)), STRIP);
    image::imageops::replace(&mut whole, picture, 0, 0);
    let mut canvas = Canvas::new(whole, scale);
    let unit = f64::from(scale);
    for line in placed {
        let at = [line.at[0], line.at[1] + f64::from(picture.height())];
        if let Some(mark) = line.mark {
            mark.draw(&mut canvas, [at[0] + 6.0 * unit, at[1] + 3.0 * unit], if mark == Mark::ZeroOrder { 2.5 * unit } else { 4.0 * unit });
        }
        let indent = if line.mark.is_some() { mark_px(unit) } else { 0.0 };
        canvas.letters(&line.text, [at[0] + indent, at[1]], PLAIN);
    }
    canvas.image
}

/// Room for a mark before its text.
fn mark_px(unit: f64) -> f64 {
    18.0 * unit
}

/// Lays entries out from left to right; an entry without a mark gets a line of its own. Gives the places and the height.
fn flow(entries: &[Entry], width: f64, unit: f64) -> (Vec<Placed>, f64) {
    let (margin, row_px) = (8.0 * unit, (LETTER_HEIGHT as f64 + 6.0) * unit);
    let letter_px = ADVANCE as f64 * unit;
    let (mut placed, mut x, mut y) = (vec![], margin, margin);
    for entry in entries {
        let indent = if entry.mark.is_some() { mark_px(unit) } else { 0.0 };
        let needed = indent + entry.text.chars().count() as f64 * letter_px;
        if x > margin && (entry.mark.is_none() || x + needed > width - margin) {
            (x, y) = (margin, y + row_px);
        }
        let room = usize::try_from(index((width - 2.0 * margin - indent) / letter_px, 1000)).unwrap_or(1);
        for (i, text) in wrapped(&entry.text, room).into_iter().enumerate() {
            if i > 0 {
                y += row_px;
            }
            let mark = entry.mark.filter(|_| i == 0);
            let at = [if i == 0 { x } else { margin + indent }, y];
            placed.push(Placed { mark, text, at });
        }
        x += needed + 4.0 * letter_px;
        if entry.mark.is_none() {
            (x, y) = (margin, y + row_px);
        }
    }
    let end = if x > margin { y + row_px } else { y };
    (placed, end + margin - 4.0 * unit)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn entries() -> Vec<Entry> {
        vec![
            Entry { mark: None, text: "pitch 1 = 4.00031 µm".to_owned() },
            Entry { mark: Some(Mark::Used), text: "order used".to_owned() },
            Entry { mark: Some(Mark::Rejected), text: "rejected".to_owned() },
        ]
    }

    #[test]
    fn the_photo_stays_in_place_above_the_strip() {
        let picture = RgbImage::from_pixel(400, 100, Rgb([9, 8, 7]));
        let whole = with_strip(&picture, 1, &entries());
        assert_eq!(whole.get_pixel(399, 99).0, [9, 8, 7]);
        assert_eq!(whole.get_pixel(399, 100).0, STRIP.0);
        assert!(whole.height() > 120);
    }

    #[test]
    fn everything_stays_within_the_width() {
        for width in [240.0, 500.0, 4000.0] {
            let (placed, height) = flow(&entries(), width, 1.0);
            for line in placed {
                let end = line.at[0] + line.mark.map_or(0.0, |_| mark_px(1.0)) + line.text.chars().count() as f64 * 6.0;
                assert!(end <= width && line.at[1] < height, "{} ends at {end} of {width}", line.text);
            }
        }
    }
}
