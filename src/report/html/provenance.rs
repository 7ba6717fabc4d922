//! Who, when, what, by which method, and everything that is needed to repeat it.

use crate::{
    measure::{Measurement, PhotoSummary},
    report::{
        Context, Program, significant,
        units::MILLIMETRE,
        words::{mode_name, pattern_name},
    },
};
use maud::{Markup, html};

/// The particulars of a report, after ISO/IEC 17025:2017, 7.8.2, as far as they apply to a bench.
pub(super) fn facts(measurement: Option<&Measurement>, context: &Context, program: &Program) -> Markup {
    let provenance = context.provenance.as_ref();
    let name = measurement.map_or("", |measurement| measurement.sample.name.as_str());
    let name = if name.is_empty() { provenance.and_then(|provenance| provenance.sample_name.as_deref()).unwrap_or("") } else { name };
    html! {
        section {
            h2 { "Particulars" }
            dl class="facts" {
                @if let Some(entry) = &context.entry {
                    (fact("Identification", &format!("entry {} of the log {}, SHA-256 {}", entry.entry, entry.log, entry.sha256)))
                }
                (fact("Item", if name.is_empty() { "unnamed sample" } else { name }))
                @if let Some(provenance) = provenance {
                    (fact("Measured and reported", &provenance.time))
                    (fact("Operator", provenance.operator.as_deref().unwrap_or("not stated")))
                }
                (fact("Method", &method(measurement)))
                @if let Some(measurement) = measurement {
                    @for photo in &measurement.photos { (fact("Camera data", &camera_words(photo))) }
                }
                (fact("Program", &format!("spotrule {}, commit {}", program.version, program.commit)))
            }
            @if context.entry.is_some() {
                p class="small" {
                    "The hash above names this entry and all entries before it. A printed copy of this page is a witness: "
                    code { "spotrule log verify --expect-head HASH" } " finds out whether the log still holds them unchanged."
                }
            }
        }
    }
}

fn fact(name: &str, value: &str) -> Markup {
    html! { dt { (name) } dd { (value) } }
}

fn method(measurement: Option<&Measurement>) -> String {
    let kind = match measurement {
        Some(measurement) => format!("{}, {}", pattern_name(&measurement.sample), mode_name(measurement.mode)),
        None => "no result".to_owned(),
    };
    format!(
        "Laser diffraction photographed on a screen ({kind}): weighted least-squares fit of the grating equation in direction cosines to the places of all orders, \
         jointly with screen, target and camera; standard uncertainties per JCGM 100 (GUM) from the covariance of the fit, expanded by Student's factor for about 95 %."
    )
}

fn camera_words(photo: &PhotoSummary) -> String {
    let exif = &photo.exif;
    let parts = [
        Some(format!("{}: {} × {} px", photo.file, photo.size_px[0], photo.size_px[1])),
        exif.camera.clone(),
        exif.focal_length_m.map(|length_m| format!("focal length {} mm", significant(length_m * MILLIMETRE.per_si, 4))),
        exif.f_number.map(|number| format!("f/{}", significant(number, 3))),
        exif.exposure_s.map(|exposure_s| format!("{} s", significant(exposure_s, 3))),
        exif.iso.map(|iso| format!("ISO {}", significant(iso, 6))),
    ];
    parts.into_iter().flatten().collect::<Vec<_>>().join(", ")
}

/// Inputs with their fingerprints.
pub(super) fn repeat(context: &Context) -> Markup {
    html! {
        @if let Some(provenance) = &context.provenance {
            section {
                h2 { "To repeat the measurement" }
                p {
                    "The same program with the same files and flags gives the same figures. Whether a file is the same, its SHA-256 tells ("
                    code { "sha256sum FILE" } ")."
                }
                div class="wide" {
                    table {
                        thead { tr { th { "file" } th { "shows" } th class="n" { "bytes" } th { "SHA-256" } } }
                        tbody {
                            @for photo in &provenance.photos {
                                tr { td { (photo.file) } td { (photo.role.name()) } td class="n" { (photo.bytes) } td { code { (photo.sha256) } } }
                            }
                            @if let Some(bench) = &provenance.bench {
                                tr { td { (bench.file) } td { "bench file" } td class="n" { (bench.text.len()) } td { code { (bench.sha256) } } }
                            }
                        }
                    }
                }
                @if !provenance.flags.is_empty() {
                    h3 { "Flags over the bench file" }
                    pre { (provenance.flags.join("\n")) }
                }
                @if let Some(bench) = &provenance.bench {
                    h3 { "Bench file" }
                    pre { (bench.text) }
                }
            }
        }
    }
}
