//! Coverage study: some three hundred benches drawn at random, photographed, measured, and compared with their truth.
//!
//! ```text
//! cargo test --release --test study -- 22
//! ```
//!
//! draws 22 benches per class (the default), prints the table of docs/validation.md and writes docs/figures/coverage.csv and two plots. It is
//! not part of `cargo test`: it takes minutes.

#![allow(clippy::unwrap_used, clippy::print_stdout, missing_docs, reason = "a study that reports what it found")]

mod classes;
mod plots;
#[path = "../scenes.rs"]
mod scenes;
mod tally;

use rayon::prelude::*;
use scenes::{drawn, measured, truth};
use spotrule::{bench::Pattern, measure::Measurement, synth::Scene};
use tally::{Case, Outcome, Pull, table};

/// A lattice counts as numbered right when every value lies within this many u, or within this share, of the truth.
const RIGHT_U: f64 = 8.0;
const RIGHT_SHARE: f64 = 0.01;

/// Measures one drawn bench. The operator does not say whether a line or a plane is to be expected.
fn case(class: &'static str, seed: u64) -> Case {
    let scene = classes::scene(class, seed);
    let mut bench = scene.bench();
    bench.samples[0].pattern = Pattern::Auto;
    let outcome = match measured(&scene, &drawn(&scene), &bench) {
        Ok(found) => compared(&scene, &found),
        Err(refusal) => Outcome::Refused(refusal.to_string()),
    };
    Case { class, seed, outcome }
}

fn compared(scene: &Scene, found: &Measurement) -> Outcome {
    let (pitches, angle) = truth(scene);
    let notes: Vec<&str> = found.notes.iter().map(spotrule::Note::code).collect();
    if pitches.len() != found.sample.pitch_m.len() {
        return Outcome::Wrong(format!("{} pitches instead of {}; notes {notes:?}", found.sample.pitch_m.len(), pitches.len()));
    }
    let values = found.sample.pitch_m.iter().copied().zip(pitches).chain(found.sample.lattice_angle_rad.zip(angle));
    let pulls: Vec<Pull> = values
        .map(|(value, truth)| Pull {
            z: (value.value - truth) / value.u,
            inside: (value.value - truth).abs() <= value.expanded(),
            u_relative: value.u / value.value,
        })
        .collect();
    match pulls.iter().find(|pull| pull.z.abs() > RIGHT_U && (pull.z * pull.u_relative).abs() > RIGHT_SHARE) {
        Some(pull) => Outcome::Wrong(format!("off by {:.1} u, {:.2} %; notes {notes:?}", pull.z, 100.0 * pull.z * pull.u_relative)),
        None => Outcome::Right(pulls),
    }
}

fn main() {
    let per_class: u64 = std::env::args().skip(1).find_map(|argument| argument.parse().ok()).unwrap_or(22);
    let wanted: Vec<(&'static str, u64)> =
        classes::CLASSES.iter().flat_map(|(class, _)| (1..=per_class).map(|seed| (*class, seed))).collect();
    let cases: Vec<Case> = wanted.into_par_iter().map(|(class, seed)| case(class, seed)).collect();
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/figures");
    std::fs::create_dir_all(&folder).unwrap();
    let table = table(&cases);
    println!("{table}");
    for case in &cases {
        if let Outcome::Refused(why) | Outcome::Wrong(why) = &case.outcome {
            println!("{} seed {}: {why}", case.class, case.seed);
        }
    }
    std::fs::write(folder.join("coverage.csv"), tally::csv(&cases)).unwrap();
    std::fs::write(folder.join("pulls.svg"), plots::pulls(&cases)).unwrap();
    std::fs::write(folder.join("coverage.svg"), plots::coverage(&cases)).unwrap();
}
