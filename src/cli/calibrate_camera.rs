//! `spotrule calibrate camera`: views of the dot target in, the lens with its covariance out.

use super::{
    Failure,
    arguments::CalibrateCameraArguments,
    calibrate::{existing, stamp},
    files::{self, Existing},
    measure::photo_files,
};
use crate::{
    bench, calibration,
    measure::calibrate_camera,
    report::{self, Program},
};
use std::process::ExitCode;

const REMARKS: &str =
    "# Written by spotrule calibrate camera: focal length, principal point and distortion of one camera at one zoom and focus setting.
# In a bench file: [camera] calibration = \"THIS-FILE\"
# Do not edit it: a checksum guards it. This is not a calibration certificate of an accredited laboratory.
";

pub(super) fn run(arguments: &CalibrateCameraArguments) -> Result<ExitCode, Failure> {
    let outcome = camera(arguments);
    if let (Err(failure), Some(path)) = (&outcome, &arguments.json) {
        let text = report::refused_json(failure.code(), &failure.to_string(), &report::Context::default(), &Program::this());
        if path.as_os_str() == "-" { files::print(&text)? } else { files::write(path, text.as_bytes(), Existing::Replaced)? }
    }
    outcome
}

fn camera(arguments: &CalibrateCameraArguments) -> Result<ExitCode, Failure> {
    let existing = existing(&arguments.out, arguments.force)?;
    let pitch_m = bench::target_pitch("--target-pitch", &arguments.target_pitch)
        .map_err(|error| Failure::Measurement { about: None, error: Box::new(error.into()) })?;
    let photos =
        arguments.photos.iter().map(|path| Ok((path.display().to_string(), files::read(path)?))).collect::<Result<Vec<_>, Failure>>()?;
    let mut found = calibrate_camera(&photo_files(&photos), pitch_m)
        .map_err(|failed| Failure::Measurement { about: failed.file, error: failed.error })?;
    stamp(&mut found.calibration);
    let text = format!("{REMARKS}{}", calibration::text(&found.calibration));
    files::write(&arguments.out, text.as_bytes(), existing)?;
    match &arguments.json {
        Some(path) if path.as_os_str() == "-" => {
            files::print(&report::camera_json(&found, &Program::this()))?;
            return Ok(ExitCode::SUCCESS);
        }
        Some(path) => files::write(path, report::camera_json(&found, &Program::this()).as_bytes(), Existing::Replaced)?,
        None => {}
    }
    if !arguments.quiet {
        files::print(&report::camera_text(&found))?;
        files::print(&format!("Written to {}\n", arguments.out.display()))?;
    }
    Ok(ExitCode::SUCCESS)
}
