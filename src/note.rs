//! What a reader of a result must know: one table of notes, each with a code, a sentence with its
//! numbers, and advice.

/// One remark on a result that exists but needs care.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Note {
    // photo
    /// The photo is stored with a tone curve that is only known roughly.
    ToneCurveAssumed,
    // spots
    // lattice
    // target
    /// Dots of the target that did not fit among their neighbours.
    TargetDotsLeftOut {
        /// Dots left out.
        left_out: usize,
        /// Dots used.
        kept: usize,
    },
    /// One of the three larger dots was not seen.
    TargetMarkHidden {
        /// Its place on the print, pitches.
        index: (i32, i32),
    },
    // bench
    // fit
}

impl Note {
    /// Short machine-readable name, stable between versions.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::ToneCurveAssumed => "tone-curve-assumed",
            Self::TargetDotsLeftOut { .. } => "target-dots-left-out",
            Self::TargetMarkHidden { .. } => "target-mark-hidden",
        }
    }
}

impl std::fmt::Display for Note {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::ToneCurveAssumed => f.write_str(
                "8-bit photo without a colour profile: the sRGB curve was undone; brightness is approximate, places are not affected",
            ),
            Self::TargetDotsLeftOut { left_out, kept } => write!(
                f,
                "{left_out} dots of the target lie off their neighbours' trend and were left out, {kept} are used; \
                 look for glare, laser light, dirt or a crease on them"
            ),
            Self::TargetMarkHidden { index: (i, j) } => write!(
                f,
                "the larger dot at ({i},{j}) of the target was not seen; the other two and their neighbours fix the orientation, \
                 but uncover it if you can"
            ),
        }
    }
}
