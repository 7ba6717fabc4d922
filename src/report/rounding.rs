//! Values rounded to their uncertainty: two significant digits of u, the value to the same place (JCGM 100:2008, 7.2.6).

/// Outside these places after the point, plain decimal text gets absurdly long; powers of ten are clearer.
const PLAIN_PLACES: std::ops::RangeInclusive<i32> = -6..=15;

/// Digits shown of a value that has no uncertainty.
const EXACT_DIGITS: usize = 9;

/// A value and its uncertainty as text, rounded to the same place.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Rounded {
    /// The value.
    pub value: String,
    /// The uncertainty, two significant digits; "0" when there is none.
    pub u: String,
}

/// Rounds `u` to two significant digits and `value` to the same place; both in the same unit.
///
/// A carry keeps two digits: u = 0.0996 becomes 0.10. With u = 0 the value keeps nine significant digits.
/// What is not finite is written as "unknown".
///
/// Source: JCGM 100:2008, 7.2.6. Halves go to the even digit of the exact binary value.
///
/// ```
/// let shown = spotrule::report::rounded(4.000_312, 0.000_432);
/// assert_eq!((shown.value.as_str(), shown.u.as_str()), ("4.00031", "0.00043"));
/// ```
#[must_use]
pub fn rounded(value: f64, u: f64) -> Rounded {
    let Some(exponent) = exponent_of(u) else {
        let u = if u.is_finite() { "0" } else { "unknown" };
        return Rounded { value: significant(value, EXACT_DIGITS), u: u.to_owned() };
    };
    let places = 1 - exponent;
    if PLAIN_PLACES.contains(&places) {
        return Rounded { value: at_place(value, places), u: at_place(u, places) };
    }
    Rounded { value: power_of_ten(value, exponent), u: format!("{u:.1e}") }
}

/// `value(u)` with u in units of the last digit shown, e.g. `812.00(80)` for 812 and 0.8 (JCGM 100:2008, 7.2.2).
///
/// Without uncertainty the value is followed by `(exact)`, as in the bench file.
///
/// ```
/// assert_eq!(spotrule::report::concise(812.0, 0.8), "812.00(80)");
/// assert_eq!(spotrule::report::concise(812.0, 0.0), "812 (exact)");
/// ```
#[must_use]
pub fn concise(value: f64, u: f64) -> String {
    let shown = rounded(value, u);
    match exponent_of(u) {
        None if u.is_finite() => format!("{} (exact)", shown.value),
        Some(exponent) if PLAIN_PLACES.contains(&(1 - exponent)) => {
            format!("{}({})", shown.value, shown.u.trim_start_matches(['0', '.']).replace('.', ""))
        }
        _ => format!("{} (u = {})", shown.value, shown.u),
    }
}

/// A value to `digits` significant digits, trailing zeros after the point dropped; "unknown" when not finite.
#[must_use]
pub fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "unknown".to_owned();
    }
    let precise = format!("{value:.*e}", digits.max(1) - 1);
    let Ok(near) = precise.parse::<f64>() else { return precise };
    let magnitude = near.abs();
    if magnitude == 0.0 {
        return "0".to_owned();
    }
    if (1e-6..1e15).contains(&magnitude) { format!("{near}") } else { format!("{near:e}") }
}

/// A fraction as percent with two significant digits, tiny ones in parts per million or billion.
///
/// ```
/// assert_eq!(spotrule::report::percent(0.000_11), "0.011 %");
/// assert_eq!(spotrule::report::percent(0.000_011), "11 ppm");
/// ```
#[must_use]
pub fn percent(fraction: f64) -> String {
    let magnitude = fraction.abs();
    match magnitude {
        m if !m.is_finite() => "unknown".to_owned(),
        m if m < 1e-12 => "0 %".to_owned(),
        m if m < 1e-7 => format!("{} ppb", significant(fraction * 1e9, 2)),
        m if m < 1e-4 => format!("{} ppm", significant(fraction * 1e6, 2)),
        _ => format!("{} %", significant(fraction * 1e2, 2)),
    }
}

/// Power of ten of the leading digit after rounding to two significant digits; `None` unless `u` is finite and positive.
fn exponent_of(u: f64) -> Option<i32> {
    if !u.is_finite() || u <= 0.0 {
        return None;
    }
    format!("{u:.1e}").split_once('e')?.1.parse().ok()
}

/// `value` rounded to `places` digits after the point (negative: to tens, hundreds ...).
pub(super) fn at_place(value: f64, places: i32) -> String {
    if !value.is_finite() {
        return "unknown".to_owned();
    }
    let text = match usize::try_from(places) {
        Ok(places) => format!("{value:.places$}"),
        Err(_) => {
            let step = 10f64.powi(-places);
            format!("{:.0}", (value / step).round_ties_even() * step)
        }
    };
    unsigned_zero(text)
}

