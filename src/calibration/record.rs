//! What a calibration holds, as plain data in SI units.

use nalgebra::DMatrix;

/// A saved posterior with what it was made from.
#[derive(Debug, Clone, PartialEq)]
pub struct Calibration {
    /// Of a whole bench, or of a camera alone.
    pub kind: Kind,
    /// What it was made from, when, by which version.
    pub made_from: MadeFrom,
    /// The camera that it belongs to.
    pub taken_with: TakenWith,
    /// Rotation from print axes to camera axes before the camera's small turn, row by row; `None` for a camera alone.
    pub camera_reference: Option<[[f64; 3]; 3]>,
    /// Mean and covariance.
    pub posterior: Posterior,
}

/// What was calibrated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Throw, screen, laser, lens and where the camera stands.
    Bench,
    /// Focal length, principal point and distortion.
    Camera,
}

/// What a calibration was made from.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct MadeFrom {
    /// Version of the program.
    pub program: String,
    /// When, UTC, RFC 3339.
    pub date: String,
    /// SHA-256 of the bench file's text; empty for a camera alone.
    pub bench_sha256: String,
    /// Every photo.
    pub photos: Vec<MadePhoto>,
    /// What was known of the references.
    pub certificates: Vec<Certificate>,
    /// SHA-256 of each section of the bench file that the calibration stands for, so that a changed statement is noticed.
    pub sections: Vec<(String, String)>,
    /// Root mean square distance of what was seen (spots of a bench, dots of a camera) from the model, px.
    pub rms_px: f64,
}

/// A photo that a calibration was made from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct MadePhoto {
    /// Name as the user wrote it.
    pub file: String,
    /// SHA-256 of the file.
    pub sha256: String,
    /// What it shows.
    pub shows: Shows,
}

/// What a photo shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shows {
    /// The laser's pattern.
    Pattern,
    /// The printed dots.
    Target,
}

/// A length that was taken as known, in words of a certificate: the pitch of a reference, the pitch of the dot target.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Certificate {
    /// Name of the sample, or "target".
    pub of: String,
    /// The length with its uncertainty, e.g. "2.0000(5) um".
    pub pitch: String,
}

/// The camera as its photos describe it.
#[derive(Debug, Clone, PartialEq)]
pub struct TakenWith {
    /// Width and height of the photos as displayed, px.
    pub size_px: [usize; 2],
    /// Name of the camera, where EXIF tells.
    pub camera: Option<String>,
    /// Focal length by EXIF, m.
    pub focal_length_m: Option<f64>,
    /// Focal length by EXIF as the equivalent on 35 mm film, m.
    pub focal_length_35mm_m: Option<f64>,
}

/// Mean and full covariance of some parameters.
#[derive(Debug, Clone, PartialEq)]
pub struct Posterior {
    /// Parameters with mean and standard uncertainty; u = 0 for what is known exactly.
    pub values: Vec<UncertainValue>,
    /// Correlation of those with u > 0, in the same order.
    pub correlation: DMatrix<f64>,
}

/// One parameter of a [`Posterior`].
#[derive(Debug, Clone, PartialEq)]
pub struct UncertainValue {
    /// Name as in reports, e.g. "throw".
    pub name: String,
    /// Unit in which it is written: "mm", "nm", "deg", "px" or "1".
    pub unit: String,
    /// Mean, SI (or px).
    pub value: f64,
    /// Standard uncertainty, SI (or px).
    pub u: f64,
}

impl Posterior {
    /// The value of that name.
    #[must_use]
    pub fn named(&self, name: &str) -> Option<&UncertainValue> {
        self.values.iter().find(|value| value.name == name)
    }
}
