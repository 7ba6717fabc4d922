//! `[sample]`, and what it shares with `[laser]`: one, or several with names.

use super::{
    BenchError, Mode, Pattern, Sample,
    screen::tilt_pair,
    section::{Section, Sense, Stated},
    tree::{Content, Node, Table},
};
use crate::quantity::{Dimension, Quantity};

const KEYS: &[&str] = &["mode", "pattern", "incidence", "pitch", "angle"];
const PITCH: Sense = Sense { what: "pitch", range: 50e-9..=0.02, low: "50 nm", high: "20 mm" };

/// All samples, in the order of the file.
pub(super) fn read_samples(root: &Table) -> Result<Vec<Sample>, BenchError> {
    members(root, "sample", KEYS)?.into_iter().map(|(name, section)| read_sample(name, &section)).collect()
}

fn read_sample(name: String, section: &Section<'_>) -> Result<Sample, BenchError> {
    let modes = [("transmission", Mode::Transmission), ("reflection", Mode::Reflection)];
    let patterns = [("line", Pattern::Line), ("plane", Pattern::Plane), ("auto", Pattern::Auto)];
    let mode = section.choice("mode", &modes)?.unwrap_or(Mode::Transmission);
    let pattern = section.choice("pattern", &patterns)?.unwrap_or(Pattern::Auto);
    let incidence_rad = section.pair("incidence", Dimension::Angle)?.map(|pair| tilt_pair(pair, "angle of incidence")).transpose()?;
    let pitch_m = known_pitches(section)?;
    let lattice_angle_rad = section.quantity("angle", Dimension::Angle)?.map(lattice_angle).transpose()?;
    check_reference(section, pattern, pitch_m.len(), lattice_angle_rad.is_some())?;
    Ok(Sample { name, mode, pattern, incidence_rad, pitch_m, lattice_angle_rad })
}

/// `pitch = "..."` or `pitch = ["...", "..."]`.
fn known_pitches(section: &Section<'_>) -> Result<Vec<Quantity>, BenchError> {
    match section.node("pitch").map(|node| &node.content) {
        None => Ok(Vec::new()),
        Some(Content::List(_)) => {
            let pair = section.pair("pitch", Dimension::Length)?;
            pair.into_iter().flatten().map(|stated| stated.sensible_and_known(&PITCH)).collect()
        }
        Some(_) => section.quantity("pitch", Dimension::Length)?.into_iter().map(|stated| stated.sensible_and_known(&PITCH)).collect(),
    }
}

fn lattice_angle(stated: Stated) -> Result<Quantity, BenchError> {
    // A basis that is more oblique than this is never the reduced one (60 to 120 degrees); certificates may choose another.
    let range = 20f64.to_radians()..=160f64.to_radians();
    stated.sensible(&Sense { what: "lattice angle", range, low: "20 deg", high: "160 deg" })
}

/// A plane reference needs two pitches and the angle, a line reference one pitch and no angle.
fn check_reference(section: &Section<'_>, pattern: Pattern, pitches: usize, has_angle: bool) -> Result<(), BenchError> {
    let conflict = |key, conflict| Err(BenchError::Conflict { place: section.place(key), conflict });
    match (pitches, has_angle, pattern) {
        (0, true, _) => conflict(
            "angle",
            "a lattice angle without the two pitches of a reference; state pitch = [\"...\", \"...\"] too, or leave it out",
        ),
        (1, true, _) => {
            conflict("angle", "a lattice angle belongs to a plane reference: state its two pitches, pitch = [\"...\", \"...\"]")
        }
        (1, false, Pattern::Plane) => {
            conflict("pitch", "a plane reference has two pitches and an angle: pitch = [\"...\", \"...\"], angle = \"90.00(1) deg\"")
        }
        (2, _, Pattern::Line) => conflict("pitch", "a line grating has one pitch"),
        (2, false, _) => conflict("pitch", "two pitches need the angle between them: angle = \"90.00(1) deg\""),
        _ => Ok(()),
    }
}

/// The one section `[kind]`, or all of `[kind.NAME]`; at least one, so that what is missing in it can be named.
pub(super) fn members<'a>(root: &'a Table, kind: &'static str, keys: &[&'static str]) -> Result<Vec<(String, Section<'a>)>, BenchError> {
    let whole = Section::at(root, kind)?;
    let Some(Node { content: Content::Table(table), .. }) = root.get(kind) else { return Ok(vec![(String::new(), whole)]) };
    let is_member = |(key, node): &&(String, Node)| matches!(node.content, Content::Table(_)) && !keys.contains(&key.as_str());
    let Some((first_name, _)) = table.0.iter().find(is_member) else {
        whole.allow_only(keys)?;
        return Ok(vec![(String::new(), whole)]);
    };
    if let Some((key, node)) = table.0.iter().find(|entry| !is_member(entry)) {
        let place = node.place(&whole.path_of(key));
        return Err(BenchError::MixedNames { place, section: kind.to_owned(), name: first_name.clone() });
    }
    let sections = table.0.iter().filter_map(|(name, node)| match &node.content {
        Content::Table(member) => Some((name.clone(), Section::of(whole.path_of(name), member))),
        _ => None,
    });
    let sections: Vec<_> = sections.collect();
    for (_, section) in &sections {
        section.allow_only(keys)?;
    }
    Ok(sections)
}
