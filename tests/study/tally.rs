//! Outcomes counted: per class and over all.

use super::classes::CLASSES;
use std::fmt::Write;

/// One value against its truth.
pub(crate) struct Pull {
    pub(crate) z: f64,
    pub(crate) inside: bool,
    pub(crate) u_relative: f64,
}

pub(crate) enum Outcome {
    Right(Vec<Pull>),
    Wrong(String),
    Refused(String),
}

pub(crate) struct Case {
    pub(crate) class: &'static str,
    pub(crate) seed: u64,
    pub(crate) outcome: Outcome,
}

impl Case {
    pub(crate) fn pulls(&self) -> &[Pull] {
        match &self.outcome {
            Outcome::Right(pulls) => pulls,
            Outcome::Wrong(_) | Outcome::Refused(_) => &[],
        }
    }
}

/// Counts of a set of cases.
pub(crate) struct Count {
    pub(crate) cases: usize,
    pub(crate) right: usize,
    pub(crate) wrong: usize,
    pub(crate) values: usize,
    pub(crate) inside: usize,
    pub(crate) rms_z: f64,
    pub(crate) median_u: f64,
}

pub(crate) fn count<'a>(cases: impl Iterator<Item = &'a Case>) -> Count {
    let mut count = Count { cases: 0, right: 0, wrong: 0, values: 0, inside: 0, rms_z: 0.0, median_u: f64::NAN };
    let mut u: Vec<f64> = Vec::new();
    for case in cases {
        count.cases += 1;
        count.right += usize::from(matches!(case.outcome, Outcome::Right(_)));
        count.wrong += usize::from(matches!(case.outcome, Outcome::Wrong(_)));
        for pull in case.pulls() {
            count.values += 1;
            count.inside += usize::from(pull.inside);
            count.rms_z += pull.z * pull.z;
            u.push(pull.u_relative);
        }
    }
    count.rms_z = (count.rms_z / count.values.max(1) as f64).sqrt();
    u.sort_by(f64::total_cmp);
    count.median_u = u.get(u.len() / 2).copied().unwrap_or(f64::NAN);
    count
}

/// The table of docs/validation.md.
pub(crate) fn table(cases: &[Case]) -> String {
    let mut text =
        "| class | benches | right | refused | wrong | values | inside U | rms z | median u |\n|---|---|---|---|---|---|---|---|---|\n"
            .to_owned();
    let mut row = |name: &str, count: &Count| {
        let refused = count.cases - count.right - count.wrong;
        let inside = 100.0 * count.inside as f64 / count.values.max(1) as f64;
        writeln!(
            text,
            "| {name} | {} | {} | {refused} | {} | {} | {inside:.1} % | {:.2} | {:.1e} |",
            count.cases, count.right, count.wrong, count.values, count.rms_z, count.median_u
        )
        .unwrap();
    };
    for (class, meaning) in CLASSES {
        row(meaning, &count(cases.iter().filter(|case| case.class == class)));
    }
    row("**all**", &count(cases.iter()));
    text
}

/// Every value of every bench.
pub(crate) fn csv(cases: &[Case]) -> String {
    let mut text = "class,seed,outcome,value,z,inside,u_relative\n".to_owned();
    for case in cases {
        let outcome = match case.outcome {
            Outcome::Right(_) => "right",
            Outcome::Wrong(_) => "wrong",
            Outcome::Refused(_) => "refused",
        };
        if case.pulls().is_empty() {
            writeln!(text, "{},{},{outcome},,,,", case.class, case.seed).unwrap();
        }
        for (number, pull) in case.pulls().iter().enumerate() {
            let value = ["pitch 1", "pitch 2", "angle"][number];
            writeln!(text, "{},{},{outcome},{value},{:.4},{},{:.3e}", case.class, case.seed, pull.z, pull.inside, pull.u_relative).unwrap();
        }
    }
    text
}
