//! Decimal numbers as they are written, before their value is taken: the place of the last digit counts here.

/// A signed run of digits with at most one point, and what follows it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Mantissa<'a> {
    /// Sign, digits and point as written.
    pub(super) text: &'a str,
    /// Digits behind the point.
    pub(super) decimals: usize,
    /// Whether there is a point.
    pub(super) has_point: bool,
}

/// The mantissa at the start of `text` and the rest; `None` where there is no digit.
pub(super) fn mantissa(text: &str) -> Option<(Mantissa<'_>, &str)> {
    let bytes = text.as_bytes();
    let sign = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
    let digits = |from: usize| bytes.iter().skip(from).take_while(|byte| byte.is_ascii_digit()).count();
    let whole = digits(sign);
    let has_point = bytes.get(sign + whole) == Some(&b'.');
    let decimals = if has_point { digits(sign + whole + 1) } else { 0 };
    if whole + decimals == 0 {
        return None;
    }
    let (number, rest) = text.split_at_checked(sign + whole + usize::from(has_point) + decimals)?;
    Some((Mantissa { text: number, decimals, has_point }, rest))
}

/// The exponent (`e-5`, `E+3`) at the start of `text`, empty where there is none, and the rest.
pub(super) fn exponent(text: &str) -> (&str, &str) {
    let bytes = text.as_bytes();
    if !matches!(bytes.first(), Some(b'e' | b'E')) {
        return ("", text);
    }
    let sign = usize::from(matches!(bytes.get(1), Some(b'+' | b'-')));
    let digits = bytes.iter().skip(1 + sign).take_while(|byte| byte.is_ascii_digit()).count();
    match text.split_at_checked(1 + sign + digits) {
        Some(parts) if digits > 0 => parts,
        _ => ("", text),
    }
}

/// The power of ten of an exponent as [`exponent`] gives it; `None` where it is beyond any number.
pub(super) fn power_of_ten(exponent: &str) -> Option<i32> {
    let Some(digits) = exponent.strip_prefix(['e', 'E']) else { return Some(0) };
    digits.parse().ok().filter(|power: &i32| power.abs() <= 400)
}

/// The value of digits with an exponent; `None` where it overflows, or vanishes although a digit is not zero.
pub(super) fn value(mantissa: &str, power: i32) -> Option<f64> {
    let value: f64 = format!("{mantissa}e{power}").parse().ok()?;
    let is_zero = !mantissa.bytes().any(|byte| matches!(byte, b'1'..=b'9'));
    let lost = !is_zero && !value.is_normal();
    // "-0.0" is the number zero; a sign on it would only be carried into results.
    (value.is_finite() && !lost).then_some(if is_zero { 0.0 } else { value })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_mantissa_ends_where_the_digits_end() {
        let (number, rest) = mantissa("-812.05(8) mm").unwrap();
        assert_eq!((number.text, number.decimals, number.has_point, rest), ("-812.05", 2, true, "(8) mm"));
        assert_eq!(mantissa("5. mm").unwrap().0.decimals, 0);
        assert_eq!(mantissa(".5").unwrap().0.decimals, 1);
        for none in ["", ".", "-", "+.", "mm", "e5", "°"] {
            assert!(mantissa(none).is_none(), "{none}");
        }
    }

    #[test]
    fn an_exponent_needs_digits() {
        assert_eq!(exponent("e-05 mm"), ("e-05", " mm"));
        assert_eq!(exponent("E3"), ("E3", ""));
        for none in ["e", "e-", "em", " e3", "°", ""] {
            assert_eq!(exponent(none), ("", none));
        }
        assert_eq!(power_of_ten("e-05"), Some(-5));
        assert_eq!(power_of_ten("e99999999999999"), None);
    }

    #[test]
    fn values_beyond_the_arithmetic_are_none() {
        assert_eq!(value("1", 400), None);
        assert_eq!(value("1", -400), None);
        assert_eq!(value("0.00", -400), Some(0.0));
        assert!(value("-0", 0).is_some_and(f64::is_sign_positive));
    }
}
