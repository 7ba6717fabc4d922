//! Camera data from EXIF (JPEG APP1, PNG eXIf, TIFF tags). All of it is optional: a photo without is a photo.

use std::io::Cursor;

use exif::{In, Tag, Value};

use super::Exif;

/// Camera data of a file; unreadable metadata counts as absent.
pub(super) fn read(bytes: &[u8]) -> Exif {
    let absent = Exif { orientation: 1, ..Exif::default() };
    let Ok(fields) = exif::Reader::new().read_from_container(&mut Cursor::new(bytes)) else { return absent };
    let number = |tag| fields.get_field(tag, In::PRIMARY).and_then(|field| first_number(&field.value)).filter(|x| *x > 0.0);
    let text = |tag| fields.get_field(tag, In::PRIMARY).and_then(|field| first_text(&field.value));
    let orientation = fields.get_field(Tag::Orientation, In::PRIMARY).and_then(|field| field.value.get_uint(0));
    Exif {
        focal_length_m: number(Tag::FocalLength).map(|mm| mm * 1e-3),
        focal_length_35mm_m: number(Tag::FocalLengthIn35mmFilm).map(|mm| mm * 1e-3),
        exposure_s: number(Tag::ExposureTime),
        iso: number(Tag::PhotographicSensitivity),
        f_number: number(Tag::FNumber),
        camera: camera_name(text(Tag::Make), text(Tag::Model)),
        orientation: orientation.and_then(|tag| u8::try_from(tag).ok()).filter(|tag| (1..=8).contains(tag)).unwrap_or(1),
    }
}

fn first_number(value: &Value) -> Option<f64> {
    let number = match value {
        Value::Rational(list) => list.first()?.to_f64(),
        Value::SRational(list) => list.first()?.to_f64(),
        other => f64::from(other.get_uint(0)?),
    };
    number.is_finite().then_some(number)
}

fn first_text(value: &Value) -> Option<String> {
    let Value::Ascii(list) = value else { return None };
    let text = String::from_utf8_lossy(list.first()?).trim_matches(|c: char| c.is_whitespace() || c == '\0').to_owned();
    (!text.is_empty()).then_some(text)
}

/// Many makers repeat their name in the model; then it is said once.
fn camera_name(make: Option<String>, model: Option<String>) -> Option<String> {
    match (make, model) {
        (Some(make), Some(model)) if !model.to_lowercase().starts_with(&make.to_lowercase()) => Some(format!("{make} {model}")),
        (make, model) => model.or(make),
    }
}

#[cfg(test)]
mod tests {
    use super::{camera_name, read};

    #[test]
    fn file_without_metadata_is_upright_and_silent() {
        let exif = read(b"no image at all");
        assert_eq!(exif.orientation, 1);
        assert_eq!(exif.camera, None);
    }

    #[test]
    fn maker_is_said_once() {
        let text = |s: &str| Some(s.to_owned());
        assert_eq!(camera_name(text("Acme"), text("ACME One")), text("ACME One"));
        assert_eq!(camera_name(text("Acme"), text("One")), text("Acme One"));
        assert_eq!(camera_name(None, None), None);
    }
}
