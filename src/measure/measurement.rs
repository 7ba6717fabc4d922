//! The result as plain data: what the reports format and the record keeps. SI units throughout.

use super::trials::Trials;
use crate::{
    Note,
    bench::Mode,
    budget::{BudgetLine, Value},
    frames::{PixelCovariance, PixelPoint},
    lattice::LatticeKind,
    photo::Exif,
};

/// Everything that one measurement found.
#[derive(Debug, Clone, PartialEq)]
pub struct Measurement {
    /// The sample that was to be measured.
    pub sample: SampleResult,
    /// The other samples of a series (references), in the order of the bench file.
    pub other_samples: Vec<SampleResult>,
    /// The zero order in the first photo of the sample.
    pub zero_order: ZeroOrder,
    /// Every spot that carries an order, used or not.
    pub orders: Vec<OrderRow>,
    /// Spots that belong to no order, each with its reason.
    pub rejected: Vec<RejectedSpot>,
    /// All unknowns, before and after.
    pub parameters: Vec<ParameterRow>,
    /// How well model and photo agree.
    pub fit: FitSummary,
    /// The photos of the pattern.
    pub photos: Vec<PhotoSummary>,
    /// Transmission or reflection.
    pub mode: Mode,
    /// The same by Monte Carlo, where it was asked for.
    pub trials: Option<Trials>,
    /// The diffraction of the sample in reciprocal space.
    pub reciprocal: ReciprocalView,
    /// What a reader of the result must know.
    pub notes: Vec<Note>,
}

/// The sample's reciprocal lattice and what of it can reach the screen, in the plane of the sample as seen by someone who looks along the beam
/// (first component to the right, second up).
///
/// The order with reciprocal-lattice vector g propagates where `|z_t + λ g| < 1`: inside a circle of radius 1/λ about `-z_t/λ`, the Ewald limit.
#[derive(Debug, Clone, PartialEq)]
pub struct ReciprocalView {
    /// Wavelength at the sample in the first photo of the sample, m.
    pub wavelength_m: f64,
    /// z_t: part of the zero order in the plane of the sample, direction cosines.
    pub zero_order: [f64; 2],
    /// The vectors that belong to the orders (1,0) and (0,1) (line: only the first), cycles per metre.
    pub vectors_per_m: Vec<[f64; 2]>,
}

/// What was found of one sample.
#[derive(Debug, Clone, PartialEq)]
pub struct SampleResult {
    /// Name in the bench file ("" when unnamed).
    pub name: String,
    /// The pitch of a line grating, or the lengths of the two shortest lattice vectors, shortest first, m.
    pub pitch_m: Vec<Value>,
    /// Angle between the two vectors, 90°..120°, rad; `None` for a line grating.
    pub lattice_angle_rad: Option<Value>,
    /// First lattice vector (line: grating vector) against the X of the target (without target: of the photo), counter-clockwise for the viewer, rad.
    pub orientation_rad: Value,
    /// Distance of neighbouring rows, 1/|g|, of the two families of rows along the lattice vectors, m; for a line grating the pitch.
    pub row_spacing_m: Vec<Value>,
    /// Area of the primitive cell, m²; `None` for a line grating.
    pub cell_area_m2: Option<Value>,
    /// Kind of plane lattice, as a statistical statement; `None` for a line grating.
    pub kind: Option<KindStatement>,
    /// One line per source, largest first.
    pub budget: Vec<BudgetLine>,
}

/// A lattice kind and how well the data support it.
#[derive(Debug, Clone, PartialEq)]
pub struct KindStatement {
    /// The most symmetric kind that the data do not contradict.
    pub kind: LatticeKind,
    /// Probability of a deviation at least as large as the one seen if the lattice were exactly of this kind (1 for oblique).
    pub p_value: f64,
    /// A sentence for the report.
    pub sentence: String,
}

/// The zero order in a photo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ZeroOrder {
    /// Predicted by the fit.
    pub at: PixelPoint,
    /// Whether a spot was seen there.
    pub seen: bool,
}

/// A spot with its order.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OrderRow {
    /// Index of the photo.
    pub photo: usize,
    /// First index.
    pub h: i32,
    /// Second index; 0 for a line grating.
    pub k: i32,
    /// Centroid.
    pub at: PixelPoint,
    /// Covariance of the centroid as used in the fit (Birge factor included), px².
    pub covariance: PixelCovariance,
    /// Seen minus predicted, px.
    pub residual_px: [f64; 2],
    /// Whether the spot took part in the final fit.
    pub used: bool,
    /// Whether its core is clipped.
    pub clipped: bool,
}

/// A spot without an order.
#[derive(Debug, Clone, PartialEq)]
pub struct RejectedSpot {
    /// Index of the photo.
    pub photo: usize,
    /// Centroid.
    pub at: PixelPoint,
    /// Why it has no order.
    pub reason: String,
    /// How far off, where that can be said; empty otherwise.
    pub detail: String,
}

/// An unknown before and after the fit.
#[derive(Debug, Clone, PartialEq)]
pub struct ParameterRow {
    /// Name for reports, e.g. "throw".
    pub name: String,
    /// What it measures; decides the unit in reports.
    pub unit: ParameterUnit,
    /// What was known beforehand (value, u), if anything.
    pub prior: Option<(f64, f64)>,
    /// Value after the fit, SI (or px).
    pub value: f64,
    /// Standard uncertainty after the fit; 0 for an exactly known value.
    pub u: f64,
}

/// What a parameter measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ParameterUnit {
    /// m, shown as mm.
    Length,
    /// m, shown as nm.
    Wavelength,
    /// rad, shown as degrees.
    Angle,
    /// 1/m, shown as lines per mm.
    LineDensity,
    /// px.
    Pixel,
    /// A plain number.
    Number,
}

/// How well model and photo agree.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FitSummary {
    /// Reduced chi-square of the spots with their stated centroid uncertainties, before any Birge scaling.
    pub chi2_reduced: f64,
    /// Degrees of freedom that the spots leave over.
    pub degrees_of_freedom: f64,
    /// Root mean square distance of used spots from their predictions, px.
    pub rms_px: f64,
    /// Factor applied to the centroid uncertainties (1 when they were honest).
    pub birge_factor: f64,
    /// Spots used.
    pub spots_used: usize,
    /// Target dots or marks used.
    pub dots_used: usize,
}

/// A photo of the pattern, for the report.
#[derive(Debug, Clone, PartialEq)]
pub struct PhotoSummary {
    /// Name as the user gave it.
    pub file: String,
    /// Width and height as displayed, px.
    pub size_px: [usize; 2],
    /// Camera data.
    pub exif: Exif,
    /// Spots found.
    pub spots: usize,
    /// Directions of the two lattice axes in the photo at the zero order: pixel of the orders (1,0) and (0,1) (line: only the first).
    pub axes_px: Vec<PixelPoint>,
}
