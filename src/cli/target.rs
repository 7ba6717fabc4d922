//! `spotrule target`: the printable dot target.

use super::{
    Failure,
    arguments::{PaperFormat, TargetArguments},
    files::{self, Existing},
};
use crate::target::{Paper, Sheet, pdf, svg};
use std::process::ExitCode;

pub(super) fn run(arguments: &TargetArguments) -> Result<ExitCode, Failure> {
    let paper = match arguments.paper {
        PaperFormat::A4 => Paper::A4,
        PaperFormat::A3 => Paper::A3,
        PaperFormat::Letter => Paper::Letter,
    };
    let sheet = Sheet::new(paper, arguments.pitch * 1e-3).map_err(|error| Failure::Usage(error.to_string()))?;
    let ending = arguments.out.extension().map(|ending| ending.to_string_lossy().to_lowercase());
    let bytes = match ending.as_deref() {
        Some("svg") => svg(&sheet).into_bytes(),
        Some("pdf") => pdf(&sheet),
        _ => return Err(Failure::UnknownEnding { path: arguments.out.clone(), endings: ".svg, .pdf" }),
    };
    files::write(&arguments.out, &bytes, if arguments.force { Existing::Replaced } else { Existing::Kept })?;
    files::print(&format!(
        "{} written. Print it at 100 % on matt paper, then measure the print with a steel rule in both directions: printers scale by 0.1 to 0.5 %.\n",
        arguments.out.display()
    ))?;
    Ok(ExitCode::SUCCESS)
}
