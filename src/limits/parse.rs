//! Reads limits. The forms stand at [`Limits::parse`].

use super::{Characteristic, Limits, LimitsError, Subject, Tolerance};
use crate::quantity::{Dimension, Quantity, QuantityError};

impl Limits {
    /// Reads limits, in SI.
    ///
    /// | text | allows |
    /// |---|---|
    /// | `20.00 ± 0.05 um`, `20 um ± 50 nm`, `20.00 um ± 0.2 %` | from value - tolerance to value + tolerance; `+-` and `+/-` are ± |
    /// | `20.00 +0.05 -0.02 um` | unequal tolerances |
    /// | `19.95 .. 20.05 um` | from the first to the second |
    /// | `<= 20.05 um`, `>= 19.95 um` (also ≤ and ≥) | one side only |
    ///
    /// Several are separated by semicolons, each with its subject: `pitch 1: …; pitch 2: …; angle: …`. Without a subject, or with `pitch`,
    /// every pitch of the sample is meant. Here a bare ± is clear: it is a tolerance.
    ///
    /// # Errors
    /// A [`LimitsError`] that shows the part and how to write it.
    pub fn parse(text: &str) -> Result<Self, LimitsError> {
        if text.trim().is_empty() {
            return Err(LimitsError::Empty { place: "between the quotation marks" });
        }
        let written = text.trim().trim_end_matches(';');
        let parts = written.split(';').map(part).collect::<Result<Vec<_>, _>>()?;
        for (i, (subject, _)) in parts.iter().enumerate() {
            if parts.iter().take(i).any(|(earlier, _)| overlap(*earlier, *subject)) {
                return Err(LimitsError::Twice { what: subject_name(*subject) });
            }
        }
        let visible = written.trim().chars().map(|c| if c.is_control() { ' ' } else { c }).collect();
        Ok(Self { text: visible, parts })
    }
}

fn overlap(a: Subject, b: Subject) -> bool {
    let is_pitch = |subject| matches!(subject, Subject::EveryPitch | Subject::One(Characteristic::Pitch(_)));
    a == b || (is_pitch(a) && is_pitch(b) && (a == Subject::EveryPitch || b == Subject::EveryPitch))
}

fn subject_name(subject: Subject) -> String {
    match subject {
        Subject::EveryPitch => "pitch".to_owned(),
        Subject::One(characteristic) => characteristic.name(2),
    }
}

fn part(text: &str) -> Result<(Subject, Tolerance), LimitsError> {
    let (subject, limits) = match text.split_once(':') {
        Some((name, limits)) => (subject(name)?, limits.trim()),
        None => (Subject::EveryPitch, text.trim()),
    };
    if limits.is_empty() {
        return Err(LimitsError::Empty { place: if text.contains(':') { "after a colon" } else { "between two semicolons" } });
    }
    let tolerance = Part::new(limits, subject).tolerance()?;
    Ok((subject, tolerance))
}

fn subject(name: &str) -> Result<Subject, LimitsError> {
    let compact: String = name.chars().filter(|c| !c.is_whitespace()).flat_map(char::to_lowercase).collect();
    match compact.as_str() {
        "pitch" => Ok(Subject::EveryPitch),
        "pitch1" => Ok(Subject::One(Characteristic::Pitch(0))),
        "pitch2" => Ok(Subject::One(Characteristic::Pitch(1))),
        "angle" | "latticeangle" => Ok(Subject::One(Characteristic::LatticeAngle)),
        _ => Err(LimitsError::Subject { subject: name.trim().to_owned() }),
    }
}

/// One part of the text, without its subject.
struct Part<'a> {
    /// As written, for messages.
    seen: &'a str,
    dimension: Dimension,
    /// With one spelling for each sign.
    text: String,
}

impl<'a> Part<'a> {
    fn new(seen: &'a str, subject: Subject) -> Self {
        let dimension = if subject == Subject::One(Characteristic::LatticeAngle) { Dimension::Angle } else { Dimension::Length };
        let text = seen.replace("+/-", "±").replace("+-", "±").replace("<=", "≤").replace(">=", "≥").replace(['\u{2212}', '\u{2013}'], "-");
        Self { seen, dimension, text }
    }

    fn tolerance(&self) -> Result<Tolerance, LimitsError> {
        if self.text.contains(',') {
            return Err(LimitsError::Comma { part: self.seen.to_owned() });
        }
        if self.text.contains('(') {
            return Err(LimitsError::Uncertainty { part: self.seen.to_owned() });
        }
        let tolerance = self.form()?;
        self.sensible(tolerance)
    }

