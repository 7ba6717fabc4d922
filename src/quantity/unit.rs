//! The units that are read and written.

use std::f64::consts::PI;

use super::Dimension;

/// A unit: how it is written and what it is in SI.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unit {
    /// As it is printed.
    pub symbol: &'static str,
    /// What it measures.
    pub dimension: Dimension,
    /// Other ways in which people type it.
    also: &'static [&'static str],
    /// SI = value · `times` / `per` + `offset`. Two factors, because 1e9 is a float and 1e-9 only nearly one.
    times: f64,
    per: f64,
    offset: f64,
}

impl Unit {
    /// The unit written as `text`, exact in case (Pa is not pA).
    #[must_use]
    pub fn find(text: &str) -> Option<&'static Self> {
        UNITS.iter().find(|unit| unit.symbol == text || unit.also.contains(&text))
    }

    /// A value in this unit, in SI.
    #[must_use]
    pub fn value_to_si(&self, value: f64) -> f64 {
        self.difference_to_si(value) + self.offset
    }

    /// An SI value in this unit.
    #[must_use]
    pub fn value_from_si(&self, value_si: f64) -> f64 {
        self.difference_from_si(value_si - self.offset)
    }

    /// A difference or an uncertainty in this unit, in SI: without the offset of a temperature scale.
    #[must_use]
    pub fn difference_to_si(&self, difference: f64) -> f64 {
        difference * self.times / self.per
    }

    /// An SI difference or uncertainty in this unit.
    #[must_use]
    pub fn difference_from_si(&self, difference_si: f64) -> f64 {
        difference_si * self.per / self.times
    }
}

/// A unit in which a length reads well.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LengthUnit {
    /// nm
    Nanometre,
    /// µm
    Micrometre,
    /// mm
    Millimetre,
    /// m
    Metre,
}

impl LengthUnit {
    /// The unit in which `length_m` has a number from 1 to below 1000; nm below that, m above it.
    #[must_use]
    pub fn for_length_m(length_m: f64) -> Self {
        let length_m = length_m.abs();
        if length_m < 1e-6 {
            Self::Nanometre
        } else if length_m < 1e-3 {
            Self::Micrometre
        } else if length_m < 1.0 {
            Self::Millimetre
        } else {
            Self::Metre
        }
    }

    /// The unit itself.
    #[must_use]
    pub fn unit(self) -> &'static Unit {
        match self {
            Self::Nanometre => &NANOMETRE,
            Self::Micrometre => &MICROMETRE,
            Self::Millimetre => &MILLIMETRE,
            Self::Metre => &METRE,
        }
    }
}

/// The units of a dimension, the usual one first.
pub fn units_of(dimension: Dimension) -> impl Iterator<Item = &'static Unit> {
    UNITS.iter().filter(move |unit| unit.dimension == dimension)
}

impl Dimension {
    /// How a quantity of this dimension is written.
    pub(super) fn example(self) -> &'static str {
        match self {
            Self::Length => "812.0(8) mm",
            Self::Angle => "0.0(5) deg",
            Self::Pixel => "3400(50) px",
            Self::Temperature => "20.0(5) degC",
            Self::Pressure => "1013(2) hPa",
            Self::Ratio => "50(5) %",
        }
    }

    /// The unit named when one is missing.
    pub(super) fn usual_unit(self) -> &'static str {
        units_of(self).next().map_or("", |unit| unit.symbol)
    }

    /// All unit symbols, for a message.
    pub(super) fn accepted_units(self) -> String {
        units_of(self).map(|unit| if unit.symbol.is_empty() { "no unit" } else { unit.symbol }).collect::<Vec<_>>().join(", ")
    }
}

/// What people write for a unit that is spelt otherwise here, too far apart for a spelling distance.
pub(super) const OTHER_NAMES: &[(&str, &str)] = &[
    ("micron", "um"),
    ("microns", "um"),
    ("micrometer", "um"),
    ("micrometers", "um"),
    ("micrometre", "um"),
    ("micrometres", "um"),
    ("nanometer", "nm"),
    ("nanometers", "nm"),
    ("nanometre", "nm"),
    ("nanometres", "nm"),
    ("millimeter", "mm"),
    ("millimeters", "mm"),
    ("millimetre", "mm"),
    ("millimetres", "mm"),
    ("centimeter", "cm"),
    ("centimeters", "cm"),
    ("centimetre", "cm"),
    ("centimetres", "cm"),
    ("meter", "m"),
    ("meters", "m"),
    ("metre", "m"),
    ("metres", "m"),
    ("inch", "in"),
    ("inches", "in"),
    ("\"", "in"),
    ("degree", "deg"),
    ("degrees", "deg"),
    ("radian", "rad"),
    ("radians", "rad"),
    ("'", "arcmin"),
    ("′", "arcmin"),
    ("pixel", "px"),
    ("pixels", "px"),
    ("C", "degC"),
    ("celsius", "degC"),
    ("percent", "%"),
    ("mbar", "hPa"),
    ("Å", "nm (1 nm = 10 Å)"),
    ("Å", "nm (1 nm = 10 Å)"),
    ("A", "nm (1 nm = 10 Å)"),
    ("angstrom", "nm (1 nm = 10 Å)"),
];

