//! `spotrule log`: looks into a log, checks it, adds to it.

mod arguments;
mod chart;
mod filter;
mod show;
mod verify;

pub(super) use arguments::LogArguments;
pub(super) use verify::photo_path;

use super::{
    Failure,
    files::{self, Existing},
    provenance::now,
};
use crate::log::{Appended, CSV_HEADER, Draft, Log, csv_row, line};
use arguments::{AddArguments, CorrectArguments, ExportArguments, ExportFormat, LogCommand};
use std::{
    io::{BufRead, Write},
    process::ExitCode,
};

pub(super) fn run(arguments: &LogArguments) -> Result<ExitCode, Failure> {
    match &arguments.command {
        LogCommand::List(arguments) => show::list(arguments),
        LogCommand::Show(arguments) => show::show(arguments),
        LogCommand::Export(arguments) => export(arguments),
        LogCommand::Verify(arguments) => verify::verify(arguments),
        LogCommand::Chart(arguments) => chart::chart(arguments),
        LogCommand::Correct(arguments) => correct(arguments),
        LogCommand::Add(arguments) => add(arguments),
    }
}

fn export(arguments: &ExportArguments) -> Result<ExitCode, Failure> {
    let log = Log::read(&arguments.log)?;
    let filter = filter::filter(&arguments.filter)?;
    match &arguments.out {
        // Into a neighbour first: an export that breaks off leaves nothing under the name.
        Some(path) => files::write_with(path, Existing::Replaced, |out| exported(&log, &filter, arguments.format, out))?,
        None => exported(&log, &filter, arguments.format, &mut std::io::stdout().lock())?,
    }
    Ok(ExitCode::SUCCESS)
}

fn exported(log: &Log, filter: &crate::log::Filter, format: ExportFormat, out: &mut dyn Write) -> Result<(), Failure> {
    if format == ExportFormat::Jsonl {
        log.walk(filter, |shown| writeln!(out, "{}", line(shown)).map_err(Failure::Output))?;
        return out.flush().map_err(Failure::Output);
    }
    let output = |error: csv::Error| Failure::Output(std::io::Error::other(error));
    let mut table = csv::Writer::from_writer(out);
    table.write_record(CSV_HEADER).map_err(output)?;
    log.walk(filter, |shown| table.write_record(csv_row(shown)).map_err(output))?;
    table.flush().map_err(Failure::Output)
}

fn correct(arguments: &CorrectArguments) -> Result<ExitCode, Failure> {
    // A log that is not there must not be made by a correction.
    let old = Log::read(&arguments.log)?.entry(arguments.entry)?;
    let sample = arguments.sample_name.clone().unwrap_or(old.listed.entry.sample);
    let draft = Draft::correction(arguments.entry, &arguments.why, sample, arguments.operator.clone())?;
    acknowledge(&Log::open(&arguments.log)?.append(&draft, &now())?)?;
    Ok(ExitCode::SUCCESS)
}

fn add(arguments: &AddArguments) -> Result<ExitCode, Failure> {
    let bench = arguments.bench.as_deref().map(files::read_text).transpose()?;
    let mut log = Log::open(&arguments.log)?;
    let mut enter = |result: &str| acknowledge(&log.append(&Draft::of_result(result, bench.as_deref())?, &now())?);
    for path in &arguments.results {
        if path.as_os_str() == "-" {
            for line in std::io::stdin().lock().lines() {
                let line = line.map_err(|cause| Failure::Unreadable { path: "standard input".into(), cause })?;
                if !line.trim().is_empty() {
                    enter(&line)?;
                }
            }
        } else {
            enter(&files::read_text(path)?)?;
        }
    }
    Ok(ExitCode::SUCCESS)
}

/// Told only after the entry is safe.
fn acknowledge(appended: &Appended) -> Result<(), Failure> {
    files::print(&format!("entry {} {}\n", appended.entry, appended.sha256))
}
