//! Reads the keys of one section: as quantities, pairs, choices and names, each complaint with its place.

use std::ops::RangeInclusive;

use super::{
    BenchError, Place,
    tree::{Content, Node, Table, shortened},
};
use crate::quantity::{Dimension, Quantity, nearest};

const QUANTITY: &str = "a text in quotes with unit and uncertainty, such as \"812.0(8) mm\"";
const PAIR: &str = "a list of two quantities, about x and about y, such as [\"0.0(5) deg\", \"0.0(5) deg\"]";
const POINT: &str = "a list of two numbers, such as [412.0, 880.0]";

/// One section of the bench file, or none of it.
#[derive(Debug, Clone)]
pub(super) struct Section<'a> {
    /// `laser.red`
    path: String,
    table: Option<&'a Table>,
}

/// A quantity as stated: what it says, where, and how it was written.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Stated {
    pub(super) quantity: Quantity,
    pub(super) place: Place,
    pub(super) text: String,
}

/// A range in which a value makes sense, in SI and in words.
#[derive(Debug, Clone)]
pub(super) struct Sense {
    pub(super) what: &'static str,
    pub(super) range: RangeInclusive<f64>,
    pub(super) low: &'static str,
    pub(super) high: &'static str,
}

impl<'a> Section<'a> {
    /// The section at a key of the whole file.
    pub(super) fn at(root: &'a Table, key: &'static str) -> Result<Self, BenchError> {
        let table = root.get(key).map(|node| table_of(node, key, "a section of its own, written [NAME] above its keys")).transpose()?;
        Ok(Self { path: key.to_owned(), table })
    }

    pub(super) fn of(path: String, table: &'a Table) -> Self {
        Self { path, table: Some(table) }
    }

    /// The table at a key of this section.
    pub(super) fn table(&self, key: &str, needed: &'static str) -> Result<Option<Self>, BenchError> {
        let Some(node) = self.node(key) else { return Ok(None) };
        let path = self.path_of(key);
        Ok(Some(Self { table: Some(table_of(node, &path, needed)?), path }))
    }

    pub(super) fn is_given(&self) -> bool {
        self.table.is_some()
    }

