//! SI values to the units that people read. The only place of the room where a power of ten of a unit stands.

use crate::measure::{ParameterUnit, SampleResult, Value};

/// A unit to show a value in.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Unit {
    /// For people, e.g. "µm".
    pub(super) label: &'static str,
    /// For scripts: plain ASCII, e.g. "um".
    pub(super) ascii: &'static str,
    /// How many of this unit make one SI unit.
    pub(super) per_si: f64,
}

pub(super) const NANOMETRE: Unit = Unit { label: "nm", ascii: "nm", per_si: 1e9 };
pub(super) const MICROMETRE: Unit = Unit { label: "µm", ascii: "um", per_si: 1e6 };
pub(super) const MILLIMETRE: Unit = Unit { label: "mm", ascii: "mm", per_si: 1e3 };
pub(super) const DEGREE: Unit = Unit { label: "°", ascii: "deg", per_si: 180.0 / std::f64::consts::PI };
pub(super) const SQUARE_MICROMETRE: Unit = Unit { label: "µm²", ascii: "um2", per_si: 1e12 };
pub(super) const SQUARE_MILLIMETRE: Unit = Unit { label: "mm²", ascii: "mm2", per_si: 1e6 };
pub(super) const LINES_PER_MILLIMETRE: Unit = Unit { label: "lines/mm", ascii: "1/mm", per_si: 1e-3 };
const PIXEL: Unit = Unit { label: "px", ascii: "px", per_si: 1.0 };
const NUMBER: Unit = Unit { label: "", ascii: "1", per_si: 1.0 };

impl Unit {
    /// `value` and its uncertainties in this unit; factor and degrees of freedom are plain numbers.
    pub(super) fn of(self, value: Value) -> Value {
        Value { value: value.value * self.per_si, u: value.u * self.per_si, ..value }
    }

    /// " µm", or "°" without the space, or nothing: ready to stand behind a number.
    pub(super) fn suffix(self) -> String {
        match self.label {
            "" | "°" => self.label.to_owned(),
            label => format!(" {label}"),
        }
    }
}

/// µm from 0.5 µm up to 1000 µm, nm below, mm above.
pub(super) fn for_pitch(pitch_m: f64) -> Unit {
    match pitch_m {
        p if p < 0.5e-6 => NANOMETRE,
        p if p >= 1e-3 => MILLIMETRE,
        _ => MICROMETRE,
    }
}

/// µm², or mm² for coarse meshes.
pub(super) fn for_area(sample: &SampleResult) -> Unit {
    match sample.pitch_m.first() {
        Some(pitch_m) if pitch_m.value >= 1e-3 => SQUARE_MILLIMETRE,
        _ => SQUARE_MICROMETRE,
    }
}

/// For uncertainties of pitches: one step below the unit of a pitch.
pub(super) fn for_small_length(length_m: f64) -> Unit {
    match length_m {
        u if u < 0.5e-6 => NANOMETRE,
        u if u < 0.5e-3 => MICROMETRE,
        _ => MILLIMETRE,
    }
}

/// The unit in which a parameter is read off a bench.
pub(super) fn for_parameter(unit: ParameterUnit) -> Unit {
    match unit {
        ParameterUnit::Length => MILLIMETRE,
        ParameterUnit::Wavelength => NANOMETRE,
        ParameterUnit::Angle => DEGREE,
        ParameterUnit::LineDensity => LINES_PER_MILLIMETRE,
        ParameterUnit::Pixel => PIXEL,
        ParameterUnit::Number => NUMBER,
    }
}

/// Number of rows per length: the reciprocal of their spacing, with the same relative uncertainty.
pub(super) fn line_density_per_m(spacing_m: Value) -> Option<Value> {
    let density = Value { value: 1.0 / spacing_m.value, u: spacing_m.u / (spacing_m.value * spacing_m.value), ..spacing_m };
    (density.value.is_finite() && density.u.is_finite()).then_some(density)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pitch_units_change_at_half_a_micrometre_and_a_millimetre() {
        for (pitch_m, want) in [(0.49e-6, "nm"), (0.5e-6, "um"), (999e-6, "um"), (1e-3, "mm"), (f64::NAN, "um")] {
            assert_eq!(for_pitch(pitch_m).ascii, want, "{pitch_m} m");
        }
    }

    #[test]
    fn line_density_keeps_the_relative_uncertainty() {
        let spacing_m = Value { value: 2e-6, u: 2e-9, coverage_factor: 2.0, effective_degrees_of_freedom: f64::INFINITY };
        let density = LINES_PER_MILLIMETRE.of(line_density_per_m(spacing_m).unwrap());
        assert!((density.value - 500.0).abs() < 1e-9, "{density:?}");
        assert!((density.u - 0.5).abs() < 1e-9, "{density:?}");
        assert!(line_density_per_m(Value { value: 0.0, ..spacing_m }).is_none());
    }
}
