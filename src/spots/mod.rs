//! In: a [`Photo`](crate::photo::Photo). Out: every spot of laser light in it, each with a centroid and an honest 2×2 covariance.
//! Must never know: lattices, screens, the bench.
//! Start reading at [`Spot`].

use crate::frames::{PixelCovariance, PixelPoint};

/// One candidate spot. Nothing is thrown away before the lattice is known.
#[derive(Debug, Clone, PartialEq)]
pub struct Spot {
    /// Centre of the fitted profile.
    pub at: PixelPoint,
    /// Covariance of `at`, px²; includes what speckle does to the profile.
    pub covariance: PixelCovariance,
    /// Second moments of the fitted profile (its shape), px²: sigma_x², sigma_xy, sigma_y².
    pub shape: PixelCovariance,
    /// Height of the profile above background, linear light of the laser's main channel (may exceed 1 for clipped spots).
    pub peak: f64,
    /// Background below the spot, linear light.
    pub background: f64,
    /// Height over the noise of the matched filter.
    pub signal_to_noise: f64,
    /// Number of clipped pixels in the spot.
    pub clipped_px: usize,
    /// The profile reaches the edge of the photo.
    pub cut_by_frame: bool,
    /// Reduced chi-square of the profile fit.
    pub profile_chi2: f64,
}

/// All spots of a photo.
#[derive(Debug, Clone, PartialEq)]
pub struct Spots {
    /// Brightest first.
    pub spots: Vec<Spot>,
    /// Share of the laser's light in red, green and blue (sums to 1; all 0 for a grey photo).
    pub colour: [f64; 3],
    /// What a reader of the result must know.
    pub notes: Vec<crate::Note>,
}

/// Why a photo gives no spots.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum SpotError {}
