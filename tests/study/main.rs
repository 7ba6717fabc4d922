//! Coverage and robustness over several hundred drawn benches, and centroids against the Cramér-Rao bound.
//!
//!     cargo test --release --test study                  the whole study (minutes); rewrites tests/data/study.csv and docs/figures/
//!     cargo test --release --test study -- --class EG --seeds 5..8 --keep DIR
//!
//! With `--class` or `--seeds` nothing is rewritten; `--keep` writes photos, scene and bench file of each case, to look at.
#![allow(
    clippy::unwrap_used,
    clippy::print_stdout,
    clippy::print_stderr,
    clippy::cast_possible_truncation,
    reason = "a study that says what it measured, and stops where it stands"
)]

// one case: drawn, measured, compared
mod judge;
// what is drawn
mod classes;
mod draw;
// what is told
mod table;

use clap::Parser;
use classes::{CLASSES, Class};
use judge::{Outcome, Verdict};
use rayon::prelude::*;
use std::path::{Path, PathBuf};

#[derive(Debug, Parser)]
struct Arguments {
    /// Only these classes, as letters
    #[arg(long)]
    class: Option<String>,
    /// First seed..one beyond the last
    #[arg(long, value_parser = seeds)]
    seeds: Option<std::ops::Range<u64>>,
    /// Write the files of each case here
    #[arg(long)]
    keep: Option<PathBuf>,
    /// Lay aside cases that were right
    #[arg(long)]
    keep_failures: bool,
    /// Cases to the standard output as they end
    #[arg(long)]
    verbose: bool,
    /// What the test harness may add
    #[arg(hide = true)]
    rest: Vec<String>,
}

fn seeds(text: &str) -> Result<std::ops::Range<u64>, String> {
    let (first, end) = text.split_once("..").ok_or("two numbers such as 0..20")?;
    let number = |text: &str| text.parse::<u64>().map_err(|error| error.to_string());
    Ok(number(first)?..number(end)?)
}

/// Seeds per class of the whole study.
const SEEDS: std::ops::Range<u64> = 0..20;

fn main() {
    let arguments = Arguments::parse();
    let whole = arguments.class.is_none() && arguments.seeds.is_none();
    let chosen = |class: &&Class| arguments.class.as_ref().is_none_or(|letters| letters.contains(class.letter));
    let seeds = arguments.seeds.clone().unwrap_or(SEEDS);
    let cases: Vec<(&Class, u64)> = CLASSES.iter().filter(chosen).flat_map(|class| seeds.clone().map(move |seed| (class, seed))).collect();
    let outcomes: Vec<Outcome> = cases.into_par_iter().map(|(class, seed)| one(class, seed, &arguments)).collect();
    print!("{}", table::table(&outcomes));
    if whole {
        let root = Path::new(env!("CARGO_MANIFEST_DIR"));
        std::fs::write(root.join("tests/data/study.csv"), table::csv(&outcomes)).unwrap();
    }
}

fn one(class: &Class, seed: u64, arguments: &Arguments) -> Outcome {
    let outcome = judge::run(class, seed);
    let good = outcome.verdict == Verdict::Right && !outcome.is_far_off();
    if arguments.verbose || !good {
        println!("{}", table::line(&outcome));
    }
    if let Some(folder) = &arguments.keep
        && !(arguments.keep_failures && good)
    {
        keep(&folder.join(format!("{}-{seed:04}", class.letter)), class, seed);
    }
    outcome
}

fn keep(folder: &Path, class: &Class, seed: u64) {
    let scene = class.scene(seed);
    let files = judge::drawn(&scene);
    std::fs::create_dir_all(folder).unwrap();
    std::fs::write(folder.join("scene.toml"), toml::to_string(&scene).unwrap()).unwrap();
    std::fs::write(folder.join(scene.pattern_file()), &files.pattern).unwrap();
    if let Some(target) = &files.target {
        std::fs::write(folder.join(scene.target_file()), target).unwrap();
    }
    let mut text = scene.bench_text();
    if let Some(scale) = judge::stated(&scene).camera.scale {
        let [a, b] = scale.points;
        text += &format!(
            "scale = {{ points = [[{}, {}], [{}, {}]], distance = \"{} ± 0.3 mm (k=1)\" }}\n",
            a.x_px,
            a.y_px,
            b.x_px,
            b.y_px,
            scale.distance_m.value * 1e3
        );
    }
    std::fs::write(folder.join("bench.toml"), text).unwrap();
}
