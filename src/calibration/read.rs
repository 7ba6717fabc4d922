//! Text to calibration. Nothing is believed: form, checksum, every number and the covariance are checked.

use nalgebra::{Cholesky, DMatrix, Matrix3};

use super::{
    Calibration, CalibrationError, Certificate, Kind, MadeFrom, MadePhoto, Posterior, Shows, TakenWith, UncertainValue,
    form::{FORMAT, File, Form, ParameterForm, PhotoForm},
    write::{kind_word, shows},
};
use crate::quantity::Unit;

/// More text than any calibration has: one of 30 parameters needs 15 kB.
const MOST_BYTES: usize = 1 << 20;
/// More parameters than any bench has.
const MOST_PARAMETERS: usize = 200;
/// Larger than any value of a bench in its unit.
const LARGEST: f64 = 1e9;
/// A rotation is one to within the digits that are written.
const ROTATION_TOLERANCE: f64 = 1e-9;

/// Reads the table `[calibration]` of a TOML file; `None` where there is none.
///
/// # Errors
/// [`CalibrationError`]: not the form of a calibration, another format, edited after it was written.
pub fn read(text: &str) -> Result<Option<Calibration>, CalibrationError> {
    if text.len() > MOST_BYTES {
        return Err(wrong(None, format!("the file has {} bytes, more than {MOST_BYTES}", text.len())));
    }
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let file: File = toml::from_str(text).map_err(|error| {
        let line = error.span().map(|span| 1 + text.bytes().take(span.start).filter(|byte| *byte == b'\n').count());
        wrong(line, printable(error.message()))
    })?;
    file.calibration.map(checked).transpose()
}

fn wrong(line: Option<usize>, reason: String) -> CalibrationError {
    CalibrationError::Form { line, reason }
}

/// A text short enough for a message, without what could steer a terminal.
fn printable(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { ' ' } else { c }).take(160).collect()
}

fn checked(form: Form) -> Result<Calibration, CalibrationError> {
    if form.format != FORMAT {
        return Err(CalibrationError::Format { seen: printable(&form.format), known: FORMAT });
    }
    let right = form.right_checksum();
    if form.checksum != right {
        let first = |checksum: &str| printable(&checksum.chars().take(12).collect::<String>());
        return Err(CalibrationError::Edited { found: first(&right), stated: first(&form.checksum) });
    }
    let kind = [Kind::Bench, Kind::Camera].into_iter().find(|kind| kind_word(*kind) == form.kind);
    let kind = kind.ok_or_else(|| wrong(None, format!("kind = \"{}\" is neither bench nor camera", printable(&form.kind))))?;
    let numbers = [form.rms_px].into_iter().chain(form.focal_length_mm).chain(form.focal_length_35mm_mm);
    for number in numbers {
        if !(number.is_finite() && (0.0..LARGEST).contains(&number)) {
            return Err(wrong(None, format!("{number} is no length")));
        }
    }
    if let Some(rows) = &form.camera_reference {
        check_rotation(rows)?;
    }
    if (kind == Kind::Bench) != form.camera_reference.is_some() {
        return Err(wrong(None, "camera_reference belongs to the calibration of a bench, and to no other".to_owned()));
    }
    Ok(Calibration {
        kind,
        made_from: MadeFrom {
            program: form.program,
            date: form.date,
            bench_sha256: form.bench_sha256.unwrap_or_default(),
            photos: form.photos.into_iter().map(photo).collect::<Result<_, _>>()?,
            certificates: form.certificates.into_iter().map(|known| Certificate { of: known.of, pitch: known.pitch }).collect(),
            sections: form.sections.into_iter().map(|section| (section.name, section.sha256)).collect(),
            rms_px: form.rms_px,
        },
        taken_with: TakenWith {
            size_px: form.size_px.map(|side| usize::try_from(side).unwrap_or(usize::MAX)),
            camera: form.camera,
            focal_length_m: form.focal_length_mm.map(|mm| mm / 1e3),
            focal_length_35mm_m: form.focal_length_35mm_mm.map(|mm| mm / 1e3),
        },
        camera_reference: form.camera_reference,
        posterior: posterior(&form.parameters, &form.correlation)?,
    })
}

