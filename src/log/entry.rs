//! One entry of the log, as it is hashed.

use crate::digest::sha256_hex;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Name and version of the entry's format.
pub(super) const SCHEMA: &str = "spotrule.log/1";

/// What `previous` says in the first entry.
pub(super) const NO_PREVIOUS: &str = "0000000000000000000000000000000000000000000000000000000000000000";

/// An entry. Its canonical form is the compact JSON of this struct, keys in the order of the fields, absent values left out; the hash of the
/// entry is the SHA-256 of these bytes. Each entry holds the hash of the one before it, so that a changed, removed or reordered
/// entry breaks the chain at its place.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Entry {
    /// `spotrule.log/1`.
    #[schemars(extend("const" = "spotrule.log/1"))]
    pub schema: String,
    /// Number of the entry, from 1, without gaps.
    pub entry: u64,
    /// SHA-256 of the entry before; 64 zeros in the first.
    pub previous: String,
    /// When it was entered: RFC 3339, UTC, milliseconds.
    pub time: String,
    /// A measurement, or a correction of an earlier entry.
    pub kind: Kind,
    /// How it ended.
    pub outcome: Outcome,
    /// When it was measured, where the result says so.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub measured_at: Option<String>,
    /// Name of the sample; empty when it has none.
    pub sample: String,
    /// Who measured, or who corrects.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub operator: Option<String>,
    /// The operator's words.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub remark: Option<String>,
    /// Pitches, shortest first.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub pitch: Vec<Reading>,
    /// Lattice angle.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub lattice_angle: Option<Reading>,
    /// The bench file; its text is kept under this hash.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub bench: Option<BenchReference>,
    /// Flags that stood over the bench file.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub flags: Vec<String>,
    /// The photos, patterns first.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub photos: Vec<PhotoReference>,
    /// Codes of the notes.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub notes: Vec<String>,
    /// Code of the reason of a refusal.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub reason: Option<String>,
    /// The program that measured.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub program: Option<ProgramReference>,
    /// SHA-256 of the full result, which is kept beside the entry.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub result_sha256: Option<String>,
    /// Number of the entry that this one corrects.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub corrects: Option<u64>,
    /// Why it is corrected.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub why: Option<String>,
}

/// What an entry is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum Kind {
    /// A measurement, measured or refused.
    Measurement,
    /// A correction of an earlier entry.
    Correction,
}

/// How a measurement ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum Outcome {
    /// Measured, without limits.
    Measured,
    /// Measured, inside the limits.
    Inside,
    /// Measured, undecided.
    Undecided,
    /// Measured, outside the limits.
    Outside,
    /// Refused: nothing could honestly be said.
    Refused,
    /// No measurement, but the correction of one.
    Corrected,
}

/// A measured value.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Reading {
    /// Value.
    pub value: f64,
    /// Standard uncertainty.
    pub u: f64,
    /// Expanded uncertainty.
    #[serde(rename = "U")]
    pub expanded: f64,
    /// `um` or `deg`.
    pub unit: String,
}

/// A bench file.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub struct BenchReference {
    /// Name as the user gave it.
    pub file: String,
    /// SHA-256 of its text.
    pub sha256: String,
    /// Whether the text is kept in the log.
    #[serde(default)]
    pub text_kept: bool,
}

/// A photo.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub struct PhotoReference {
    /// Name as the user gave it.
    pub file: String,
    /// `pattern` or `target`.
    pub role: String,
    /// SHA-256 of the file.
    pub sha256: String,
    /// Size of the file.
    pub bytes: u64,
}

/// A program.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub struct ProgramReference {
    /// Version.
    pub version: String,
    /// Commit it was built from.
    pub commit: String,
}

impl Entry {
    /// The canonical form and its SHA-256.
    pub(super) fn sealed(&self) -> (String, String) {
        // Text, integers and finite numbers under text keys: writing cannot fail.
        let body = serde_json::to_string(self).unwrap_or_default();
        let sha256 = sha256_hex(body.as_bytes());
        (body, sha256)
    }
}

impl Kind {
    /// "measurement" or "correction".
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Measurement => "measurement",
            Self::Correction => "correction",
        }
    }
}

impl Outcome {
    /// All outcomes.
    pub const ALL: [Self; 6] = [Self::Measured, Self::Inside, Self::Undecided, Self::Outside, Self::Refused, Self::Corrected];

    /// The word in the log.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Measured => "measured",
            Self::Inside => "inside",
            Self::Undecided => "undecided",
            Self::Outside => "outside",
            Self::Refused => "refused",
            Self::Corrected => "corrected",
        }
    }
}
