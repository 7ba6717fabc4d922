//! Where the uncertainty comes from, and what the photos told of the bench.

use super::{chart, figure};
use crate::{
    measure::{BudgetLine, Measurement, ParameterRow, SampleResult},
    report::{concise, rounded, significant, units},
};
use maud::{Markup, html};

pub(super) fn budget(sample: &SampleResult) -> Markup {
    let pitches = sample.pitch_m.len().min(2);
    html! {
        @if !sample.budget.is_empty() {
            section {
                h2 { "Uncertainty budget" }
                (figure(chart::shares(sample)))
                div class="wide" {
                    table class="stack" {
                        thead {
                            tr {
                                th { "source" }
                                @for pitch in 0..pitches {
                                    th class="n" { "share" (number(pitch, pitches)) }
                                    th class="n" { "u" (number(pitch, pitches)) " alone" }
                                }
                                @if sample.lattice_angle_rad.is_some() { th class="n" { "share, angle" } }
                            }
                        }
                        tbody { @for line in &sample.budget { (budget_row(sample, line, pitches)) } }
                    }
                }
                div class="plain" {
                    p {
                        "In plain words: each line is one thing that is not known exactly. Its share says how much of the variance (u squared) of the result it owns; all shares together make "
                        "100 %. Who wants a smaller uncertainty works on the top line; the others hardly matter."
                    }
                }
            }
        }
    }
}

fn number(pitch: usize, pitches: usize) -> String {
    if pitches > 1 { format!(", pitch {}", pitch + 1) } else { String::new() }
}

fn budget_row(sample: &SampleResult, line: &BudgetLine, pitches: usize) -> Markup {
    let unit = units::for_small_length(sample.budget.iter().flat_map(|line| line.u_pitch_m.iter().copied()).fold(0.0, f64::max));
    html! {
        tr {
            th { (line.source) }
            @for pitch in 0..pitches {
                td class="n" data-label={ "share" (number(pitch, pitches)) } { (chart::percent(line.share.get(pitch).copied().unwrap_or(0.0))) }
                td class="n" data-label={ "u" (number(pitch, pitches)) " alone" } { (rounded(0.0, line.u_pitch_m.get(pitch).copied().unwrap_or(0.0) * unit.per_si).u) (unit.suffix()) }
            }
            @if sample.lattice_angle_rad.is_some() { td class="n" data-label="share, angle" { (chart::percent(line.angle_share.unwrap_or(0.0))) } }
        }
    }
}

pub(super) fn parameters(measurement: &Measurement) -> Markup {
    html! {
        @if !measurement.parameters.is_empty() {
            section {
                h2 { "What was known before, and what is known now" }
                div class="wide" {
                    table class="stack" {
                        thead { tr { th { "parameter" } th class="n" { "before" } th class="n" { "after" } th class="n" { "u after / before" } th class="n" { "moved by" } } }
                        tbody { @for parameter in &measurement.parameters { (parameter_row(parameter)) } }
                    }
                }
                div class="plain" {
                    p {
                        "In plain words: \"before\" is what the operator stated, \"after\" is what follows when the photos are taken into account (in brackets: u in the last digits). "
                        "A ratio near 1 means that the photos told nothing new about it; near 0, that they fixed it. "
                        "A value that moved by much more than 2 u contradicts what was stated: measure it again."
                    }
                }
            }
        }
    }
}

fn parameter_row(parameter: &ParameterRow) -> Markup {
    let unit = units::for_parameter(parameter.unit);
    let shown = |value: f64, u: f64| format!("{}{}", concise(value * unit.per_si, u * unit.per_si), unit.suffix());
    let prior = parameter.prior.filter(|(value, u)| value.is_finite() && u.is_finite());
    let compared = prior.filter(|(_, u)| *u > 0.0);
    html! {
        tr {
            th { (parameter.name) }
            td class="n" data-label="before" { @match prior { Some((value, u)) => (shown(value, u)), None => "not known" } }
            td class="n" data-label="after" { (shown(parameter.value, parameter.u)) }
            td class="n" data-label="u after / before" { @if let Some((_, u)) = compared { (significant(parameter.u / u, 2)) } }
            td class="n" data-label="moved by" { @if let Some((value, u)) = compared { (format!("{:.2} u", (parameter.value - value) / u + 0.0)) } }
        }
    }
}
