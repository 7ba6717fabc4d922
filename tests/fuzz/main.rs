//! Mutated bytes against every reader of outside data: no panic, no hang, no unbounded memory.
//!
//! `cargo test` runs a few hundred mutations per reader. A long run of one reader, in minutes:
//!
//! ```text
//! cargo test --release --test fuzz -- photo 30
//! ```
//!
//! An input that fails is written to `tests/fuzz/seeds/<reader>/` and is a seed from then on.

#![allow(clippy::unwrap_used, clippy::print_stdout, missing_docs, reason = "a test that reports what it did")]

mod mutate;

use mutate::Mutator;
use spotrule::{
    bench::{self, Bench},
    calibration, photo,
    quantity::{Dimension, Quantity},
    spots, target,
};
use std::{
    fs,
    panic::catch_unwind,
    path::{Path, PathBuf},
    process::ExitCode,
    time::{Duration, Instant},
};

/// Mutations per reader in an ordinary test run.
const SHORT_RUN: usize = 400;
/// An input that takes longer hangs: the largest photo that is read at all takes a second.
const HANG: Duration = Duration::from_secs(10);
/// Memory that the process may ever have held.
const MOST_MEMORY_MIB: u64 = 1024;

struct Reader {
    name: &'static str,
    read: fn(&[u8]),
}

const READERS: [Reader; 4] = [
    Reader { name: "photo", read: read_photo },
    Reader { name: "bench", read: |bytes| read_text(bytes, read_bench) },
    Reader { name: "quantity", read: |bytes| read_text(bytes, read_quantity) },
    Reader { name: "calibration", read: |bytes| read_text(bytes, read_calibration) },
];

/// Decodes, and looks for spots and a target in whatever came out.
fn read_photo(bytes: &[u8]) {
    let Ok(decoded) = photo::decode(bytes) else { return };
    if decoded.width * decoded.height < 4_000_000 {
        let _ = spots::find(&decoded, &spots::SpotOptions::default());
        let _ = target::read(&decoded.grey(), &target::ReadOptions::default());
    }
}

fn read_text(bytes: &[u8], read: fn(&str)) {
    read(&String::from_utf8_lossy(bytes));
}

fn read_bench(text: &str) {
    if let Err(error) = Bench::parse(text) {
        assert!(!error.to_string().is_empty());
    }
    let _ = bench::sections(text);
}

fn read_quantity(text: &str) {
    for line in text.lines() {
        for dimension in [Dimension::Length, Dimension::Angle, Dimension::Temperature] {
            if let Ok(quantity) = Quantity::parse(line, dimension) {
                assert!(quantity.value.is_finite() && quantity.u.is_finite() && quantity.u >= 0.0, "{line:?} gave {quantity:?}");
            }
        }
    }
}

fn read_calibration(text: &str) {
    if let Ok(Some(found)) = calibration::read(text) {
        let written = calibration::text(&found);
        assert_eq!(calibration::read(&written).unwrap().as_ref(), Some(&found), "what was read and written reads differently");
    }
}

fn seeds_folder(reader: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/fuzz/seeds").join(reader)
}

fn seeds(reader: &str) -> Vec<Vec<u8>> {
    let mut paths: Vec<PathBuf> = fs::read_dir(seeds_folder(reader)).unwrap().map(|entry| entry.unwrap().path()).collect();
    paths.sort();
    paths.iter().map(|path| fs::read(path).unwrap()).collect()
}

/// Most memory that this process has held, MiB; 0 where the system does not tell.
fn peak_memory_mib() -> u64 {
    let status = fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"));
    line.and_then(|line| line.split_whitespace().next()?.parse::<u64>().ok()).map_or(0, |kib| kib / 1024)
}

/// Reads mutated seeds until `enough` says so; the first input that fails ends the run.
fn run(reader: &Reader, seed: u64, enough: impl Fn(usize) -> bool) -> Result<usize, String> {
    let seeds = seeds(reader.name);
    let mut mutator = Mutator::new(seed);
    let mut made = 0;
    while !enough(made) {
        // The seeds as they are come first.
        let input = seeds.get(made).cloned().unwrap_or_else(|| mutator.mutated(&seeds));
        let begun = Instant::now();
        let outcome = catch_unwind(|| (reader.read)(&input));
        let failed = match (outcome, begun.elapsed()) {
            (Err(_), _) => Some("panicked".to_owned()),
            (Ok(()), took) if took > HANG => Some(format!("took {took:?}")),
            (Ok(()), _) if peak_memory_mib() > MOST_MEMORY_MIB => Some(format!("brought memory to {} MiB", peak_memory_mib())),
            (Ok(()), _) => None,
        };
        if let Some(what) = failed {
            let path = seeds_folder(reader.name).join(format!("found-{}", &spotrule::digest::sha256_hex(&input)[..16]));
            fs::write(&path, &input).unwrap();
            return Err(format!("{}: input {made} of seed {seed} {what}; kept as {}", reader.name, path.display()));
        }
        made += 1;
    }
    Ok(made)
}

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| !argument.starts_with('-')).collect();
    let named = |reader: &&Reader| arguments.first().is_none_or(|name| name == reader.name);
    let minutes: Option<u64> = arguments.get(1).and_then(|minutes| minutes.parse().ok());
    // A long run begins where no run began before; the short one is the same everywhere.
    let seed = minutes.map_or(1, |_| std::time::UNIX_EPOCH.elapsed().map_or(1, |now| now.as_secs()));
    let mut code = ExitCode::SUCCESS;
    for reader in READERS.iter().filter(named) {
        let begun = Instant::now();
        let enough = |made: usize| match minutes {
            Some(minutes) => begun.elapsed() > Duration::from_secs(60 * minutes),
            None => made >= SHORT_RUN,
        };
        match run(reader, seed, enough) {
            Ok(made) => println!("fuzz {}: {made} inputs, seed {seed}, peak memory {} MiB", reader.name, peak_memory_mib()),
            Err(failure) => {
                println!("fuzz {failure}");
                code = ExitCode::FAILURE;
            }
        }
    }
    code
}
