//! Writes a value with its uncertainty.

use super::LengthUnit;

/// Significant digits of the uncertainty (JCGM 100:2008, 7.2.6: two at most usually suffice).
const DIGITS: u32 = 2;

/// Beyond so many digits in front of or behind the point a power of ten reads better.
const MOST_PLACES: i32 = 9;

/// A value with its standard uncertainty as `812.00(80) mm`: two digits of u, the value rounded to match.
///
/// The digits in brackets count in the last places of the value (JCGM 100:2008, 7.2.2), and the text reads back with
/// [`super::Quantity::parse`]. `value` and `u` are in `unit`. Numbers that would need a long row of zeros get a power
/// of ten; u = 0 is written `812 mm (exact)`. A number that is not finite, or a negative u, gives `not known`.
///
/// ```
/// use spotrule::quantity::format_concise;
/// assert_eq!(format_concise(2.001_34, 0.000_42, "µm"), "2.00134(42) µm");
/// assert_eq!(format_concise(812.04, 0.0996, "mm"), "812.04(10) mm");
/// assert_eq!(format_concise(6543.2, 123.4, "nm"), "6540(120) nm");
/// ```
#[must_use]
pub fn format_concise(value: f64, u: f64, unit: &str) -> String {
    format_concise_digits(value, u, unit, DIGITS)
}

/// As [`format_concise`], with another number of significant digits of u (1 to 9; others count as the nearer of these).
#[must_use]
pub fn format_concise_digits(value: f64, u: f64, unit: &str, digits: u32) -> String {
    let space = if unit.is_empty() { "" } else { " " };
    if !value.is_finite() || !u.is_finite() || u < 0.0 {
        return "not known".to_owned();
    }
    if u == 0.0 {
        return format!("{}{space}{unit} (exact)", shortest(value));
    }
    let digits = digits.clamp(1, 9);
    let (u_digits, last_place) = rounded_digits(u, digits);
    // The place of the value's first digit after rounding decides whether a power of ten is needed.
    let first_place = if value == 0.0 { last_place } else { exponent_of(value).max(last_place) };
    if last_place >= -MOST_PLACES && first_place <= MOST_PLACES && last_place <= 3 {
        return format!("{}({}){space}{unit}", fixed(value, last_place), widened(&u_digits, last_place));
    }
    let scaled = scaled_by_power_of_ten(value, first_place, last_place);
    format!("{scaled}({u_digits})e{first_place}{space}{unit}")
}

/// A length with its uncertainty, in the unit in which its value reads well.
#[must_use]
pub fn format_length(length_m: f64, u_m: f64) -> String {
    let unit = LengthUnit::for_length_m(length_m).unit();
    format_concise(unit.value_from_si(length_m), unit.difference_from_si(u_m), unit.symbol)
}

/// An angle in radians with its uncertainty, in degrees: `90.013(21) deg`.
#[must_use]
pub fn format_angle_deg(angle_rad: f64, u_rad: f64) -> String {
    format_concise(angle_rad.to_degrees(), u_rad.to_degrees(), "deg")
}

/// Both ends of an interval of length, rounded to the second digit of the standard uncertainty: `12.0286 to 12.0554 um`.
#[must_use]
pub fn format_length_interval(ends_m: [f64; 2], u_m: f64) -> String {
    let unit = LengthUnit::for_length_m(0.5 * (ends_m[0] + ends_m[1])).unit();
    format_interval(ends_m.map(|end| unit.value_from_si(end)), unit.difference_from_si(u_m), unit.symbol)
}

/// The same for angles in radians, in degrees.
#[must_use]
pub fn format_angle_deg_interval(ends_rad: [f64; 2], u_rad: f64) -> String {
    format_interval(ends_rad.map(f64::to_degrees), u_rad.to_degrees(), "deg")
}

fn format_interval([low, high]: [f64; 2], u: f64, unit: &str) -> String {
    if !(low.is_finite() && high.is_finite() && u.is_finite() && u > 0.0) {
        return "not known".to_owned();
    }
    let last_place = rounded_digits(u, DIGITS).1;
    format!("{} to {} {unit}", fixed(low, last_place), fixed(high, last_place))
}

