//! `[target]`: how places on the screen are known.

use super::{
    BenchError, SheetFormat, Side, Target, TargetKind,
    screen::turn,
    section::{Section, Sense, point, stated},
    tree::{Content, Node, Table},
};
use crate::{
    frames::{PixelPoint, TargetPoint},
    quantity::{Dimension, Quantity},
};

const KINDS: [&str; 4] = ["pitch", "marks", "sheet", "ruling"];
const MARKS: &str = "a list of marks, such as [{ px = [380, 293], mm = [0, 210] }, ...]";
/// More marks than anyone types.
const MOST_MARKS: usize = 1000;
/// Marks whose triangle is flatter than this share of the whole extent count as lying on a line.
const FLAT: f64 = 0.01;

/// The target, if there is one.
pub(super) fn read_target(root: &Table, seen_from: Side) -> Result<Option<Target>, BenchError> {
    let section = Section::at(root, "target")?;
    if !section.is_given() {
        return Ok(None);
    }
    section.allow_only(&["photo", "pitch", "turn", "marks", "marks_u", "sheet", "ruling"])?;
    let turn_rad = section.quantity("turn", Dimension::Angle)?.map(turn).transpose()?;
    let given: Vec<&str> = KINDS.into_iter().filter(|key| section.node(key).is_some()).collect();
    match given.as_slice() {
        [kind] => {
            refuse_stray_marks_u(&section, kind)?;
            Ok(Some(Target { kind: read_kind(&section, kind, seen_from)?, turn_rad }))
        }
        [] => Err(BenchError::Missing {
            key: section.path_of("pitch"),
            advice: "state the distance of the printed dots, pitch = \"10.000(3) mm\"; or marks, sheet or ruling; or take [target] out"
                .to_owned(),
        }),
        [first, second, ..] => {
            let first = KINDS.into_iter().find(|key| key == first).unwrap_or(KINDS[0]);
            Err(BenchError::SeveralTargets { place: section.place(second), first })
        }
    }
}

fn refuse_stray_marks_u(section: &Section<'_>, kind: &str) -> Result<(), BenchError> {
    if kind == "marks" || section.node("marks_u").is_none() {
        return Ok(());
    }
    Err(BenchError::Conflict { place: section.place("marks_u"), conflict: "this is the uncertainty of marks, but there are none" })
}

const DOTS: Sense = Sense { what: "distance of printed dots", range: 0.2e-3..=1.0, range_in_words: "0.2 mm to 1 m" };

/// The pitch of a dot target as a flag states it, m.
///
/// # Errors
/// A [`BenchError`] that names the flag, the value seen and what to do.
pub fn target_pitch(flag: &'static str, text: &str) -> Result<Quantity, BenchError> {
    stated(&Node::text(flag, text), flag, Dimension::Length)?.sensible_and_known(&DOTS)
}

fn read_kind(section: &Section<'_>, kind: &str, seen_from: Side) -> Result<TargetKind, BenchError> {
    const LINES: Sense = Sense { what: "distance of ruled lines", range: 0.2e-3..=1.0, range_in_words: "0.2 mm to 1 m" };
    let photo = section.text("photo", "a file name in quotes, such as \"target.jpg\"")?.map(str::to_owned);
    let pitch = |sense: &Sense| match section.quantity(kind, Dimension::Length)? {
        Some(stated) => stated.sensible_and_known(sense),
        None => Err(BenchError::Missing { key: section.path_of(kind), advice: "write \"10.000(3) mm\"".to_owned() }),
    };
    match kind {
        "pitch" => Ok(TargetKind::Dots { photo, pitch_m: pitch(&DOTS)? }),
        "ruling" => Ok(TargetKind::Ruling { photo, pitch_m: pitch(&LINES)? }),
        "sheet" => {
            let format = section.choice("sheet", &SheetFormat::ALL)?;
            Ok(TargetKind::Sheet { photo, format: format.unwrap_or(SheetFormat::A4) })
        }
        _ if photo.is_some() => Err(BenchError::Conflict {
            place: section.place("photo"),
            conflict: "marks are places in the pattern photo itself; take photo out of [target]",
        }),
        _ => read_marks(section, seen_from),
    }
}

