//! The report as one self-contained HTML page: no script, nothing from the network, prints on A4 and Letter, reads on a phone.
//! All text goes through the escaping of `maud`; only the charts, made here, are put in as they are.

mod chart;
mod evidence;
mod picture;
mod plain_words;
mod provenance;
mod result;
mod uncertainty;

pub use picture::{Embeddable, Picture, embeddable};

use super::{
    Context, Program,
    words::{NO_CERTIFICATE, mode_name, pattern_name},
};
use crate::measure::Measurement;
use base64::{Engine, engine::general_purpose::STANDARD};
use chart::Chart;
use maud::{DOCTYPE, Markup, PreEscaped, html};

const STYLE: &str = include_str!("style.css");

/// The report of a measurement. `overlay` is the picture of [`super::overlay()`].
#[must_use]
pub fn html_report(measurement: &Measurement, context: &Context, program: &Program, overlay: Option<Picture<'_>>) -> String {
    let title = title(&measurement.sample.name, pattern_name(&measurement.sample));
    let content = html! {
        (head(&title, context, Some(mode_name(measurement.mode))))
        (result::result(measurement, context))
        (plain_words::how_it_works(measurement))
        (evidence::evidence(measurement, overlay))
        (uncertainty::budget(&measurement.sample))
        (uncertainty::parameters(measurement))
        (evidence::other_samples(measurement))
        (evidence::notes(measurement))
        (provenance::facts(Some(measurement), context, program))
        (provenance::repeat(context))
        (cautions())
    };
    page(&title, &content)
}

/// The report of a refusal: that and why there is no result.
#[must_use]
pub fn refused_html_report(code: &str, reason: &str, context: &Context, program: &Program) -> String {
    let name = context.provenance.as_ref().and_then(|provenance| provenance.sample_name.as_deref()).unwrap_or("");
    let title = if name.is_empty() { "No result".to_owned() } else { format!("{name}: no result") };
    let content = html! {
        (head(&title, context, None))
        div class="verdict undecided" { b { "NO RESULT" } p { (reason) } p class="small" { "Reason: " code { (code) } } }
        div class="plain" { p { "The photos do not allow an honest answer, so the program gives none. The sentence above says what to change; nothing is said about the sample." } }
        (provenance::facts(None, context, program))
        (provenance::repeat(context))
        (cautions())
    };
    page(&title, &content)
}

fn page(title: &str, content: &Markup) -> String {
    let page = html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; img-src data:";
                title { (title) " - pitch by laser diffraction" }
                style { (PreEscaped(STYLE)) }
            }
            body { (content) }
        }
    };
    page.into_string()
}

fn title(name: &str, pattern: &str) -> String {
    let kind = if pattern == "line" { "line grating" } else { "plane lattice" };
    if name.is_empty() { format!("Pitch of a {kind}") } else { format!("{name}: pitch of a {kind}") }
}

fn head(title: &str, context: &Context, mode: Option<&str>) -> Markup {
    let provenance = context.provenance.as_ref();
    html! {
        header {
            h1 { (title) }
            p class="sub" {
                "By laser diffraction" @if let Some(mode) = mode { " in " (mode) }
                @if let Some(provenance) = provenance { ", " (provenance.time) }
                @if let Some(operator) = provenance.and_then(|provenance| provenance.operator.as_ref()) { ", by " (operator) }
                ". " (NO_CERTIFICATE)
            }
        }
    }
}

fn cautions() -> Markup {
    html! {
        section {
            h2 { "Laser safety" }
            div class="caution" {
                p {
                    "Lasers can blind. Never look into the beam or its reflections; the zero order of a mirror-like sample is almost the full beam. "
                    "Keep the beam below eye level, take off what reflects, end the beam on a matt screen. Follow your local laser-safety rules and your laser "
                    "safety officer; class and eyewear per IEC 60825-1. This program is no safety device."
                }
            }
        }
        footer { p { (NO_CERTIFICATE) " It holds for the item that was measured, as it was measured. Give it on as a whole only." } }
    }
}

/// A chart with its text alternative, which is shown as well: what helps one reader seldom hurts another.
fn figure(chart: Option<Chart>) -> Markup {
    html! {
        @if let Some(chart) = chart {
            figure role="img" aria-label=(chart.words) { (PreEscaped(chart.svg)) figcaption aria-hidden="true" { (chart.words) } }
        }
    }
}