/// A fraction as a percentage with `digits` significant digits: `42 %`; below a hundredth of a percent `< 0.01 %`.
#[must_use]
pub fn format_ratio_percent(ratio: f64, digits: u32) -> String {
    let percent = ratio * 100.0;
    if !percent.is_finite() {
        return "not known".to_owned();
    }
    if percent != 0.0 && percent.abs() < 0.01 {
        return "< 0.01 %".to_owned();
    }
    let last_place = if percent == 0.0 { 0 } else { rounded_digits(percent.abs(), digits.clamp(1, 9)).1 };
    format!("{} %", fixed(percent, last_place.min(0)))
}

/// The significant digits of a positive number and the power of ten of the last of them: 0.0996 -> ("10", -2).
fn rounded_digits(number: f64, digits: u32) -> (String, i32) {
    let text = format!("{number:.precision$e}", precision = digits as usize - 1);
    let (mantissa, power) = split_exponent(&text);
    (mantissa.replace('.', ""), power - (digits.cast_signed() - 1))
}

/// The power of ten of the first digit.
fn exponent_of(number: f64) -> i32 {
    split_exponent(&format!("{number:e}")).1
}

fn split_exponent(text: &str) -> (&str, i32) {
    // The text comes from `{:e}`, so both parts are there; the fallback only keeps this total.
    text.split_once('e').map_or((text, 0), |(mantissa, power)| (mantissa, power.parse().unwrap_or(0)))
}

/// A number rounded to the place 10^`last_place`, written without a power of ten.
fn fixed(number: f64, last_place: i32) -> String {
    let text = if last_place <= 0 {
        format!("{number:.places$}", places = last_place.unsigned_abs() as usize)
    } else {
        // Rounded in decimal, not by dividing in binary: `{:e}` with as many digits as stay above the place.
        let kept = exponent_of(number) - last_place;
        match usize::try_from(kept) {
            Ok(kept) => expanded(&format!("{number:.kept$e}")),
            Err(_) => format!("{:.0}", (number / 10f64.powi(last_place)).round() * 10f64.powi(last_place)),
        }
    };
    without_sign_of_zero(text)
}

/// Digits that count in places above the point get the zeros they need: ("12", 1) -> "120".
fn widened(digits: &str, last_place: i32) -> String {
    let zeros = usize::try_from(last_place).unwrap_or(0);
    format!("{digits}{}", "0".repeat(zeros))
}

/// `6.54e3` -> `6540`.
fn expanded(text: &str) -> String {
    let (mantissa, power) = split_exponent(text);
    let decimals = mantissa.split_once('.').map_or(0, |(_, decimals)| decimals.len());
    let zeros = usize::try_from(power).unwrap_or(0).saturating_sub(decimals);
    format!("{}{}", mantissa.replace('.', ""), "0".repeat(zeros))
}

/// `value` / 10^`first_place`, rounded to the place 10^`last_place` of the unscaled value.
fn scaled_by_power_of_ten(value: f64, first_place: i32, last_place: i32) -> String {
    let decimals = usize::try_from(first_place - last_place).unwrap_or(0);
    let place_of_value = if value == 0.0 { i32::MIN / 2 } else { exponent_of(value) };
    if place_of_value == first_place {
        let text = format!("{value:.decimals$e}");
        let (mantissa, power) = split_exponent(&text);
        // 9.996 rounded to 10.0 keeps the power of ten that was chosen.
        if power == first_place { mantissa.to_owned() } else { format!("{:.decimals$}", if value < 0.0 { -10.0 } else { 10.0 }) }
    } else {
        // The value is smaller than the last digit of u: zero or one in the last place.
        let text = if value == 0.0 { 0.0 } else { format!("{value:e}").parse::<f64>().unwrap_or(0.0) / 10f64.powi(first_place) };
        without_sign_of_zero(format!("{text:.decimals$}"))
    }
}

/// The shortest text that reads back as the same number.
fn shortest(value: f64) -> String {
    let size = value.abs();
    if value == 0.0 {
        "0".to_owned()
    } else if (1e-5..1e9).contains(&size) {
        format!("{value}")
    } else {
        format!("{value:e}")
    }
}

