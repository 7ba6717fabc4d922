//! Decision rules by name.

use super::LimitsError;

/// Smallest capability index `C_m = T / (4 u)` at which risk can be shared: the tolerance is four times the span of ±U (k = 2).
///
/// Common practice: the ratio 4 to 1 of tolerance to expanded uncertainty.
pub const CAPABLE: f64 = 4.0;

/// How a measured value and its uncertainty decide.
///
/// Source: `[JCGM106]` clauses 7 and 8 (wording from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Rule {
    /// Simple acceptance: the measured value alone decides, there is no "undecided". At a limit every second verdict is wrong.
    /// `[JCGM106]` 8.2.
    Simple,
    /// Guard band w = U on either side of each limit: inside only where the whole interval value ± U is allowed, outside only where none of
    /// it is, else undecided. `[JCGM106]` 8.3; ISO 14253-1 decides in this way (its 2017 edition with a narrower band of 1.65 u by default).
    #[default]
    Guarded,
    /// Shared risk: as simple acceptance, but only where the measurement is capable, `C_m = T / (4 u) >=` [`CAPABLE`]; else undecided.
    /// A one-sided limit has no `C_m` and is decided as in simple acceptance. `[JCGM106]` 7.6.3 and 8.2.
    Shared,
}

impl Rule {
    /// All rules, the default first.
    pub const ALL: [Self; 3] = [Self::Guarded, Self::Simple, Self::Shared];

    /// The name by which it is asked for and reported.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Simple => "simple",
            Self::Guarded => "guarded",
            Self::Shared => "shared",
        }
    }

    /// The rule of this name.
    ///
    /// # Errors
    /// When there is none; the message names them all.
    pub fn named(name: &str) -> Result<Self, LimitsError> {
        let known = || Self::ALL.map(Self::name).join(", ");
        Self::ALL
            .into_iter()
            .find(|rule| rule.name() == name)
            .ok_or_else(|| LimitsError::UnknownRule { seen: name.to_owned(), known: known() })
    }

    /// What the rule does, in a sentence for a report.
    #[must_use]
    pub fn sentence(self) -> &'static str {
        match self {
            Self::Simple => {
                "Simple acceptance (JCGM 106, 8.2): the measured value alone decides; near a limit up to one verdict in two is wrong."
            }
            Self::Guarded => {
                "Guard band w = U (JCGM 106, 8.3; in the manner of ISO 14253-1): inside only if value - U to value + U lies wholly within the limits, \
                 outside only if it lies wholly beyond one of them, else undecided."
            }
            Self::Shared => {
                "Shared risk (JCGM 106, 8.2): the measured value decides, provided that the tolerance is at least four times the span of the \
                 uncertainty (T / (4 u) >= 4), else undecided; a one-sided limit is decided by the value alone."
            }
        }
    }
}
