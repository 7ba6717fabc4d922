//! Looks at every photo: decoded, spots found, target read. The heavy part; photos are worked on side by side.

use super::Refusal;
use crate::{
    Error,
    bench::{Bench, TargetKind},
    photo::{self, Exif, Photo},
    spots::{self, Spots},
    target::{self, Outline, Reading, Ruling},
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

/// What gives the plane of the screen its scale, as read from a photo.
#[derive(Debug, Clone)]
pub(super) enum Print {
    /// The printed dot target.
    Dots(Reading),
    /// A sheet of paper.
    Sheet(Outline),
    /// Ruled paper.
    Ruling(Ruling),
}

/// What is looked for in a photo.
#[derive(Debug, Clone, Copy)]
enum PrintKind {
    Dots,
    Sheet,
    Ruling,
}

/// A photo of the pattern, looked at.
#[derive(Debug, Clone)]
pub(super) struct SeenPattern {
    pub(super) size_px: [usize; 2],
    pub(super) exif: Exif,
    pub(super) spots: Spots,
    /// The target in the same photo, when the bench file says that it is there.
    pub(super) print: Option<Print>,
}

/// A photo of the target, looked at.
#[derive(Debug, Clone)]
pub(super) struct SeenTarget {
    pub(super) size_px: [usize; 2],
    pub(super) exif: Exif,
    pub(super) print: Print,
}

/// Everything seen.
#[derive(Debug, Clone)]
pub(super) struct Seen {
    pub(super) patterns: Vec<SeenPattern>,
    pub(super) targets: Vec<SeenTarget>,
}

/// Decodes and reads all photos.
pub(super) fn look(inputs: &Inputs<'_>, bench: &Bench) -> Result<Seen, Refusal> {
    let target = bench.target.as_ref().map(|target| &target.kind);
    // A calibration knows the view already.
    let in_pattern = match target.filter(|_| bench.calibration.is_none()) {
        Some(TargetKind::Dots { photo: None, .. }) => Some(PrintKind::Dots),
        Some(TargetKind::Sheet { photo: None, .. }) => Some(PrintKind::Sheet),
        Some(TargetKind::Ruling { photo: None, .. }) => Some(PrintKind::Ruling),
        _ => None,
    };
    let in_target = match target {
        Some(TargetKind::Sheet { .. }) => PrintKind::Sheet,
        Some(TargetKind::Ruling { .. }) => PrintKind::Ruling,
        _ => PrintKind::Dots,
    };
    let (patterns, targets) = rayon::join(
        || {
            inputs
                .patterns
                .par_iter()
                .map(|file| look_at_pattern(file, in_pattern).map_err(|error| blaming(file, error)))
                .collect::<Result<Vec<_>, Refusal>>()
        },
        || {
            inputs
                .targets
                .par_iter()
                .map(|file| look_at_target(file, in_target).map_err(|error| blaming(file, error)))
                .collect::<Result<Vec<_>, Refusal>>()
        },
    );
    Ok(Seen { patterns: patterns?, targets: targets? })
}

fn blaming(file: &PhotoFile<'_>, error: Error) -> Refusal {
    Refusal { file: Some(file.name.to_owned()), error: Box::new(error) }
}

fn look_at_pattern(file: &PhotoFile<'_>, in_pattern: Option<PrintKind>) -> Result<SeenPattern, Error> {
    let photo = photo::decode(file.bytes)?;
    let spots = spots::find(&photo, &spots::SpotOptions::default())?;
    let print = in_pattern.map(|kind| read_print(&without_laser(&photo, &spots), kind)).transpose()?;
    Ok(SeenPattern { size_px: [photo.width, photo.height], exif: photo.exif, spots, print })
}

/// Luminance without the laser's own channel, for reading a target that lies under the pattern.
fn without_laser(photo: &Photo, spots: &Spots) -> photo::Light {
    let own = (0..3).max_by(|&a, &b| spots.colour[a].total_cmp(&spots.colour[b])).unwrap_or(0);
    let mut weights = photo::LUMINANCE;
    weights[own] = 0.0;
    let sum: f64 = weights.iter().sum();
    photo.light(weights.map(|weight| weight / sum))
}

/// A photo of the printed dot target.
pub(super) struct SeenDots {
    pub(super) size_px: [usize; 2],
    pub(super) exif: Exif,
    pub(super) reading: Reading,
}

pub(super) fn look_at_dots(file: &PhotoFile<'_>) -> Result<SeenDots, Error> {
    let photo = photo::decode(file.bytes)?;
    let reading = target::read(&photo.grey(), &target::ReadOptions::default())?;
    Ok(SeenDots { size_px: [photo.width, photo.height], exif: photo.exif, reading })
}

fn look_at_target(file: &PhotoFile<'_>, kind: PrintKind) -> Result<SeenTarget, Error> {
    let photo = photo::decode(file.bytes)?;
    let print = read_print(&photo.grey(), kind)?;
    Ok(SeenTarget { size_px: [photo.width, photo.height], exif: photo.exif, print })
}

fn read_print(light: &photo::Light, kind: PrintKind) -> Result<Print, Error> {
    Ok(match kind {
        PrintKind::Dots => Print::Dots(target::read(light, &target::ReadOptions::default())?),
        PrintKind::Ruling => Print::Ruling(target::read_ruling(light)?),
        PrintKind::Sheet => Print::Sheet(target::read_outline(light)?),
    })
}