fn without_sign_of_zero(text: String) -> String {
    match text.strip_prefix('-') {
        Some(digits) if !digits.bytes().any(|byte| matches!(byte, b'1'..=b'9')) => digits.to_owned(),
        _ => text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Dimension, Quantity};

    #[test]
    fn two_digits_and_the_value_to_match() {
        for (value, u, text) in [
            (812.0, 0.8, "812.00(80) mm"),
            (812.0, 1.2, "812.0(12) mm"),
            (812.0, 12.0, "812(12) mm"),
            (812.0, 120.0, "810(120) mm"),
            (6543.2, 123.4, "6540(120) mm"),
            (6543.2, 9960.0, "7000(10000) mm"),
            (0.0, 0.5, "0.00(50) mm"),
            (-0.001, 0.5, "0.00(50) mm"),
            (-0.06, 1.0, "-0.1(10) mm"),
            (100.021_47, 0.000_35, "100.02147(35) mm"),
            // 0.0996 rounds to 0.10: the last place moves with it.
            (1.0, 0.0996, "1.00(10) mm"),
            (9.996, 0.012, "9.996(12) mm"),
        ] {
            assert_eq!(format_concise(value, u, "mm"), text);
        }
    }

    #[test]
    fn huge_and_tiny_numbers_get_a_power_of_ten() {
        assert_eq!(format_concise(6.328e-7, 1e-11, "m"), "6.32800(10)e-7 m");
        assert_eq!(format_concise(-6.328e-7, 1e-11, "m"), "-6.32800(10)e-7 m");
        assert_eq!(format_concise(1.234_56e12, 3.4e9, "m"), "1.2346(34)e12 m");
        assert_eq!(format_concise(0.0, 3.4e-15, "m"), "0(34)e-16 m");
        assert_eq!(format_concise(9.9999e-12, 1.0e-15, "m"), "9.9999(10)e-12 m");
        assert_eq!(format_concise(9.999_99e-12, 1.0e-15, "m"), "10.0000(10)e-12 m");
    }

    /// CODATA 2018 as published (from memory): gravitational constant, electron mass, inverse fine-structure constant,
    /// proton-electron mass ratio, Bohr radius; each is printed there with two digits of u.
    #[test]
    fn published_constants_print_as_published() {
        for (value, u, text) in [
            (6.674_30e-11, 0.000_15e-11, "6.67430(15)e-11"),
            (9.109_383_701_5e-31, 0.000_000_002_8e-31, "9.1093837015(28)e-31"),
            (137.035_999_084, 0.000_000_021, "137.035999084(21)"),
            (1_836.152_673_43, 0.000_000_11, "1836.15267343(11)"),
            (5.291_772_109_03e-11, 0.000_000_000_80e-11, "5.29177210903(80)e-11"),
        ] {
            assert_eq!(format_concise(value, u, ""), text);
            let read = Quantity::parse(text, Dimension::Ratio).unwrap();
            assert!((read.value / value - 1.0).abs() < 1e-15 && (read.u / u - 1.0).abs() < 1e-12, "{text}: {read:?}");
        }
    }

    #[test]
    fn no_uncertainty_and_no_number() {
        assert_eq!(format_concise(812.0, 0.0, "mm"), "812 mm (exact)");
        assert_eq!(format_concise(0.5, 0.0, ""), "0.5 (exact)");
        for (value, u) in [(f64::NAN, 1.0), (1.0, f64::INFINITY), (1.0, -1.0)] {
            assert_eq!(format_concise(value, u, "mm"), "not known");
        }
    }

    #[test]
    fn lengths_angles_and_shares() {
        assert_eq!(format_length(2.001_34e-6, 4.2e-10), "2.00134(42) µm");
        assert_eq!(format_length(0.812, 8e-4), "812.00(80) mm");
        assert_eq!(format_length(632.82e-9, 1e-11), "632.820(10) nm");
        assert_eq!(format_angle_deg(90.013_f64.to_radians(), 0.021_f64.to_radians()), "90.013(21) deg");
        assert_eq!(format_ratio_percent(0.4213, 2), "42 %");
        assert_eq!(format_ratio_percent(0.004_213, 2), "0.42 %");
        assert_eq!(format_ratio_percent(0.0, 2), "0 %");
        assert_eq!(format_ratio_percent(1e-9, 2), "< 0.01 %");
        assert_eq!(format_ratio_percent(f64::NAN, 2), "not known");
        assert_eq!(format_ratio_percent(123.4, 2), "12340 %");
    }
}
