//! In: text such as `20.00 ± 0.05 um`, a decision rule, and a [`SampleResult`](crate::measure::SampleResult). Out: inside, outside or undecided, and
//! how likely the true value conforms. Must never know: how the value was measured, how a verdict is shown.
//! Start reading at [`Limits::parse`], then [`judge()`].

mod error;
mod judge;
mod parse;
mod probability;
mod rule;

pub use error::LimitsError;
pub use judge::{Judgement, Outcome, Verdict, judge};
pub use probability::conformance_probability;
pub use rule::{CAPABLE, Rule};

/// What limits are set on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Characteristic {
    /// One pitch by its index, shortest first.
    Pitch(usize),
    /// The lattice angle.
    LatticeAngle,
}

/// The values that are allowed, SI; at least one end is there, and the upper one lies above the lower one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Smallest allowed value.
    pub lower: Option<f64>,
    /// Largest allowed value.
    pub upper: Option<f64>,
}

/// What one part of the text speaks of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Subject {
    /// Every pitch of the sample.
    EveryPitch,
    /// One of them.
    One(Characteristic),
}

/// Limits as stated, SI.
///
/// ```
/// use spotrule::limits::Limits;
/// assert!(Limits::parse("pitch 1: 20.00 ± 0.05 um; pitch 2: <= 20.1 um; angle: 90.0 ± 0.2 deg").is_ok());
/// let error = Limits::parse("20.00(5) um").unwrap_err();
/// assert!(error.to_string().contains("±"));
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct Limits {
    /// The text, for reports.
    text: String,
    parts: Vec<(Subject, Tolerance)>,
}

impl Limits {
    /// The limits as they were written.
    #[must_use]
    pub fn text(&self) -> &str {
        &self.text
    }
}

impl Characteristic {
    /// "pitch" alone, "pitch 1" of several, "lattice angle".
    #[must_use]
    pub fn name(self, pitches: usize) -> String {
        match self {
            Self::Pitch(_) if pitches < 2 => "pitch".to_owned(),
            Self::Pitch(index) => format!("pitch {}", index + 1),
            Self::LatticeAngle => "lattice angle".to_owned(),
        }
    }
}

impl Tolerance {
    /// Distance between the limits; `None` when one-sided.
    #[must_use]
    pub fn width(&self) -> Option<f64> {
        Some(self.upper? - self.lower?)
    }

    /// Whether `value` is allowed; the limits themselves are.
    #[must_use]
    pub fn holds(&self, value: f64) -> bool {
        self.lower.is_none_or(|lower| value >= lower) && self.upper.is_none_or(|upper| value <= upper)
    }

    /// Both limits drawn inwards by `band` (outwards when negative). A two-sided tolerance narrower than two bands turns over: it holds nothing.
    #[must_use]
    pub fn inset(&self, band: f64) -> Self {
        Self { lower: self.lower.map(|lower| lower + band), upper: self.upper.map(|upper| upper - band) }
    }
}
