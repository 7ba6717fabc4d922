//! `spotrule measure`: photos and bench file in, result out.

use super::{
    Failure,
    arguments::{BenchFlags, MeasureArguments},
    files::{self, Existing},
    progress,
};
use crate::{
    Error, Note,
    bench::{Bench, Overrides, Target, TargetKind},
    measure::{Inputs, Measurement, PhotoFile, TrialOptions, measure_with},
    photo, report,
};
use std::{
    path::{Path, PathBuf},
    process::ExitCode,
};

/// Files of a measurement, read.
struct Loaded {
    bench: Bench,
    notes: Vec<Note>,
    patterns: Vec<(String, Vec<u8>)>,
    targets: Vec<(String, Vec<u8>)>,
}

pub(super) fn run(arguments: &MeasureArguments) -> Result<ExitCode, Failure> {
    let outcome = load(arguments).and_then(|loaded| Ok((measured(arguments, &loaded)?, loaded)));
    match outcome {
        Ok((measurement, loaded)) => {
            deliver(arguments, &measurement, &loaded)?;
            Ok(ExitCode::SUCCESS)
        }
        Err(failure) => {
            refuse(arguments, &failure)?;
            Err(failure)
        }
    }
}

fn load(arguments: &MeasureArguments) -> Result<Loaded, Failure> {
    let bench_path = bench_path(arguments)?;
    let text = bench_path.as_deref().map(files::read_text).transpose()?;
    let named = |error| Failure::Measurement {
        about: bench_path.as_ref().map(|path| path.display().to_string()),
        error: Box::new(Error::Bench(error)),
    };
    let (bench, notes) = Bench::with_overrides(text.as_deref(), &overrides(&arguments.bench_flags)).map_err(named)?;
    let folder = bench_path.as_deref().and_then(Path::parent).map(Path::to_owned).unwrap_or_default();
    let patterns = match &arguments.photo {
        Some(photo) => vec![(photo.display().to_string(), files::read(photo)?)],
        None => read_all(&folder, bench.photos.iter().map(|photo| photo.file.as_str()))?,
    };
    if patterns.is_empty() {
        return Err(Failure::Usage("no photo: name one on the command line, or as [[photo]] in the bench file".to_owned()));
    }
    // A target named by a flag lies where the user stands, one named by the bench file lies beside that file.
    let target_folder = if arguments.bench_flags.target_photo.is_some() { PathBuf::new() } else { folder };
    let targets = read_all(&target_folder, target_names(&bench).into_iter())?;
    Ok(Loaded { bench, notes, patterns, targets })
}

/// The bench file: as named, or `bench.toml` beside the photo when it is there.
fn bench_path(arguments: &MeasureArguments) -> Result<Option<PathBuf>, Failure> {
    if let Some(path) = &arguments.bench {
        return Ok(Some(path.clone()));
    }
    let beside = arguments.photo.as_deref().and_then(Path::parent).unwrap_or(Path::new("")).join("bench.toml");
    if beside.exists() {
        return Ok(Some(beside));
    }
    if arguments.bench_flags.wavelength.is_none() {
        return Err(Failure::Usage(format!(
            "no bench file: {} does not exist; write one with `spotrule new`, or give at least --wavelength",
            beside.display()
        )));
    }
    Ok(None)
}

/// Names of the target photos, each once: the bench file's, then those of single photos.
fn target_names(bench: &Bench) -> Vec<&str> {
    let common = match &bench.target {
        Some(Target {
            kind: TargetKind::Dots { photo, .. } | TargetKind::Sheet { photo, .. } | TargetKind::Ruling { photo, .. }, ..
        }) => photo.as_deref(),
        Some(Target { kind: TargetKind::Marks { .. }, .. }) | None => None,
    };
    let mut names: Vec<&str> = Vec::new();
    for name in common.into_iter().chain(bench.photos.iter().filter_map(|photo| photo.target.as_deref())) {
        if !names.contains(&name) {
            names.push(name);
        }
    }
    names
}

