//! The words that every form of the report shares.

use std::{cmp::Reverse, collections::BTreeMap};

use crate::{
    bench::Mode,
    measure::{LatticeKind, Measurement, RejectedSpot, SampleResult},
};

/// Said wherever a result is presented.
pub(super) const NO_CERTIFICATE: &str = "This is not a calibration certificate of an accredited laboratory.";

/// Name of a lattice kind.
pub(super) fn kind_name(kind: LatticeKind) -> &'static str {
    match kind {
        LatticeKind::Oblique => "oblique",
        LatticeKind::Rectangular => "rectangular",
        LatticeKind::CentredRectangular => "centred rectangular",
        LatticeKind::Square => "square",
        LatticeKind::Hexagonal => "hexagonal",
    }
}

/// Name of the side that the light leaves.
pub(super) fn mode_name(mode: Mode) -> &'static str {
    match mode {
        Mode::Transmission => "transmission",
        Mode::Reflection => "reflection",
    }
}

/// "line" for one pitch, "plane" for two.
pub(super) fn pattern_name(sample: &SampleResult) -> &'static str {
    if sample.pitch_m.len() < 2 { "line" } else { "plane" }
}

/// Name of the i-th of `count` things: "pitch" alone, "pitch 1" and "pitch 2" together.
pub(super) fn numbered(name: &str, index: usize, count: usize) -> String {
    if count < 2 { name.to_owned() } else { format!("{name} {}", index + 1) }
}

/// Reasons for rejected spots, each with its number of spots, the commonest first.
pub(super) fn reason_counts<'a>(spots: impl Iterator<Item = &'a RejectedSpot>) -> Vec<(&'a str, usize)> {
    let mut counts = BTreeMap::new();
    for spot in spots {
        *counts.entry(spot.reason.as_str()).or_insert(0_usize) += 1;
    }
    let mut reasons: Vec<(&str, usize)> = counts.into_iter().collect();
    reasons.sort_by_key(|&(reason, count)| (Reverse(count), reason));
    reasons
}

/// What the orientation is measured from.
pub(super) fn orientation_words(measurement: &Measurement) -> String {
    let first = match pattern_name(&measurement.sample) {
        "line" => "the direction across the lines",
        _ => "the first lattice vector (pitch 1)",
    };
    let axis = if measurement.fit.dots_used > 0 { "the X axis of the target" } else { "the photo's horizontal" };
    format!("Orientation: {first} against {axis}, counter-clockwise for the viewer.")
}
