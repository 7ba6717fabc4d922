//! Reads a quantity: value, uncertainty, unit, and what the uncertainty means.
//!
//! ```text
//! 812.0(8) mm             JCGM 100:2008, 7.2.2: digits in the last places, so u = 0.8 mm
//! 812.0(0.8) mm           the same; a point in the brackets says that u is in the unit itself
//! 1.2(3)e-4 m             the exponent belongs to both;  also 1.2e-4(3e-5) m
//! 812.0 ± 0.8 mm (k=1)    also (k=2), (k=1.96); +- and +/- are read as ±
//! (812.0 ± 0.8) mm (k=1)  the same
//! 650 nm ± 1 % (k=1)      the uncertainty in another unit, or relative
//! 20.0 ± 0.5 degC (limits)  half-width a, u = a/√3 (JCGM 100:2008, 4.3.7)
//! 632.8 nm (exact)        no uncertainty
//! ```

use super::{
    Dimension, Distribution, Quantity, QuantityError, Unit, nearest,
    number::{self, Mantissa},
    unit::OTHER_NAMES,
    units_of,
};

/// The longest text that is read.
const LONGEST_TEXT: usize = 120;

impl Quantity {
    /// Reads a quantity of the given dimension, in SI.
    ///
    /// The forms are shown in the table of the crate's documentation of the bench file: `812.0(8) mm`,
    /// `812.0 ± 0.8 mm (k=1)`, `(k=2)`, `(limits)`, `(exact)`. Every accepted value is finite, and its uncertainty is
    /// positive unless it is marked exact.
    ///
    /// # Errors
    /// A [`QuantityError`] that shows the text and how to write it.
    pub fn parse(text: &str, dimension: Dimension) -> Result<Self, QuantityError> {
        let reader = Reader::new(text, dimension)?;
        let (stated, qualifier) = reader.split_qualifier();
        let qualifier = qualifier.map(|words| reader.qualifier(words)).transpose()?;
        match stated.split_once('±') {
            Some((value, half_width)) => reader.with_half_width(value, half_width, qualifier),
            None => reader.with_brackets(&stated, qualifier),
        }
    }
}

/// What the words in brackets say.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Qualifier {
    Exact,
    Limits,
    Coverage(f64),
}

/// One number of the text with what belongs to it.
#[derive(Debug, Clone, Copy)]
struct Term<'a> {
    mantissa: Mantissa<'a>,
    /// In front of the brackets.
    exponent: &'a str,
    brackets: Option<&'a str>,
    /// Behind the brackets.
    late_exponent: &'a str,
    unit: &'a str,
}

/// The text on its way to a quantity; knows how to complain about it.
struct Reader {
    /// As written, trimmed.
    seen: String,
    /// With one sign for ±, one for minus, and plain spaces.
    text: String,
    dimension: Dimension,
}

impl Reader {
    fn new(text: &str, dimension: Dimension) -> Result<Self, QuantityError> {
        let seen = text.trim();
        let example = dimension.example();
        let length = seen.chars().count();
        if seen.is_empty() {
            return Err(QuantityError::Empty { example });
        }
        if length > LONGEST_TEXT {
            let seen = seen.chars().take(24).chain(['…']).collect();
            return Err(QuantityError::TooLong { seen, length, most: LONGEST_TEXT, example });
        }
        let seen = seen.to_owned();
        if seen.contains(',') {
            let suggestion = if seen.contains('.') { seen.replace(',', "") } else { seen.replace(',', ".") };
            return Err(QuantityError::DecimalComma { seen, suggestion });
        }
        let text = seen.replace("+/-", "±").replace("+-", "±").replace(['\u{2212}', '\u{2013}'], "-");
        let text = text.chars().map(|c| if c.is_whitespace() { ' ' } else { c }).collect();
        Ok(Self { seen, text, dimension })
    }

