//! `spotrule completions` and `spotrule manual`.

use super::{
    Failure,
    arguments::{self, CompletionArguments, ManualArguments},
    files,
};
use std::process::ExitCode;

/// Prints a completion script.
pub(super) fn shell(arguments: &CompletionArguments) -> Result<ExitCode, Failure> {
    let mut script = Vec::new();
    clap_complete::generate(arguments.shell, &mut arguments::command(), "spotrule", &mut script);
    files::print(&String::from_utf8_lossy(&script))?;
    Ok(ExitCode::SUCCESS)
}

/// Prints the manual page: the program's page followed by one per command.
pub(super) fn manual(_: &ManualArguments) -> Result<ExitCode, Failure> {
    let mut page = Vec::new();
    let mut command = arguments::command();
    command.build();
    clap_mangen::Man::new(command.clone()).render(&mut page).map_err(Failure::Output)?;
    pages_below(&command, "spotrule", &mut page)?;
    files::print(&String::from_utf8_lossy(&page))?;
    Ok(ExitCode::SUCCESS)
}

/// One page per command, and one per command of a command.
fn pages_below(command: &clap::Command, name: &str, page: &mut Vec<u8>) -> Result<(), Failure> {
    for sub in command.get_subcommands().filter(|sub| sub.get_name() != "help") {
        let name = format!("{name}-{}", sub.get_name());
        clap_mangen::Man::new(sub.clone()).title(name.clone()).render(page).map_err(Failure::Output)?;
        pages_below(sub, &name, page)?;
    }
    Ok(())
}
