//! What a quick look states on the command line instead of in a bench file, or over it.

use super::{
    Bench, BenchError,
    tree::{Content, Node, Origin, Table},
};

/// Values given as flags. Each is written as in the bench file; a pair is written with a comma: `0(1) deg, 0(1) deg`.
///
/// The flag of each field is named in its description; messages name it.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Overrides {
    /// `--wavelength`: `650(5) nm`
    pub wavelength: Option<String>,
    /// `--medium`: `air` or `vacuum`
    pub medium: Option<String>,
    /// `--temperature`: `20.0(5) degC`
    pub temperature: Option<String>,
    /// `--pressure`: `1013(2) hPa`
    pub pressure: Option<String>,
    /// `--humidity`: `50(10) %`
    pub humidity: Option<String>,
    /// `--mode`: `transmission` or `reflection`
    pub mode: Option<String>,
    /// `--pattern`: `line`, `plane` or `auto`
    pub pattern: Option<String>,
    /// `--incidence`: a pair
    pub incidence: Option<String>,
    /// `--throw`: `1.200(2) m`
    pub throw: Option<String>,
    /// `--tilt`: a pair
    pub tilt: Option<String>,
    /// `--seen-from`: `front` or `behind`
    pub seen_from: Option<String>,
    /// `--target-photo`: file name
    pub target_photo: Option<String>,
    /// `--target-pitch`: `10.000(3) mm`
    pub target_pitch: Option<String>,
    /// `--target-turn`: `0(1) deg`
    pub target_turn: Option<String>,
    /// `--sheet`: `a4` and the like
    pub sheet: Option<String>,
    /// `--ruling`: `1.000(2) mm`
    pub ruling: Option<String>,
    /// `--square-on`: a pair
    pub square_on: Option<String>,
    /// `--focal-length`: `3400(50) px`, or focal length and pixel size: `4.20(5) mm, 1.40(1) um`
    pub focal_length: Option<String>,
    /// `--scale`: two points and their distance: `412,880 1630,902 = 100.0(2) mm`
    pub scale: Option<String>,
}

/// Section, key, flag and text of one flag.
type Flag<'a> = (&'static str, &'static str, &'static str, &'a Option<String>);

impl Overrides {
    /// Whether each value can be used by itself, for a program that asks for one value after the other.
    ///
    /// What is not stated is not missed.
    ///
    /// # Errors
    /// As [`Bench::with_overrides`]; the flag names the value.
    pub fn check(&self) -> Result<(), BenchError> {
        let mut filled = self.clone();
        filled.wavelength.get_or_insert_with(|| "650(5) nm".to_owned());
        if self.sheet.is_none() && self.ruling.is_none() && (self.target_photo.is_some() || self.target_turn.is_some()) {
            filled.target_pitch.get_or_insert_with(|| "10.000(3) mm".to_owned());
        }
        Bench::with_overrides(None, &filled).map(|_| ())
    }

    /// What is stated, as flag and text, in the order of the sections; for the record of a measurement.
    #[must_use]
    pub fn stated(&self) -> Vec<(&'static str, &str)> {
        self.flags().into_iter().filter_map(|(_, _, flag, text)| Some((flag, text.as_deref()?))).collect()
    }

    /// Puts the flags into the tree of the bench file.
    pub(super) fn apply(&self, root: &mut Table) -> Result<(), BenchError> {
        for (section, key, flag, text) in self.flags() {
            let Some(text) = text else { continue };
            let node = node(key, flag, text)?;
            let origin = Origin::Flag(flag);
            // A section that is none is refused when it is read.
            let Some(table) = root.section_mut(section, origin) else { continue };
            only_member(table, section, flag)?.set(key, node);
        }
        Ok(())
    }

    /// Whether anything is said about a section.
    pub(super) fn names_section(&self, name: &str) -> bool {
        self.flags().iter().any(|(section, _, _, text)| *section == name && text.is_some())
    }

    /// What is said about a key, as it stands in a bench file.
    pub(super) fn written_value(&self, section: &str, key: &str) -> Option<String> {
        let (_, _, flag, text) = self.flags().into_iter().find(|flag| flag.0 == section && flag.1 == key)?;
        let text = text.as_deref()?;
        // An answer that cannot be taken apart is written whole, and refused when the file is read.
        Some(node(key, flag, text).map_or_else(|_| toml_text(text), |node| written(&node.content)))
    }

