//! The result, large, and the verdict.

use crate::{
    limits::{Outcome, Verdict},
    measure::{Measurement, SampleResult, Value},
    report::{
        Context, concise,
        limits_text::{allowed, incapable, measured, pitches, probability, unit_of},
        percent, rounded,
        units::{self, Unit},
        words::{kind_name, numbered, orientation_words},
    },
};
use maud::{Markup, html};

pub(super) fn result(measurement: &Measurement, context: &Context) -> Markup {
    let sample = &measurement.sample;
    html! {
        section {
            (headline(sample))
            @if let Some(verdict) = &context.verdict { (verdict_box(verdict)) }
            @if let Some(remark) = context.provenance.as_ref().and_then(|provenance| provenance.remark.as_ref()) {
                p { "The operator says: " q { (remark) } }
            }
            (table(measurement))
        }
    }
}

fn headline(sample: &SampleResult) -> Markup {
    let count = sample.pitch_m.len();
    let item = |name: &str, si: Value, unit: Unit| {
        let value = unit.of(si);
        let shown = rounded(value.value, value.expanded());
        html! {
            div {
                div class="name" { (name) }
                div class="value" { (shown.value) " ± " (shown.u) small { (unit.suffix()) } }
                div class="small" { "k = " (format!("{:.2}", value.coverage_factor)) ", about 95 %" }
            }
        }
    };
    html! {
        div class="headline" {
            @for (i, pitch_m) in sample.pitch_m.iter().enumerate() { (item(&numbered("Pitch", i, count), *pitch_m, units::for_pitch(pitch_m.value))) }
            @if let Some(angle) = sample.lattice_angle_rad { (item("Lattice angle", angle, units::DEGREE)) }
            @if let Some(kind) = &sample.kind { div { div class="name" { "Lattice" } div class="value" { (kind_name(kind.kind)) } } }
        }
    }
}

fn verdict_box(verdict: &Verdict) -> Markup {
    let (word, sign) = match verdict.outcome {
        Outcome::Inside => ("PASS: inside the limits", "✓"),
        Outcome::Outside => ("FAIL: outside the limits", "✗"),
        Outcome::Undecided => ("UNDECIDED: a limit lies within the uncertainty", "?"),
    };
    let word = if verdict.outcome == Outcome::Undecided && !incapable(verdict).is_empty() {
        "UNDECIDED: the measurement is too coarse for this rule"
    } else {
        word
    };
    html! {
        div class={ "verdict " (verdict.outcome.name()) } {
            p { b { (sign) " " (word) } }
            p { "Limits: " (verdict.limits) }
            div class="wide" {
                table class="stack" {
                    thead { tr { th { "" } th { "allowed" } th { "measured" } th { "probability that it conforms" } th { "verdict" } } }
                    tbody {
                        @for judgement in &verdict.judgements {
                            tr {
                                th { (judgement.characteristic.name(pitches(verdict))) }
                                td data-label="allowed" { (allowed(judgement.tolerance, unit_of(judgement))) }
                                td data-label="measured" { (measured(judgement)) }
                                td data-label="conforms with a probability of" { (probability(judgement.conformance_probability)) }
                                td data-label="verdict" { (judgement.outcome.name()) }
                            }
                        }
                    }
                }
            }
            p class="small" { "Decision rule \"" (verdict.rule.name()) "\". " (verdict.rule.sentence()) }
            @let reason = incapable(verdict);
            @if !reason.is_empty() { p class="small" { (reason.split_whitespace().collect::<Vec<_>>().join(" ")) } }
        }
    }
}

fn table(measurement: &Measurement) -> Markup {
    let sample = &measurement.sample;
    let count = sample.pitch_m.len();
    let rows_of = sample.row_spacing_m.len();
    let length = |name: String, si: Value| row(&name, si, units::for_pitch(si.value), true);
    html! {
        h2 { "Result" }
        div class="wide" {
            table class="stack" {
                thead {
                    tr { th { "quantity" } th class="n" { "value" } th class="n" { "U (about 95 %)" } th class="n" { "k" } th class="n" { "u" } th class="n" { "u relative" } }
                }
                tbody {
                    @for (i, pitch_m) in sample.pitch_m.iter().enumerate() { (length(numbered("pitch", i, count), *pitch_m)) }
                    @if let Some(angle) = sample.lattice_angle_rad { (row("lattice angle", angle, units::DEGREE, false)) }
                    (row("orientation", sample.orientation_rad, units::DEGREE, false))
                    @if count > 1 {
                        @for (i, spacing_m) in sample.row_spacing_m.iter().enumerate() { (length(numbered("row spacing", i, rows_of), *spacing_m)) }
                    }
                    @for (i, density) in sample.row_spacing_m.iter().filter_map(|spacing_m| units::line_density_per_m(*spacing_m)).enumerate() {
                        (row(&numbered("line density", i, rows_of), density, units::LINES_PER_MILLIMETRE, true))
                    }
                    @if let Some(area) = sample.cell_area_m2 { (row("cell area", area, units::for_area(sample), true)) }
                }
            }
        }
        p class="small" { (orientation_words(measurement)) }
        @if let Some(kind) = &sample.kind { @if !kind.sentence.is_empty() { p class="small" { "Lattice: " (kind.sentence) } } }
        div class="plain" {
            p {
                "In plain words: "
                @if let Some(pitch) = sample.pitch_m.first() {
                    @let unit = units::for_pitch(pitch.value);
                    @let shown = unit.of(*pitch);
                    "the pattern repeats every " (concise(shown.value, shown.u)) (unit.suffix()) " (the digits in brackets are the standard uncertainty, counted in the last places). "
                }
                "U is the expanded uncertainty: were the measurement repeated many times in the same honest way, value ± U would hold the true value in about 95 of 100 cases. "
                "u is the standard uncertainty, about half of U."
            }
        }
    }
}

fn row(name: &str, si: Value, unit: Unit, is_relative: bool) -> Markup {
    let value = unit.of(si);
    let shown = rounded(value.value, value.expanded());
    html! {
        tr {
            th { (name) }
            td class="n" data-label="value" { (shown.value) (unit.suffix()) }
            @if value.u > 0.0 {
                td class="n" data-label="U" { (shown.u) (unit.suffix()) }
                td class="n" data-label="k" { (format!("{:.2}", value.coverage_factor)) }
                td class="n" data-label="u" { (rounded(value.value, value.u).u) (unit.suffix()) }
                td class="n" data-label="u relative" { @if is_relative { (percent(value.u / value.value)) } }
            } @else {
                td class="n" { "exact" } td {} td {} td {}
            }
        }
    }
}
