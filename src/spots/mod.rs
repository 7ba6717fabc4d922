//! In: a [`Photo`]. Out: every spot of laser light in it, each with a centroid and an honest 2×2 covariance.
//! Must never know: lattices, screens, the bench.
//! Start reading at [`find`].

mod colour;
mod detect;
mod error;
mod measure;
mod profile;
mod scale;
mod scatter;
mod window;

pub use error::SpotError;

use crate::Note;
use crate::frames::{PixelCovariance, PixelPoint};
use crate::photo::Photo;

/// One candidate spot. Nothing is thrown away before the lattice is known.
#[derive(Debug, Clone, PartialEq)]
pub struct Spot {
    /// Centre of the fitted profile.
    pub at: PixelPoint,
    /// Covariance of `at`, px²; includes what speckle does to the profile.
    pub covariance: PixelCovariance,
    /// Second moments of the fitted profile (its shape), px²: along x, mixed, along y.
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
    pub notes: Vec<Note>,
}

/// What may be chosen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SpotOptions {
    /// Expected number of false spots per photo if its noise were normal.
    pub false_spots: f64,
    /// Most spots that are returned; the brightest stay.
    pub max_spots: usize,
}

impl Default for SpotOptions {
    fn default() -> Self {
        Self { false_spots: 0.1, max_spots: 3000 }
    }
}

/// Dark marks that make it a photo of a printed sheet.
const MANY_MARKS: usize = 30;

/// Finds the laser spots of a photo.
///
/// 1. The channels that carry the laser are found from the spots themselves.
/// 2. A pyramid of planes binned by 2, 4 … 32 px is filtered with a difference of Gaussians: the matched filter of spots from 2 to 60 px
///    across on an uneven background. Local maxima count above a threshold set by `options.false_spots` and the local noise.
/// 3. Each is fitted with an elliptical Gaussian on a sloping background, weighted by the noise of sensor and speckle, neighbours taken
///    off, clipped pixels and their neighbours left out. A clipped spot is also fitted in the weaker channels; the best known centre stays.
///
/// # Errors
/// [`SpotError::NothingFound`] or [`SpotError::NoneFits`] with the brightest thing seen.
pub fn find(photo: &Photo, options: &SpotOptions) -> Result<Spots, SpotError> {
    let linear = photo.linear();
    let half = linear.half_planes();
    let colour = colour::of_spots(&half);
    // On a printed sheet the marks hide the spots beside them until the room light is taken off.
    let laser = half.mixed(colour.weights);
    let noise = laser.halved().noise(16.0);
    let plane = if colour.marks > MANY_MARKS { half.mixed(colour.without_room) } else { laser };
    drop(half);
    let found = detect::detect(&plane, noise, options.false_spots);
    let mut spots = measure::measure(&linear, &colour, noise, &found);
    if spots.is_empty() {
        if let Some(brightest) = found.peaks.first() {
            return Err(SpotError::NoneFits { candidates: found.peaks.len(), x_px: brightest.x_px, y_px: brightest.y_px });
        }
        let best = found.best_reject;
        return Err(SpotError::NothingFound {
            x_px: best.map_or(0.0, |peak| peak.x_px),
            y_px: best.map_or(0.0, |peak| peak.y_px),
            signal_to_noise: best.map_or(0.0, |peak| peak.signal_to_noise),
            needed: found.threshold,
        });
    }
    spots.sort_by(|a, b| b.peak.total_cmp(&a.peak));
    let mut notes = Vec::new();
    if spots.len() > options.max_spots {
        notes.push(Note::SpotsLeftOut { found: spots.len(), kept: options.max_spots });
        spots.truncate(options.max_spots);
    }
    Ok(Spots { spots, colour: colour.share, notes })
}