    /// Takes the words in brackets off the end; brackets with a number in them are an uncertainty and stay.
    fn split_qualifier(&self) -> (String, Option<&str>) {
        let whole = || (self.text.clone(), None);
        let Some(inner) = self.text.strip_suffix(')') else { return whole() };
        match inner.rsplit_once('(') {
            Some((stated, words)) if !stated.trim().is_empty() && !looks_numeric(words) => (stated.trim().to_owned(), Some(words)),
            _ => whole(),
        }
    }

    fn qualifier(&self, words: &str) -> Result<Qualifier, QuantityError> {
        let compact: String = words.chars().filter(|c| *c != ' ').flat_map(char::to_lowercase).collect();
        if let Some(k) = compact.strip_prefix("k=") {
            let factor = self.plain_number(k).filter(|factor| *factor > 0.0);
            return factor
                .map(Qualifier::Coverage)
                .ok_or_else(|| QuantityError::CoverageFactor { seen: self.seen.clone(), k: k.to_owned() });
        }
        match compact.as_str() {
            "exact" => Ok(Qualifier::Exact),
            "limits" | "limit" => Ok(Qualifier::Limits),
            _ => Err(QuantityError::UnknownQualifier { seen: self.seen.clone(), word: words.trim().to_owned() }),
        }
    }

    fn plain_number(&self, text: &str) -> Option<f64> {
        let (mantissa, rest) = number::mantissa(text)?;
        let (exponent, rest) = number::exponent(rest);
        rest.is_empty().then(|| number::value(mantissa.text, number::power_of_ten(exponent)?))?
    }

    /// `value ± half-width`, with or without brackets around both.
    fn with_half_width(&self, value: &str, half_width: &str, qualifier: Option<Qualifier>) -> Result<Quantity, QuantityError> {
        if half_width.contains('±') {
            return Err(self.contradiction("± stands twice; write one value with one uncertainty"));
        }
        let (value, half_width) = match value.trim().strip_prefix('(') {
            Some(value) => (value, half_width.replacen(')', " ", 1)),
            None => (value, half_width.to_owned()),
        };
        let left = self.term(value, "the value")?;
        let right = self.term(&half_width, "the uncertainty")?;
        let qualifier = match (right.brackets, qualifier) {
            (Some(words), None) if !looks_numeric(words) => Some(self.qualifier(words)?),
            (None, qualifier) => qualifier,
            _ => return Err(self.contradiction("an uncertainty stands behind ± and in brackets; keep one of them")),
        };
        if left.brackets.is_some() {
            return Err(self.contradiction("an uncertainty stands behind ± and in brackets; keep one of them"));
        }
        let (unit, own_unit) = match (left.unit, right.unit) {
            ("", both) | (both, "") => (self.unit(both, &left)?, None),
            (of_value, of_half_width) => (self.unit(of_value, &left)?, Some(of_half_width)),
        };
        let (k, distribution) = match qualifier {
            None => return Err(QuantityError::BareTolerance { seen: self.seen.clone(), bare: self.seen.clone() }),
            Some(Qualifier::Exact) => return Err(self.contradiction("± and (exact); keep one of them")),
            Some(Qualifier::Limits) => (3.0_f64.sqrt(), Distribution::Rectangular),
            Some(Qualifier::Coverage(k)) => (k, Distribution::Normal),
        };
        let value = self.number(&left, "the value")?;
        let half_width = self.number(&right, "the uncertainty")?;
        let half_width_si = match own_unit {
            None => unit.difference_to_si(half_width),
            // A percentage of the value, unless the quantity is itself a ratio.
            Some("%") if self.dimension != Dimension::Ratio => {
                (unit.difference_to_si(value) * half_width / 100.0).abs().copysign(half_width)
            }
            Some(other) => self.unit(other, &right)?.difference_to_si(half_width),
        };
        self.quantity(unit.value_to_si(value), half_width_si / k, distribution, &left)
    }

