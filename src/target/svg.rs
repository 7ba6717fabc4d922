//! The target as SVG 1.1.

use std::fmt::Write as _;

use super::sheet::{Sheet, TEXT_MM, Turned, plain};

/// The print as an SVG document whose user unit is one millimetre.
#[must_use]
pub fn svg(sheet: &Sheet) -> String {
    let drawing = sheet.drawing();
    let [width, height] = drawing.size_mm;
    let (w, h) = (plain(width), plain(height));
    let mut out = format!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{w}mm\" height=\"{h}mm\" viewBox=\"0 0 {w} {h}\">\n\
         <rect width=\"{w}\" height=\"{h}\" fill=\"#fff\"/>\n<g fill=\"#000\">\n"
    );
    // SVG's y runs down. Writing into a String cannot fail.
    for disc in &drawing.discs {
        let (x, y, r) = (plain(disc.at_mm[0]), plain(height - disc.at_mm[1]), plain(disc.radius_mm));
        let _ = writeln!(out, "<circle cx=\"{x}\" cy=\"{y}\" r=\"{r}\"/>");
    }
    out.push_str("</g>\n<g stroke=\"#000\" fill=\"none\">\n");
    for s in &drawing.strokes {
        let [x1, x2] = [s.from_mm[0], s.to_mm[0]].map(plain);
        let [y1, y2] = [s.from_mm[1], s.to_mm[1]].map(|y| plain(height - y));
        let _ = writeln!(out, "<path d=\"M{x1} {y1}L{x2} {y2}\" stroke-width=\"{}\"/>", plain(s.width_mm));
    }
    let _ = writeln!(out, "</g>\n<g fill=\"#000\" font-family=\"Helvetica, Arial, sans-serif\" font-size=\"{}\">", plain(TEXT_MM));
    for words in &drawing.words {
        let (x, y) = (plain(words.at_mm[0]), plain(height - words.at_mm[1]));
        let turn = match words.turned {
            Turned::No => String::new(),
            Turned::Upwards => format!(" transform=\"rotate(-90 {x} {y})\""),
        };
        let _ = writeln!(out, "<text x=\"{x}\" y=\"{y}\"{turn}>{}</text>", words.text);
    }
    out.push_str("</g>\n</svg>\n");
    out
}
