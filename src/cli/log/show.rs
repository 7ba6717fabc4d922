//! Entries for people.

use super::{
    arguments::{ListArguments, ShowArguments},
    filter,
};
use crate::{
    cli::{Failure, files},
    log::{Entry, Listed, Log, Reading, Shown},
    report::{concise, percent},
};
use std::{fmt::Write, process::ExitCode};

pub(super) fn list(arguments: &ListArguments) -> Result<ExitCode, Failure> {
    let log = Log::read(&arguments.log)?;
    let wanted = crate::log::Filter { below: arguments.below, ..filter::filter(&arguments.filter)? };
    let found = log.list(&wanted, arguments.limit)?;
    let mut text = format!("{:>7}  {:<20}  {:<9}  {:<24}  {:<12}  result\n", "entry", "time (UTC)", "outcome", "sample", "operator");
    for listed in &found {
        text += &row(listed);
    }
    if let (Some(last), true) = (found.last(), found.len() == arguments.limit) {
        let _ = writeln!(text, "older ones: --below {}", last.entry.entry);
    }
    files::print(&text)?;
    Ok(ExitCode::SUCCESS)
}

fn row(listed: &Listed) -> String {
    let entry = &listed.entry;
    let time: String = entry.time.chars().take(19).collect::<String>().replace('T', " ");
    let mark = listed.corrected_by.map(|number| format!("  [corrected by {number}]")).unwrap_or_default();
    format!(
        "{:>7}  {time:<20}  {:<9}  {:<24}  {:<12}  {}{mark}\n",
        entry.entry,
        entry.outcome.name(),
        cut(&entry.sample, 24),
        cut(entry.operator.as_deref().unwrap_or(""), 12),
        cut(&summary(entry), 60),
    )
}

fn summary(entry: &Entry) -> String {
    if let (Some(number), Some(why)) = (entry.corrects, &entry.why) {
        return format!("corrects {number}: {why}");
    }
    if let Some(reason) = &entry.reason {
        return format!("no result: {reason}");
    }
    let mut words: Vec<String> = entry.pitch.iter().map(reading).collect();
    words.extend(entry.lattice_angle.as_ref().map(reading));
    words.join(", ")
}

fn reading(reading: &Reading) -> String {
    let unit = match reading.unit.as_str() {
        "um" => " µm",
        "deg" => "°",
        other => other,
    };
    format!("{}{unit}", concise(reading.value, reading.u))
}

pub(super) fn show(arguments: &ShowArguments) -> Result<ExitCode, Failure> {
    let shown = Log::read(&arguments.log)?.entry(arguments.entry)?;
    if arguments.json {
        let none = || Failure::Usage(format!("entry {} is a correction and has no result", arguments.entry));
        files::print(&format!("{}\n", shown.result.as_deref().ok_or_else(none)?))?;
    } else {
        files::print(&described(&shown))?;
    }
    Ok(ExitCode::SUCCESS)
}

fn described(shown: &Shown) -> String {
    let entry = &shown.listed.entry;
    let mut text = String::new();
    let mut line = |name: &str, value: &str| {
        if !value.is_empty() {
            let _ = writeln!(text, "{name:<14} {}", visible(value));
        }
    };
    line("entry", &format!("{}, a {}", entry.entry, entry.kind.name()));
    line("SHA-256", &shown.listed.sha256);
    line("follows", &entry.previous);
    line("entered", &entry.time);
    line("measured", entry.measured_at.as_deref().unwrap_or(""));
    line("outcome", entry.outcome.name());
    line("sample", &entry.sample);
    line("operator", entry.operator.as_deref().unwrap_or(""));
    line("remark", entry.remark.as_deref().unwrap_or(""));
    for (i, pitch) in entry.pitch.iter().enumerate() {
        line(&format!("pitch {}", i + 1), &format!("{}, u relative {}", reading(pitch), percent(pitch.u / pitch.value)));
    }
    line("lattice angle", &entry.lattice_angle.as_ref().map(reading).unwrap_or_default());
    line("reason", entry.reason.as_deref().unwrap_or(""));
    line("notes", &entry.notes.join(", "));
    line("corrects", &entry.corrects.map(|number| number.to_string()).unwrap_or_default());
    line("why", entry.why.as_deref().unwrap_or(""));
    line("corrected by", &shown.listed.corrected_by.map(|number| number.to_string()).unwrap_or_default());
    if let Some(program) = &entry.program {
        line("program", &format!("spotrule {}, commit {}", program.version, program.commit));
    }
    for photo in &entry.photos {
        line("photo", &format!("{} ({}, {} bytes) SHA-256 {}", photo.file, photo.role, photo.bytes, photo.sha256));
    }
    for flag in &entry.flags {
        line("flag", flag);
    }
    if let Some(bench) = &entry.bench {
        line("bench", &format!("{} SHA-256 {}", bench.file, bench.sha256));
    }
    if let Some(bench) = &shown.bench_text {
        text.push('\n');
        for line in bench.lines() {
            let _ = writeln!(text, "    {}", visible(line));
        }
    }
    text
}

/// Free text must not steer the terminal.
fn visible(text: &str) -> String {
    text.chars().map(|letter| if letter.is_control() { '\u{fffd}' } else { letter }).collect()
}

fn cut(text: &str, width: usize) -> String {
    let text = visible(text);
    if text.chars().count() <= width { text } else { text.chars().take(width.saturating_sub(2)).chain("..".chars()).collect() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn free_text_cannot_steer_the_terminal() {
        assert_eq!(visible("a\u{1b}[31mb\nc"), "a\u{fffd}[31mb\u{fffd}c");
        assert_eq!(cut("abcdefgh", 5), "abc..");
    }
}