    fn form(&self) -> Result<Tolerance, LimitsError> {
        for (sign, instead) in [('<', "<="), ('>', ">=")] {
            if self.text.contains(sign) {
                return Err(LimitsError::Strict { part: self.seen.to_owned(), sign, instead });
            }
        }
        if let Some(limit) = self.text.strip_prefix('≤') {
            return Ok(Tolerance { lower: None, upper: Some(self.alone(limit)?) });
        }
        if let Some(limit) = self.text.strip_prefix('≥') {
            return Ok(Tolerance { lower: Some(self.alone(limit)?), upper: None });
        }
        if let Some((lower, upper)) = self.text.split_once("..") {
            let [lower, upper] = self.pair(lower, upper)?;
            return Ok(Tolerance { lower: Some(lower), upper: Some(upper) });
        }
        if let Some((value, tolerance)) = self.text.split_once('±') {
            let (value, [half, _]) = self.value_with(value, [tolerance, tolerance])?;
            return Ok(Tolerance { lower: Some(value - half), upper: Some(value + half) });
        }
        if let Some((value, above, below)) = self.unequal() {
            let (value, [above, below]) = self.value_with(value, [above, below])?;
            return Ok(Tolerance { lower: Some(value - below), upper: Some(value + above) });
        }
        // A value that reads is only incomplete; one that does not is told why.
        self.alone(&self.text)?;
        Err(LimitsError::Bare { part: self.seen.to_owned() })
    }

    /// `value +a -b`: three pieces. Signs of exponents and of the value itself are none of these.
    fn unequal(&self) -> Option<(&str, &str, &str)> {
        let spaced = |sign: char| {
            let after_blank = |at: &usize| self.text[..*at].ends_with([' ', '/']);
            self.text.match_indices(sign).map(|(at, _)| at).find(after_blank)
        };
        let (plus, minus) = (spaced('+')?, spaced('-')?);
        if plus > minus {
            return None;
        }
        let (value, above, below) = (&self.text[..plus], &self.text[plus + 1..minus], &self.text[minus + 1..]);
        Some((value, above.trim_end_matches(['/', ' ']), below))
    }

    /// A number with its own unit, SI.
    fn alone(&self, text: &str) -> Result<f64, LimitsError> {
        let (number, unit) = split(text);
        self.number(number, unit)
    }

    /// Two numbers of which one may borrow the unit of the other, SI.
    fn pair(&self, first: &str, second: &str) -> Result<[f64; 2], LimitsError> {
        let (first, second) = (split(first), split(second));
        let shared = if second.1.is_empty() { first.1 } else { second.1 };
        Ok([self.number(first.0, if first.1.is_empty() { shared } else { first.1 })?, self.number(second.0, shared)?])
    }

    /// A value with tolerances above and below it, SI; a tolerance may have a unit of its own, or be a percentage of the value.
    fn value_with(&self, value: &str, tolerances: [&str; 2]) -> Result<(f64, [f64; 2]), LimitsError> {
        let (number, unit) = split(value);
        let last = split(tolerances[1]).1;
        let unit = if unit.is_empty() { last } else { unit };
        let value = self.number(number, unit)?;
        let tolerance = |text: &str| {
            let (number, own) = split(text);
            let own = match (own, last) {
                ("", "") => unit,
                ("", last) => last,
                (own, _) => own,
            };
            match own {
                "%" => self.plain(number).map(|percent| value.abs() * percent / 100.0),
                own => self.number(number, own),
            }
        };
        let [above, below] = [tolerance(tolerances[0])?, tolerance(tolerances[1])?];
        if above < 0.0 || below < 0.0 {
            return Err(LimitsError::Reversed { part: self.seen.to_owned() });
        }
        Ok((value, [above, below]))
    }

    fn number(&self, number: &str, unit: &str) -> Result<f64, LimitsError> {
        let part = || self.seen.to_owned();
        if unit.is_empty() {
            self.plain(number)?;
            let unit = if self.dimension == Dimension::Angle { "deg" } else { "um" };
            return Err(LimitsError::NoUnit { part: part(), unit });
        }
        let read = Quantity::parse(&format!("{number} {unit} (exact)"), self.dimension);
        read.map(|quantity| quantity.value).map_err(|error| match error {
            QuantityError::UnknownUnit { unit, advice, .. } => {
                LimitsError::Unit { part: part(), why: format!("unit \"{unit}\" is not known; {advice}") }
            }
            QuantityError::WrongDimension { unit, found, needed, accepted, .. } => LimitsError::Unit {
                part: part(),
                why: format!("{unit} is a unit of {found}, but {needed} is needed (accepted: {accepted})"),
            },
            _ => LimitsError::Number { part: part(), found: number.to_owned() },
        })
    }

    /// A number without unit.
    fn plain(&self, number: &str) -> Result<f64, LimitsError> {
        let read = Quantity::parse(&format!("{number} (exact)"), Dimension::Ratio);
        read.map(|quantity| quantity.value).map_err(|_| LimitsError::Number { part: self.seen.to_owned(), found: number.to_owned() })
    }

    fn sensible(&self, tolerance: Tolerance) -> Result<Tolerance, LimitsError> {
        if tolerance.width().is_some_and(|width| !(width > 0.0 && width.is_finite())) {
            return Err(LimitsError::Reversed { part: self.seen.to_owned() });
        }
        if [tolerance.lower, tolerance.upper].into_iter().flatten().any(|limit| limit <= 0.0) {
            let what = if self.dimension == Dimension::Angle { "lattice angle" } else { "pitch" };
            return Err(LimitsError::NotPositive { part: self.seen.to_owned(), what });
        }
        Ok(tolerance)
    }
}

