//! What the result rests on: spots, pictures, notes.

use super::{Picture, chart, embedded, figure};
use crate::{
    measure::{Measurement, SampleResult},
    report::{concise, significant, units, words::reason_counts},
};
use maud::{Markup, html};

/// Most reasons for rejected spots in the page; the JSON lists every spot.
const REASONS_SHOWN: usize = 8;

pub(super) fn evidence(measurement: &Measurement, overlay: Option<Picture<'_>>) -> Markup {
    html! {
        section {
            h2 { "What was seen" }
            (spots(measurement))
            @if let Some(picture) = overlay { (overlay_figure(measurement, picture)) }
        }
        section {
            div class="keep" {
                h2 { "The pattern in reciprocal space, and what is left over" }
                div class="pair" {
                    (figure(chart::reciprocal(measurement)))
                    (figure(chart::residuals(measurement)))
                }
            }
            div class="plain" {
                p {
                    "In plain words: in reciprocal space the orders of a perfect sample form a regular grid, however oblique the camera stood. A fine sample has a coarse grid. "
                    "The residuals show how far each spot lies from its place in the best grid: if they scatter without pattern, model and photo agree."
                }
            }
        }
    }
}

fn spots(measurement: &Measurement) -> Markup {
    let used = measurement.orders.iter().filter(|order| order.used).count();
    let clipped = measurement.orders.iter().filter(|order| order.used && order.clipped).count();
    let fit = &measurement.fit;
    let reasons = reason_counts(measurement.rejected.iter());
    html! {
        p {
            (used) " of " (measurement.orders.len()) " spots with an order were used"
            @if clipped > 0 { ", " (clipped) " of them clipped (brighter than the camera could record)" }
            "; " (counted(measurement.rejected.len(), "rejected spot")) ". "
            @if measurement.zero_order.seen { "The zero order was seen. " } @else { "The zero order was not seen; its place comes from the fit. " }
            @if fit.dots_used > 0 { (fit.dots_used) " dots or marks of the target were used. " }
            "The spots used lie " (significant(fit.rms_px, 2)) " px (root mean square) from where the model puts them; reduced chi-square "
            (significant(fit.chi2_reduced, 3)) " with " (significant(fit.degrees_of_freedom, 4)) " degrees of freedom"
            @if fit.birge_factor > 1.0 { ", so that the spots' uncertainties were raised by the factor " (significant(fit.birge_factor, 3)) }
            "."
        }
        @if !reasons.is_empty() {
            ul class="small" {
                @for (reason, count) in reasons.iter().take(REASONS_SHOWN) { li { (count) " × " (reason) } }
                @if reasons.len() > REASONS_SHOWN { li { "and " (reasons.len() - REASONS_SHOWN) " more reasons" } }
            }
        }
    }
}

/// "1 spot", "2 spots".
fn counted(count: usize, thing: &str) -> String {
    format!("{count} {thing}{}", if count == 1 { "" } else { "s" })
}

fn overlay_figure(measurement: &Measurement, picture: Picture<'_>) -> Markup {
    let file = measurement.photos.first().map_or("the photo", |photo| photo.file.as_str());
    let words = format!(
        "The photo {file}, dimmed, with {} marked by their order and {}; its legend stands below the picture.",
        counted(measurement.orders.iter().filter(|order| order.photo == 0).count(), "spot"),
        counted(measurement.rejected.iter().filter(|spot| spot.photo == 0).count(), "rejected spot")
    );
    html! {
        figure role="img" aria-label=(words) {
            img src=(embedded(picture)) alt="";
            figcaption aria-hidden="true" { (words) }
        }
    }
}

pub(super) fn other_samples(measurement: &Measurement) -> Markup {
    let pitches = |sample: &SampleResult| {
        let shown = sample.pitch_m.iter().map(|&pitch_m| {
            let unit = units::for_pitch(pitch_m.value);
            let pitch = unit.of(pitch_m);
            format!("{}{}", concise(pitch.value, pitch.u), unit.suffix())
        });
        shown.collect::<Vec<_>>().join(" and ")
    };
    html! {
        @if !measurement.other_samples.is_empty() {
            section {
                h2 { "Other samples of the series" }
                ul { @for sample in &measurement.other_samples { li { (sample.name) ": pitch " (pitches(sample)) } } }
            }
        }
    }
}

pub(super) fn notes(measurement: &Measurement) -> Markup {
    html! {
        section {
            h2 { "Notes" }
            @if measurement.notes.is_empty() {
                p { "None: nothing in the photos or the bench file called for care." }
            } @else {
                ul { @for note in &measurement.notes { li { (note.to_string()) " " code { "(" (note.code()) ")" } } } }
            }
        }
    }
}
