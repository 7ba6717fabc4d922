//! One text on its way to a quantity: cleaned, taken apart, and able to complain about itself.

use super::{
    Dimension, Distribution, Quantity, QuantityError, Unit, nearest,
    number::{self, Mantissa},
    unit::OTHER_NAMES,
    units_of,
};

/// The longest text that is read.
const LONGEST_TEXT: usize = 120;

/// What the words in brackets say.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Qualifier {
    Exact,
    Limits,
    Coverage(f64),
}

/// One number of the text with what belongs to it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Term<'a> {
    pub(super) mantissa: Mantissa<'a>,
    /// In front of the brackets.
    pub(super) exponent: &'a str,
    pub(super) brackets: Option<&'a str>,
    /// Behind the brackets.
    pub(super) late_exponent: &'a str,
    pub(super) unit: &'a str,
}

/// The text on its way to a quantity; knows how to complain about it.
pub(super) struct Reader {
    /// As written, trimmed.
    pub(super) seen: String,
    /// With one sign for ±, one for minus, and plain spaces.
    pub(super) text: String,
    pub(super) dimension: Dimension,
}

impl Reader {
    pub(super) fn new(text: &str, dimension: Dimension) -> Result<Self, QuantityError> {
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
        // Control characters must not reach a terminal through a message.
        let seen: String = seen.chars().map(|c| if c.is_control() && !c.is_whitespace() { '\u{fffd}' } else { c }).collect();
        if seen.contains(',') {
            let suggestion = if seen.contains('.') { seen.replace(',', "") } else { seen.replace(',', ".") };
            return Err(QuantityError::DecimalComma { seen, suggestion });
        }
        let text = seen.replace("+/-", "±").replace("+-", "±").replace(['\u{2212}', '\u{2013}'], "-");
        let text = text.chars().map(|c| if c.is_whitespace() { ' ' } else { c }).collect();
        Ok(Self { seen, text, dimension })
    }

    /// Takes the words in brackets off the end; brackets with a number in them are an uncertainty and stay.
    pub(super) fn split_qualifier(&self) -> (String, Option<&str>) {
        let whole = || (self.text.clone(), None);
        let Some(inner) = self.text.strip_suffix(')') else { return whole() };
        match inner.rsplit_once('(') {
            Some((stated, words)) if !stated.trim().is_empty() && !looks_numeric(words) => (stated.trim().to_owned(), Some(words)),
            _ => whole(),
        }
    }

    pub(super) fn qualifier(&self, words: &str) -> Result<Qualifier, QuantityError> {
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

    pub(super) fn plain_number(&self, text: &str) -> Option<f64> {
        let (mantissa, rest) = number::mantissa(text)?;
        let (exponent, rest) = number::exponent(rest);
        rest.is_empty().then(|| number::value(mantissa.text, number::power_of_ten(exponent)?))?
    }

    /// One number with its brackets, exponent and unit.
    pub(super) fn term<'a>(&self, text: &'a str, place: &'static str) -> Result<Term<'a>, QuantityError> {
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

    pub(super) fn number(&self, term: &Term<'_>, place: &'static str) -> Result<f64, QuantityError> {
        number::power_of_ten(exponent_of(term))
            .and_then(|power| number::value(term.mantissa.text, power))
            .ok_or_else(|| QuantityError::OutOfRange { seen: self.seen.clone(), place })
    }

    pub(super) fn unit(&self, text: &str, term: &Term<'_>) -> Result<&'static Unit, QuantityError> {
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
                needed: self.dimension.name_with_article(),
                accepted: accepted(),
            }),
            None => Err(QuantityError::UnknownUnit { seen: self.seen.clone(), unit: text.to_owned(), advice: self.unit_advice(text) }),
        }
    }

    pub(super) fn unit_advice(&self, text: &str) -> String {
        let by_name = OTHER_NAMES.iter().find(|(name, _)| name.eq_ignore_ascii_case(text)).map(|(_, unit)| *unit);
        let by_spelling = || nearest(text, units_of(self.dimension).map(|unit| unit.symbol));
        match by_name.or_else(by_spelling) {
            Some(unit) => format!("did you mean {unit}? (accepted: {})", self.dimension.accepted_units()),
            None => format!("accepted: {}", self.dimension.accepted_units()),
        }
    }

    pub(super) fn quantity(
        &self,
        value: f64,
        u: f64,
        distribution: Distribution,
        (term, unit): (&Term<'_>, &Unit),
    ) -> Result<Quantity, QuantityError> {
        if u < 0.0 {
            return Err(QuantityError::NegativeUncertainty { seen: self.seen.clone() });
        }
        if u == 0.0 {
            let unit = if unit.symbol.is_empty() { String::new() } else { format!(" {}", unit.symbol) };
            let suggestion = format!("{}{}{unit} (exact)", term.mantissa.text, exponent_of(term));
            return Err(QuantityError::ZeroUncertainty { seen: self.seen.clone(), suggestion });
        }
        self.finite(Quantity { value, u, distribution })
    }

    /// The last gate: a unit can still push a finite number over the edge.
    pub(super) fn finite(&self, quantity: Quantity) -> Result<Quantity, QuantityError> {
        if quantity.value.is_finite() && quantity.u.is_finite() {
            return Ok(quantity);
        }
        Err(QuantityError::OutOfRange { seen: self.seen.clone(), place: "the value" })
    }

    pub(super) fn missing_uncertainty(&self, term: &Term<'_>) -> QuantityError {
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

    pub(super) fn not_a_number(&self, place: &'static str, found: &str) -> QuantityError {
        let lower = found.trim().trim_start_matches(['+', '-']).to_lowercase();
        let example = self.dimension.example();
        if lower.starts_with("nan") || lower.starts_with("inf") || lower.starts_with('∞') {
            return QuantityError::NotFinite { seen: self.seen.clone(), example };
        }
        QuantityError::NotANumber { seen: self.seen.clone(), place, found: found.trim().to_owned(), example }
    }

    pub(super) fn contradiction(&self, conflict: &'static str) -> QuantityError {
        QuantityError::Contradiction { seen: self.seen.clone(), conflict }
    }
}

/// Brackets that hold an uncertainty, sensible or not, and no words.
pub(super) fn looks_numeric(inside: &str) -> bool {
    let inside = inside.trim();
    if let Some((_, rest)) = number::mantissa(inside) {
        return number::exponent(rest).1.is_empty();
    }
    matches!(inside.trim_start_matches(['+', '-']).to_ascii_lowercase().as_str(), "" | "nan" | "inf" | "infinity")
}

pub(super) fn exponent_of<'a>(term: &Term<'a>) -> &'a str {
    if term.exponent.is_empty() { term.late_exponent } else { term.exponent }
}

/// The text without spaces between digits.
fn joined_digits(text: &str) -> String {
    let letters: Vec<char> = text.chars().collect();
    let digit_at = |i: Option<usize>| i.and_then(|i| letters.get(i)).is_some_and(char::is_ascii_digit);
    let between_digits = |i: usize| letters[i].is_whitespace() && digit_at(i.checked_sub(1)) && digit_at(Some(i + 1));
    (0..letters.len()).filter(|i| !between_digits(*i)).map(|i| letters[i]).collect()
}
