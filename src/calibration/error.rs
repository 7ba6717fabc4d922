//! Why a calibration cannot be used: each reason names what was seen and what to do.

/// Why a calibration cannot be read, or does not belong to a photo or bench file.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum CalibrationError {
    /// The table has not the form of a calibration.
    #[error("[calibration]{}: {reason}; write it anew with spotrule calibrate", line.map(|line| format!(" (line {line})")).unwrap_or_default())]
    Form {
        /// Line of the file, from 1.
        line: Option<usize>,
        /// What is wrong, with the value seen.
        reason: String,
    },
    /// The format of another version.
    #[error("[calibration] has the format \"{seen}\", this version reads \"{known}\"; write it anew with spotrule calibrate")]
    Format {
        /// As written.
        seen: String,
        /// What is read.
        known: &'static str,
    },
    /// The text is not what the program wrote.
    #[error(
        "[calibration] was changed after it was written (its content has the checksum {found}…, the file says {stated}…); it stands for a measurement and cannot be edited: write it anew with spotrule calibrate"
    )]
    Edited {
        /// First digits of the checksum of the content.
        found: String,
        /// First digits of the checksum in the file.
        stated: String,
    },
    /// A camera's calibration where a bench's is needed, or the other way round.
    #[error("this is the calibration of {seen}, but {needed} is needed here{advice}")]
    WrongKind {
        /// "a camera".
        seen: &'static str,
        /// "that of a bench".
        needed: &'static str,
        /// What to do.
        advice: &'static str,
    },
    /// No calibration in the file.
    #[error("there is no [calibration] in it; write one with spotrule calibrate camera")]
    Absent,
    /// A section of the bench file differs from what was calibrated.
    #[error(
        "[{section}] is not what it was when the bench was calibrated; the calibration replaces it, so a change there would have no effect: undo it, or calibrate again from the changed bench file"
    )]
    SectionChanged {
        /// The section.
        section: String,
    },
    /// A photo of another size.
    #[error(
        "the photo has {}x{} px, the calibration was made with {}x{} px: it holds for one camera setting and for uncropped, unscaled photos only; take the photo with that setting, or calibrate again",
        photo[0], photo[1], calibrated[0], calibrated[1]
    )]
    OtherSize {
        /// Width and height of the photo.
        photo: [usize; 2],
        /// Width and height calibrated.
        calibrated: [usize; 2],
    },
    /// A photo of another camera or zoom.
    #[error(
        "the photo's EXIF data say {what} {photo}, the calibration was made with {calibrated}: it holds for one camera setting only; calibrate again"
    )]
    OtherCamera {
        /// "focal length" or "camera".
        what: &'static str,
        /// As the photo says.
        photo: String,
        /// As calibrated.
        calibrated: String,
    },
    /// A photo that the calibration was made from.
    #[error(
        "this photo is one of those that the calibration was made from; measured again with it, the same evidence would count twice: measure it with the bench file that has no [calibration]"
    )]
    SamePhoto,
    /// The camera was moved.
    #[error("a calibration fixes where the camera stands, but {what} a target photo of its own: take it out, or calibrate again")]
    CameraMoved {
        /// Which photo.
        what: String,
    },
    /// A parameter that the bench does not have.
    #[error("[calibration] holds \"{name}\", which this bench does not have{advice}")]
    UnknownParameter {
        /// Its name.
        name: String,
        /// What to do.
        advice: &'static str,
    },
    /// A parameter that is needed is not there.
    #[error("[calibration] lacks \"{name}\"; write it anew with spotrule calibrate")]
    MissingParameter {
        /// Its name.
        name: String,
    },
    /// The photos were taken from several places.
    #[error(
        "the photos show {views} camera positions, but a calibration keeps one: calibrate from photos of one position, with one target photo"
    )]
    SeveralViews {
        /// Number of positions.
        views: usize,
    },
    /// A bench that is calibrated already.
    #[error(
        "this bench file holds a [calibration] already; calibrate from the bench file that it was made from, or take [calibration] out"
    )]
    Already,
    /// Too few views of the target.
    #[error(
        "{found} views of the dot target; a camera needs at least {needed}, better 6 to 15, most of them 20 to 40 degrees oblique from different sides"
    )]
    TooFewViews {
        /// Photos given.
        found: usize,
        /// Photos needed.
        needed: usize,
    },
    /// All views look from the same direction.
    #[error(
        "all views look at the print from nearly the same direction (at most {:.1} degrees apart, {:.0} are needed): they cannot tell focal length from distance; photograph it 20 to 40 degrees oblique from different sides",
        spread_rad.to_degrees(), needed_rad.to_degrees()
    )]
    ViewsParallel {
        /// Largest angle between two directions.
        spread_rad: f64,
        /// Least angle.
        needed_rad: f64,
    },
    /// One photo given twice.
    #[error("the photo is given twice ({first} is the same file); the same evidence must not count twice")]
    ViewTwice {
        /// Name of the first.
        first: String,
    },
    /// A view from another camera setting than the first.
    #[error("the photo was taken with another camera setting than {first}: {why}")]
    ViewsDiffer {
        /// Name of the first photo.
        first: String,
        /// Why.
        why: Box<Self>,
    },
    /// The views leave the lens open.
    #[error(
        "the views fix the focal length only to {:.1} % (at most {:.0} % is of use); photograph the print larger in the frame and more obliquely from different sides",
        relative_u * 100.0, most * 100.0
    )]
    LensOpen {
        /// u(f) / f.
        relative_u: f64,
        /// What is accepted.
        most: f64,
    },
    /// The covariance of the fit cannot be saved.
    #[error(
        "photos and bench file leave some combination of throw, screen and camera entirely open, so there is nothing to save; photograph the dot target, or state the throw"
    )]
    Open,
}

impl CalibrationError {
    /// Short machine-readable name of the reason.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::OtherSize { .. } => "calibration-other-size",
            Self::OtherCamera { .. } => "calibration-other-camera",
            Self::Edited { .. } => "calibration-edited",
            Self::SectionChanged { .. } => "calibration-section-changed",
            Self::SamePhoto => "calibration-same-photo",
            Self::CameraMoved { .. } | Self::SeveralViews { .. } => "calibration-camera-moved",
            Self::Open | Self::LensOpen { .. } => "calibration-open",
            Self::TooFewViews { .. } | Self::ViewsParallel { .. } => "calibration-views",
            _ => "calibration",
        }
    }

    /// Whether the input could not be used at all, as opposed to photos that honestly fix nothing.
    #[must_use]
    pub fn is_unusable_input(&self) -> bool {
        !matches!(self, Self::Open | Self::LensOpen { .. } | Self::TooFewViews { .. } | Self::ViewsParallel { .. })
    }
}
