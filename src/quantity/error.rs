//! Why a text is no quantity: each reason says what was seen and how to write it.

/// Why a text is no quantity. `seen` is the text as written, shortened where it is long.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum QuantityError {
    /// No text at all.
    #[error("the value is empty; write a quantity such as \"{example}\", or leave the key out when nothing is known")]
    Empty {
        /// A quantity of this dimension.
        example: &'static str,
    },
    /// More text than any quantity needs.
    #[error("\"{seen}\" has {length} characters; a quantity such as \"{example}\" needs fewer than {most}")]
    TooLong {
        /// Its beginning.
        seen: String,
        /// Characters found.
        length: usize,
        /// Characters accepted.
        most: usize,
        /// A quantity of this dimension.
        example: &'static str,
    },
    /// A comma, which means decimals in one country and thousands in another.
    #[error("\"{seen}\" has a comma, which means decimals here and thousands there; write a decimal point: \"{suggestion}\"")]
    DecimalComma {
        /// As written.
        seen: String,
        /// With points.
        suggestion: String,
    },
    /// Digits in groups.
    #[error("\"{seen}\" has digits in groups; write them without spaces: \"{suggestion}\"")]
    DigitGroups {
        /// As written.
        seen: String,
        /// Without the spaces.
        suggestion: String,
    },
    /// Nothing that reads as a number where one must stand.
    #[error("\"{seen}\": {place} is no number (found \"{found}\"); write for example \"{example}\"")]
    NotANumber {
        /// As written.
        seen: String,
        /// Which of the numbers.
        place: &'static str,
        /// What stands there.
        found: String,
        /// A quantity of this dimension.
        example: &'static str,
    },
    /// NaN or infinity.
    #[error("\"{seen}\" is not finite; a quantity needs a number such as \"{example}\", or leave the key out when nothing is known")]
    NotFinite {
        /// As written.
        seen: String,
        /// A quantity of this dimension.
        example: &'static str,
    },
    /// Too large or too small for the arithmetic.
    #[error("\"{seen}\": {place} is too large or too small to compute with; check the exponent")]
    OutOfRange {
        /// As written.
        seen: String,
        /// Which of the numbers.
        place: &'static str,
    },
    /// A number without a unit.
    #[error("\"{seen}\" has no unit; write for example \"{suggestion}\" (accepted: {accepted})")]
    MissingUnit {
        /// As written.
        seen: String,
        /// With a unit, and an uncertainty where that was missing too.
        suggestion: String,
        /// Units of this dimension.
        accepted: String,
    },
    /// A unit that is not known.
    #[error("\"{seen}\": unit \"{unit}\" is not known; {advice}")]
    UnknownUnit {
        /// As written.
        seen: String,
        /// The unit as written.
        unit: String,
        /// The nearest unit, or all of them.
        advice: String,
    },
    /// A unit of another dimension.
    #[error("\"{seen}\": {unit} is a unit of {found}, but a {needed} is needed (accepted: {accepted})")]
    WrongDimension {
        /// As written.
        seen: String,
        /// The unit as written.
        unit: String,
        /// What that unit measures.
        found: &'static str,
        /// What is needed.
        needed: &'static str,
        /// Units of the dimension that is needed.
        accepted: String,
    },
    /// A value without uncertainty.
    #[error(
        "{seen}: how sure? {suggestion} means u = {u}; or state ± with (k=1), (k=2) or (limits); (exact) says that there is no doubt; leave it out when it is not known at all"
    )]
    MissingUncertainty {
        /// As written.
        seen: String,
        /// With an uncertainty of one in the last digit.
        suggestion: String,
        /// That uncertainty.
        u: String,
    },
    /// ± without saying what it means.
    #[error(
        "\"{seen}\": what does ± mean? Write \"{bare} (k=1)\" for a standard uncertainty, \"{bare} (k=2)\" for an expanded one (about 95 %), or \"{bare} (limits)\" for limits that are surely not exceeded"
    )]
    BareTolerance {
        /// As written.
        seen: String,
        /// The text to which the choice is added.
        bare: String,
    },
    /// Uncertainty zero.
    #[error("\"{seen}\": an uncertainty of zero; write \"{suggestion}\" if there is truly no doubt, or a small uncertainty")]
    ZeroUncertainty {
        /// As written.
        seen: String,
        /// The same value marked exact.
        suggestion: String,
    },
    /// Uncertainty below zero.
    #[error("\"{seen}\": an uncertainty cannot be negative; write it without the minus sign")]
    NegativeUncertainty {
        /// As written.
        seen: String,
    },
    /// A coverage factor that is none.
    #[error("\"{seen}\": the coverage factor must be a positive number such as (k=1) or (k=2), found k = {k}")]
    CoverageFactor {
        /// As written.
        seen: String,
        /// As written.
        k: String,
    },
    /// Words in brackets that are not known.
    #[error("\"{seen}\": ({word}) is not known; use (k=1), (k=2), (limits) or (exact)")]
    UnknownQualifier {
        /// As written.
        seen: String,
        /// The words.
        word: String,
    },
    /// Two statements that exclude each other.
    #[error("\"{seen}\" says two things: {conflict}")]
    Contradiction {
        /// As written.
        seen: String,
        /// Which, and how to choose.
        conflict: &'static str,
    },
}
