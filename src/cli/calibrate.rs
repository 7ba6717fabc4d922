//! `spotrule calibrate`: a bench file and its photos in, the bench file with its posterior out.

use super::{
    Failure,
    arguments::{CalibrateArguments, CalibrateBenchArguments, CalibrateCommand},
    calibrate_camera,
    files::{self, Existing},
    measure::{photo_files, read_all, read_patterns, target_names, with_lens},
};
use crate::{
    Error,
    bench::{Bench, BenchError, sections},
    calibration::{self, Calibration},
    digest::sha256_hex,
    measure::{Inputs, calibrate},
    report,
};
use std::{
    path::{Path, PathBuf},
    process::ExitCode,
};

pub(super) fn run(arguments: &CalibrateArguments) -> Result<ExitCode, Failure> {
    match (&arguments.of, &arguments.bench) {
        (Some(CalibrateCommand::Camera(arguments)), _) => calibrate_camera::run(arguments),
        (None, Some(arguments)) => bench(arguments),
        (None, None) => Err(Failure::Usage("say what to calibrate: --bench FILE --out FILE, or camera PHOTOS".to_owned())),
    }
}

fn bench(arguments: &CalibrateBenchArguments) -> Result<ExitCode, Failure> {
    let existing = existing(&arguments.out, arguments.force)?;
    let text = files::read_text(&arguments.bench)?;
    let named = |error: BenchError| Failure::Measurement {
        about: Some(arguments.bench.display().to_string()),
        error: Box::new(Error::Bench(error)),
    };
    let (bench, notes) = Bench::to_calibrate(&text).map_err(named)?;
    let folder: PathBuf = arguments.bench.parent().map(Path::to_owned).unwrap_or_default();
    let bench = with_lens(bench, &folder)?;
    let patterns = read_patterns(arguments.photo.as_deref(), &bench, &folder)?;
    let targets = read_all(&folder, target_names(&bench).into_iter())?;
    let inputs = Inputs { patterns: photo_files(&patterns), targets: photo_files(&targets) };
    let (mut measurement, mut calibration) =
        calibrate(&inputs, &bench).map_err(|failed| Failure::Measurement { about: failed.file, error: failed.error })?;
    measurement.notes.splice(0..0, notes);
    calibration.made_from.bench_sha256 = sha256_hex(text.as_bytes());
    calibration.made_from.sections = sections(&text).map_err(named)?;
    stamp(&mut calibration);
    files::write(&arguments.out, calibrated(&text, &calibration).as_bytes(), existing)?;
    if !arguments.quiet {
        files::print(&report::text(&measurement, &report::Context::default()))?;
        files::print(&report::calibration_text(&calibration, &arguments.out.display().to_string()))?;
    }
    Ok(ExitCode::SUCCESS)
}

/// The bench file as it was, with the calibration at its end.
fn calibrated(bench_text: &str, calibration: &Calibration) -> String {
    let gap = if bench_text.ends_with('\n') { "\n" } else { "\n\n" };
    format!("{bench_text}{gap}{REMARKS}{}", calibration::text(calibration))
}

const REMARKS: &str =
    "# Written by spotrule calibrate: what the photos below told of this bench, as mean, standard uncertainty u and correlation.
# It takes the place of [laser], [air], [screen], [target] and [camera] above, which must stay as they are. [sample] and [[photo]] are free:
#     spotrule measure sample.jpg --bench THIS-FILE
# It holds as long as laser, screen and camera (place, zoom, focus) are not touched. Do not edit it: a checksum guards it.
# This is not a calibration certificate of an accredited laboratory.
";

/// Date and program, which only the command line knows.
pub(super) fn stamp(calibration: &mut Calibration) {
    calibration.made_from.program = report::Program::this().version;
    calibration.made_from.date = jiff::Timestamp::now().strftime("%Y-%m-%dT%H:%M:%SZ").to_string();
}

/// Looks whether the file may be written before anything is computed.
pub(super) fn existing(out: &Path, force: bool) -> Result<Existing, Failure> {
    match (force, out.exists()) {
        (true, _) => Ok(Existing::Replaced),
        (false, true) => Err(Failure::Exists { path: out.to_owned() }),
        (false, false) => Ok(Existing::Kept),
    }
}