    /// `value(uncertainty)` or `value (exact)`.
    fn with_brackets(&self, stated: &str, qualifier: Option<Qualifier>) -> Result<Quantity, QuantityError> {
        let term = self.term(stated, "the value")?;
        let unit = self.unit(term.unit, &term)?;
        let value = self.number(&term, "the value")?;
        let (brackets, qualifier) = match (term.brackets, qualifier) {
            (Some(words), None) if !looks_numeric(words) => (None, Some(self.qualifier(words)?)),
            both => both,
        };
        match (brackets, qualifier) {
            (None, Some(Qualifier::Exact)) => self.finite(Quantity::exact(unit.value_to_si(value))),
            (Some(digits), None) => {
                let u = self.uncertainty_in_brackets(&term, digits)?;
                self.quantity(unit.value_to_si(value), unit.difference_to_si(u), Distribution::Normal, &term)
            }
            (None, _) => Err(self.missing_uncertainty(&term)),
            (Some(_), Some(Qualifier::Exact)) => Err(self.contradiction("an uncertainty in brackets and (exact); keep one of them")),
            (Some(_), Some(_)) => {
                Err(self
                    .contradiction("brackets already mean the standard uncertainty; write ± with (k=2) or (limits), or the brackets alone"))
            }
        }
    }

    /// The uncertainty in the unit of the value.
    fn uncertainty_in_brackets(&self, term: &Term<'_>, digits: &str) -> Result<f64, QuantityError> {
        const PLACE: &str = "the uncertainty in brackets";
        let Some((mantissa, rest)) = number::mantissa(digits.trim()) else { return Err(self.not_a_number(PLACE, digits)) };
        let (own_exponent, rest) = number::exponent(rest);
        if !rest.is_empty() {
            return Err(self.not_a_number(PLACE, digits));
        }
        let out_of_range = || QuantityError::OutOfRange { seen: self.seen.clone(), place: PLACE };
        let own_power = number::power_of_ten(own_exponent).ok_or_else(out_of_range)?;
        let power_of_value = number::power_of_ten(exponent_of(term)).ok_or_else(out_of_range)?;
        let power = if !own_exponent.is_empty() {
            own_power
        } else if !mantissa.has_point {
            // Digits in the last places of the value; its decimals are below the longest text.
            power_of_value - i32::try_from(term.mantissa.decimals).map_err(|_| out_of_range())?
        } else if term.exponent.is_empty() {
            power_of_value
        } else {
            return Err(self.contradiction("a power of ten for the value alone; write it behind the brackets: 1.2(0.3)e-3 m"));
        };
        number::value(mantissa.text, power).ok_or_else(out_of_range)
    }

    /// One number with its brackets, exponent and unit.
    fn term<'a>(&self, text: &'a str, place: &'static str) -> Result<Term<'a>, QuantityError> {
        let Some((mantissa, rest)) = number::mantissa(text.trim()) else { return Err(self.not_a_number(place, text)) };
        let (exponent, rest) = number::exponent(rest);
        let (brackets, rest) = match rest.trim_start().strip_prefix('(').and_then(|rest| rest.split_once(')')) {
            Some((inside, rest)) => (Some(inside), rest),
            None => (None, rest),
        };
        let (late_exponent, rest) = if brackets.is_some() { number::exponent(rest) } else { ("", rest) };
        let unit = rest.trim();
        if unit.starts_with(|c: char| c.is_ascii_digit()) && rest.starts_with(' ') {
            return Err(QuantityError::DigitGroups { seen: self.seen.clone(), suggestion: joined_digits(&self.seen) });
        }
        if !exponent.is_empty() && !late_exponent.is_empty() || unit.starts_with(|c: char| c.is_ascii_digit() || c == '.') {
            return Err(self.not_a_number(place, text));
        }
        Ok(Term { mantissa, exponent, brackets, late_exponent, unit })
    }