/// Number and unit: the unit is what follows the last digit (no unit has a digit in it), or the first blank where there is no digit.
fn split(text: &str) -> (&str, &str) {
    let text = text.trim();
    match text.rfind(|c: char| c.is_ascii_digit() || c == '.') {
        Some(at) => (text[..=at].trim(), text[at + 1..].trim()),
        None => text.split_once(' ').unwrap_or((text, "")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn one(text: &str) -> (f64, f64) {
        let limits = Limits::parse(text).unwrap_or_else(|error| panic!("{text}: {error}"));
        assert_eq!(limits.parts.len(), 1, "{text}");
        let tolerance = limits.parts[0].1;
        (tolerance.lower.unwrap_or(0.0) * 1e6, tolerance.upper.unwrap_or(0.0) * 1e6)
    }

    #[test]
    fn every_form_gives_its_limits() {
        let cases = [
            ("20.00 ± 0.05 um", 19.95, 20.05),
            ("20.00±0.05µm", 19.95, 20.05),
            ("20.00 +/- 0.05 um", 19.95, 20.05),
            ("pitch: 20 um +- 50 nm", 19.95, 20.05),
            ("20 um ± 0.25 %", 19.95, 20.05),
            ("20 um +0.05 -0.02 um", 19.98, 20.05),
            ("20 +0.05/-0.02 um", 19.98, 20.05),
            ("20 um +0 -20 nm", 19.98, 20.0),
            ("19.95 .. 20.05 um", 19.95, 20.05),
            ("19950 nm..20.05 um", 19.95, 20.05),
            ("2e1 ± 5e-2 um", 19.95, 20.05),
            ("<= 20.05 um", 0.0, 20.05),
            ("≤20.05 um", 0.0, 20.05),
            (">= 19.95 um;", 19.95, 0.0),
            ("  20.00 \u{b1} 0.05 \u{3bc}m ", 19.95, 20.05),
        ];
        for (text, lower, upper) in cases {
            let got = one(text);
            assert!((got.0 - lower).abs() < 1e-9 && (got.1 - upper).abs() < 1e-9, "{text}: {got:?}");
        }
    }

    #[test]
    fn subjects_are_told_apart() {
        let limits = Limits::parse("Pitch 1: <= 20 um; pitch 2: >= 3 um; Lattice angle: 90 ± 0.2 °").unwrap();
        let subjects: Vec<Subject> = limits.parts.iter().map(|part| part.0).collect();
        let wanted = [Characteristic::Pitch(0), Characteristic::Pitch(1), Characteristic::LatticeAngle].map(Subject::One);
        assert_eq!(subjects, wanted);
        let upper = limits.parts[2].1.upper.unwrap();
        assert!((upper - 90.2f64.to_radians()).abs() < 1e-12, "{upper}");
    }

    #[test]
    fn each_mistake_is_told_with_the_way_out() {
        let cases = [
            ("", "20.00 ± 0.05 um"),
            ("20 ± 0.05 um;; angle: 90 ± 1 deg", "between two semicolons"),
            ("pitch 1:", "after a colon"),
            ("20.00 ± 0.05", "has no unit"),
            ("20,00 ± 0,05 um", "decimal point"),
            ("20.00(5) um", "without brackets"),
            ("20.00 ± 0.05 um (k=2)", "without brackets"),
            ("20.00 um", "value without limits"),
            ("< 20 um", "<="),
            ("20.05 .. 19.95 um", "smaller one"),
            ("20 ± 0 um", "greater than zero"),
            ("20 ± -1 um", "greater than zero"),
            ("1 ± 2 um", "no pitch has"),
            ("width: 20 ± 1 um", "pitch 2 or angle"),
            ("pitch 3: 20 ± 1 um", "pitch 2 or angle"),
            ("20 ± 1 um; pitch 2: 20 ± 2 um", "twice"),
            ("angle: 90 ± 0.2 um", "unit of length"),
            ("20 ± 0.05 micron", "um"),
            ("abc", "no number"),
            ("± 0.05 um", "no number"),
            ("nan ± 1 um", "no number"),
            ("20 ± inf um", "no number"),
        ];
        for (text, wanted) in cases {
            let error = Limits::parse(text).expect_err(text).to_string();
            assert!(error.contains(wanted), "{text}: {error}");
        }
    }

    proptest! {
        #[test]
        fn any_text_is_read_or_refused(text in "\\PC{0,40}") {
            let _ = Limits::parse(&text);
        }

        #[test]
        fn any_text_of_its_own_signs_is_read_or_refused(text in "[-+±0-9. umdeg<>=≤≥;:,()%e/]{0,24}") {
            if let Ok(limits) = Limits::parse(&text) {
                for (_, tolerance) in limits.parts {
                    prop_assert!(tolerance.lower.is_some() || tolerance.upper.is_some());
                    prop_assert!(tolerance.width().is_none_or(|width| width > 0.0));
                }
            }
        }
    }
}
