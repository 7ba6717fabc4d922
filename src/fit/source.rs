//! Who owns a residual: the lines of the uncertainty budget.

/// A source of uncertainty. Each residual row belongs to exactly one, so the shares add up exactly.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Source {
    /// Centroids of the spots.
    Spots,
    /// Wavelength of a laser.
    Wavelength {
        /// Which laser.
        laser: usize,
    },
    /// Throw.
    Throw,
    /// Steps of the screen along the rail.
    Step,
    /// Tilt of the screen.
    ScreenTilt,
    /// Attitude of a sample.
    Incidence {
        /// Which sample.
        sample: usize,
    },
    /// Known pitch of a reference.
    ReferencePitch {
        /// Which sample.
        sample: usize,
    },
    /// Pitch of the printed target.
    TargetPitch,
    /// Turn of the print.
    TargetTurn,
    /// Centroids of the dots.
    Dots,
    /// Places of ruled lines.
    Ruling,
    /// Places of a sheet's edges.
    SheetEdges,
    /// Width and height of a sheet, and how straight its edges are.
    SheetShape,
    /// Pixels of the known marks.
    Marks,
    /// Two points of known distance.
    Scale,
    /// How square-on the camera stands.
    SquareOn,
    /// Focal length.
    FocalLength,
    /// Principal point and lens distortion of an ordinary camera.
    Lens,
    /// Saved posterior of the bench.
    Calibration,
    /// Saved posterior of the lens alone.
    CameraCalibration,
    /// Only fixes an overall scale that the pitch does not depend on.
    Gauge,
}

impl Source {
    /// Name in reports.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Spots => "spots",
            Self::Wavelength { .. } => "wavelength",
            Self::Throw => "throw",
            Self::Step => "screen steps",
            Self::ScreenTilt => "screen tilt",
            Self::Incidence { .. } => "incidence",
            Self::ReferencePitch { .. } => "reference pitch",
            Self::TargetPitch => "target pitch",
            Self::TargetTurn => "target turn",
            Self::Dots => "target dots",
            Self::Ruling => "ruled lines",
            Self::SheetEdges => "sheet edges",
            Self::SheetShape => "sheet shape",
            Self::Marks => "marks",
            Self::Scale => "scale",
            Self::SquareOn => "camera square-on",
            Self::FocalLength => "focal length",
            Self::Lens => "lens",
            Self::Calibration => "calibration",
            Self::CameraCalibration => "camera calibration",
            Self::Gauge => "gauge",
        }
    }
}
