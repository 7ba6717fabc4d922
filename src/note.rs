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
    /// More spots than are returned.
    SpotsLeftOut {
        /// Number found.
        found: usize,
        /// Number returned, the brightest.
        kept: usize,
    },
    // lattice
    // target
    // bench
    // fit
}

impl Note {
    /// Short machine-readable name, stable between versions.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::ToneCurveAssumed => "tone-curve-assumed",
            Self::SpotsLeftOut { .. } => "spots-left-out",
        }
    }
}

impl std::fmt::Display for Note {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::ToneCurveAssumed => f.write_str(
                "8-bit photo without a colour profile: the sRGB curve was undone; brightness is approximate, places are not affected",
            ),
            Self::SpotsLeftOut { found, kept } => write!(
                f,
                "{found} spots were found and the {kept} brightest are used; a ruled or textured screen gives many false ones: use plain card"
            ),
        }
    }
}
