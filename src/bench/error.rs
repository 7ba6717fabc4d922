//! Why a bench file cannot be used: each reason names the place, the value seen, and what to do.

use crate::{calibration::CalibrationError, quantity::QuantityError};

/// Where something stands: a key of the bench file with its line, or a flag of the command line.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// `screen.throw`, or `--throw`.
    pub key: String,
    /// Line of the bench file, from 1; `None` for a flag.
    pub line: Option<usize>,
}

impl std::fmt::Display for Place {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.line {
            Some(line) => write!(f, "{} (line {line})", self.key),
            None => f.write_str(&self.key),
        }
    }
}

/// Why a bench file cannot be used.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum BenchError {
    /// The text is no TOML.
    #[error("line {line} of the bench file cannot be read as TOML ({reason}): {seen}{advice}")]
    Syntax {
        /// Line, from 1.
        line: usize,
        /// What the TOML reader says.
        reason: String,
        /// The line.
        seen: String,
        /// What to do, where the cause is plain.
        advice: &'static str,
    },
    /// Far more text than any bench file has.
    #[error("the bench file has {bytes} bytes, more than {most}; is it a bench file?")]
    TooLong {
        /// Bytes found.
        bytes: usize,
        /// Bytes accepted.
        most: usize,
    },
    /// A key that means nothing.
    #[error("{place}: {} is not known{}", if *is_section { "this section" } else { "this key" }, advice)]
    UnknownKey {
        /// Where.
        place: Place,
        /// Whether it is a section.
        is_section: bool,
        /// The nearest key, and all that are known.
        advice: String,
    },
    /// A list where a text is needed, and the like.
    #[error("{place} is {seen}, but must be {needed}")]
    WrongKind {
        /// Where.
        place: Place,
        /// What stands there.
        seen: String,
        /// What is needed, with an example.
        needed: &'static str,
    },
    /// A text that is no quantity.
    #[error("{place}: {reason}")]
    Quantity {
        /// Where.
        place: Place,
        /// Why.
        #[source]
        reason: Box<QuantityError>,
    },
    /// A word that is none of the choices.
    #[error("{place} = \"{seen}\" is not known; {advice}")]
    UnknownWord {
        /// Where.
        place: Place,
        /// The word.
        seen: String,
        /// The nearest choice, and all of them.
        advice: String,
    },
    /// Something that is needed is not there.
    #[error("{key} is missing: {advice}")]
    Missing {
        /// The key.
        key: String,
        /// What to write.
        advice: String,
    },
    /// A wavelength that no laser for this work has.
    #[error("{place}: {seen} is no wavelength of a laser for this (200 nm to 2 um){advice}")]
    Wavelength {
        /// Where.
        place: Place,
        /// As written.
        seen: String,
        /// What was probably meant.
        advice: String,
    },
    /// A vacuum wavelength where the index of air is not known.
    #[error(
        "{place}: {seen} in vacuum cannot be carried into air: the index is known from 300 nm to 1.7 um; state the wavelength in air (medium = \"air\")"
    )]
    NoIndexOfAir {
        /// Where.
        place: Place,
        /// As written.
        seen: String,
    },
    /// A value outside the range in which it makes sense.
    #[error("{place}: {seen} is no {what} ({range} is accepted); {advice}")]
    OutOfRange {
        /// Where.
        place: Place,
        /// As written.
        seen: String,
        /// What it should be.
        what: &'static str,
        /// The range, in words.
        range: &'static str,
        /// The same number with the unit that was probably meant.
        advice: String,
    },
    /// An uncertainty as large as the value, where the value must be positive.
    #[error("{place}: the uncertainty of {seen} is as large as the value; when it is not known at all, leave it out")]
    NotKnown {
        /// Where.
        place: Place,
        /// As written.
        seen: String,
    },
    /// A photo that names a laser or a sample that does not exist.
    #[error("{place} = \"{seen}\": there is no {kind} of that name; {advice}")]
    UnknownName {
        /// Where.
        place: Place,
        /// The name.
        seen: String,
        /// Laser or sample.
        kind: &'static str,
        /// The nearest name, and all of them.
        advice: String,
    },
    /// A photo that does not say which of several lasers or samples.
    #[error("{place}: there are several {kind}s ({names}); say which one this photo shows: {kind} = \"{first}\"")]
    NameNeeded {
        /// The photo.
        place: Place,
        /// Laser or sample.
        kind: &'static str,
        /// All names.
        names: String,
        /// The first of them.
        first: String,
    },
    /// Several lasers or samples, and no photo listed.
    #[error("there are several {kind}s ({names}) but no [[photo]]: list every photo with the {kind} that belongs to it")]
    PhotosNeeded {
        /// Laser or sample.
        kind: &'static str,
        /// All names.
        names: String,
    },
    /// `[laser]` with keys of its own beside `[laser.NAME]`.
    #[error("{place}: [{section}] has keys of its own beside [{section}.{name}]; give every {section} a name, or keep a single one")]
    MixedNames {
        /// The key.
        place: Place,
        /// Laser or sample.
        section: String,
        /// The named one.
        name: String,
    },
    /// A flag that could mean any of several.
    #[error("{flag}: the bench file has several {section}s ({names}); change the one that is meant in the file")]
    FlagAmbiguous {
        /// The flag.
        flag: &'static str,
        /// Laser or sample.
        section: String,
        /// All names.
        names: String,
    },
    /// Two kinds of target.
    #[error("{place}: a target is given by one of pitch (printed dots), marks, sheet or ruling; {first} is there too, keep one of them")]
    SeveralTargets {
        /// The second.
        place: Place,
        /// The first.
        first: &'static str,
    },
    /// Two keys that exclude each other.
    #[error("{place}: {conflict}")]
    Conflict {
        /// The key to take out.
        place: Place,
        /// Why, and what to do.
        conflict: &'static str,
    },
    /// Too few marks to fix a view, or more than anyone types.
    #[error("{place}: {found} marks; 4 to 1000 are needed, not all on a line")]
    NumberOfMarks {
        /// Where.
        place: Place,
        /// Marks found.
        found: usize,
    },
    /// Marks on a line.
    #[error("{place}: all marks but one at most lie on one line ({in_what}); add marks well off that line")]
    MarksOnALine {
        /// Where.
        place: Place,
        /// In the photo or on the screen.
        in_what: &'static str,
    },
    /// The same mark twice.
    #[error("{place}: marks {} and {} have the same {in_what}; correct or remove one", first + 1, second + 1)]
    MarkTwice {
        /// Where.
        place: Place,
        /// Index of the first.
        first: usize,
        /// Index of the second.
        second: usize,
        /// px or mm.
        in_what: &'static str,
    },
    /// Marks that run the other way round in the photo.
    #[error("{place}: the marks are mirrored; px runs right and DOWN, mm runs right and UP (seen from the front)")]
    MarksMirrored {
        /// Where.
        place: Place,
    },
    /// Marks that no camera can see in this order.
    #[error("{place}: marks {}, {} and {} turn the other way round than the rest; are two marks swapped?", marks[0] + 1, marks[1] + 1, marks[2] + 1)]
    MarksContradict {
        /// Where.
        place: Place,
        /// Indices of three of them.
        marks: [usize; 3],
    },
    /// Two scale points at one place.
    #[error("{place}: the two points are {distance_px:.1} px apart; take points at least {least_px} px apart, the farther the better")]
    ScalePointsCoincide {
        /// Where.
        place: Place,
        /// Their distance.
        distance_px: f64,
        /// Least distance.
        least_px: f64,
    },
    /// A focal length in millimetres without the pixel size.
    #[error(
        "{place}: \"{seen}\": a focal length in {unit} needs the pixel size too: {{ focal = \"4.20(5) mm\", pixel = \"1.40(1) um\" }}; or state it in px"
    )]
    PixelSizeNeeded {
        /// Where.
        place: Place,
        /// As written.
        seen: String,
        /// Its unit.
        unit: String,
    },
    /// The same photo twice.
    #[error("{place} = \"{file}\" is listed twice; the same evidence must not count twice")]
    PhotoTwice {
        /// Where.
        place: Place,
        /// File name.
        file: String,
    },
    /// Every sample's pitch is known.
    #[error("the pitch of every sample is given, so nothing is left to measure; leave out the pitch of the sample to be measured")]
    NothingToMeasure,
    /// The file holds a calibration that cannot be used.
    #[error(transparent)]
    Calibration(#[from] CalibrationError),
    /// No photo shows the sample to be measured.
    #[error("no [[photo]] shows sample \"{name}\", the one to be measured (the first without a known pitch)")]
    NoPhotoOfSample {
        /// Its name.
        name: String,
    },
}