fn read_marks(section: &Section<'_>, seen_from: Side) -> Result<TargetKind, BenchError> {
    const U: Sense = Sense { what: "uncertainty of a mark", range: 1e-3..=1e3, range_in_words: "0.001 px to 1000 px" };
    let items = section.list("marks", MARKS)?.unwrap_or(&[]);
    if !(4..=MOST_MARKS).contains(&items.len()) {
        return Err(BenchError::NumberOfMarks { place: section.place("marks"), found: items.len() });
    }
    let marks = items.iter().map(|item| read_mark(item, &section.path_of("marks"))).collect::<Result<Vec<_>, _>>()?;
    Shape { section, marks: &marks }.check(seen_from)?;
    Ok(TargetKind::Marks { u_px: marks_u(section, &U)?, marks })
}

fn marks_u(section: &Section<'_>, sense: &Sense) -> Result<f64, BenchError> {
    match section.uncertainty("marks_u", Dimension::Pixel)? {
        Some(stated) => Ok(stated.sensible(sense)?.value),
        None => Err(BenchError::Missing {
            key: section.path_of("marks_u"),
            advice: "state how well each mark was read off the photo, such as marks_u = \"2 px (k=1)\"".to_owned(),
        }),
    }
}

fn read_mark(item: &Node, path: &str) -> Result<(PixelPoint, TargetPoint), BenchError> {
    let Content::Table(table) = &item.content else {
        return Err(BenchError::WrongKind { place: item.place(path), seen: item.seen(), needed: MARKS });
    };
    let mark = Section::of(path.to_owned(), table);
    mark.allow_only(&["px", "mm"])?;
    let coordinates = |key: &str| match mark.node(key) {
        Some(node) => point(node, &mark.path_of(key)),
        None => {
            Err(BenchError::Missing { key: mark.path_of(key), advice: "each mark has both: { px = [380, 293], mm = [0, 210] }".to_owned() })
        }
    };
    let [x_px, y_px] = coordinates("px")?;
    let [x_mm, y_mm] = coordinates("mm")?;
    Ok((PixelPoint { x_px, y_px }, TargetPoint { x_m: x_mm / 1e3, y_m: y_mm / 1e3 }))
}

/// Whether marks can fix the view of a plane.
struct Shape<'a> {
    section: &'a Section<'a>,
    marks: &'a [(PixelPoint, TargetPoint)],
}

impl Shape<'_> {
    fn check(&self, seen_from: Side) -> Result<(), BenchError> {
        let px: Vec<[f64; 2]> = self.marks.iter().map(|(pixel, _)| [pixel.x_px, pixel.y_px]).collect();
        let m: Vec<[f64; 2]> = self.marks.iter().map(|(_, place)| [place.x_m, place.y_m]).collect();
        for (points, in_what) in [(&px, "px"), (&m, "mm")] {
            if let Some((first, second)) = twice(points) {
                return Err(BenchError::MarkTwice { place: self.section.place("marks"), first, second, in_what });
            }
            if all_but_one_on_a_line(points) {
                let in_what = if in_what == "px" { "in the photo" } else { "on the screen" };
                return Err(BenchError::MarksOnALine { place: self.section.place("marks"), in_what });
            }
        }
        self.check_sense_of_turning(&px, &m, seen_from)
    }

    /// A camera in front of a plane keeps the sense in which any three marks turn, or reverses it for all of them.
    ///
    /// From the front, y down against Y up reverses it. From behind both occur: the print may be on either face.
    fn check_sense_of_turning(&self, px: &[[f64; 2]], m: &[[f64; 2]], seen_from: Side) -> Result<(), BenchError> {
        let place = || self.section.place("marks");
        let (flat_px, flat_m) = (FLAT * extent(px).powi(2), FLAT * extent(m).powi(2));
        // Twenty marks have 1140 triples; more marks are as good as checked by these.
        let few = self.marks.len().min(20);
        let triples = (0..few).flat_map(|i| (i + 1..few).flat_map(move |j| (j + 1..few).map(move |k| [i, j, k])));
        let senses = triples.filter_map(|[i, j, k]| {
            let (area_px, area_m) = (doubled_area(px[i], px[j], px[k]), doubled_area(m[i], m[j], m[k]));
            (area_px.abs() > flat_px && area_m.abs() > flat_m).then_some(([i, j, k], area_px * area_m > 0.0))
        });
        let (kept, reversed): (Vec<_>, Vec<_>) = senses.partition(|(_, kept)| *kept);
        let few = if kept.len() < reversed.len() { &kept } else { &reversed };
        match few.first() {
            Some((marks, _)) => Err(BenchError::MarksContradict { place: place(), marks: *marks }),
            None if seen_from == Side::Front && !kept.is_empty() => Err(BenchError::MarksMirrored { place: place() }),
            None => Ok(()),
        }
    }
}

