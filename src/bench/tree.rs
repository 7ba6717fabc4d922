//! The bench file as a tree of texts, numbers and lists, each of which knows its line or its flag.

use toml::{
    Spanned,
    de::{DeTable, DeValue},
};

use super::{BenchError, Place};

/// The longest bench file that is read; a hundred photos with a thousand marks stay far below.
const MOST_BYTES: usize = 1 << 20;

/// One value.
#[derive(Debug, Clone)]
pub(super) struct Node {
    pub(super) origin: Origin,
    pub(super) content: Content,
}

/// Where a value comes from.
#[derive(Debug, Clone, Copy)]
pub(super) enum Origin {
    Line(usize),
    Flag(&'static str),
}

/// What a value is.
#[derive(Debug, Clone)]
pub(super) enum Content {
    Text(String),
    Number(f64),
    List(Vec<Node>),
    Table(Table),
    /// A truth value, a date: never wanted. As written.
    Other(String),
}

/// Keys with their values, in the order of the file.
#[derive(Debug, Clone, Default)]
pub(super) struct Table(pub(super) Vec<(String, Node)>);

impl Table {
    /// Reads TOML.
    pub(super) fn from_toml(text: &str) -> Result<Self, BenchError> {
        if text.len() > MOST_BYTES {
            return Err(BenchError::TooLong { bytes: text.len(), most: MOST_BYTES });
        }
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let lines = Lines::of(text);
        match DeTable::parse(text) {
            Ok(root) => Ok(table(root.get_ref(), &lines)),
            Err(error) => Err(syntax_error(&error, text, &lines)),
        }
    }

    pub(super) fn get(&self, key: &str) -> Option<&Node> {
        self.0.iter().find(|(name, _)| name == key).map(|(_, node)| node)
    }

    /// Sets a key, in place of what it was.
    pub(super) fn set(&mut self, key: &str, node: Node) {
        match self.0.iter_mut().find(|(name, _)| name == key) {
            Some((_, old)) => *old = node,
            None => self.0.push((key.to_owned(), node)),
        }
    }

    /// The section of that name, made if it is not there; `None` where the key is something else than a section.
    pub(super) fn section_mut(&mut self, name: &str, origin: Origin) -> Option<&mut Self> {
        if self.get(name).is_none() {
            self.set(name, Node { origin, content: Content::Table(Self::default()) });
        }
        match self.0.iter_mut().find(|(key, _)| key == name) {
            Some((_, Node { content: Content::Table(section), .. })) => Some(section),
            _ => None,
        }
    }
}

impl Node {
    pub(super) fn text(flag: &'static str, text: &str) -> Self {
        Self { origin: Origin::Flag(flag), content: Content::Text(text.trim().to_owned()) }
    }

    pub(super) fn number(flag: &'static str, value: f64) -> Self {
        Self { origin: Origin::Flag(flag), content: Content::Number(value) }
    }

    pub(super) fn list(flag: &'static str, nodes: Vec<Self>) -> Self {
        Self { origin: Origin::Flag(flag), content: Content::List(nodes) }
    }

    /// The place of this value, whose key is `path`.
    pub(super) fn place(&self, path: &str) -> Place {
        match self.origin {
            Origin::Line(line) => Place { key: path.to_owned(), line: Some(line) },
            Origin::Flag(flag) => Place { key: flag.to_owned(), line: None },
        }
    }

    /// What stands here, for a message.
    pub(super) fn seen(&self) -> String {
        match &self.content {
            Content::Text(text) => format!("the text \"{}\"", shortened(text)),
            Content::Number(value) => format!("the bare number {value}"),
            Content::List(nodes) => format!("a list of {}", nodes.len()),
            Content::Table(_) => "a table".to_owned(),
            Content::Other(written) => written.clone(),
        }
    }
}

/// A text short enough for a message.
pub(super) fn shortened(text: &str) -> String {
    const MOST: usize = 60;
    if text.chars().count() <= MOST { text.to_owned() } else { text.chars().take(MOST).chain(['…']).collect() }
}

/// Byte offsets at which the lines start.
struct Lines(Vec<usize>);

impl Lines {
    fn of(text: &str) -> Self {
        Self(std::iter::once(0).chain(text.bytes().enumerate().filter(|(_, byte)| *byte == b'\n').map(|(at, _)| at + 1)).collect())
    }

    /// Number of the line, from 1.
    fn at(&self, offset: usize) -> usize {
        self.0.partition_point(|start| *start <= offset)
    }
}

fn table(entries: &DeTable<'_>, lines: &Lines) -> Table {
    // The TOML reader sorts keys by name; the first laser and the first sample are those that come first in the file.
    let mut entries: Vec<_> = entries.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    Table(entries.into_iter().map(|(key, value)| (key.get_ref().to_string(), node(value, lines.at(key.span().start), lines))).collect())
}

/// `line`: the line of the key; items of a list stand on their own lines.
fn node(value: &Spanned<DeValue<'_>>, line: usize, lines: &Lines) -> Node {
    let content = match value.get_ref() {
        DeValue::String(text) => Content::Text(text.to_string()),
        DeValue::Integer(digits) => integer(digits.as_str(), digits.radix()),
        DeValue::Float(digits) => digits.as_str().parse().map_or_else(|_| Content::Other(digits.as_str().to_owned()), Content::Number),
        DeValue::Boolean(value) => Content::Other(value.to_string()),
        DeValue::Datetime(value) => Content::Other(value.to_string()),
        DeValue::Array(items) => Content::List(items.iter().map(|item| node(item, lines.at(item.span().start), lines)).collect()),
        DeValue::Table(entries) => Content::Table(table(entries, lines)),
    };
    Node { origin: Origin::Line(line), content }
}

fn integer(digits: &str, radix: u32) -> Content {
    let other = || Content::Other(digits.to_owned());
    if radix == 10 {
        return digits.parse().map_or_else(|_| other(), Content::Number);
    }
    // 32 bits fit a float exactly, and no pixel or millimetre needs more.
    i32::from_str_radix(digits, radix).map_or_else(|_| other(), |value| Content::Number(f64::from(value)))
}

fn syntax_error(error: &toml::de::Error, text: &str, lines: &Lines) -> BenchError {
    let line = error.span().map_or(1, |span| lines.at(span.start.min(text.len())));
    let seen = text.lines().nth(line - 1).unwrap_or("").trim();
    let reason = error.message().lines().next().unwrap_or("not valid").to_owned();
    BenchError::Syntax { line, reason, seen: shortened(seen), advice: syntax_advice(seen) }
}

/// What to do about the mistakes that are made most often.
fn syntax_advice(line: &str) -> &'static str {
    let Some((_, value)) = line.split_once('=') else {
        return "; a line is a [section], or key = \"value\"";
    };
    let value = value.trim();
    if value.is_empty() {
        "; write the value behind =, or take the line out when nothing is known"
    } else if !value.starts_with(['"', '\'', '[', '{']) {
        "; a quantity stands in quotes: \"812(1) mm\""
    } else {
        "; check quotes, brackets and commas, and that no key stands twice"
    }
}
