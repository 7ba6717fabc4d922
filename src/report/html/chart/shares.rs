//! The budget as bars.

use super::{BLUE, Chart, Drawn, INK, LETTERS, ORANGE, WIDTH, svg};
use crate::{
    measure::{BudgetLine, SampleResult},
    report::columns::shortened,
};
use plotters::{
    prelude::*,
    style::text_anchor::{HPos, Pos, VPos},
};

/// Bars that would be shorter than this are summed up in words.
const SMALLEST: f64 = 0.005;

/// Where the bars begin, px: names stand left of it.
const NAMES: i32 = 190;
const ROW: i32 = 34;
const TOP: i32 = 8;
/// Room behind the longest bar for its number.
const NUMBERS: i32 = 56;

/// Share of each source in the variance of each pitch.
pub(in crate::report::html) fn shares(sample: &SampleResult) -> Option<Chart> {
    let largest = |line: &BudgetLine| line.share.iter().copied().fold(0.0, f64::max);
    let shown: Vec<&BudgetLine> = sample.budget.iter().filter(|line| largest(line) >= SMALLEST && largest(line).is_finite()).collect();
    if shown.is_empty() {
        return None;
    }
    let rows = i32::try_from(shown.len()).ok()?;
    let height = u32::try_from(2 * TOP + ROW * rows).ok()?;
    let drawing = svg(height, |area| (0..rows).zip(&shown).try_for_each(|(row, line)| bar(area, TOP + row * ROW, line)))?;
    Some(Chart { svg: drawing, words: words(sample, &shown) })
}

fn bar(area: &super::Area<'_>, top: i32, line: &BudgetLine) -> Drawn {
    let name = ("sans-serif", LETTERS).into_font().color(&INK).pos(Pos::new(HPos::Right, VPos::Center));
    area.draw(&Text::new(shortened(&line.source, 24), (NAMES - 8, top + ROW / 2), name))?;
    let count = i32::try_from(line.share.len().clamp(1, 2)).unwrap_or(1);
    let thick = (ROW - 8) / count;
    for (i, (&share, colour)) in (0..count).zip(line.share.iter().zip([BLUE, ORANGE])) {
        let length = bar_length(share);
        let (above, below) = (top + 4 + i * thick, top + 4 + (i + 1) * thick - 1);
        area.draw(&Rectangle::new([(NAMES, above), (NAMES + length, below)], colour.filled()))?;
        area.draw(&Rectangle::new([(NAMES, above), (NAMES + length, below)], INK.stroke_width(1)))?;
        let number = ("sans-serif", LETTERS - 2).into_font().color(&INK).pos(Pos::new(HPos::Left, VPos::Center));
        area.draw(&Text::new(percent(share), (NAMES + length + 5, i32::midpoint(above, below)), number))?;
    }
    Ok(())
}

/// Length of a bar, px; at least a line.
#[expect(clippy::cast_possible_truncation, reason = "clamped to the width of the chart")]
fn bar_length(share: f64) -> i32 {
    let full = f64::from(i32::try_from(WIDTH).unwrap_or(0) - NAMES - NUMBERS);
    (share.clamp(0.0, 1.0) * full).round().max(1.0) as i32
}

pub(in crate::report::html) fn percent(share: f64) -> String {
    if share.is_finite() { format!("{:.1} %", share * 100.0) } else { "unknown".to_owned() }
}

fn words(sample: &SampleResult, shown: &[&BudgetLine]) -> String {
    let parts: Vec<String> = shown
        .iter()
        .map(|line| format!("{} {}", line.source, line.share.iter().map(|share| percent(*share)).collect::<Vec<_>>().join(" and ")))
        .collect();
    let pitches = if sample.pitch_m.len() > 1 { "of each pitch (dark bar: pitch 1, light bar: pitch 2)" } else { "of the pitch" };
    let rest = sample.budget.len() - shown.len();
    let rest = if rest > 0 { format!(" {rest} further sources are below 0.5 % each; the table lists them.") } else { String::new() };
    format!("Shares of the sources in the variance {pitches}: {}.{rest}", parts.join("; "))
}
