//! Entries for other programs: one JSON object or one CSV row each.

use super::{Entry, Outcome, Reading, Shown};
use schemars::{JsonSchema, generate::SchemaSettings};
use serde::{Serialize, Serializer};
use serde_json::value::RawValue;

/// A line of the export: the entry as it was hashed, its hash, and everything that belongs to it.
#[derive(Serialize, JsonSchema)]
struct Line<'a> {
    /// SHA-256 of the bytes of `entry`.
    #[schemars(extend("pattern" = "^[0-9a-f]{64}$"))]
    sha256: &'a str,
    /// The entry, byte for byte as it was hashed.
    #[serde(serialize_with = "as_written")]
    #[schemars(with = "Entry")]
    entry: &'a str,
    /// The full result in the format `spotrule.measurement/1`; null for a correction.
    #[serde(serialize_with = "as_written_or_null")]
    #[schemars(with = "Option<serde_json::Map<String, serde_json::Value>>")]
    result: Option<&'a str>,
    /// The text of the bench file; null where it is not kept.
    bench_text: Option<&'a str>,
}

/// JSON Schema of a line of the export, generated from the structs that are written; pretty-printed, ending with a line break.
#[must_use]
pub fn line_schema() -> String {
    let schema = SchemaSettings::draft2020_12().for_serialize().into_generator().into_root_schema_for::<Line<'_>>();
    // A schema is text, numbers and booleans under text keys: writing cannot fail.
    serde_json::to_string_pretty(&schema).unwrap_or_default() + "\n"
}

fn as_written<S: Serializer>(json: &&str, serializer: S) -> Result<S::Ok, S::Error> {
    let raw: &RawValue = serde_json::from_str(json).map_err(serde::ser::Error::custom)?;
    raw.serialize(serializer)
}

fn as_written_or_null<S: Serializer>(json: &Option<&str>, serializer: S) -> Result<S::Ok, S::Error> {
    match json {
        Some(json) => as_written(json, serializer),
        None => serializer.serialize_none(),
    }
}

/// The entry as one line of JSON, without the line break: `sha256`, `entry` byte for byte as it was hashed, `result`, `bench_text`; null where there is none.
#[must_use]
pub fn line(shown: &Shown) -> String {
    let line =
        Line { sha256: &shown.listed.sha256, entry: &shown.body, result: shown.result.as_deref(), bench_text: shown.bench_text.as_deref() };
    // A walk gives only entries that were read as JSON; a result that was spoilt in the file leaves an empty line, and verify names it.
    serde_json::to_string(&line).unwrap_or_default()
}

/// Heads of the columns of [`csv_row`].
pub const CSV_HEADER: [&str; 27] = [
    "entry",
    "time",
    "kind",
    "outcome",
    "sample",
    "operator",
    "pitch 1",
    "u 1",
    "U 1",
    "pitch 2",
    "u 2",
    "U 2",
    "pitch unit",
    "lattice angle",
    "u angle",
    "U angle",
    "angle unit",
    "notes",
    "reason",
    "remark",
    "bench",
    "bench sha256",
    "pattern photo sha256",
    "corrects",
    "why",
    "program",
    "sha256",
];

/// The entry as cells, see [`CSV_HEADER`].
///
/// A text that a spreadsheet would take for a formula (it begins with = + - @ or a tab) gets an apostrophe in front.
#[must_use]
pub fn csv_row(shown: &Shown) -> Vec<String> {
    let entry = &shown.listed.entry;
    let optional = |text: &Option<String>| text.as_deref().map(harmless).unwrap_or_default();
    let reading = |reading: Option<&Reading>| {
        let number = |number: fn(&Reading) -> f64| reading.map(|reading| number(reading).to_string()).unwrap_or_default();
        [number(|reading| reading.value), number(|reading| reading.u), number(|reading| reading.expanded)]
    };
    let unit = |reading: Option<&Reading>| reading.map(|reading| reading.unit.clone()).unwrap_or_default();
    let mut cells = vec![
        entry.entry.to_string(),
        entry.time.clone(),
        entry.kind.name().to_owned(),
        Outcome::name(entry.outcome).to_owned(),
        harmless(&entry.sample),
        optional(&entry.operator),
    ];
    cells.extend(reading(entry.pitch.first()));
    cells.extend(reading(entry.pitch.get(1)));
    cells.push(unit(entry.pitch.first()));
    cells.extend(reading(entry.lattice_angle.as_ref()));
    cells.push(unit(entry.lattice_angle.as_ref()));
    cells.extend([
        entry.notes.join(" "),
        optional(&entry.reason),
        optional(&entry.remark),
        entry.bench.as_ref().map(|bench| harmless(&bench.file)).unwrap_or_default(),
        entry.bench.as_ref().map(|bench| bench.sha256.clone()).unwrap_or_default(),
        entry.photos.first().map(|photo| photo.sha256.clone()).unwrap_or_default(),
        entry.corrects.map(|number| number.to_string()).unwrap_or_default(),
        optional(&entry.why),
        entry.program.as_ref().map(|program| format!("{} ({})", program.version, program.commit)).unwrap_or_default(),
        shown.listed.sha256.clone(),
    ]);
    cells
}

fn harmless(text: &str) -> String {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r']) { format!("'{text}") } else { text.to_owned() }
}
