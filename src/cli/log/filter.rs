//! Which entries the flags mean.

use super::arguments::{FilterFlags, OutcomeName};
use crate::{
    cli::{Failure, files},
    digest::sha256_hex,
    log::{Filter, Outcome},
};
use jiff::{Timestamp, civil::Date};
use std::path::Path;

/// The width of times in the log.
const MOMENT: &str = "%Y-%m-%dT%H:%M:%S%.3fZ";

pub(super) fn filter(flags: &FilterFlags) -> Result<Filter, Failure> {
    Ok(Filter {
        sample: flags.sample.clone(),
        operator: flags.operator.clone(),
        bench_sha256: flags.bench.as_deref().map(bench_sha256).transpose()?,
        outcome: flags.outcome.map(outcome),
        since: flags.since.as_deref().map(|text| moment("--since", text, Edge::Begin)).transpose()?,
        before: flags.until.as_deref().map(|text| moment("--until", text, Edge::End)).transpose()?,
        below: None,
    })
}

fn outcome(name: OutcomeName) -> Outcome {
    match name {
        OutcomeName::Measured => Outcome::Measured,
        OutcomeName::Inside => Outcome::Inside,
        OutcomeName::Undecided => Outcome::Undecided,
        OutcomeName::Outside => Outcome::Outside,
        OutcomeName::Refused => Outcome::Refused,
        OutcomeName::Corrected => Outcome::Corrected,
    }
}

/// A file is hashed; anything else must be the beginning of a hash.
fn bench_sha256(text: &str) -> Result<String, Failure> {
    let path = Path::new(text);
    if path.is_file() {
        return Ok(sha256_hex(files::read_text(path)?.as_bytes()));
    }
    let hash = text.to_ascii_lowercase();
    if hash.is_empty() || hash.len() > 64 || !hash.bytes().all(|byte| byte.is_ascii_hexdigit()) {
        return Err(Failure::Usage(format!(
            "--bench {text}: neither a file nor the beginning of a SHA-256; `spotrule log show` prints the hash"
        )));
    }
    Ok(hash)
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Edge {
    Begin,
    End,
}

/// A day or a moment as the log writes it. A day ends when the next one begins.
fn moment(flag: &str, text: &str, edge: Edge) -> Result<String, Failure> {
    // A moment reads as a day too; a day has ten letters.
    if let (10, Ok(day)) = (text.len(), text.parse::<Date>()) {
        let day = if edge == Edge::End { day.tomorrow().unwrap_or(day) } else { day };
        return Ok(format!("{day}T00:00:00.000Z"));
    }
    let moment = text.parse::<Timestamp>();
    moment.map(|moment| moment.strftime(MOMENT).to_string()).map_err(|_| {
        Failure::Usage(format!("{flag} {text}: no day and no moment; write for example 2030-01-31 or 2030-01-31T14:30:00Z (UTC)"))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn days_and_moments() {
        let until = |text| moment("--until", text, Edge::End).map_err(|error| error.to_string());
        assert_eq!(until("2031-12-31").unwrap(), "2032-01-01T00:00:00.000Z");
        assert_eq!(moment("--since", "2031-12-31", Edge::Begin).unwrap(), "2031-12-31T00:00:00.000Z");
        assert_eq!(until("2031-12-31T14:00:00+02:00").unwrap(), "2031-12-31T12:00:00.000Z");
        assert!(until("31.12.2031").unwrap_err().contains("2030-01-31"));
        assert!(until("2031-02-30").is_err());
    }

    #[test]
    fn a_bench_is_a_file_or_a_hash() {
        assert_eq!(bench_sha256("3FAB").unwrap(), "3fab");
        assert!(bench_sha256("no-such-bench.toml").unwrap_err().to_string().contains("neither"));
    }
}
