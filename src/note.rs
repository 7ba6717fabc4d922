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
    /// Another numbering of the orders explains the spots nearly as well.
    ThinNumbering {
        /// Cell of the other lattice over that of the chosen one.
        cell_ratio: f64,
        /// Lead of the chosen numbering, nats.
        lead: f64,
    },
    /// The numbering hangs on a few spots.
    FewDeciders {
        /// Without them the pitch would be this many times smaller.
        factor: u32,
        /// Their number.
        deciders: usize,
    },
    /// Faint orders stand between strong ones.
    FaintBetween {
        /// The strong ones alone would mean a pitch this many times smaller.
        factor: u32,
        /// Median brightness of the faint ones over the strong ones.
        brightness_ratio: f64,
    },
    /// No spot at the zero order.
    ZeroOrderUnseen,
    /// Another spot could be the zero order.
    ZeroOrderUncertain {
        /// Lead of the chosen one, nats.
        lead: f64,
        /// The other one, in the chosen numbering.
        other: (i32, i32),
    },
    /// So few spots that nothing checks the result.
    FewSpots {
        /// Spots with an order.
        indexed: usize,
    },
    /// The spots left over form a lattice of their own.
    SecondLattice {
        /// Spots on it.
        spots: usize,
    },
    /// Faint copies of the pattern, all shifted alike.
    Ghosts {
        /// Their number.
        spots: usize,
    },
    /// Line and plane are nearly equally likely.
    ShapeUncertain {
        /// Lead of the chosen one, nats.
        lead: f64,
    },
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
    /// The linear propagation of uncertainty is not good enough here.
    NotLinear {
        /// Which value.
        what: String,
        /// Interval of the linear result, with unit.
        linear: String,
        /// Interval by Monte Carlo, with unit.
        trials: String,
    },
    /// The photo and a statement of the bench file do not go together.
    StatementStrained {
        /// What was stated.
        what: String,
        /// As stated, with unit.
        stated: String,
        /// As the photo wants it, with unit.
        found: String,
        /// Distance in stated standard uncertainties.
        pull: f64,
    },
    // calibration
    /// The photo has no EXIF data to check against the calibration's.
    CalibrationUnchecked,
    /// Photo and calibration do not go together.
    CalibrationStrained {
        /// Parameter that is pulled most.
        what: String,
        /// How far, in the calibration's standard uncertainties.
        pull: f64,
        /// Squared residuals of the calibration.
        chi2: f64,
        /// Expected value of `chi2` on a bench that was left alone.
        redundancy: f64,
    },
    /// All spots lie beside their places by the same amount.
    CalibrationShifted {
        /// Mean offset of the spots, px.
        shift_px: [f64; 2],
    },
}

impl Note {
    /// Short machine-readable name, stable between versions.
    #[must_use]
    pub fn code(&self) -> &'static str {
        match self {
            Self::ToneCurveAssumed => "tone-curve-assumed",
            Self::TargetDotsLeftOut { .. } => "target-dots-left-out",
            Self::TargetMarkHidden { .. } => "target-mark-hidden",
            Self::SpotsLeftOut { .. } => "spots-left-out",
            Self::ThinNumbering { .. } => "thin-numbering",
            Self::FewDeciders { .. } => "few-deciders",
            Self::FaintBetween { .. } => "faint-orders-between",
            Self::ZeroOrderUnseen => "zero-order-unseen",
            Self::ZeroOrderUncertain { .. } => "zero-order-uncertain",
            Self::FewSpots { .. } => "few-spots",
            Self::SecondLattice { .. } => "second-lattice",
            Self::Ghosts { .. } => "ghosts",
            Self::ShapeUncertain { .. } => "line-or-plane-uncertain",
            Self::StatementStrained { .. } => "statement-strained",
            Self::CalibrationUnchecked => "calibration-unchecked",
            Self::CalibrationStrained { .. } => "calibration-strained",
            Self::CalibrationShifted { .. } => "calibration-shifted",
            Self::NotLinear { .. } => "not-linear",
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
            Self::SpotsLeftOut { found, kept } => write!(
                f,
                "{found} spots were found and the {kept} brightest are used; a ruled or textured screen gives many false ones: use plain card"
            ),
            Self::ThinNumbering { cell_ratio, lead } => write!(
                f,
                "another numbering explains the spots nearly as well (cell area {cell_ratio:.2} times as large in order space, behind by {lead:.1} nats): compare the pitch with what you expect, expose longer to show weak orders"
            ),
            Self::FewDeciders { factor, deciders } => write!(
                f,
                "without {deciders} spots the orders would share a factor and the pitch would be {factor} times smaller: look at these spots in the overlay, expose longer to show more of them"
            ),
            Self::FaintBetween { factor, brightness_ratio } => write!(
                f,
                "the orders between the strong ones are faint ({:.1} % as bright): the sample repeats after {factor} of its conspicuous periods; if you meant the conspicuous period, divide the pitch by {factor}",
                brightness_ratio * 100.0
            ),
            Self::ZeroOrderUnseen => f.write_str("no spot stands at the zero order (hole, beam stop or out of frame): its place is the one that the other orders point to"),
            Self::ZeroOrderUncertain { lead, other } => write!(
                f,
                "order ({}, {}) could be the zero order instead (behind by {lead:.1} nats): mark the undiffracted beam, or photograph more orders on both sides",
                other.0, other.1
            ),
            Self::FewSpots { indexed } => write!(f, "only {indexed} spots carry an order, so nothing checks the numbering: include more of the pattern"),
            Self::SecondLattice { spots } => write!(
                f,
                "{spots} of the spots left over form a lattice of their own: two superposed samples, or a second laser mode; the result is the stronger lattice"
            ),
            Self::Ghosts { spots } => write!(f, "{spots} faint spots are copies of the pattern, all shifted alike (reflection between two faces): they were left out"),
            Self::ShapeUncertain { lead } => write!(
                f,
                "a single row and a plane lattice are nearly equally likely ({lead:.1} nats apart): state [sample] pattern = \"line\" or \"plane\" if you know"
            ),
            Self::StatementStrained { what, stated, found, pull } => write!(
                f,
                "{what}: stated {stated}, but the photo wants {found}, {:.1} standard uncertainties away: measure it again, or state it with an honest uncertainty",
                pull.abs()
            ),
            Self::CalibrationUnchecked => f.write_str(
                "the photo lacks EXIF data that the calibration's photos have, so only its size was checked: make sure that camera, zoom and focus are the same",
            ),
            Self::CalibrationStrained { what, pull, chi2, redundancy } => write!(
                f,
                "the photo does not go with the calibration (chi-square {chi2:.1} where {redundancy:.1} is expected; {what} is pulled by {:.1} standard uncertainties): something was moved since; calibrate again",
                pull.abs()
            ),
            Self::CalibrationShifted { shift_px: [x, y] } => write!(
                f,
                "all spots lie beside the places that the calibration gives them, by ({x:.2}, {y:.2}) px on average: camera, screen or laser was moved since; calibrate again"
            ),
            Self::NotLinear { what, linear, trials } => write!(
                f,
                "{what}: the interval {linear} takes the model for straight; with every input redrawn it is {trials}: quote the latter"
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
