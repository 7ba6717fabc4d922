//! Why a text sets no limits, or sets them on something that was not measured.

/// Why limits cannot be used. `part` is the part of the text between two semicolons.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LimitsError {
    /// No text, or nothing between two semicolons.
    #[error("limits: nothing stands {place}; write for example \"20.00 ± 0.05 um\" or \"<= 20.05 um\"")]
    Empty {
        /// Where.
        place: &'static str,
    },
    /// A subject that is none.
    #[error("limits: \"{subject}\" is nothing that can be limited; write pitch, pitch 1, pitch 2 or angle before the colon")]
    Subject {
        /// As written.
        subject: String,
    },
    /// The same thing limited twice.
    #[error("limits: {what} is limited twice; state both limits together, for example \"{what}: 19.95 .. 20.05 um\"")]
    Twice {
        /// What.
        what: String,
    },
    /// A comma.
    #[error(
        "limits: \"{part}\" has a comma, which means decimals here and thousands there; write a decimal point, and a semicolon between limits"
    )]
    Comma {
        /// As written.
        part: String,
    },
    /// A number that is none, or a number without the rest.
    #[error(
        "limits: \"{part}\": \"{found}\" is no number with a unit; write for example \"20.00 ± 0.05 um\", \"19.95 .. 20.05 um\" or \"<= 20.05 um\""
    )]
    Number {
        /// As written.
        part: String,
        /// What stands where a number should.
        found: String,
    },
    /// No unit anywhere.
    #[error("limits: \"{part}\" has no unit; write for example \"{part} {unit}\"")]
    NoUnit {
        /// As written.
        part: String,
        /// A unit that would fit.
        unit: &'static str,
    },
    /// A unit that is not known or does not fit.
    #[error("limits: \"{part}\": {why}")]
    Unit {
        /// As written.
        part: String,
        /// Why, and which units are known.
        why: String,
    },
    /// A single value.
    #[error("limits: \"{part}\" is a value without limits; write \"{part} ± ...\" with the tolerance, or <= or >= before it")]
    Bare {
        /// As written.
        part: String,
    },
    /// An uncertainty instead of a tolerance.
    #[error("limits: \"{part}\" states an uncertainty; limits have none: write the tolerance behind ±, without brackets")]
    Uncertainty {
        /// As written.
        part: String,
    },
    /// Strictly less or greater.
    #[error("limits: \"{part}\": a limit itself is allowed; write {instead} instead of {sign}")]
    Strict {
        /// As written.
        part: String,
        /// As written.
        sign: char,
        /// What to write.
        instead: &'static str,
    },
    /// Limits in the wrong order, or none between them.
    #[error("limits: \"{part}\" leaves nothing between the limits; the first must be the smaller one, and a tolerance greater than zero")]
    Reversed {
        /// As written.
        part: String,
    },
    /// A pitch or an angle of a lattice is positive.
    #[error(
        "limits: \"{part}\" allows values that no {what} has; a limit of a {what} is greater than zero (one-sided: write <= and the upper limit alone)"
    )]
    NotPositive {
        /// As written.
        part: String,
        /// "pitch" or "lattice angle".
        what: &'static str,
    },
    /// Limits on something that the sample does not have.
    #[error("limits: {what} is limited, but the sample is a {sample}; limit {instead}, or state [sample] pattern if that is wrong")]
    Absent {
        /// What is limited.
        what: String,
        /// What was found.
        sample: &'static str,
        /// What can be limited.
        instead: &'static str,
    },
    /// A rule that is none.
    #[error("\"{seen}\" is no decision rule; write {known}")]
    UnknownRule {
        /// As written.
        seen: String,
        /// The rules.
        known: String,
    },
}
