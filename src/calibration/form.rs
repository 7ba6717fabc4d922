//! The table `[calibration]` as it is written: its keys, in their order, as text that a person can read.
//!
//! The checksum is the SHA-256 of [`Form::body`]. So this text must not change within one [`FORMAT`]: spaces and comments in the file may,
//! values may not. A golden file holds it.

use serde::Deserialize;

use crate::digest::sha256_hex;

/// Name and version of the format.
pub(super) const FORMAT: &str = "spotrule.calibration/1";

/// A file with such a table.
#[derive(Debug, Deserialize)]
pub(super) struct File {
    pub(super) calibration: Option<Form>,
}

/// The table.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Form {
    pub(super) format: String,
    pub(super) kind: String,
    pub(super) program: String,
    pub(super) date: String,
    pub(super) bench_sha256: Option<String>,
    pub(super) photos: Vec<PhotoForm>,
    #[serde(default)]
    pub(super) certificates: Vec<CertificateForm>,
    #[serde(default)]
    pub(super) sections: Vec<SectionForm>,
    pub(super) size_px: [u32; 2],
    pub(super) camera: Option<String>,
    pub(super) focal_length_mm: Option<f64>,
    pub(super) focal_length_35mm_mm: Option<f64>,
    pub(super) rms_px: f64,
    pub(super) camera_reference: Option<[[f64; 3]; 3]>,
    pub(super) parameters: Vec<ParameterForm>,
    pub(super) correlation: Vec<Vec<f64>>,
    pub(super) checksum: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct PhotoForm {
    pub(super) file: String,
    pub(super) shows: String,
    pub(super) sha256: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct CertificateForm {
    pub(super) of: String,
    pub(super) pitch: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct SectionForm {
    pub(super) name: String,
    pub(super) sha256: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ParameterForm {
    pub(super) name: String,
    pub(super) unit: String,
    pub(super) value: f64,
    pub(super) u: f64,
}

impl Form {
    /// The table without its checksum.
    pub(super) fn body(&self) -> String {
        let mut text = String::from("[calibration]\n");
        let mut line = |key: &str, value: String| text += &format!("{key} = {value}\n");
        line("format", quoted(&self.format));
        line("kind", quoted(&self.kind));
        line("program", quoted(&self.program));
        line("date", quoted(&self.date));
        if let Some(hash) = &self.bench_sha256 {
            line("bench_sha256", quoted(hash));
        }
        line("photos", items(&self.photos, |p| fields(&[("file", &p.file), ("shows", &p.shows), ("sha256", &p.sha256)])));
        line("certificates", items(&self.certificates, |c| fields(&[("of", &c.of), ("pitch", &c.pitch)])));
        line("sections", items(&self.sections, |s| fields(&[("name", &s.name), ("sha256", &s.sha256)])));
        line("size_px", format!("[{}, {}]", self.size_px[0], self.size_px[1]));
        if let Some(camera) = &self.camera {
            line("camera", quoted(camera));
        }
        for (key, value) in [("focal_length_mm", self.focal_length_mm), ("focal_length_35mm_mm", self.focal_length_35mm_mm)] {
            if let Some(value) = value {
                line(key, number(value));
            }
        }
        line("rms_px", number(self.rms_px));
        if let Some(rows) = &self.camera_reference {
            line("camera_reference", items(rows, |row| list(row)));
        }
        line("parameters", items(&self.parameters, parameter));
        line("correlation", items(&self.correlation, |row| list(row)));
        text
    }

    /// The whole table.
    pub(super) fn text(&self) -> String {
        format!("{}checksum = {}\n", self.body(), quoted(&self.checksum))
    }

    /// The checksum that belongs to the content.
    pub(super) fn right_checksum(&self) -> String {
        sha256_hex(self.body().as_bytes())
    }
}

fn parameter(parameter: &ParameterForm) -> String {
    let ParameterForm { name, unit, value, u } = parameter;
    format!("{{ name = {}, unit = {}, value = {}, u = {} }}", quoted(name), quoted(unit), number(*value), number(*u))
}

/// A TOML basic string.
fn quoted(text: &str) -> String {
    let mut out = String::from("\"");
    for letter in text.chars() {
        match letter {
            '"' | '\\' => out.extend(['\\', letter]),
            c if c.is_control() => out += &format!("\\u{:04X}", u32::from(c)),
            c => out.push(c),
        }
    }
    out + "\""
}

/// The shortest text that reads back as the same float.
fn number(value: f64) -> String {
    format!("{value:?}")
}

fn list(values: &[f64]) -> String {
    format!("[{}]", values.iter().map(|value| number(*value)).collect::<Vec<_>>().join(", "))
}

fn fields(pairs: &[(&str, &String)]) -> String {
    format!("{{ {} }}", pairs.iter().map(|(key, value)| format!("{key} = {}", quoted(value))).collect::<Vec<_>>().join(", "))
}

/// A list with one item per line.
fn items<T>(values: &[T], item: impl Fn(&T) -> String) -> String {
    if values.is_empty() {
        return "[]".to_owned();
    }
    format!("[\n{}]", values.iter().map(|value| format!("  {},\n", item(value))).collect::<String>())
}
