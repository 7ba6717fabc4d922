//! The charts of the report as SVG. Meaning never hangs on colour alone: shapes and shades differ too. Colours: the set of Okabe and Ito, which
//! colour-blind people tell apart (common practice).

mod reciprocal;
mod residuals;
mod shares;

pub(super) use reciprocal::reciprocal;
pub(super) use residuals::residuals;
pub(super) use shares::{percent, shares};

use plotters::{backend::SVGBackend, drawing::DrawingAreaErrorKind, prelude::*};

/// A chart with its text alternative.
#[derive(Debug, Clone)]
pub(super) struct Chart {
    /// The SVG element.
    pub(super) svg: String,
    /// What a reader who cannot see it must know.
    pub(super) words: String,
}

/// Width of every chart, px: narrow, so that its letters stay readable on a phone.
pub(super) const WIDTH: u32 = 480;

pub(super) const INK: RGBColor = RGBColor(0x1c, 0x23, 0x30);
pub(super) const SOFT: RGBColor = RGBColor(0x5a, 0x64, 0x74);
pub(super) const FAINT: RGBColor = RGBColor(0xd8, 0xdc, 0xe2);
/// Okabe and Ito's blue: dark in grey.
pub(super) const BLUE: RGBColor = RGBColor(0x00, 0x72, 0xb2);
/// Okabe and Ito's orange: light in grey.
pub(super) const ORANGE: RGBColor = RGBColor(0xe6, 0x9f, 0x00);
/// Okabe and Ito's vermilion.
pub(super) const VERMILION: RGBColor = RGBColor(0xd5, 0x5e, 0x00);

/// Letters, px.
pub(super) const LETTERS: u32 = 14;

pub(super) type Area<'a> = DrawingArea<SVGBackend<'a>, plotters::coord::Shift>;
pub(super) type Drawn = Result<(), DrawingAreaErrorKind<std::io::Error>>;

/// Draws into an SVG of the usual width; `None` when that fails (the report then goes without this chart).
pub(super) fn svg(height: u32, draw: impl FnOnce(&Area<'_>) -> Drawn) -> Option<String> {
    let mut text = String::new();
    {
        let area = SVGBackend::with_string(&mut text, (WIDTH, height)).into_drawing_area();
        area.fill(&WHITE).ok()?;
        draw(&area).ok()?;
        area.present().ok()?;
    }
    // Inside a page the element stands alone; its text alternative stands on the figure.
    let element = text.find("<svg")?;
    Some(text[element..].replacen("<svg", "<svg aria-hidden=\"true\" focusable=\"false\"", 1))
}

/// Half the side of a square view around the origin that holds all finite points with some room; at least `least`.
pub(super) fn reach(points: impl Iterator<Item = [f64; 2]>, least: f64) -> f64 {
    points.flatten().map(f64::abs).filter(|reach| reach.is_finite()).fold(least, f64::max) * 1.12
}

/// A number for an axis: as short as it can be. The plotter computes 0 with a rounding error.
pub(super) fn tick(value: &f64) -> String {
    crate::report::significant((value * 1e9).round() / 1e9, 6)
}
