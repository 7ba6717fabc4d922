//! From the JSON of a result to what an entry says of it.

use super::{
    LogError,
    entry::{BenchReference, Entry, Kind, NO_PREVIOUS, Outcome, PhotoReference, ProgramReference, Reading, SCHEMA},
};
use crate::digest::sha256_hex;
use serde::Deserialize;

/// An entry before it has a place in the log.
#[derive(Debug, Clone, PartialEq)]
pub struct Draft {
    /// Number, predecessor and time are filled when it is entered.
    pub(super) entry: Entry,
    /// The full result, compact.
    pub(super) result: Option<String>,
    /// The text of the bench file.
    pub(super) bench_text: Option<String>,
}

/// The keys of a result that an entry repeats; see docs/json.md.
#[derive(Deserialize)]
struct ResultKeys {
    schema: String,
    program: ProgramReference,
    status: String,
    #[serde(default)]
    sample: String,
    time: Option<String>,
    operator: Option<String>,
    operator_remark: Option<String>,
    #[serde(default)]
    pitch: Vec<Reading>,
    lattice_angle: Option<Reading>,
    #[serde(default)]
    warnings: Vec<Code>,
    reason: Option<Code>,
    limits: Option<LimitsKeys>,
    #[serde(default)]
    inputs: InputsKeys,
}

#[derive(Deserialize)]
struct Code {
    code: String,
}

#[derive(Deserialize)]
struct LimitsKeys {
    outcome: Outcome,
}

#[derive(Default, Deserialize)]
struct InputsKeys {
    bench: Option<BenchReference>,
    #[serde(default)]
    flags: Vec<String>,
    #[serde(default)]
    photos: Vec<PhotoReference>,
}

impl Draft {
    /// An entry for a result in the format `spotrule.measurement/1`, measured or refused.
    ///
    /// The text of the bench file is checked against the hash in the result.
    ///
    /// # Errors
    /// When the text is no such result, or the bench file another one.
    pub fn of_result(result: &str, bench_text: Option<&str>) -> Result<Self, LogError> {
        let no_result = |cause: String| LogError::NoResult { cause };
        let keys: ResultKeys = serde_json::from_str(result).map_err(|error| no_result(error.to_string()))?;
        if keys.schema != "spotrule.measurement/1" {
            return Err(no_result(format!("its schema is \"{}\"", keys.schema)));
        }
        let outcome = match (keys.status.as_str(), &keys.limits) {
            ("measured", Some(limits)) => limits.outcome,
            ("measured", None) => Outcome::Measured,
            ("refused", _) => Outcome::Refused,
            (status, _) => return Err(no_result(format!("its status is \"{status}\""))),
        };
        if let Some(text) = bench_text {
            let found = sha256_hex(text.as_bytes());
            let stated = keys.inputs.bench.as_ref().map_or("none", |bench| bench.sha256.as_str());
            if found != stated {
                return Err(LogError::OtherBench { found, stated: stated.to_owned() });
            }
        }
        let result = compact(result);
        let entry = Entry {
            outcome,
            measured_at: keys.time,
            sample: keys.sample,
            operator: keys.operator,
            remark: keys.operator_remark,
            pitch: keys.pitch,
            lattice_angle: keys.lattice_angle,
            bench: keys.inputs.bench.map(|bench| BenchReference { text_kept: bench_text.is_some(), ..bench }),
            flags: keys.inputs.flags,
            photos: keys.inputs.photos,
            notes: keys.warnings.into_iter().map(|warning| warning.code).collect(),
            reason: keys.reason.map(|reason| reason.code),
            program: Some(keys.program),
            result_sha256: Some(sha256_hex(result.as_bytes())),
            ..blank(Kind::Measurement)
        };
        Ok(Self { entry, result: Some(result), bench_text: bench_text.map(str::to_owned) })
    }

    /// A correction of `entry`: the old entry stays as it is, this one says what is wrong with it.
    ///
    /// # Errors
    /// Without a reason.
    pub fn correction(entry: u64, why: &str, sample: String, operator: Option<String>) -> Result<Self, LogError> {
        if why.trim().is_empty() {
            return Err(LogError::NoReason);
        }
        let entry = Entry {
            outcome: Outcome::Corrected,
            sample,
            operator,
            corrects: Some(entry),
            why: Some(why.trim().to_owned()),
            ..blank(Kind::Correction)
        };
        Ok(Self { entry, result: None, bench_text: None })
    }
}

fn blank(kind: Kind) -> Entry {
    Entry {
        schema: SCHEMA.to_owned(),
        entry: 0,
        previous: NO_PREVIOUS.to_owned(),
        time: String::new(),
        kind,
        outcome: Outcome::Measured,
        measured_at: None,
        sample: String::new(),
        operator: None,
        remark: None,
        pitch: vec![],
        lattice_angle: None,
        bench: None,
        flags: vec![],
        photos: vec![],
        notes: vec![],
        reason: None,
        program: None,
        result_sha256: None,
        corrects: None,
        why: None,
    }
}

/// JSON without blanks and line breaks between its parts; what stands in quotation marks is kept, and so is the order of the keys.
fn compact(json: &str) -> String {
    let mut out = String::with_capacity(json.len());
    let (mut quoted, mut escaped) = (false, false);
    for letter in json.chars() {
        if quoted {
            out.push(letter);
            quoted = escaped || letter != '"';
            escaped = letter == '\\' && !escaped;
        } else if !letter.is_ascii_whitespace() {
            quoted = letter == '"';
            out.push(letter);
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn compact_keeps_values_and_order() {
        let pretty = "{\n  \"z\": \" a \\\" b \\\\\",\n  \"a\": [ 1.50, true ]\n}\n";
        assert_eq!(compact(pretty), "{\"z\":\" a \\\" b \\\\\",\"a\":[1.50,true]}");
        let same = |text: &str| serde_json::from_str::<serde_json::Value>(text).unwrap();
        assert_eq!(same(pretty), same(&compact(pretty)));
    }

    #[test]
    fn what_is_no_result_is_refused_with_the_reason() {
        for (text, wanted) in [
            ("", "EOF"),
            ("[]", "invalid length"),
            ("{\"schema\":\"x\",\"status\":\"measured\",\"program\":{\"version\":\"1\",\"commit\":\"c\"}}", "\"x\""),
        ] {
            let error = Draft::of_result(text, None).unwrap_err().to_string();
            assert!(error.contains(wanted), "{error}");
        }
        assert!(matches!(Draft::correction(1, " ", String::new(), None), Err(LogError::NoReason)));
    }
}