fn photo(form: PhotoForm) -> Result<MadePhoto, CalibrationError> {
    let shown = [Shows::Pattern, Shows::Target].into_iter().find(|shown| shows(*shown) == form.shows);
    let shows = shown.ok_or_else(|| wrong(None, format!("shows = \"{}\" is neither pattern nor target", printable(&form.shows))))?;
    Ok(MadePhoto { file: form.file, sha256: form.sha256, shows })
}

fn check_rotation(rows: &[[f64; 3]; 3]) -> Result<(), CalibrationError> {
    let rotation = Matrix3::from_fn(|row, column| rows[row][column]);
    let off = (rotation * rotation.transpose() - Matrix3::identity()).norm();
    if off < ROTATION_TOLERANCE && rotation.determinant() > 0.0 {
        return Ok(());
    }
    Err(wrong(None, format!("camera_reference is no rotation (off by {off:.1e})")))
}

fn posterior(parameters: &[ParameterForm], rows: &[Vec<f64>]) -> Result<Posterior, CalibrationError> {
    if parameters.is_empty() || parameters.len() > MOST_PARAMETERS {
        return Err(wrong(None, format!("{} parameters; 1 to {MOST_PARAMETERS} are expected", parameters.len())));
    }
    let mut values: Vec<UncertainValue> = Vec::with_capacity(parameters.len());
    for parameter in parameters {
        let value = value(parameter)?;
        if values.iter().any(|other| other.name == value.name) {
            return Err(wrong(None, format!("\"{}\" is there twice", printable(&value.name))));
        }
        values.push(value);
    }
    let uncertain = values.iter().filter(|value| value.u > 0.0).count();
    Ok(Posterior { values, correlation: correlation(rows, uncertain)? })
}

fn value(parameter: &ParameterForm) -> Result<UncertainValue, CalibrationError> {
    let ParameterForm { name, unit, value, u } = parameter;
    if !(value.abs() < LARGEST && (0.0..LARGEST).contains(u)) {
        return Err(wrong(None, format!("{} = {value}, u = {u} is no value with its uncertainty", printable(name))));
    }
    let si = |number: f64| match unit.as_str() {
        "1" => Some(number),
        unit => Unit::find(unit).map(|unit| unit.difference_to_si(number)),
    };
    match (si(*value), si(*u)) {
        (Some(value), Some(u)) => Ok(UncertainValue { name: name.clone(), unit: unit.clone(), value, u }),
        _ => Err(wrong(None, format!("{}: the unit \"{}\" is not known", printable(name), printable(unit)))),
    }
}

/// The symmetric matrix whose lower triangle is written.
fn correlation(rows: &[Vec<f64>], uncertain: usize) -> Result<DMatrix<f64>, CalibrationError> {
    if rows.len() != uncertain || rows.iter().enumerate().any(|(row, entries)| entries.len() != row + 1) {
        return Err(wrong(None, format!("correlation must be the lower triangle for {uncertain} parameters with u above 0")));
    }
    let matrix = DMatrix::from_fn(uncertain, uncertain, |row, column| rows[row.max(column)][row.min(column)]);
    #[expect(clippy::float_cmp, reason = "a correlation with itself is written as 1")]
    let ones = matrix.diagonal().iter().all(|entry| *entry == 1.0);
    // The comparison is false for NaN.
    if !(ones && matrix.iter().all(|entry| entry.abs() <= 1.0)) || Cholesky::new(matrix.clone()).is_none() {
        return Err(wrong(None, "correlation is no correlation matrix: 1 on the diagonal, positive definite".to_owned()));
    }
    Ok(matrix)
}
