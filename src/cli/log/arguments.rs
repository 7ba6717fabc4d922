//! The arguments of `spotrule log`.

use clap::{Args, Subcommand, ValueEnum};
use std::path::PathBuf;

#[derive(Debug, Args)]
pub(in crate::cli) struct LogArguments {
    #[command(subcommand)]
    pub(super) command: LogCommand,
}

#[derive(Debug, Subcommand)]
pub(super) enum LogCommand {
    /// List entries, newest first
    #[command(after_help = "Example:\n  spotrule log list book.db --sample \"lot 7*\" --since 2030-01-01 --outcome outside")]
    List(ListArguments),
    /// Show one entry with everything that belongs to it
    #[command(after_help = "Example:\n  spotrule log show book.db 12")]
    Show(ShowArguments),
    /// Write entries as CSV or JSON lines
    #[command(after_help = "Example:\n  spotrule log export book.db --format csv --out book.csv")]
    Export(ExportArguments),
    /// Check that no entry was changed, removed or reordered
    #[command(
        after_help = "Example:\n  spotrule log verify book.db --expect-head 3f5a...\n\nThe hash is the one that a report or `measure` printed. Without a hash that was noted elsewhere nobody can tell\nwhether the whole log was written anew.\n\nExit code: 0 sound; 1 not; 2 cannot be read."
    )]
    Verify(VerifyArguments),
    /// Draw a control chart of individuals and moving ranges
    #[command(
        after_help = "Example:\n  spotrule log chart book.db --sample \"reference grating\" --out chart.svg\n\nRefused measurements and corrected entries are left out. Exit code: 0 drawn; 1 too few readings."
    )]
    Chart(ChartArguments),
    /// Correct an entry by a new one that points to it
    #[command(after_help = "Example:\n  spotrule log correct book.db 12 --why \"sample 8 was in the holder\" --sample-name \"sample 8\"")]
    Correct(CorrectArguments),
    /// Enter results that were written by `measure --json`
    #[command(after_help = "Example:\n  spotrule log add book.db result.json --bench bench.toml")]
    Add(AddArguments),
}

/// Which entries.
#[derive(Debug, Args)]
pub(super) struct FilterFlags {
    /// Name of the sample; * and ? stand for any letters and any one letter
    #[arg(long, value_name = "TEXT")]
    pub(super) sample: Option<String>,
    /// Operator; * and ? as above
    #[arg(long, value_name = "TEXT")]
    pub(super) operator: Option<String>,
    /// Bench file, or the beginning of its SHA-256
    #[arg(long, value_name = "FILE|HASH")]
    pub(super) bench: Option<String>,
    /// How it ended
    #[arg(long, value_enum)]
    pub(super) outcome: Option<OutcomeName>,
    /// Entered on this day (UTC) or later, or at this moment
    #[arg(long, value_name = "YYYY-MM-DD")]
    pub(super) since: Option<String>,
    /// Entered on this day (UTC) or earlier, or before this moment
    #[arg(long, value_name = "YYYY-MM-DD")]
    pub(super) until: Option<String>,
}

#[derive(Debug, Clone, Copy, ValueEnum)]
pub(super) enum OutcomeName {
    /// Measured, without limits
    Measured,
    /// Inside the limits
    Inside,
    /// A limit lies within the uncertainty
    Undecided,
    /// Outside the limits
    Outside,
    /// Nothing could honestly be said
    Refused,
    /// A correction
    Corrected,
}

#[derive(Debug, Args)]
pub(super) struct ListArguments {
    /// The log
    pub(super) log: PathBuf,
    #[command(flatten)]
    pub(super) filter: FilterFlags,
    /// Most entries listed
    #[arg(long, value_name = "N", default_value_t = 50)]
    pub(super) limit: usize,
    /// Only entries below this number: the next page
    #[arg(long, value_name = "ENTRY")]
    pub(super) below: Option<u64>,
}

#[derive(Debug, Args)]
pub(super) struct ShowArguments {
    /// The log
    pub(super) log: PathBuf,
    /// Number of the entry
    pub(super) entry: u64,
    /// Print the full result as it was entered (JSON) and nothing else
    #[arg(long)]
    pub(super) json: bool,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum ExportFormat {
    /// A table, one row per entry
    Csv,
    /// One JSON object per line, with the full result and the bench file
    Jsonl,
}

#[derive(Debug, Args)]
pub(super) struct ExportArguments {
    /// The log
    pub(super) log: PathBuf,
    #[command(flatten)]
    pub(super) filter: FilterFlags,
    /// Format
    #[arg(long, value_enum, default_value = "csv")]
    pub(super) format: ExportFormat,
    /// File to write [default: standard output]
    #[arg(long, value_name = "FILE")]
    pub(super) out: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub(super) struct VerifyArguments {
    /// The log
    pub(super) log: PathBuf,
    /// A hash that was noted earlier: some entry must carry it
    #[arg(long, value_name = "HASH")]
    pub(super) expect_head: Option<String>,
    /// Also check the photos kept in this folder (measure --keep-photos)
    #[arg(long, value_name = "DIR")]
    pub(super) photos: Option<PathBuf>,
}

/// What a control chart shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum ChartedValue {
    /// First (shortest) pitch
    #[value(name = "pitch1", alias = "pitch")]
    FirstPitch,
    /// Second pitch
    #[value(name = "pitch2")]
    SecondPitch,
    /// Lattice angle
    Angle,
}

#[derive(Debug, Args)]
pub(super) struct ChartArguments {
    /// The log
    pub(super) log: PathBuf,
    #[command(flatten)]
    pub(super) filter: FilterFlags,
    /// What to chart
    #[arg(long, value_enum, default_value = "pitch1")]
    pub(super) value: ChartedValue,
    /// The newest readings, at most this many
    #[arg(long, value_name = "N", default_value_t = 100)]
    pub(super) last: usize,
    /// File to write
    #[arg(long, value_name = "FILE.svg")]
    pub(super) out: PathBuf,
}

#[derive(Debug, Args)]
pub(super) struct CorrectArguments {
    /// The log
    pub(super) log: PathBuf,
    /// Number of the entry that is wrong
    pub(super) entry: u64,
    /// What is wrong and what holds instead
    #[arg(long, value_name = "TEXT")]
    pub(super) why: String,
    /// The right name of the sample [default: that of the entry]
    #[arg(long, value_name = "TEXT")]
    pub(super) sample_name: Option<String>,
    /// Who corrects
    #[arg(long, value_name = "TEXT")]
    pub(super) operator: Option<String>,
}

#[derive(Debug, Args)]
pub(super) struct AddArguments {
    /// The log; made where there is none
    pub(super) log: PathBuf,
    /// Files written by `measure --json`; - reads JSON lines from standard input
    #[arg(required = true)]
    pub(super) results: Vec<PathBuf>,
    /// The bench file of these results, to be kept with them
    #[arg(long, value_name = "FILE")]
    pub(super) bench: Option<PathBuf>,
}
