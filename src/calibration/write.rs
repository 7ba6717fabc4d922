//! A calibration as text.

use super::{
    Calibration, Kind, Shows,
    form::{CertificateForm, FORMAT, Form, ParameterForm, PhotoForm, SectionForm},
};
use crate::quantity::Unit;

/// The table `[calibration]`, to be put at the end of a TOML file: every number with all its digits, and a checksum over the content.
#[must_use]
pub fn text(calibration: &Calibration) -> String {
    let mut form = form(calibration);
    form.checksum = form.right_checksum();
    form.text()
}

fn form(calibration: &Calibration) -> Form {
    let Calibration { kind, made_from, taken_with, camera_reference, posterior } = calibration;
    let photo = |photo: &super::MadePhoto| PhotoForm {
        file: photo.file.clone(),
        shows: shows(photo.shows).to_owned(),
        sha256: photo.sha256.clone(),
    };
    let parameter = |known: &super::UncertainValue| {
        let in_unit = |si: f64| Unit::find(&known.unit).map_or(si, |unit| unit.difference_from_si(si));
        ParameterForm { name: known.name.clone(), unit: known.unit.clone(), value: in_unit(known.value), u: in_unit(known.u) }
    };
    let correlation = &posterior.correlation;
    Form {
        format: FORMAT.to_owned(),
        kind: kind_word(*kind).to_owned(),
        program: made_from.program.clone(),
        date: made_from.date.clone(),
        bench_sha256: (!made_from.bench_sha256.is_empty()).then(|| made_from.bench_sha256.clone()),
        photos: made_from.photos.iter().map(photo).collect(),
        certificates: made_from
            .certificates
            .iter()
            .map(|known| CertificateForm { of: known.of.clone(), pitch: known.pitch.clone() })
            .collect(),
        sections: made_from.sections.iter().map(|(name, sha256)| SectionForm { name: name.clone(), sha256: sha256.clone() }).collect(),
        size_px: taken_with.size_px.map(|side| u32::try_from(side).unwrap_or(u32::MAX)),
        camera: taken_with.camera.clone(),
        focal_length_mm: taken_with.focal_length_m.map(|m| m * 1e3),
        focal_length_35mm_mm: taken_with.focal_length_35mm_m.map(|m| m * 1e3),
        rms_px: made_from.rms_px,
        camera_reference: *camera_reference,
        parameters: posterior.values.iter().map(parameter).collect(),
        correlation: (0..correlation.nrows()).map(|row| (0..=row).map(|column| correlation[(row, column)]).collect()).collect(),
        checksum: String::new(),
    }
}

pub(super) fn kind_word(kind: Kind) -> &'static str {
    match kind {
        Kind::Bench => "bench",
        Kind::Camera => "camera",
    }
}

pub(super) fn shows(shows: Shows) -> &'static str {
    match shows {
        Shows::Pattern => "pattern",
        Shows::Target => "target",
    }
}