const NANOMETRE: Unit = plain("nm", Dimension::Length, &[], 1.0, 1e9);
// Both signs are in use: the micro sign U+00B5 and the Greek letter mu U+03BC.
const MICROMETRE: Unit = plain("µm", Dimension::Length, &["um", "\u{3bc}m"], 1.0, 1e6);
const MILLIMETRE: Unit = plain("mm", Dimension::Length, &[], 1.0, 1e3);
const METRE: Unit = plain("m", Dimension::Length, &[], 1.0, 1.0);

const UNITS: &[Unit] = &[
    MILLIMETRE,
    NANOMETRE,
    MICROMETRE,
    plain("cm", Dimension::Length, &[], 1.0, 1e2),
    METRE,
    // International inch, 25.4 mm exactly (1959 agreement).
    plain("in", Dimension::Length, &[], 254.0, 1e4),
    plain("deg", Dimension::Angle, &["°"], PI, 180.0),
    plain("mrad", Dimension::Angle, &[], 1.0, 1e3),
    plain("rad", Dimension::Angle, &[], 1.0, 1.0),
    plain("arcmin", Dimension::Angle, &[], PI, 10_800.0),
    plain("px", Dimension::Pixel, &[], 1.0, 1.0),
    plain("degC", Dimension::Temperature, &["°C", "\u{2103}"], 1.0, 1.0),
    Unit { symbol: "K", dimension: Dimension::Temperature, also: &[], times: 1.0, per: 1.0, offset: -273.15 },
    plain("hPa", Dimension::Pressure, &[], 1e2, 1.0),
    plain("Pa", Dimension::Pressure, &[], 1.0, 1.0),
    plain("kPa", Dimension::Pressure, &[], 1e3, 1.0),
    plain("%", Dimension::Ratio, &[], 1.0, 1e2),
    plain("", Dimension::Ratio, &[], 1.0, 1.0),
];

const fn plain(symbol: &'static str, dimension: Dimension, also: &'static [&'static str], times: f64, per: f64) -> Unit {
    Unit { symbol, dimension, also, times, per, offset: 0.0 }
}

#[cfg(test)]
#[expect(clippy::float_cmp, reason = "one correctly rounded division has one answer")]
mod tests {
    use super::*;

    #[test]
    fn powers_of_ten_divide() {
        assert_eq!(Unit::find("nm").unwrap().value_to_si(632.8), 632.8 / 1e9);
        assert_eq!(Unit::find("mm").unwrap().value_to_si(812.0), 0.812);
        assert_eq!(Unit::find("in").unwrap().value_to_si(1.0), 0.0254);
        for micro in ["um", "\u{b5}m", "\u{3bc}m"] {
            assert_eq!(Unit::find(micro).unwrap().value_to_si(1.6), 1.6 / 1e6);
        }
    }

    #[test]
    fn a_temperature_has_an_offset_and_its_uncertainty_has_none() {
        let kelvin = Unit::find("K").unwrap();
        assert!((kelvin.value_to_si(293.15) - 20.0).abs() < 1e-12);
        assert_eq!(kelvin.difference_to_si(0.5), 0.5);
        assert!((kelvin.value_from_si(20.0) - 293.15).abs() < 1e-12);
    }

    #[test]
    fn a_length_finds_its_unit() {
        for (length_m, symbol) in [(0.0, "nm"), (5.0e-7, "nm"), (-2.0e-6, "µm"), (1e-3, "mm"), (0.9999, "mm"), (1.2, "m")] {
            assert_eq!(LengthUnit::for_length_m(length_m).unit().symbol, symbol);
        }
    }

    #[test]
    fn every_other_name_points_to_a_unit() {
        for (name, unit) in OTHER_NAMES {
            assert!(Unit::find(name).is_none(), "{name} is a unit already");
            assert!(Unit::find(unit.split(' ').next().unwrap()).is_some(), "{unit}");
        }
    }
}
