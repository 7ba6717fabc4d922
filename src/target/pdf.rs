//! The target as PDF: one page of vector shapes and Helvetica, which every reader has.

use std::fmt::Write as _;

use super::sheet::{Disc, Drawing, Sheet, TEXT_MM, Turned, plain};

/// PDF points per millimetre, as a number in a content stream.
const POINTS_PER_MM: &str = "2.83464567";

/// A quarter circle as one cubic Bézier curve has its control points at this share of the radius
/// (4/3 (√2 - 1); it leaves the circle by at most 0.027 % of the radius).
const QUARTER: f64 = 0.552_284_749_8;

/// The print as a PDF 1.6 document (1.6 for the wish not to be scaled by the print dialog).
#[must_use]
pub fn pdf(sheet: &Sheet) -> Vec<u8> {
    let drawing = sheet.drawing();
    let content = content(&drawing);
    let [width, height] = drawing.size_mm.map(|mm| plain(mm * 72.0 / 25.4));
    let objects = [
        "<< /Type /Catalog /Pages 2 0 R /ViewerPreferences << /PrintScaling /None >> >>".to_owned(),
        "<< /Type /Pages /Kids [3 0 R] /Count 1 >>".to_owned(),
        format!("<< /Type /Page /Parent 2 0 R /MediaBox [0 0 {width} {height}] /Resources << /Font << /F1 5 0 R >> >> /Contents 4 0 R >>"),
        format!("<< /Length {} >>\nstream\n{content}endstream", content.len()),
        "<< /Type /Font /Subtype /Type1 /BaseFont /Helvetica /Encoding /WinAnsiEncoding >>".to_owned(),
    ];
    // The second line marks the file as binary for programs that guess (ISO 32000-1, 7.5.2).
    let mut out = b"%PDF-1.6\n%\xE2\xE3\xCF\xD3\n".to_vec();
    let mut places = Vec::new();
    for (n, object) in objects.iter().enumerate() {
        places.push(out.len());
        out.extend(format!("{} 0 obj\n{object}\nendobj\n", n + 1).bytes());
    }
    let table_at = out.len();
    // Every entry of the table is exactly 20 bytes long (7.5.4).
    let mut table = format!("xref\n0 {}\n0000000000 65535 f \n", places.len() + 1);
    for place in &places {
        let _ = writeln!(table, "{place:010} 00000 n ");
    }
    let _ = write!(table, "trailer\n<< /Size {} /Root 1 0 R >>\nstartxref\n{table_at}\n%%EOF\n", places.len() + 1);
    out.extend(table.bytes());
    out
}

/// The page's drawing commands, in millimetres. Writing into a String cannot fail.
fn content(drawing: &Drawing) -> String {
    let mut out = format!("{POINTS_PER_MM} 0 0 {POINTS_PER_MM} 0 0 cm\n0 g 0 G\n");
    for disc in &drawing.discs {
        circle(&mut out, disc);
    }
    for s in &drawing.strokes {
        let [a, b, c, d] = [s.from_mm[0], s.from_mm[1], s.to_mm[0], s.to_mm[1]].map(plain);
        let _ = writeln!(out, "{} w {a} {b} m {c} {d} l S", plain(s.width_mm));
    }
    for words in &drawing.words {
        let [x, y] = words.at_mm.map(plain);
        let turn = match words.turned {
            Turned::No => "1 0 0 1",
            Turned::Upwards => "0 1 -1 0",
        };
        let text = words.text.replace('\\', "\\\\").replace('(', "\\(").replace(')', "\\)");
        let _ = writeln!(out, "BT /F1 {} Tf {turn} {x} {y} Tm ({text}) Tj ET", plain(TEXT_MM));
    }
    out
}

fn circle(out: &mut String, disc: &Disc) {
    let ([x, y], r) = (disc.at_mm, disc.radius_mm);
    let k = QUARTER * r;
    let point = |dx: f64, dy: f64| format!("{} {}", plain(x + dx), plain(y + dy));
    let _ = write!(out, "{} m", point(r, 0.0));
    for [a, b, c] in
        [[(r, k), (k, r), (0.0, r)], [(-k, r), (-r, k), (-r, 0.0)], [(-r, -k), (-k, -r), (0.0, -r)], [(k, -r), (r, -k), (r, 0.0)]]
    {
        let _ = write!(out, " {} {} {} c", point(a.0, a.1), point(b.0, b.1), point(c.0, c.1));
    }
    out.push_str(" f\n");
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::target::Paper;

    #[test]
    fn the_cross_reference_table_points_at_every_object() {
        let file = pdf(&Sheet::new(Paper::A4, 0.01).unwrap());
        let find = |what: &[u8]| file.windows(what.len()).rposition(|w| w == what).unwrap();
        let tail = String::from_utf8(file[find(b"startxref")..].to_vec()).unwrap();
        let table_at: usize = tail.lines().nth(1).unwrap().parse().unwrap();
        let table = String::from_utf8(file[table_at..].to_vec()).unwrap();
        assert!(table.starts_with("xref\n0 6\n"));
        for (n, entry) in table.lines().skip(3).take(5).enumerate() {
            assert_eq!(entry.len(), 19, "entry {entry:?} and its line end are 20 bytes");
            let place: usize = entry[..10].parse().unwrap();
            assert!(file[place..].starts_with(format!("{} 0 obj", n + 1).as_bytes()));
        }
    }

    #[test]
    fn the_stream_is_as_long_as_it_says() {
        let file = pdf(&Sheet::new(Paper::Letter, 0.02).unwrap());
        let text = String::from_utf8_lossy(&file);
        let stated: usize = text.split("/Length ").nth(1).unwrap().split(' ').next().unwrap().parse().unwrap();
        let start = text.find("stream\n").unwrap() + 7;
        assert_eq!(text.find("endstream").unwrap() - start, stated);
    }
}