    fn number(&self, term: &Term<'_>, place: &'static str) -> Result<f64, QuantityError> {
        number::power_of_ten(exponent_of(term))
            .and_then(|power| number::value(term.mantissa.text, power))
            .ok_or_else(|| QuantityError::OutOfRange { seen: self.seen.clone(), place })
    }

    fn unit(&self, text: &str, term: &Term<'_>) -> Result<&'static Unit, QuantityError> {
        let accepted = || self.dimension.accepted_units();
        if text.is_empty() && self.dimension != Dimension::Ratio {
            let unit = self.dimension.usual_unit();
            let suggestion = match term.brackets {
                Some(digits) => format!("{}({digits}){} {unit}", term.mantissa.text, exponent_of(term)),
                None => format!("{}(1){} {unit}", term.mantissa.text, exponent_of(term)),
            };
            return Err(QuantityError::MissingUnit { seen: self.seen.clone(), suggestion, accepted: accepted() });
        }
        match Unit::find(text) {
            Some(unit) if unit.dimension == self.dimension => Ok(unit),
            Some(unit) => Err(QuantityError::WrongDimension {
                seen: self.seen.clone(),
                unit: text.to_owned(),
                found: unit.dimension.name(),
                needed: self.dimension.name(),
                accepted: accepted(),
            }),
            None => Err(QuantityError::UnknownUnit { seen: self.seen.clone(), unit: text.to_owned(), advice: self.unit_advice(text) }),
        }
    }

    fn unit_advice(&self, text: &str) -> String {
        let by_name = OTHER_NAMES.iter().find(|(name, _)| name.eq_ignore_ascii_case(text)).map(|(_, unit)| *unit);
        let by_spelling = || nearest(text, units_of(self.dimension).map(|unit| unit.symbol));
        match by_name.or_else(by_spelling) {
            Some(unit) => format!("did you mean {unit}? (accepted: {})", self.dimension.accepted_units()),
            None => format!("accepted: {}", self.dimension.accepted_units()),
        }
    }

    fn quantity(&self, value: f64, u: f64, distribution: Distribution, term: &Term<'_>) -> Result<Quantity, QuantityError> {
        if u < 0.0 {
            return Err(QuantityError::NegativeUncertainty { seen: self.seen.clone() });
        }
        if u == 0.0 {
            let unit = if term.unit.is_empty() { String::new() } else { format!(" {}", term.unit) };
            let suggestion = format!("{}{}{unit} (exact)", term.mantissa.text, exponent_of(term));
            return Err(QuantityError::ZeroUncertainty { seen: self.seen.clone(), suggestion });
        }
        self.finite(Quantity { value, u, distribution })
    }

    /// The last gate: a unit can still push a finite number over the edge.
    fn finite(&self, quantity: Quantity) -> Result<Quantity, QuantityError> {
        if quantity.value.is_finite() && quantity.u.is_finite() {
            return Ok(quantity);
        }
        Err(QuantityError::OutOfRange { seen: self.seen.clone(), place: "the value" })
    }

    fn missing_uncertainty(&self, term: &Term<'_>) -> QuantityError {
        let exponent = exponent_of(term);
        let unit = if term.unit.is_empty() { String::new() } else { format!(" {}", term.unit) };
        let last_place = match term.mantissa.decimals {
            0 => "1".to_owned(),
            decimals => format!("0.{}1", "0".repeat(decimals - 1)),
        };
        QuantityError::MissingUncertainty {
            seen: self.seen.clone(),
            suggestion: format!("{}(1){exponent}{unit}", term.mantissa.text),
            u: format!("{last_place}{exponent}{unit}"),
        }
    }

    fn not_a_number(&self, place: &'static str, found: &str) -> QuantityError {
        let lower = found.trim().trim_start_matches(['+', '-']).to_lowercase();
        let example = self.dimension.example();
        if lower.starts_with("nan") || lower.starts_with("inf") || lower.starts_with('∞') {
            return QuantityError::NotFinite { seen: self.seen.clone(), example };
        }
        QuantityError::NotANumber { seen: self.seen.clone(), place, found: found.trim().to_owned(), example }
    }

    fn contradiction(&self, conflict: &'static str) -> QuantityError {
        QuantityError::Contradiction { seen: self.seen.clone(), conflict }
    }
}

/// Brackets that hold an uncertainty, sensible or not, and no words.
fn looks_numeric(inside: &str) -> bool {
    let inside = inside.trim();
    if let Some((_, rest)) = number::mantissa(inside) {
        return number::exponent(rest).1.is_empty();
    }
    matches!(inside.trim_start_matches(['+', '-']).to_ascii_lowercase().as_str(), "" | "nan" | "inf" | "infinity")
}

fn exponent_of<'a>(term: &Term<'a>) -> &'a str {
    if term.exponent.is_empty() { term.late_exponent } else { term.exponent }
}

