//! `spotrule measure`: photos and bench file in, result out.

use super::{
    Failure,
    arguments::{BenchFlags, MeasureArguments, RecordFlags},
    failure,
    files::{self, Existing},
    progress, provenance, record,
};
use crate::{
    Error, Note,
    bench::{Bench, Overrides, Target, TargetKind},
    limits::{Limits, Outcome, Rule, judge},
    measure::{Inputs, Measurement, PhotoFile, TrialOptions, measure_with},
    photo,
    report::{self, Context},
};
use std::{
    path::{Path, PathBuf},
    process::ExitCode,
};

/// Photos under the names that the user gave them.
pub(super) type Named = Vec<(String, Vec<u8>)>;

/// Files of a measurement, read.
pub(super) struct Loaded {
    bench: Bench,
    pub(super) bench_file: Option<BenchFile>,
    notes: Vec<Note>,
    pub(super) patterns: Named,
    pub(super) targets: Named,
}

impl Loaded {
    /// The name that the bench file gives to the sample to be measured, if any.
    pub(super) fn sample_name(&self) -> Option<String> {
        let sample = &self.bench.samples[self.bench.measured_sample()?];
        (!sample.name.is_empty()).then(|| sample.name.clone())
    }
}

/// The bench file as it was read.
pub(super) struct BenchFile {
    pub(super) path: PathBuf,
    pub(super) text: String,
}

/// What to judge by.
struct Criteria {
    limits: Limits,
    rule: Rule,
}

pub(super) fn run(arguments: &MeasureArguments) -> Result<ExitCode, Failure> {
    let prepared = criteria(arguments).and_then(|criteria| Ok((criteria, load(arguments)?)));
    let (criteria, loaded) = match prepared {
        Ok(prepared) => prepared,
        Err(failure) => {
            refuse(arguments, &failure, &Context::default())?;
            return Err(failure);
        }
    };
    let provenance = provenance::provenance(&arguments.record, &overrides(&arguments.bench_flags), &loaded);
    let mut context = Context { provenance: Some(provenance), ..Context::default() };
    let outcome = measured(arguments, &loaded).and_then(|measurement| named(measurement, &arguments.record)).and_then(|measurement| {
        context.verdict = criteria.map(|criteria| judge(&criteria.limits, criteria.rule, &measurement.sample)).transpose()?;
        Ok(measurement)
    });
    let logged = enter(arguments, outcome.as_ref(), &mut context, &loaded);
    match outcome {
        Ok(measurement) => {
            deliver(arguments, &measurement, &context, &loaded)?;
            // A result is not lost because it could not be logged.
            logged.map(|()| exit_code(&context))
        }
        Err(failure) => {
            refuse(arguments, &failure, &context)?;
            logged.and(Err(failure))
        }
    }
}

/// Into the log goes what was measured and what was refused; wrong use is neither.
fn enter(
    arguments: &MeasureArguments,
    outcome: Result<&Measurement, &Failure>,
    context: &mut Context,
    loaded: &Loaded,
) -> Result<(), Failure> {
    let program = report::Program::this();
    let result = match outcome {
        Ok(measurement) => report::json(measurement, context, &program),
        Err(failure) if failure.exit_code() == failure::REFUSED => {
            report::refused_json(failure.code(), &failure.to_string(), context, &program)
        }
        Err(_) => return Ok(()),
    };
    if let Some(provenance) = &context.provenance {
        context.entry = record::enter(&arguments.record, &result, provenance, loaded)?;
    }
    Ok(())
}

/// Read before anything is measured: a slip of the pen shall not cost a measurement.
fn criteria(arguments: &MeasureArguments) -> Result<Option<Criteria>, Failure> {
    let rule = Rule::named(&arguments.rule)?;
    let limits = arguments.limits.as_deref().map(Limits::parse).transpose()?;
    Ok(limits.map(|limits| Criteria { limits, rule }))
}

fn exit_code(context: &Context) -> ExitCode {
    match context.verdict.as_ref().map(|verdict| verdict.outcome) {
        None | Some(Outcome::Inside) => ExitCode::SUCCESS,
        Some(Outcome::Outside) => ExitCode::from(failure::OUTSIDE),
        Some(Outcome::Undecided) => ExitCode::from(failure::UNDECIDED),
    }
}

/// The measurement under the name that the sample has on the command line.
fn named(mut measurement: Measurement, record: &RecordFlags) -> Result<Measurement, Failure> {
    let Some(name) = &record.sample_name else { return Ok(measurement) };
    if measurement.other_samples.iter().any(|other| other.name == *name) {
        return Err(Failure::Usage(format!(
            "--sample-name {name}: another sample of the bench file has this name; choose a name of its own"
        )));
    }
    measurement.sample.name.clone_from(name);
    Ok(measurement)
}

