//! `[[photo]]`: which photo shows which sample in which light.

use super::{
    BenchError, Laser, PatternPhoto, Sample,
    screen::turn,
    section::{Section, Sense, did_you_mean},
    tree::{Content, Node, Table, shortened},
};
use crate::quantity::Dimension;

const LISTED: &str = "a list of photos, each written under [[photo]] (two brackets)";

/// All photos, in the order of the file.
pub(super) fn read_photos(root: &Table, lasers: &[Laser], samples: &[Sample]) -> Result<Vec<PatternPhoto>, BenchError> {
    let lasers: Vec<&str> = lasers.iter().map(|laser| laser.name.as_str()).collect();
    let samples: Vec<&str> = samples.iter().map(|sample| sample.name.as_str()).collect();
    let Some(node) = root.get("photo") else { return without_photos(&lasers, &samples) };
    let Content::List(items) = &node.content else {
        return Err(BenchError::WrongKind { place: node.place("photo"), seen: node.seen(), needed: LISTED });
    };
    let mut photos: Vec<PatternPhoto> = Vec::with_capacity(items.len());
    for (index, item) in items.iter().enumerate() {
        let photo = read_photo(item, index, &lasers, &samples)?;
        if photos.iter().any(|other| other.file == photo.file) {
            return Err(BenchError::PhotoTwice { place: item.place(&path(index)), file: photo.file });
        }
        photos.push(photo);
    }
    if photos.is_empty() { without_photos(&lasers, &samples) } else { Ok(photos) }
}

/// The command line names the one photo, which is then of the one sample in the one light.
fn without_photos(lasers: &[&str], samples: &[&str]) -> Result<Vec<PatternPhoto>, BenchError> {
    for (kind, names) in [("laser", lasers), ("sample", samples)] {
        if names.len() > 1 {
            return Err(BenchError::PhotosNeeded { kind, names: names.join(", ") });
        }
    }
    Ok(Vec::new())
}

fn path(index: usize) -> String {
    format!("photo {}", index + 1)
}

fn read_photo(node: &Node, index: usize, lasers: &[&str], samples: &[&str]) -> Result<PatternPhoto, BenchError> {
    const STEP: Sense = Sense { what: "step of the screen", range: -100.0..=100.0, low: "-100 m", high: "100 m" };
    const FILE: &str = "a file name in quotes, such as \"pattern.jpg\"";
    let Content::Table(table) = &node.content else {
        return Err(BenchError::WrongKind { place: node.place("photo"), seen: node.seen(), needed: LISTED });
    };
    let section = Section::of(path(index), table);
    section.allow_only(&["file", "laser", "sample", "step", "target", "turn"])?;
    let Some(file) = section.text("file", FILE)? else {
        return Err(BenchError::Missing { key: section.path_of("file"), advice: format!("write file = {FILE}") });
    };
    Ok(PatternPhoto {
        file: file.to_owned(),
        laser: which(&section, node, "laser", lasers)?,
        sample: which(&section, node, "sample", samples)?,
        step_m: section.quantity("step", Dimension::Length)?.map(|stated| stated.sensible(&STEP)).transpose()?,
        target: section.text("target", "a file name in quotes, such as \"b-target.jpg\"")?.map(str::to_owned),
        turn_rad: section.quantity("turn", Dimension::Angle)?.map(turn).transpose()?,
    })
}

/// Index of the laser or sample that the photo names, or of the only one.
fn which(section: &Section<'_>, node: &Node, kind: &'static str, names: &[&str]) -> Result<usize, BenchError> {
    let Some(name) = section.text(kind, "a name in quotes")? else {
        return match names {
            [first, _, ..] => {
                let place = node.place(&section.path_of(kind));
                Err(BenchError::NameNeeded { place, kind, names: names.join(", "), first: (*first).to_owned() })
            }
            _ => Ok(0),
        };
    };
    if let Some(index) = names.iter().position(|known| *known == name) {
        return Ok(index);
    }
    let advice = if names == [""] {
        format!("the only {kind} has no name: write [{kind}.{}] above its keys, or leave this out", shortened(name))
    } else {
        did_you_mean(name, names.iter().copied(), "names")
    };
    Err(BenchError::UnknownName { place: section.place(kind), seen: shortened(name), kind, advice })
}