    pub(super) fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() { key.to_owned() } else { format!("{}.{key}", self.path) }
    }

    pub(super) fn node(&self, key: &str) -> Option<&'a Node> {
        self.table.and_then(|table| table.get(key))
    }

    pub(super) fn place(&self, key: &str) -> Place {
        let path = self.path_of(key);
        self.node(key).map_or(Place { key: path.clone(), line: None }, |node| node.place(&path))
    }

    /// Refuses keys that mean nothing here.
    pub(super) fn allow_only(&self, known: &[&'static str]) -> Result<(), BenchError> {
        let unknown = self.table.into_iter().flat_map(|table| &table.0).find(|(key, _)| !known.contains(&key.as_str()));
        let Some((key, node)) = unknown else { return Ok(()) };
        let advice = did_you_mean(key, known.iter().copied(), if self.path.is_empty() { "sections" } else { "keys" });
        Err(BenchError::UnknownKey {
            place: node.place(&self.path_of(&shortened(key))),
            is_section: self.path.is_empty(),
            advice: format!("; {advice}"),
        })
    }

    pub(super) fn text(&self, key: &str, needed: &'static str) -> Result<Option<&'a str>, BenchError> {
        let Some(node) = self.node(key) else { return Ok(None) };
        match &node.content {
            Content::Text(text) if text.trim().is_empty() => {
                Err(BenchError::WrongKind { place: self.place(key), seen: "empty".to_owned(), needed })
            }
            Content::Text(text) => Ok(Some(text)),
            _ => Err(BenchError::WrongKind { place: self.place(key), seen: node.seen(), needed }),
        }
    }

    pub(super) fn quantity(&self, key: &str, dimension: Dimension) -> Result<Option<Stated>, BenchError> {
        self.node(key).map(|node| stated(node, &self.path_of(key), dimension)).transpose()
    }

    /// Two quantities: about x, about y.
    pub(super) fn pair(&self, key: &str, dimension: Dimension) -> Result<Option<[Stated; 2]>, BenchError> {
        let Some(node) = self.node(key) else { return Ok(None) };
        let path = self.path_of(key);
        match &node.content {
            Content::List(items) => match items.as_slice() {
                [x, y] => Ok(Some([stated(x, &path, dimension)?, stated(y, &path, dimension)?])),
                _ => Err(BenchError::WrongKind { place: node.place(&path), seen: node.seen(), needed: PAIR }),
            },
            _ => Err(BenchError::WrongKind { place: node.place(&path), seen: node.seen(), needed: PAIR }),
        }
    }

    /// One of a few words.
    pub(super) fn choice<T: Copy>(&self, key: &str, choices: &[(&'static str, T)]) -> Result<Option<T>, BenchError> {
        let Some(text) = self.text(key, "one of a few words, in quotes")? else { return Ok(None) };
        if let Some((_, choice)) = choices.iter().find(|(word, _)| word.eq_ignore_ascii_case(text.trim())) {
            return Ok(Some(*choice));
        }
        let advice = did_you_mean(text, choices.iter().map(|(word, _)| *word), "choices");
        Err(BenchError::UnknownWord { place: self.place(key), seen: shortened(text), advice })
    }

    /// The items of a list; a single value is no list.
    pub(super) fn list(&self, key: &str, needed: &'static str) -> Result<Option<&'a [Node]>, BenchError> {
        let Some(node) = self.node(key) else { return Ok(None) };
        match &node.content {
            Content::List(items) => Ok(Some(items)),
            _ => Err(BenchError::WrongKind { place: self.place(key), seen: node.seen(), needed }),
        }
    }
}

impl Stated {
    /// The quantity, if it lies in the range in which it makes sense.
    pub(super) fn sensible(self, sense: &Sense) -> Result<Quantity, BenchError> {
        if sense.range.contains(&self.quantity.value) {
            return Ok(self.quantity);
        }
        Err(BenchError::OutOfRange { place: self.place, seen: self.text, what: sense.what, low: sense.low, high: sense.high })
    }

    /// The same for what must be positive: an uncertainty as large as the value says that it is not known.
    pub(super) fn sensible_and_known(self, sense: &Sense) -> Result<Quantity, BenchError> {
        if self.quantity.value > 0.0 && self.quantity.u >= self.quantity.value {
            return Err(BenchError::NotKnown { place: self.place, seen: self.text });
        }
        self.sensible(sense)
    }
}

/// A quantity at a node.
pub(super) fn stated(node: &Node, path: &str, dimension: Dimension) -> Result<Stated, BenchError> {
    let place = node.place(path);
    let Content::Text(text) = &node.content else {
        return Err(BenchError::WrongKind { place, seen: node.seen(), needed: QUANTITY });
    };
    match Quantity::parse(text, dimension) {
        Ok(quantity) => Ok(Stated { quantity, place, text: text.trim().to_owned() }),
        Err(reason) => Err(BenchError::Quantity { place, reason: Box::new(reason) }),
    }
}

/// Two plain numbers at a node, finite and of a size that a photo or a screen can have.
pub(super) fn point(node: &Node, path: &str) -> Result<[f64; 2], BenchError> {
    const MOST: f64 = 1e6;
    let wrong = |node: &Node| BenchError::WrongKind { place: node.place(path), seen: node.seen(), needed: POINT };
    let Content::List(items) = &node.content else { return Err(wrong(node)) };
    let [x, y] = items.as_slice() else { return Err(wrong(node)) };
    let coordinate = |item: &Node| match item.content {
        Content::Number(value) if value.abs() <= MOST => Ok(value),
        _ => Err(wrong(item)),
    };
    Ok([coordinate(x)?, coordinate(y)?])
}

/// Advice on a word that is not known: the nearest that is, and all of them.
pub(super) fn did_you_mean<'w>(word: &str, known: impl Iterator<Item = &'w str> + Clone, kind: &str) -> String {
    let all = known.clone().collect::<Vec<_>>().join(", ");
    match nearest(word.trim(), known) {
        Some(near) => format!("did you mean {near}? ({kind}: {all})"),
        None => format!("{kind}: {all}"),
    }
}

fn table_of<'a>(node: &'a Node, path: &str, needed: &'static str) -> Result<&'a Table, BenchError> {
    match &node.content {
        Content::Table(table) => Ok(table),
        _ => Err(BenchError::WrongKind { place: node.place(path), seen: node.seen(), needed }),
    }
}