    fn flags(&self) -> [Flag<'_>; 19] {
        [
            ("laser", "wavelength", "--wavelength", &self.wavelength),
            ("laser", "medium", "--medium", &self.medium),
            ("air", "temperature", "--temperature", &self.temperature),
            ("air", "pressure", "--pressure", &self.pressure),
            ("air", "humidity", "--humidity", &self.humidity),
            ("sample", "mode", "--mode", &self.mode),
            ("sample", "pattern", "--pattern", &self.pattern),
            ("sample", "incidence", "--incidence", &self.incidence),
            ("screen", "throw", "--throw", &self.throw),
            ("screen", "tilt", "--tilt", &self.tilt),
            ("screen", "seen_from", "--seen-from", &self.seen_from),
            ("target", "photo", "--target-photo", &self.target_photo),
            ("target", "pitch", "--target-pitch", &self.target_pitch),
            ("target", "turn", "--target-turn", &self.target_turn),
            ("target", "sheet", "--sheet", &self.sheet),
            ("target", "ruling", "--ruling", &self.ruling),
            ("camera", "square_on", "--square-on", &self.square_on),
            ("camera", "focal_length", "--focal-length", &self.focal_length),
            ("camera", "scale", "--scale", &self.scale),
        ]
    }
}

/// The table that a flag means: the section, or its only named member.
fn only_member<'t>(table: &'t mut Table, section: &str, flag: &'static str) -> Result<&'t mut Table, BenchError> {
    let named = |node: &Node| matches!(node.content, Content::Table(_));
    if !matches!(section, "laser" | "sample") || !table.0.iter().any(|(_, node)| named(node)) {
        return Ok(table);
    }
    let names: Vec<&str> = table.0.iter().filter(|(_, node)| named(node)).map(|(name, _)| name.as_str()).collect();
    let ambiguous = BenchError::FlagAmbiguous { flag, section: section.to_owned(), names: names.join(", ") };
    if names.len() > 1 {
        return Err(ambiguous);
    }
    let member = table.0.iter_mut().find_map(|(_, node)| match &mut node.content {
        Content::Table(member) => Some(member),
        _ => None,
    });
    member.ok_or(ambiguous)
}

fn node(key: &str, flag: &'static str, text: &str) -> Result<Node, BenchError> {
    match key {
        "incidence" | "tilt" | "square_on" => Ok(Node::list(flag, text.split([',', ';']).map(|part| Node::text(flag, part)).collect())),
        "focal_length" => Ok(match text.split_once([',', ';']) {
            Some((focal, pixel)) => table_node(flag, [("focal", Node::text(flag, focal)), ("pixel", Node::text(flag, pixel))]),
            None => Node::text(flag, text),
        }),
        "scale" => scale(flag, text),
        _ => Ok(Node::text(flag, text)),
    }
}

fn scale(flag: &'static str, text: &str) -> Result<Node, BenchError> {
    let wrong = || BenchError::WrongKind {
        place: super::Place { key: flag.to_owned(), line: None },
        seen: format!("\"{}\"", super::tree::shortened(text)),
        needed: "two points in px and their distance, such as \"412,880 1630,902 = 100.0(2) mm\"",
    };
    let (points, distance) = text.split_once('=').ok_or_else(wrong)?;
    let numbers = points.split([',', ' ', ';']).filter(|part| !part.is_empty()).map(str::parse).collect::<Result<Vec<f64>, _>>();
    let [x1, y1, x2, y2] = numbers.ok().and_then(|numbers| <[f64; 4]>::try_from(numbers).ok()).ok_or_else(wrong)?;
    let point = |x, y| Node::list(flag, vec![Node::number(flag, x), Node::number(flag, y)]);
    let points = Node::list(flag, vec![point(x1, y1), point(x2, y2)]);
    Ok(table_node(flag, [("points", points), ("distance", Node::text(flag, distance))]))
}

fn table_node(flag: &'static str, entries: [(&str, Node); 2]) -> Node {
    let table = Table(entries.map(|(key, node)| (key.to_owned(), node)).into());
    Node { origin: Origin::Flag(flag), content: Content::Table(table) }
}

/// A value as TOML.
fn written(content: &Content) -> String {
    let joined = |parts: Vec<String>| parts.join(", ");
    match content {
        Content::Text(text) => toml_text(text),
        Content::Number(value) => format!("{value:?}"),
        Content::List(items) => format!("[{}]", joined(items.iter().map(|item| written(&item.content)).collect())),
        Content::Table(table) => {
            format!("{{ {} }}", joined(table.0.iter().map(|(key, node)| format!("{key} = {}", written(&node.content))).collect()))
        }
        Content::Other(text) => text.clone(),
    }
}

/// A text in quotes, with what TOML would misread escaped.
fn toml_text(text: &str) -> String {
    let mut quoted = String::with_capacity(text.len() + 2);
    quoted.push('"');
    for c in text.chars() {
        match c {
            '"' => quoted.push_str("\\\""),
            '\\' => quoted.push_str("\\\\"),
            c if c.is_control() => quoted.push_str(&format!("\\u{:04X}", u32::from(c))),
            c => quoted.push(c),
        }
    }
    quoted.push('"');
    quoted
}
