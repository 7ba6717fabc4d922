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
    /// A wavelength is stated in vacuum and the state of the air is not fully stated.
    StandardAirAssumed,
    /// The state of the air is stated but no wavelength needs it.
    AirNotUsed,
    /// A wavelength said to be in air has the number of a laser line in vacuum, or the other way round.
    WavelengthInOtherMedium {
        /// The stated wavelength, m.
        wavelength_m: f64,
        /// Name of the line.
        line: String,
        /// Where the number belongs.
        belongs_to: crate::bench::Medium,
    },
    // fit
}

impl Note {
    /// Short machine-readable name, stable between versions.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::ToneCurveAssumed => "tone-curve-assumed",
            Self::SpotsLeftOut { .. } => "spots-left-out",
            Self::StandardAirAssumed => "standard-air-assumed",
            Self::AirNotUsed => "air-not-used",
            Self::WavelengthInOtherMedium { .. } => "wavelength-in-other-medium",
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
            Self::StandardAirAssumed => f.write_str(
                "wavelength stated in vacuum, air not fully stated: 20(3) degC, 1013(30) hPa, 50(20) % humidity assumed for what is missing; state [air], above all the pressure at more than 300 m above the sea",
            ),
            Self::AirNotUsed => f.write_str("[air] is not used: every wavelength is stated in air; state it in vacuum (medium = \"vacuum\") to use it"),
            Self::WavelengthInOtherMedium { wavelength_m, line, belongs_to } => {
                let place = match belongs_to {
                    crate::bench::Medium::Air => "air",
                    crate::bench::Medium::Vacuum => "vacuum",
                };
                write!(f, "{:.4} nm is the {line} in {place}; state medium = \"{place}\", or the pitch comes out wrong by 0.027 %", wavelength_m * 1e9)
            }
        }
    }
}