fn read_all<'a>(folder: &Path, names: impl Iterator<Item = &'a str>) -> Result<Vec<(String, Vec<u8>)>, Failure> {
    names.map(|name| Ok((name.to_owned(), files::read(&folder.join(name))?))).collect()
}

fn measured(arguments: &MeasureArguments, loaded: &Loaded) -> Result<Measurement, Failure> {
    let inputs = Inputs { patterns: photo_files(&loaded.patterns), targets: photo_files(&loaded.targets) };
    let most = arguments.trials.map(|most| most as usize);
    let bar = progress::bar(most.unwrap_or(0), arguments.quiet);
    let progress = |made: usize| bar.set_position(made as u64);
    let trials = most.map(|most| TrialOptions { most, seed: arguments.seed, progress: &progress });
    let outcome = measure_with(&inputs, &loaded.bench, trials.as_ref());
    bar.finish_and_clear();
    let mut measurement = outcome.map_err(|failed| Failure::Measurement { about: failed.file, error: failed.error })?;
    measurement.notes.splice(0..0, loaded.notes.iter().cloned());
    Ok(measurement)
}

fn photo_files(files: &[(String, Vec<u8>)]) -> Vec<PhotoFile<'_>> {
    files.iter().map(|(name, bytes)| PhotoFile { name, bytes }).collect()
}

fn deliver(arguments: &MeasureArguments, measurement: &Measurement, loaded: &Loaded) -> Result<(), Failure> {
    if let Some(path) = &arguments.overlay {
        let unreadable = |error| Failure::Measurement { about: Some(loaded.patterns[0].0.clone()), error: Box::new(Error::Photo(error)) };
        let photo = photo::decode(&loaded.patterns[0].1).map_err(unreadable)?;
        let unwritable = |cause| Failure::Unwritable { path: path.clone(), cause: std::io::Error::other(cause) };
        let picture = report::png(&report::overlay(&photo, measurement, 0)).map_err(unwritable)?;
        files::write(path, &picture, Existing::Replaced)?;
    }
    match &arguments.json {
        Some(path) if path.as_os_str() == "-" => return files::print(&report::json(measurement, &report::Program::this())),
        Some(path) => files::write(path, report::json(measurement, &report::Program::this()).as_bytes(), Existing::Replaced)?,
        None => {}
    }
    if arguments.quiet { Ok(()) } else { files::print(&report::text(measurement)) }
}

/// A script that asked for JSON gets the refusal as JSON too.
fn refuse(arguments: &MeasureArguments, failure: &Failure) -> Result<(), Failure> {
    let Some(path) = &arguments.json else { return Ok(()) };
    let text = report::refused_json(failure.code(), &failure.to_string(), &report::Program::this());
    if path.as_os_str() == "-" { files::print(&text) } else { files::write(path, text.as_bytes(), Existing::Replaced) }
}

fn overrides(flags: &BenchFlags) -> Overrides {
    let BenchFlags {
        wavelength,
        medium,
        temperature,
        pressure,
        humidity,
        mode,
        pattern,
        incidence,
        throw,
        tilt,
        seen_from,
        target_photo,
        target_pitch,
        target_turn,
        square_on,
        focal_length,
        scale,
    } = flags;
    Overrides {
        wavelength: wavelength.clone(),
        medium: medium.clone(),
        temperature: temperature.clone(),
        pressure: pressure.clone(),
        humidity: humidity.clone(),
        mode: mode.clone(),
        pattern: pattern.clone(),
        incidence: incidence.clone(),
        throw: throw.clone(),
        tilt: tilt.clone(),
        seen_from: seen_from.clone(),
        target_photo: target_photo.clone(),
        target_pitch: target_pitch.clone(),
        target_turn: target_turn.clone(),
        square_on: square_on.clone(),
        focal_length: focal_length.clone(),
        scale: scale.clone(),
        ..Overrides::default()
    }
}