fn load(arguments: &MeasureArguments) -> Result<Loaded, Failure> {
    let bench_path = bench_path(arguments)?;
    let read = |path: &PathBuf| -> Result<BenchFile, Failure> { Ok(BenchFile { path: path.clone(), text: files::read_text(path)? }) };
    let bench_file = bench_path.as_ref().map(read).transpose()?;
    let named = |error| Failure::Measurement {
        about: bench_path.as_ref().map(|path| path.display().to_string()),
        error: Box::new(Error::Bench(error)),
    };
    let (bench, notes) =
        Bench::with_overrides(bench_file.as_ref().map(|file| file.text.as_str()), &overrides(&arguments.bench_flags)).map_err(named)?;
    let folder = bench_path.as_deref().and_then(Path::parent).map(Path::to_owned).unwrap_or_default();
    let bench = with_lens(bench, &folder)?;
    let patterns = read_patterns(arguments.photo.as_deref(), &bench, &folder)?;
    // A target named by a flag lies where the user stands, one named by the bench file lies beside that file.
    let target_folder = if arguments.bench_flags.target_photo.is_some() { PathBuf::new() } else { folder };
    let targets = read_all(&target_folder, target_names(&bench).into_iter())?;
    Ok(Loaded { bench, bench_file, notes, patterns, targets })
}

/// The photos of the pattern: the one of the command line, or all that the bench file names.
pub(super) fn read_patterns(photo: Option<&Path>, bench: &Bench, folder: &Path) -> Result<Named, Failure> {
    let patterns = match photo {
        Some(photo) => vec![(photo.display().to_string(), files::read(photo)?)],
        None => read_all(folder, bench.photos.iter().map(|photo| photo.file.as_str()))?,
    };
    if patterns.is_empty() {
        return Err(Failure::Usage("no photo: name one on the command line, or as [[photo]] in the bench file".to_owned()));
    }
    Ok(patterns)
}

/// The bench with the calibration of its lens, where it names one and needs it.
pub(super) fn with_lens(bench: Bench, folder: &Path) -> Result<Bench, Failure> {
    let Some(name) = bench.camera.calibration.clone().filter(|_| bench.calibration.is_none()) else { return Ok(bench) };
    let path = folder.join(&name);
    let text = files::read_text(&path)?;
    bench
        .with_lens(&text)
        .map_err(|error| Failure::Measurement { about: Some(path.display().to_string()), error: Box::new(Error::Bench(error)) })
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
pub(super) fn target_names(bench: &Bench) -> Vec<&str> {
    // A calibration knows the view; the target need not be photographed again.
    if bench.calibration.is_some() {
        return Vec::new();
    }
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

pub(super) fn read_all<'a>(folder: &Path, names: impl Iterator<Item = &'a str>) -> Result<Named, Failure> {
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

pub(super) fn photo_files(files: &[(String, Vec<u8>)]) -> Vec<PhotoFile<'_>> {
    files.iter().map(|(name, bytes)| PhotoFile { name, bytes }).collect()
}

fn deliver(arguments: &MeasureArguments, measurement: &Measurement, context: &Context, loaded: &Loaded) -> Result<(), Failure> {
    if arguments.overlay.is_some() || arguments.report.is_some() {
        pictures(arguments, measurement, context, loaded)?;
    }
    if let Some(path) = &arguments.orders {
        let table = report::orders_csv(measurement).map_err(|error| unwritable(path, error))?;
        files::write(path, &table, Existing::Replaced)?;
    }
    if let Some(path) = &arguments.json {
        let result = report::json(measurement, context, &report::Program::this());
        if path.as_os_str() == "-" {
            return files::print(&result);
        }
        files::write(path, result.as_bytes(), Existing::Replaced)?;
    }
    if arguments.quiet { Ok(()) } else { files::print(&report::text(measurement, context)) }
}

/// What shows the photo: overlay and report.
fn pictures(arguments: &MeasureArguments, measurement: &Measurement, context: &Context, loaded: &Loaded) -> Result<(), Failure> {
    let (name, bytes) = &loaded.patterns[0];
    let unreadable = |error| Failure::Measurement { about: Some(name.clone()), error: Box::new(Error::Photo(error)) };
    let overlay = report::overlay(&photo::decode(bytes).map_err(unreadable)?, measurement, 0);
    if let Some(path) = &arguments.overlay {
        let picture = report::png(&overlay).map_err(|error| unwritable(path, error))?;
        files::write(path, &picture, Existing::Replaced)?;
    }
    if let Some(path) = &arguments.report {
        let picture = report::embeddable(overlay).map_err(|error| unwritable(path, error))?;
        let page = report::html_report(measurement, context, &report::Program::this(), Some(picture.as_picture()));
        files::write(path, page.as_bytes(), Existing::Replaced)?;
    }
    Ok(())
}

fn unwritable(path: &Path, cause: impl Into<Box<dyn std::error::Error + Send + Sync>>) -> Failure {
    Failure::Unwritable { path: path.to_owned(), cause: std::io::Error::other(cause) }
}

/// Who asked for a report or for JSON gets the refusal in the same form; nothing of an earlier result stays under the name.
fn refuse(arguments: &MeasureArguments, failure: &Failure, context: &Context) -> Result<(), Failure> {
    if let Some(path) = &arguments.report {
        let page = report::refused_html_report(failure.code(), &failure.to_string(), context, &report::Program::this());
        files::write(path, page.as_bytes(), Existing::Replaced)?;
    }
    let Some(path) = &arguments.json else { return Ok(()) };
    let text = report::refused_json(failure.code(), &failure.to_string(), context, &report::Program::this());
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