/// The text without spaces between digits.
fn joined_digits(text: &str) -> String {
    let letters: Vec<char> = text.chars().collect();
    let digit_at = |i: Option<usize>| i.and_then(|i| letters.get(i)).is_some_and(char::is_ascii_digit);
    let between_digits = |i: usize| letters[i].is_whitespace() && digit_at(i.checked_sub(1)) && digit_at(Some(i + 1));
    (0..letters.len()).filter(|i| !between_digits(*i)).map(|i| letters[i]).collect()
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::quantity::format_concise_digits;

    fn length(text: &str) -> Result<Quantity, QuantityError> {
        Quantity::parse(text, Dimension::Length)
    }

    /// Value and u to one part in 1e15 (a product of correctly rounded factors), and the law.
    fn assert_reads(text: &str, dimension: Dimension, value: f64, u: f64, distribution: Distribution) {
        let got = Quantity::parse(text, dimension).unwrap_or_else(|error| panic!("{error}"));
        assert!((got.value - value).abs() <= 1e-15 * value.abs(), "{text}: {got:?}, want {value}");
        assert!((got.u - u).abs() <= 1e-15 * u.abs(), "{text}: {got:?}, want u = {u}");
        assert_eq!(got.distribution, distribution, "{text}");
    }

    #[test]
    fn the_four_forms_of_jcgm_100_7_2_2() {
        // JCGM 100:2008, 7.2.2: a mass of 100.02147 g with u = 0.35 mg, here as lengths.
        assert_reads("100.02147(35) mm", Dimension::Length, 0.100_021_47, 0.35e-6, Distribution::Normal);
        assert_reads("100.02147(0.00035) mm", Dimension::Length, 0.100_021_47, 0.35e-6, Distribution::Normal);
        assert_reads("100.02147 mm ± 0.35 um (k=1)", Dimension::Length, 0.100_021_47, 0.35e-6, Distribution::Normal);
        assert_reads("(100.02147 ± 0.00035) mm (k=1)", Dimension::Length, 0.100_021_47, 0.35e-6, Distribution::Normal);
    }

    #[test]
    fn brackets_count_in_the_last_places() {
        for (text, value, u) in [
            ("812.0(8) mm", 0.812, 8e-4),
            ("812.0(12) mm", 0.812, 1.2e-3),
            ("812(12) mm", 0.812, 12e-3),
            ("812.0(1.2) mm", 0.812, 1.2e-3),
            ("812.(3) mm", 0.812, 3e-3),
            ("  812.0 (8)mm ", 0.812, 8e-4),
            ("1.2e-3(2e-4) m", 1.2e-3, 2e-4),
            ("1.2e-3(3) m", 1.2e-3, 3e-4),
            ("1.2(3)e-3 m", 1.2e-3, 3e-4),
            ("1.2(0.3)e-3 m", 1.2e-3, 3e-4),
            ("-0.5(5) in", -0.0127, 0.0127),
            ("632.82(1) nm", 632.82e-9, 1e-11),
            ("1.6(1) \u{b5}m", 1.6e-6, 1e-7),
            ("1.6(1) \u{3bc}m", 1.6e-6, 1e-7),
            ("\u{2212}3(1)\u{a0}cm", -0.03, 0.01),
        ] {
            assert_reads(text, Dimension::Length, value, u, Distribution::Normal);
        }
    }

    #[test]
    fn what_a_plus_minus_means() {
        assert_reads("812.0 ± 0.8 mm (k=1)", Dimension::Length, 0.812, 8e-4, Distribution::Normal);
        assert_reads("812.0 +/- 0.8 mm (k = 2)", Dimension::Length, 0.812, 4e-4, Distribution::Normal);
        assert_reads("812.0+-0.8mm (K=1.6)", Dimension::Length, 0.812, 5e-4, Distribution::Normal);
        assert_reads("812.0 ± 0.8 (k=1) mm", Dimension::Length, 0.812, 8e-4, Distribution::Normal);
        assert_reads("812.0 mm ± 0.8 (k=1)", Dimension::Length, 0.812, 8e-4, Distribution::Normal);
        assert_reads("0.1 m ± 3 mm (limits)", Dimension::Length, 0.1, 3e-3 / 3f64.sqrt(), Distribution::Rectangular);
        assert_reads("650 nm ± 1 % (k=1)", Dimension::Length, 650e-9, 6.5e-9, Distribution::Normal);
        assert_reads("50 ± 5 % (k=1)", Dimension::Ratio, 0.5, 0.05, Distribution::Normal);
        assert_reads("0.5 ± 0.05 (k=1)", Dimension::Ratio, 0.5, 0.05, Distribution::Normal);
        assert_reads("20.0 ± 0.6 K (k=2)", Dimension::Temperature, 20.0 - 273.15, 0.3, Distribution::Normal);
        assert_reads("20.0 °C ± 0.5 K (k=1)", Dimension::Temperature, 20.0, 0.5, Distribution::Normal);
    }

    /// Shortest floating-point texts of a scripting language, as scripts write them into bench files.
    #[test]
    fn what_scripts_write() {
        assert_reads("632.8 ± 0.01 nm (k=1)", Dimension::Length, 632.8e-9, 0.01e-9, Distribution::Normal);
        assert_reads("0.532 ± 5e-05 nm (k=1)", Dimension::Length, 0.532e-9, 5e-14, Distribution::Normal);
        assert_reads("1e-05 ± 1.5E-6 mm (k=1)", Dimension::Length, 1e-8, 1.5e-9, Distribution::Normal);
        assert_reads("-1.7 ± 0.5 deg (k=1)", Dimension::Angle, -1.7_f64.to_radians(), 0.5_f64.to_radians(), Distribution::Normal);
        assert_reads("0.0 mm (exact)", Dimension::Length, 0.0, 0.0, Distribution::Exact);
        assert_reads("50.0 mm(exact)", Dimension::Length, 0.05, 0.0, Distribution::Exact);
        assert_reads("50 (exact) mm", Dimension::Length, 0.05, 0.0, Distribution::Exact);
        assert_reads("1013.25 ± 2.0 hPa (k=1)", Dimension::Pressure, 101_325.0, 200.0, Distribution::Normal);
        assert_reads("101.3(1) kPa", Dimension::Pressure, 101_300.0, 100.0, Distribution::Normal);
        assert_reads("2 px ± 1 px (k=1)", Dimension::Pixel, 2.0, 1.0, Distribution::Normal);
        assert_reads("30(1)°", Dimension::Angle, 30f64.to_radians(), 1f64.to_radians(), Distribution::Normal);
        assert_reads("6(1) arcmin", Dimension::Angle, 0.1_f64.to_radians(), (1.0_f64 / 60.0).to_radians(), Distribution::Normal);
    }

    /// Each refusal is its own, shows what was seen, and says what to write.
    #[test]
    fn refusals_say_what_to_write() {
        for (text, dimension, reason, words) in [
            ("", Dimension::Length, "Empty", vec!["812.0(8) mm"]),
            ("812,0(8) mm", Dimension::Length, "DecimalComma", vec!["812,0(8) mm", "\"812.0(8) mm\""]),
            ("1,200.5(1) mm", Dimension::Length, "DecimalComma", vec!["\"1200.5(1) mm\""]),
            ("632.991 212(1) nm", Dimension::Length, "DigitGroups", vec!["\"632.991212(1) nm\""]),
            ("812", Dimension::Length, "MissingUnit", vec!["812(1) mm", "nm"]),
            ("812.0(8)", Dimension::Length, "MissingUnit", vec!["812.0(8) mm"]),
            ("812 ± 1 (k=1)", Dimension::Length, "MissingUnit", vec!["mm"]),
            ("812 mm", Dimension::Length, "MissingUncertainty", vec!["812 mm", "how sure? 812(1) mm means u = 1 mm"]),
            ("812.00 mm", Dimension::Length, "MissingUncertainty", vec!["812.00(1) mm means u = 0.01 mm"]),
            ("812 mm (k=2)", Dimension::Length, "MissingUncertainty", vec!["how sure?"]),
            ("812 ± 1 mm", Dimension::Length, "BareTolerance", vec!["(k=1)", "(k=2)", "(limits)"]),
            ("812(1) parsec", Dimension::Length, "UnknownUnit", vec!["parsec", "accepted: mm"]),
            ("812(1) MM", Dimension::Length, "UnknownUnit", vec!["did you mean mm?"]),
            ("3(1) microns", Dimension::Length, "UnknownUnit", vec!["did you mean um?"]),
            ("5320(1) Å", Dimension::Length, "UnknownUnit", vec!["did you mean nm (1 nm = 10 Å)?"]),
            ("812(1) deg", Dimension::Length, "WrongDimension", vec!["unit of angle", "length is needed", "mm"]),
            ("1(1) %", Dimension::Angle, "WrongDimension", vec!["ratio", "deg"]),
            ("812(0) mm", Dimension::Length, "ZeroUncertainty", vec!["812 mm (exact)"]),
            ("0 mm ± 1 % (k=1)", Dimension::Length, "ZeroUncertainty", vec!["(exact)"]),
            ("812 ± 0.0 mm (limits)", Dimension::Length, "ZeroUncertainty", vec!["(exact)"]),
            ("812(-1) mm", Dimension::Length, "NegativeUncertainty", vec!["minus"]),
            ("812 ± -1 mm (k=1)", Dimension::Length, "NegativeUncertainty", vec!["minus"]),
            ("812 ± 1 mm (k=0)", Dimension::Length, "CoverageFactor", vec!["k = 0"]),
            ("812 ± 1 mm (k=nan)", Dimension::Length, "CoverageFactor", vec!["k = nan"]),
            ("812 ± 1 mm (95 %)", Dimension::Length, "UnknownQualifier", vec!["(95 %)"]),
            ("812 ± 1 mm (2 sigma)", Dimension::Length, "UnknownQualifier", vec!["(2 sigma)", "(k=2)"]),
            ("812 ± 1 mm (about)", Dimension::Length, "UnknownQualifier", vec!["(about)", "(limits)"]),
            ("nan mm (exact)", Dimension::Length, "NotFinite", vec!["nan mm"]),
            ("-inf(1) mm", Dimension::Length, "NotFinite", vec!["-inf"]),
            ("812(nan) mm", Dimension::Length, "NotFinite", vec!["812(nan)"]),
            ("812 ± inf mm (k=1)", Dimension::Length, "NotFinite", vec!["inf"]),
            ("1e400(1) mm", Dimension::Length, "OutOfRange", vec!["1e400"]),
            ("1e308 ± 1 kPa (k=1)", Dimension::Pressure, "OutOfRange", vec!["1e308"]),
            ("1e-320(1) mm", Dimension::Length, "OutOfRange", vec!["1e-320"]),
            ("1e99999999999(1) mm", Dimension::Length, "OutOfRange", vec!["exponent"]),
            ("about 812 mm", Dimension::Length, "NotANumber", vec!["about 812 mm"]),
            ("812.0.5(1) mm", Dimension::Length, "NotANumber", vec!["812.0.5"]),
            ("812(x) mm", Dimension::Length, "UnknownQualifier", vec!["(x)"]),
            ("812(1)(2) mm", Dimension::Length, "UnknownUnit", vec!["(2) mm"]),
            ("812.0(8) mm (k=2)", Dimension::Length, "Contradiction", vec!["brackets already mean"]),
            ("812.0(8) mm (exact)", Dimension::Length, "Contradiction", vec!["keep one"]),
            ("812 ± 1 mm (exact)", Dimension::Length, "Contradiction", vec!["keep one"]),
            ("812(1) ± 1 mm (k=1)", Dimension::Length, "Contradiction", vec!["keep one"]),
            ("812 ± 1 ± 2 mm (k=1)", Dimension::Length, "Contradiction", vec!["twice"]),
            ("1.2e-3(0.3) m", Dimension::Length, "Contradiction", vec!["1.2(0.3)e-3"]),
        ] {
            let error = Quantity::parse(text, dimension).expect_err(text);
            let debug = format!("{error:?}");
            let message = error.to_string();
            assert!(debug.starts_with(reason), "{text}: {debug}, want {reason}");
            for word in words {
                assert!(message.contains(word), "{text}: \"{message}\" lacks \"{word}\"");
            }
        }
        let long = length(&"1".repeat(1_000_000)).expect_err("long").to_string();
        assert!(long.contains("1000000 characters") && long.len() < 200, "{long}");
    }

    proptest! {
        /// What is printed reads back: the value within half a last place, u within its rounding to the digits asked for.
        #[test]
        fn printed_quantities_read_back(mantissa in -10.0..10.0_f64, power in -40..40_i32, u_mantissa in 1.0..10.0_f64, below in -3..12_i32, digits in 1..7_u32) {
            let value = mantissa * 10f64.powi(power);
            let u = u_mantissa * 10f64.powi(power - below);
            let text = format_concise_digits(value, u, "m", digits);
            let got = length(&text).unwrap_or_else(|error| panic!("{error}"));
            let half_place = 0.5 * 10f64.powi(power - below - (digits.cast_signed() - 1));
            // Rounding u up can move its last place by one (9.96 -> 10); the float itself adds a few parts in 1e16.
            prop_assert!((got.value - value).abs() <= half_place * 10.0 + 4e-16 * value.abs(), "{} of {}", text, value);
            prop_assert!((got.u - u).abs() <= half_place * (1.0 + 1e-9), "{} of u {}", text, u);
        }

        #[test]
        fn exact_values_read_back_to_the_bit(value in proptest::num::f64::NORMAL) {
            let text = format_concise_digits(value, 0.0, "m", 2);
            prop_assert_eq!(length(&text).map(|quantity| quantity.value.to_bits()), Ok(value.to_bits()));
        }

        #[test]
        fn no_text_panics(text in "\\PC{0,40}") {
            let _ = length(&text);
        }

        #[test]
        fn no_text_made_of_the_right_letters_panics(text in "[-+0-9.,()± eEkm=°%µnalitsx]{0,30}") {
            if let Ok(quantity) = length(&text) {
                prop_assert!(quantity.value.is_finite() && quantity.u.is_finite());
                prop_assert!(quantity.u > 0.0 || quantity.distribution == Distribution::Exact);
            }
        }
    }
}