fn embedded(picture: Picture<'_>) -> String {
    format!("data:{};base64,{}", picture.media_type, STANDARD.encode(picture.bytes))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{
        limits::{Limits, Rule, judge},
        report::{BenchText, LogEntry, PhotoDigest, PhotoRole, Provenance, example},
    };

    const HOSTILE: &str = "<script>alert('x')</script>\" onload=\"y & z";

    fn context(measurement: &Measurement) -> Context {
        let limits = Limits::parse("4.000 ± 0.003 um").unwrap();
        Context {
            verdict: judge(&limits, Rule::Guarded, &measurement.sample).ok(),
            provenance: Some(Provenance {
                time: "2030-05-01T10:00:00.000Z".to_owned(),
                operator: Some(HOSTILE.to_owned()),
                remark: Some(HOSTILE.to_owned()),
                sample_name: None,
                bench: Some(BenchText { file: HOSTILE.to_owned(), text: format!("# {HOSTILE}"), sha256: "ab".repeat(32) }),
                flags: vec![HOSTILE.to_owned()],
                photos: vec![PhotoDigest { file: HOSTILE.to_owned(), role: PhotoRole::Pattern, sha256: "cd".repeat(32), bytes: 7 }],
            }),
            entry: Some(LogEntry { log: HOSTILE.to_owned(), entry: 12, sha256: "ef".repeat(32) }),
        }
    }

    fn report(measurement: &Measurement) -> String {
        let picture = Picture { bytes: &[0x89, b'P', b'N', b'G'], media_type: "image/png" };
        html_report(measurement, &context(measurement), &Program::this(), Some(picture))
    }

    #[test]
    fn hostile_text_stays_text() {
        let mut measurement = example::plane();
        measurement.sample.name = HOSTILE.to_owned();
        measurement.other_samples[0].name = HOSTILE.to_owned();
        measurement.sample.budget[0].source = HOSTILE.to_owned();
        measurement.parameters[0].name = HOSTILE.to_owned();
        measurement.rejected[0].reason = HOSTILE.to_owned();
        measurement.photos[0].file = HOSTILE.to_owned();
        for page in [report(&measurement), refused_html_report(HOSTILE, HOSTILE, &context(&measurement), &Program::this())] {
            assert!(!page.contains("<script") && !page.contains("\" onload=\"y &"), "{page}");
            assert!(page.contains("&lt;script&gt;"));
        }
    }

    #[test]
    fn stands_alone_without_script_and_network() {
        for measurement in [example::plane(), example::line()] {
            let page = report(&measurement);
            for foreign in ["<script", "<link", "@import", "url(", "src=\"http", "href=\"http", "NaN"] {
                assert!(!page.contains(foreign), "{foreign}");
            }
            assert!(page.contains("data:image/png;base64,iVBORw=="));
        }
    }

    #[test]
    fn every_picture_has_words() {
        let page = report(&example::plane());
        assert_eq!(page.matches("<figure").count(), page.matches("<figure role=\"img\" aria-label=\"").count());
        assert_eq!(page.matches("<svg").count(), 3);
        assert_eq!(page.matches("<svg aria-hidden").count(), 3);
    }

    /// ISO/IEC 17025:2017, 7.8.2.1, as far as it applies to a bench: title, unique identification, item, method, date, results with units and
    /// uncertainty, who, that it holds for the item only; and the decision rule of 7.8.6.
    #[test]
    fn says_what_a_report_must_say() {
        let page = report(&example::plane());
        for wanted in [
            "embossed film: pitch of a plane lattice",
            "entry 12",
            &"ef".repeat(32),
            "2030-05-01T10:00:00.000Z",
            "Method",
            "4.00031",
            "0.00086",
            "PASS",
            "Guard band",
            "probability",
            "throw",
            "It holds for the item that was measured",
            "not a calibration certificate",
            "IEC 60825-1",
            &"ab".repeat(32),
            &"cd".repeat(32),
            env!("CARGO_PKG_VERSION"),
        ] {
            assert!(page.contains(wanted), "{wanted}");
        }
    }

    #[test]
    fn survives_what_should_never_come() {
        let mut broken = example::plane();
        broken.sample.pitch_m.clear();
        broken.sample.budget[0].share = vec![f64::NAN];
        broken.orders[0].residual_px = [f64::NAN, f64::INFINITY];
        broken.reciprocal.wavelength_m = 0.0;
        broken.zero_order.at.x_px = f64::NAN;
        broken.photos.clear();
        assert!(!html_report(&broken, &Context::default(), &Program::this(), None).contains("NaN"));
    }
}