/// `value` as a power of ten, rounded to the place of the second digit of an uncertainty with this leading exponent.
fn power_of_ten(value: f64, u_exponent: i32) -> String {
    if !value.is_finite() {
        return "unknown".to_owned();
    }
    let leading = exponent_of(value.abs()).unwrap_or(u_exponent);
    match usize::try_from(leading - u_exponent + 1) {
        // A double carries 17 significant digits; more would be noise.
        Ok(digits) => format!("{value:.*e}", digits.min(16)),
        Err(_) => "0".to_owned(),
    }
}

/// "-0.00" reads as an error of the program; zero has no sign.
fn unsigned_zero(text: String) -> String {
    match text.strip_prefix('-') {
        Some(digits) if digits.chars().all(|c| c == '0' || c == '.') => digits.to_owned(),
        _ => text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(value: f64, u: f64, want: (&str, &str), want_concise: &str) {
        let got = rounded(value, u);
        assert_eq!((got.value.as_str(), got.u.as_str()), want, "rounded({value}, {u})");
        assert_eq!(concise(value, u), want_concise, "concise({value}, {u})");
    }

    /// 7.2.6 of JCGM 100:2008 gives 10.05762 Ω with a standard uncertainty of 27 mΩ as 10.058(27) Ω; 7.2.2 the mass of 100.02147 g with 0.35 mg.
    #[test]
    fn examples_of_the_gum() {
        check(10.057_62, 0.027, ("10.058", "0.027"), "10.058(27)");
        check(100.021_47, 0.000_35, ("100.02147", "0.00035"), "100.02147(35)");
    }

    #[test]
    fn carry_keeps_two_digits() {
        check(1.234_567, 0.009_96, ("1.235", "0.010"), "1.235(10)");
        check(1.234_567, 0.009_949, ("1.2346", "0.0099"), "1.2346(99)");
        check(1.234_567, 0.099_6, ("1.23", "0.10"), "1.23(10)");
        check(1234.567, 99.6, ("1230", "100"), "1230(100)");
    }

    #[test]
    fn places_before_and_after_the_point() {
        check(812.0, 0.8, ("812.00", "0.80"), "812.00(80)");
        check(812.34, 1.24, ("812.3", "1.2"), "812.3(12)");
        check(812.34, 12.4, ("812", "12"), "812(12)");
        check(4567.0, 123.0, ("4570", "120"), "4570(120)");
        check(-0.001, 0.5, ("0.00", "0.50"), "0.00(50)");
        check(-3.24159, 0.01, ("-3.242", "0.010"), "-3.242(10)");
    }

    #[test]
    fn without_uncertainty() {
        check(632.82, 0.0, ("632.82", "0"), "632.82 (exact)");
        check(0.1 + 0.2, 0.0, ("0.3", "0"), "0.3 (exact)");
        check(0.0, 0.0, ("0", "0"), "0 (exact)");
    }

    #[test]
    fn tiny_and_huge_uncertainty() {
        check(4.0, 1e-20, ("4.0000000000000000e0", "1.0e-20"), "4.0000000000000000e0 (u = 1.0e-20)");
        check(4.0, 2.5e300, ("0", "2.5e300"), "0 (u = 2.5e300)");
        check(3.21e300, 2.5e298, ("3.210e300", "2.5e298"), "3.210e300 (u = 2.5e298)");
        check(4.0, f64::MIN_POSITIVE, ("4.0000000000000000e0", "2.2e-308"), "4.0000000000000000e0 (u = 2.2e-308)");
    }

    #[test]
    fn nothing_that_is_not_finite_is_shown_as_a_number() {
        check(f64::NAN, 0.1, ("unknown", "0.10"), "unknown(10)");
        check(1.0, f64::INFINITY, ("1", "unknown"), "1 (u = unknown)");
        check(1.0, f64::NAN, ("1", "unknown"), "1 (u = unknown)");
        assert_eq!(significant(f64::INFINITY, 3), "unknown");
        assert_eq!(percent(f64::NAN), "unknown");
    }

    #[test]
    fn percentages_from_percent_to_parts_per_billion() {
        for (fraction, want) in
            [(0.0, "0 %"), (0.123_4, "12 %"), (0.001_26, "0.13 %"), (1.26e-5, "13 ppm"), (1.26e-8, "13 ppb"), (2.5, "250 %")]
        {
            assert_eq!(percent(fraction), want);
        }
    }

    #[test]
    fn significant_digits_without_trailing_zeros() {
        for (value, digits, want) in
            [(0.0, 3, "0"), (1234.5678, 6, "1234.57"), (1.5e-9, 2, "1.5e-9"), (2.0, 5, "2"), (9.996, 3, "10"), (-0.25, 2, "-0.25")]
        {
            assert_eq!(significant(value, digits), want);
        }
    }
}
