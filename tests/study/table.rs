//! The study as lines, as a table per class, and as CSV.

use super::{
    classes::CLASSES,
    judge::{Outcome, Pull, Verdict},
};
use std::fmt::Write;

/// One case in a line.
pub(crate) fn line(outcome: &Outcome) -> String {
    let pulls: Vec<String> = outcome.pulls.iter().map(|pull| format!("{:+.2}", pull.z)).collect();
    format!(
        "{}-{:04} {:?} z [{}] spots {} birge {:.2} {:.2} s  {}",
        outcome.class,
        outcome.seed,
        outcome.verdict,
        pulls.join(" "),
        outcome.spots,
        outcome.birge,
        outcome.seconds,
        outcome.remarks
    )
}

/// Sums over the cases of a class, or over all.
pub(crate) struct Summary {
    pub(crate) cases: usize,
    pub(crate) right: usize,
    pub(crate) refused: usize,
    pub(crate) wrong: usize,
    pub(crate) pitch: Values,
    pub(crate) angle: Values,
    pub(crate) noted: usize,
    pub(crate) slowest_s: f64,
}

/// Values against their truth.
#[derive(Default)]
pub(crate) struct Values {
    pub(crate) count: usize,
    pub(crate) inside: usize,
    pub(crate) rms: f64,
    pub(crate) median_relative_u: f64,
}

impl Values {
    fn new<'a>(pulls: impl Iterator<Item = &'a Pull>) -> Self {
        let pulls: Vec<&Pull> = pulls.collect();
        let mut widths: Vec<f64> = pulls.iter().map(|pull| pull.relative_u).collect();
        widths.sort_by(f64::total_cmp);
        Self {
            count: pulls.len(),
            inside: pulls.iter().filter(|pull| pull.inside).count(),
            rms: (pulls.iter().map(|pull| pull.z * pull.z).sum::<f64>() / pulls.len() as f64).sqrt(),
            median_relative_u: widths.get(widths.len() / 2).copied().unwrap_or(f64::NAN),
        }
    }

    /// Share of intervals that hold the truth.
    pub(crate) fn coverage(&self) -> f64 {
        self.inside as f64 / self.count as f64
    }
}

impl Summary {
    pub(crate) fn new(outcomes: &[&Outcome]) -> Self {
        let count = |verdict: Verdict| outcomes.iter().filter(|outcome| outcome.verdict == verdict).count();
        let indexed = || outcomes.iter().filter(|outcome| outcome.verdict == Verdict::Right).flat_map(|outcome| &outcome.pulls);
        let wrong = |outcome: &&&Outcome| matches!(outcome.verdict, Verdict::Misnumbered | Verdict::Panicked) || outcome.is_far_off();
        Self {
            cases: outcomes.len(),
            right: count(Verdict::Right),
            refused: count(Verdict::Refused),
            wrong: outcomes.iter().filter(wrong).count(),
            pitch: Values::new(indexed().filter(|pull| !pull.is_angle)),
            angle: Values::new(indexed().filter(|pull| pull.is_angle)),
            noted: outcomes.iter().filter(|outcome| outcome.verdict == Verdict::Right && !outcome.remarks.is_empty()).count(),
            slowest_s: outcomes.iter().map(|outcome| outcome.seconds).fold(0.0, f64::max),
        }
    }
}

/// Cases of each class that has any.
pub(crate) fn by_class(outcomes: &[Outcome]) -> Vec<(char, &'static str, Summary)> {
    let of = |letter: char| outcomes.iter().filter(|outcome| outcome.class == letter).collect::<Vec<_>>();
    let classes = CLASSES.iter().map(|class| (class, of(class.letter))).filter(|(_, own)| !own.is_empty());
    classes.map(|(class, own)| (class.letter, class.title, Summary::new(&own))).collect()
}

/// The table of the study (Markdown).
pub(crate) fn table(outcomes: &[Outcome]) -> String {
    let mut text = String::from(
        "| class | | cases | true lattice | refused | wrong | pitch in U, % | rms z | median u, % | angle in U, % | rms z | with a note | slowest, s |\n\
         |---|---|---|---|---|---|---|---|---|---|---|---|---|\n",
    );
    for (letter, title, summary) in by_class(outcomes) {
        write_row(&mut text, &letter.to_string(), title, &summary);
    }
    write_row(&mut text, "all", "", &Summary::new(&outcomes.iter().collect::<Vec<_>>()));
    text
}

fn write_row(text: &mut String, letter: &str, title: &str, summary: &Summary) {
    let percent = |values: &Values| if values.count == 0 { "–".to_owned() } else { format!("{:.1}", 100.0 * values.coverage()) };
    let rms = |values: &Values| if values.count == 0 { "–".to_owned() } else { format!("{:.2}", values.rms) };
    let _ = writeln!(
        text,
        "| {letter} | {title} | {} | {} | {} | {} | {} | {} | {:.3} | {} | {} | {} | {:.1} |",
        summary.cases,
        summary.right,
        summary.refused,
        summary.wrong,
        percent(&summary.pitch),
        rms(&summary.pitch),
        100.0 * summary.pitch.median_relative_u,
        percent(&summary.angle),
        rms(&summary.angle),
        summary.noted,
        summary.slowest_s
    );
}

/// One line per case.
pub(crate) fn csv(outcomes: &[Outcome]) -> String {
    let mut text = String::from("class,seed,verdict,z_pitch_1,z_pitch_2,z_angle,u_pitch_1_relative,all_inside,spots,birge,remarks\n");
    for outcome in outcomes {
        let mut pitches = outcome.pulls.iter().filter(|pull| !pull.is_angle);
        let z = |pull: Option<&Pull>| pull.map_or(String::new(), |pull| format!("{:.3}", pull.z));
        let (first, second) = (pitches.next(), pitches.next());
        let _ = writeln!(
            text,
            "{},{},{:?},{},{},{},{},{},{},{},{}",
            outcome.class,
            outcome.seed,
            outcome.verdict,
            z(first),
            z(second),
            z(outcome.pulls.iter().find(|pull| pull.is_angle)),
            first.map_or(String::new(), |pull| format!("{:.3e}", pull.relative_u)),
            outcome.pulls.iter().all(|pull| pull.inside),
            outcome.spots,
            if outcome.birge.is_finite() { format!("{:.3}", outcome.birge) } else { String::new() },
            outcome.remarks.replace([',', '\n'], ";")
        );
    }
    text
}
