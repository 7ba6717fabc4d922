//! Looks at every photo: decoded, spots found, target read. The heavy part; photos are worked on side by side.

use super::Refusal;
use crate::{
    Error,
    bench::{Bench, TargetKind},
    photo::{self, Exif, Photo},
    spots::{self, Spots},
    target::{self, Reading},
};
use rayon::prelude::*;

/// The bytes of a photo under the name that the bench file or the command line gives it.
#[derive(Debug, Clone, Copy)]
pub struct PhotoFile<'a> {
    /// Name as the user wrote it.
    pub name: &'a str,
    /// Content of the file.
    pub bytes: &'a [u8],
}

/// All photos of a measurement.
#[derive(Debug, Clone, Default)]
pub struct Inputs<'a> {
    /// Photos of the pattern, in the order of [`Bench::photos`] (or the one photo of the command line).
    pub patterns: Vec<PhotoFile<'a>>,
    /// Photos of the target, each once.
    pub targets: Vec<PhotoFile<'a>>,
}

/// A photo of the pattern, looked at.
#[derive(Debug, Clone)]
pub(super) struct SeenPattern {
    pub(super) size_px: [usize; 2],
    pub(super) exif: Exif,
    pub(super) spots: Spots,
    /// Dots in the same photo, when the bench file says that they are there.
    pub(super) dots: Option<Reading>,
}

/// A photo of the target, looked at.
#[derive(Debug, Clone)]
pub(super) struct SeenTarget {
    pub(super) size_px: [usize; 2],
    pub(super) exif: Exif,
    pub(super) reading: Reading,
}

/// Everything seen.
#[derive(Debug, Clone)]
pub(super) struct Seen {
    pub(super) patterns: Vec<SeenPattern>,
    pub(super) targets: Vec<SeenTarget>,
}

/// Decodes and reads all photos.
pub(super) fn look(inputs: &Inputs<'_>, bench: &Bench) -> Result<Seen, Refusal> {
    // A calibration knows the view already.
    let dots_in_pattern = bench.calibration.is_none()
        && matches!(bench.target.as_ref().map(|target| &target.kind), Some(TargetKind::Dots { photo: None, .. }));
    let (patterns, targets) = rayon::join(
        || {
            inputs
                .patterns
                .par_iter()
                .map(|file| look_at_pattern(file, dots_in_pattern).map_err(|error| blaming(file, error)))
                .collect::<Result<Vec<_>, Refusal>>()
        },
        || {
            inputs
                .targets
                .par_iter()
                .map(|file| look_at_target(file).map_err(|error| blaming(file, error)))
                .collect::<Result<Vec<_>, Refusal>>()
        },
    );
    Ok(Seen { patterns: patterns?, targets: targets? })
}

fn blaming(file: &PhotoFile<'_>, error: Error) -> Refusal {
    Refusal { file: Some(file.name.to_owned()), error: Box::new(error) }
}

fn look_at_pattern(file: &PhotoFile<'_>, dots_in_pattern: bool) -> Result<SeenPattern, Error> {
    let photo = photo::decode(file.bytes)?;
    let spots = spots::find(&photo, &spots::SpotOptions::default())?;
    let dots = if dots_in_pattern { Some(target::read(&without_laser(&photo, &spots), &target::ReadOptions::default())?) } else { None };
    Ok(SeenPattern { size_px: [photo.width, photo.height], exif: photo.exif, spots, dots })
}

/// Luminance without the laser's own channel, for reading dots that lie under the pattern.
fn without_laser(photo: &Photo, spots: &Spots) -> photo::Light {
    let own = (0..3).max_by(|&a, &b| spots.colour[a].total_cmp(&spots.colour[b])).unwrap_or(0);
    let mut weights = photo::LUMINANCE;
    weights[own] = 0.0;
    let sum: f64 = weights.iter().sum();
    photo.light(weights.map(|weight| weight / sum))
}

pub(super) fn look_at_target(file: &PhotoFile<'_>) -> Result<SeenTarget, Error> {
    let photo = photo::decode(file.bytes)?;
    let reading = target::read(&photo.grey(), &target::ReadOptions::default())?;
    Ok(SeenTarget { size_px: [photo.width, photo.height], exif: photo.exif, reading })
}
