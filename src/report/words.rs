//! The words that every form of the report shares.

use crate::{
    bench::Mode,
    measure::{LatticeKind, SampleResult},
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