fn twice(points: &[[f64; 2]]) -> Option<(usize, usize)> {
    let least = 1e-6 * extent(points);
    (0..points.len()).find_map(|i| (i + 1..points.len()).find(|j| distance(points[i], points[*j]) <= least).map(|j| (i, j)))
}

/// Exactly then four points in general position are missing, and no view of the plane is fixed.
///
/// A line that misses at most one point holds two of any three, so the three lines through the first three points are enough.
fn all_but_one_on_a_line(points: &[[f64; 2]]) -> bool {
    let flat = FLAT * extent(points);
    [[0, 1], [0, 2], [1, 2]].into_iter().any(|[i, j]| {
        let length = distance(points[i], points[j]);
        let off = points.iter().filter(|point| doubled_area(points[i], points[j], **point).abs() > flat * length);
        off.count() <= 1
    })
}

fn distance(a: [f64; 2], b: [f64; 2]) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

fn doubled_area(a: [f64; 2], b: [f64; 2], c: [f64; 2]) -> f64 {
    (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
}

/// Diagonal of the box around the points.
fn extent(points: &[[f64; 2]]) -> f64 {
    let side = |axis: usize| {
        let (low, high) =
            points.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), point| (low.min(point[axis]), high.max(point[axis])));
        high - low
    };
    side(0).hypot(side(1))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bench::Bench;

    const CORNERS: [([f64; 2], [f64; 2]); 4] = [
        ([380.0, 293.0], [0.0, 210.0]),
        ([1487.0, 336.0], [297.0, 210.0]),
        ([1421.0, 1054.0], [297.0, 0.0]),
        ([409.0, 1044.0], [0.0, 0.0]),
    ];

    fn parsed(marks: &[([f64; 2], [f64; 2])], seen_from: &str, keys: &str) -> Result<TargetKind, BenchError> {
        let marks: Vec<String> =
            marks.iter().map(|(px, mm)| format!("{{ px = [{:?}, {:?}], mm = [{:?}, {:?}] }}", px[0], px[1], mm[0], mm[1])).collect();
        let text = format!(
            "[laser]\nwavelength = \"650(5) nm\"\n[screen]\nseen_from = \"{seen_from}\"\n[target]\nmarks = [{}]\n{keys}",
            marks.join(", ")
        );
        Bench::parse(&text).map(|(bench, _)| bench.target.unwrap().kind)
    }

    fn refusal(marks: &[([f64; 2], [f64; 2])]) -> String {
        parsed(marks, "front", "marks_u = \"2 px (k=1)\"").unwrap_err().to_string()
    }

    #[test]
    fn marks_keep_their_place_and_uncertainty() {
        for (text, want) in [("2 px (k=1)", 2.0), ("2 px (k=2)", 1.0), ("± 3 px (limits)", 3f64.sqrt())] {
            let TargetKind::Marks { marks, u_px } = parsed(&CORNERS, "front", &format!("marks_u = \"{text}\"")).unwrap() else { panic!() };
            assert!((u_px - want).abs() < 1e-12, "{text}: {u_px}");
            assert_eq!(marks[1], (PixelPoint { x_px: 1487.0, y_px: 336.0 }, TargetPoint { x_m: 0.297, y_m: 0.21 }));
        }
    }

    #[test]
    fn an_uncertainty_of_marks_is_needed_and_checked() {
        let with = |keys: &str| parsed(&CORNERS, "front", keys).unwrap_err().to_string();
        assert!(with("").contains("target.marks_u is missing") && with("").contains("2 px (k=1)"));
        assert!(with("marks_u = \"2 px\"").contains("which uncertainty is that?"));
        assert!(with("marks_u = \"0 px (k=1)\"").contains("zero"));
        assert!(with("marks_u = \"2 mm (k=1)\"").contains("unit of length"));
        assert!(with("marks_u = \"2000 px (k=1)\"").contains("1000 px"));
        assert!(with("marks_u = 2").contains("bare number 2"));
        assert!(with("marks_u = \"2 px (k=1)\"\nphoto = \"t.jpg\"").contains("target.photo"));
    }

    #[test]
    fn marks_that_fix_no_view_are_refused() {
        assert!(refusal(&CORNERS[..3]).contains("3 marks; 4 to 1000"));
        let mut twice = CORNERS;
        twice[2].1 = twice[0].1;
        assert!(refusal(&twice).contains("marks 1 and 3 have the same mm"));
        // Three on a line and one beside it: a homography is still free.
        let line = [([0.0, 900.0], [0.0, 0.0]), ([100.0, 900.0], [10.0, 0.0]), ([200.0, 900.0], [20.0, 0.0]), ([0.0, 800.0], [0.0, 10.0])];
        assert!(refusal(&line).contains("one line"));
        let enough = [line.as_slice(), &[([100.0, 800.0], [10.0, 10.0])]].concat();
        assert!(parsed(&enough, "front", "marks_u = \"2 px (k=1)\"").is_ok());
    }

    #[test]
    fn mirrored_and_swapped_marks_are_refused() {
        let down = CORNERS.map(|(px, [x, y])| (px, [x, -y]));
        assert!(refusal(&down).contains("mirrored"));
        assert!(parsed(&down, "behind", "marks_u = \"2 px (k=1)\"").is_ok(), "from behind a print may read either way");
        let mut swapped = CORNERS;
        (swapped[0].1, swapped[1].1) = (swapped[1].1, swapped[0].1);
        assert!(refusal(&swapped).contains("swapped"), "{}", refusal(&swapped));
    }

    #[test]
    fn other_targets() {
        let kind = |keys: &str| {
            let text = format!("[laser]\nwavelength = \"650(5) nm\"\n[target]\n{keys}");
            Bench::parse(&text).map(|(bench, _)| bench.target.unwrap().kind)
        };
        assert_eq!(kind("sheet = \"A3\"").unwrap(), TargetKind::Sheet { format: SheetFormat::A3, photo: None });
        assert!(matches!(kind("ruling = \"1.000(2) mm\"\nphoto = \"r.png\"").unwrap(), TargetKind::Ruling { photo: Some(_), .. }));
        assert!(matches!(kind("pitch = \"10.000(3) mm\"").unwrap(), TargetKind::Dots { photo: None, .. }));
        assert!(kind("pitch = \"10.0(1) um\"").unwrap_err().to_string().contains("0.2 mm"));
        assert!(kind("pitch = \"10.0(1) mm\"\nmarks_u = \"2 px (k=1)\"").unwrap_err().to_string().contains("there are none"));
        assert!(kind("turn = \"0(1) deg\"").unwrap_err().to_string().contains("target.pitch is missing"));
    }
}
