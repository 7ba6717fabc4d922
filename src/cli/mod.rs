//! In: the command line. Out: files, text, an exit code. One file per command.
//! Must never know: how anything is computed.
//! Start reading at [`run`].

mod arguments;
mod calibrate;
mod calibrate_camera;
mod completions;
mod failure;
mod files;
mod log;
mod measure;
mod new;
mod progress;
mod provenance;
mod record;
mod render;
mod target;

pub use arguments::command;
pub use failure::Failure;

use arguments::{Command, Spotrule};
use clap::Parser;
use std::process::ExitCode;

/// Runs the program with the arguments of this process.
#[must_use]
pub fn run() -> ExitCode {
    let arguments = match Spotrule::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => return usage(&error),
    };
    let outcome = match arguments.command {
        Command::Measure(arguments) => measure::run(&arguments),
        Command::Calibrate(arguments) => calibrate::run(&arguments),
        Command::New(arguments) => new::run(&arguments),
        Command::Target(arguments) => target::run(&arguments),
        Command::Log(arguments) => log::run(&arguments),
        Command::Render(arguments) => render::run(&arguments),
        Command::Completions(arguments) => completions::shell(&arguments),
        Command::Manual(arguments) => completions::manual(&arguments),
    };
    match outcome {
        Ok(code) => code,
        Err(failure) => failure.report(),
    }
}

/// Help and version go to stdout with code 0, wrong use to stderr with code 2.
fn usage(error: &clap::Error) -> ExitCode {
    // Nothing is left to do when the terminal is gone.
    let _ = error.print();
    if error.use_stderr() { ExitCode::from(failure::WRONG_USE) } else { ExitCode::SUCCESS }
}
