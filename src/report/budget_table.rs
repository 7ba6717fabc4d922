//! The uncertainty budget as a text table with a small bar per source.

use super::{
    columns::{Align, columns, paragraph, shortened},
    rounding::{rounded, significant},
    units::{self, Unit},
};
use crate::measure::{BudgetLine, SampleResult};

/// Characters of a bar of 100 %.
const BAR_WIDTH: usize = 20;

/// Longest name of a source shown.
const SOURCE_WIDTH: usize = 30;

/// Sources whose every share stays below this are summed in one line.
const SMALL_SHARE: f64 = 0.000_5;

/// The budget of one sample; empty when there is none.
pub(super) fn budget_table(sample: &SampleResult) -> String {
    if sample.budget.is_empty() {
        return String::new();
    }
    let pitches = sample.pitch_m.len().min(2);
    let mut rows = vec![header(sample, pitches)];
    rows.extend(sample.budget.iter().filter(|line| !is_small(line)).map(|line| row(sample, line, pitches)));
    let mut align = vec![Align::Left];
    for pitch in 0..pitches {
        align.extend([Align::Right, Align::Right]);
        if pitch == 0 {
            align.push(Align::Left);
        }
    }
    align.push(Align::Right);
    columns(&rows, &align) + &small_sources(&sample.budget)
}

fn header(sample: &SampleResult, pitches: usize) -> Vec<String> {
    let mut cells = vec!["source".to_owned()];
    for pitch in 0..pitches {
        cells.push(if pitches == 1 { "share".to_owned() } else { format!("share {}", pitch + 1) });
        cells.push(if pitches == 1 { "u alone".to_owned() } else { format!("u{} alone", pitch + 1) });
        if pitch == 0 {
            cells.push(String::new());
        }
    }
    if sample.lattice_angle_rad.is_some() {
        cells.push("angle".to_owned());
    }
    cells
}

fn row(sample: &SampleResult, line: &BudgetLine, pitches: usize) -> Vec<String> {
    let mut cells = vec![shortened(&line.source, SOURCE_WIDTH)];
    for pitch in 0..pitches {
        let share = line.share.get(pitch).copied().unwrap_or(0.0);
        cells.push(share_text(share));
        let unit = u_unit(sample, pitch);
        let u_pitch_m = line.u_pitch_m.get(pitch).copied().unwrap_or(0.0);
        cells.push(format!("{}{}", rounded(0.0, u_pitch_m * unit.per_si).u, unit.suffix()));
        if pitch == 0 {
            cells.push(bar(share));
        }
    }
    cells.extend(line.angle_share.map(share_text));
    cells
}

/// One unit for the whole column, one step below that of the pitch where u is small.
fn u_unit(sample: &SampleResult, pitch: usize) -> Unit {
    let largest_m = sample.budget.iter().filter_map(|line| line.u_pitch_m.get(pitch)).copied().fold(0.0, f64::max);
    units::for_small_length(largest_m)
}

fn is_small(line: &BudgetLine) -> bool {
    line.share.iter().chain(&line.angle_share).all(|share| share.abs() < SMALL_SHARE)
}

fn small_sources(budget: &[BudgetLine]) -> String {
    let names: Vec<&str> = budget.iter().filter(|line| is_small(line)).map(|line| line.source.as_str()).collect();
    if names.is_empty() {
        return String::new();
    }
    let limit = significant(SMALL_SHARE * 100.0, 1);
    paragraph("  ", &format!("below {limit} % each: {}", names.join(", ")), super::columns::WIDTH)
}

/// A fraction as percent with one digit after the point.
fn share_text(share: f64) -> String {
    if !share.is_finite() {
        return "unknown".to_owned();
    }
    format!("{:.1} %", share * 100.0)
}

/// A bar of full and half blocks; a share that is not zero shows at least a sliver.
fn bar(share: f64) -> String {
    let halves_of = |share: f64| (0..2 * BAR_WIDTH).filter(|&i| share * 2.0 > (i as f64 + 0.5) / BAR_WIDTH as f64).count();
    let halves = halves_of(share.clamp(0.0, 1.0));
    match (halves, share > 0.0) {
        (0, true) => "▏".to_owned(),
        _ => "█".repeat(halves / 2) + if halves % 2 == 1 { "▌" } else { "" },
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bars_grow_with_the_share_and_never_leave_their_column() {
        for (share, want) in [(0.0, ""), (0.001, "▏"), (0.026, "▌"), (0.05, "█"), (0.5, "██████████"), (f64::NAN, "")]
        {
            assert_eq!(bar(share), want, "{share}");
        }
        assert_eq!(bar(7.0).chars().count(), BAR_WIDTH);
    }
}
