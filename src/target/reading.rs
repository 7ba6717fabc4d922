//! Reading the printed dots from a photo.

use std::collections::BTreeMap;

use super::{
    blobs::{Blob, ink_threshold, round_blobs},
    error::TargetError,
    grid::{Places, largest_grid},
    marks::{Hand, Orientation, orientation},
    median,
    paper::{Binned, PaperLevel, small_f64},
    refine::{Coarse, NOMINAL_RADIUS, refined},
    view::{Seen, View},
};
use crate::{
    frames::{PixelCovariance, PixelPoint},
    photo::Light,
};

/// One dot of the target as seen in a photo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Dot {
    /// Column and row on the print, in pitches from the origin mark: X right, Y up.
    pub index: (i32, i32),
    /// Centre of its rim, which is also the centroid of its darkness: the centre of the ellipse that the disc shows. Under
    /// perspective that is not the image of the disc's centre (up to 0.1 px at 35°); a fit has to predict the ellipse's centre.
    pub at: PixelPoint,
    /// Covariance of `at`, px²; holds the scatter between neighbouring dots of this photo, not only pixel noise.
    pub covariance: PixelCovariance,
    /// One of the three larger dots at (0,0), (2,0), (0,1).
    pub mark: bool,
}

/// The dot target, read from a photo.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// Every dot found, indexed.
    pub dots: Vec<Dot>,
    /// Radius of an ordinary dot in units of the pitch.
    pub dot_radius_pitches: f64,
    /// Radius of the three marks in units of the pitch.
    pub mark_radius_pitches: f64,
    /// Homography from (i, j) pitches to pixels, row-major, last element 1; a start value only.
    pub pixel_from_pitches: [[f64; 3]; 3],
    /// What a reader of the result must know.
    pub notes: Vec<crate::Note>,
}

/// How a target is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ReadOptions {
    /// Whether the three larger dots must be there.
    pub marks: Marks,
    /// Least number of dots on the grid (at least 12 are always asked for).
    pub least_dots: usize,
}

/// What is expected of the three larger dots.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Marks {
    /// They fix origin, X direction and handedness; without them there is no reading.
    Required,
    /// A grid of equal dots: the origin is the dot nearest to the middle of the photo, X the grid
    /// direction that points most to the right, and the print is taken as not mirrored.
    Absent,
}

impl Default for ReadOptions {
    fn default() -> Self {
        Self { marks: Marks::Required, least_dots: LEAST_DOTS }
    }
}

/// Fewer dots say too little about which of them are wrong.
const LEAST_DOTS: usize = 12;

/// A target needs room: fewer pixels than this cannot hold 5 × 4 dots.
const LEAST_SIDE_PX: usize = 48;

/// Longer side up to which blobs are sought at full resolution, px.
const FULL_RESOLUTION_PX: usize = 2600;

/// Radius below which blobs are sought again at a finer scale, binned px.
const SMALL_BLOB_PX: f64 = 2.6;

/// Reads the dot target from a plane of linear light.
///
/// Give the plane with the least laser light where the pattern is in the same photo. The dots may be
/// seen obliquely, distorted, cut off by the photo's rim (cut dots are left out), in uneven light.
///
/// On 48 rendered photos of known truth (8 to 42 px dot radius, up to 38° oblique, 1 to 12 megapixels) all but 5 of 19 600
/// complete dots were found, no index was wrong, places were off by 0.006 to 0.020 px rms and 0.90 to 1.08 standard uncertainties
/// (test `targets_of_known_truth`). Dots down to 3 px radius, 5 × 4 of them, 45° and |k1| = 0.3: `painted_check`.
///
/// # Errors
/// [`TargetError`] says what was seen and what was needed.
pub fn read(grey: &Light, options: &ReadOptions) -> Result<Reading, TargetError> {
    let (width, height) = (grey.width, grey.height);
    if width.min(height) < LEAST_SIDE_PX || Some(grey.value.len()) != width.checked_mul(height) {
        return Err(TargetError::PhotoTooSmall { width, height, samples: grey.value.len(), needed_px: LEAST_SIDE_PX });
    }
    let mut bin = width.max(height).div_ceil(FULL_RESOLUTION_PX);
    let mut failed: Option<TargetError> = None;
    loop {
        match read_at_scale(grey, bin, options) {
            Ok(Scaled { reading, small_blobs }) => {
                // Tiny blobs lose their shape in binning: look closer, keep the better reading.
                if small_blobs
                    && bin > 1
                    && let Ok(finer) = read_at_scale(grey, bin / 2, options)
                    && finer.reading.dots.len() >= reading.dots.len()
                {
                    return Ok(finer.reading);
                }
                return Ok(reading);
            }
            Err(error) => {
                failed = Some(match failed {
                    Some(before) if progress(&before) >= progress(&error) => before,
                    _ => error.clone(),
                });
            }
        }
        if bin == 1 {
            return Err(failed.unwrap_or(TargetError::NoDots { round: 0, needed: LEAST_DOTS }));
        }
        bin /= 2;
    }
}

/// How far a failed reading came: the error that came farthest is the one to tell.
fn progress(error: &TargetError) -> u8 {
    match error {
        TargetError::Mirrored => 4,
        TargetError::MarksAmbiguous { .. } | TargetError::MarksNotFound { .. } => 3,
        TargetError::NoGrid { .. } => 2,
        TargetError::NoDots { .. } => 1,
        _ => 0,
    }
}

struct Scaled {
    reading: Reading,
    small_blobs: bool,
}

fn read_at_scale(grey: &Light, bin: usize, options: &ReadOptions) -> Result<Scaled, TargetError> {
    let needed = options.least_dots.max(LEAST_DOTS);
    let plane = Binned::new(grey, bin);
    let paper = PaperLevel::of(&plane);
    let automatic = ink_threshold(&plane, &paper);
    let mut failed = TargetError::NoDots { round: 0, needed };
    for threshold in [automatic, 0.5, 0.7] {
        let blobs = round_blobs(&plane, &paper, threshold);
        match read_blobs(grey, &blobs, options, needed) {
            Ok(reading) => {
                let mut areas: Vec<f64> = blobs.iter().map(|blob| blob.area_px2).collect();
                let bin = small_f64(bin);
                let radius = (median(&mut areas).unwrap_or(0.0) / std::f64::consts::PI).sqrt() / bin;
                return Ok(Scaled { reading, small_blobs: radius < SMALL_BLOB_PX });
            }
            Err(error) if progress(&error) > progress(&failed) || matches!(error, TargetError::NoDots { .. }) => failed = error,
            Err(_) => {}
        }
    }
    Err(failed)
}

fn read_blobs(grey: &Light, blobs: &[Blob], options: &ReadOptions, needed: usize) -> Result<Reading, TargetError> {
    if blobs.len() < needed {
        return Err(TargetError::NoDots { round: blobs.len(), needed });
    }
    let no_grid = |on_grid: usize| TargetError::NoGrid { round: blobs.len(), on_grid, needed };
    let mut places = largest_grid(blobs);
    if places.len() < needed {
        return Err(no_grid(places.len()));
    }
    let view = settle(&mut places, blobs, grey).ok_or_else(|| no_grid(places.len()))?;
    if places.len() < needed {
        return Err(no_grid(places.len()));
    }
    let radius = radii(&places, blobs, &view);
    let print = find_orientation(&places, blobs, &view, &radius, grey, options)?;
    let mut coarse: Vec<Coarse> = places
        .iter()
        .map(|(place, blob)| Coarse { index: print.index(*place), at: blobs[*blob].at, radius_pitches: radius[place] })
        .collect();
    coarse.sort_by_key(|dot| (dot.index.1, dot.index.0));
    let reading = refined(grey, &coarse, options.marks).filter(|reading| reading.dots.len() >= needed);
    reading.ok_or_else(|| no_grid(places.len()))
}

pub(super) fn grid_point(place: (i32, i32)) -> [f64; 2] {
    [f64::from(place.0), f64::from(place.1)]
}

/// Fits a smooth view, weeds out blobs that do not obey it and takes in others that do.
fn settle(places: &mut Places, blobs: &[Blob], grey: &Light) -> Option<View> {
    let (width, height) = (small_f64(grey.width), small_f64(grey.height));
    let mut view = None;
    for _ in 0..3 {
        let seen: Vec<((i32, i32), Seen)> = places
            .iter()
            .map(|(place, blob)| {
                (*place, Seen { index: grid_point(*place), radius_pitches: NOMINAL_RADIUS, at: blobs[*blob].at, u_px: 1.0 })
            })
            .collect();
        let dots: Vec<Seen> = seen.iter().map(|(_, dot)| *dot).collect();
        let fitted = View::fit(&dots, width, height)?;
        let scatter = fitted.scatter(&dots);
        let before = places.len();
        for (place, dot) in &seen {
            let [x, y] = fitted.residual_px(dot);
            let step = shorter_step(fitted.steps(dot.index));
            if x.hypot(y) > (6.0 * scatter + 0.3).min(0.2 * step) {
                places.remove(place);
            }
        }
        let removed = before - places.len();
        take_in(places, blobs, &fitted);
        view = Some(fitted);
        if removed == 0 && places.len() == before {
            break;
        }
    }
    view
}

fn shorter_step([x, y]: [[f64; 2]; 2]) -> f64 {
    x[0].hypot(x[1]).min(y[0].hypot(y[1]))
}

/// Gives blobs beyond gaps their place, where the view predicts one.
fn take_in(places: &mut Places, blobs: &[Blob], view: &View) {
    let mut used = vec![false; blobs.len()];
    for blob in places.values() {
        used[*blob] = true;
    }
    let mut areas: Vec<f64> = places.iter().map(|(place, blob)| relative_radius(&blobs[*blob], *place, view)).collect();
    let Some(usual) = median(&mut areas) else { return };
    for (n, blob) in blobs.iter().enumerate().filter(|(n, _)| !used[*n]) {
        let Some(index) = view.index_of(blob.at) else { continue };
        let Some(place) = nearest_place(index) else { continue };
        let size = relative_radius(blob, place, view) / usual;
        let off = (index[0] - f64::from(place.0)).hypot(index[1] - f64::from(place.1));
        if off < 0.1 && (0.6..2.2).contains(&size) && !places.contains_key(&place) {
            places.insert(place, n);
        }
    }
}

/// Nearest grid place, if it lies in a sensible range.
#[expect(clippy::cast_possible_truncation, reason = "range is checked before the cast")]
fn nearest_place(index: [f64; 2]) -> Option<(i32, i32)> {
    index.iter().all(|v| v.abs() < 1e6).then(|| (index[0].round() as i32, index[1].round() as i32))
}

/// Radius of a blob in pitches, from its area and the area of a pitch square there.
fn relative_radius(blob: &Blob, place: (i32, i32), view: &View) -> f64 {
    let [x, y] = view.steps(grid_point(place));
    (blob.area_px2 / (std::f64::consts::PI * (x[0] * y[1] - x[1] * y[0]).abs())).sqrt()
}

fn radii(places: &Places, blobs: &[Blob], view: &View) -> BTreeMap<(i32, i32), f64> {
    places.iter().map(|(place, blob)| (*place, relative_radius(&blobs[*blob], *place, view))).collect()
}

fn find_orientation(
    places: &Places,
    blobs: &[Blob],
    view: &View,
    radius: &BTreeMap<(i32, i32), f64>,
    grey: &Light,
    options: &ReadOptions,
) -> Result<Orientation, TargetError> {
    let middle = PixelPoint { x_px: small_f64(grey.width) / 2.0, y_px: small_f64(grey.height) / 2.0 };
    let central = places
        .iter()
        .min_by(|a, b| middle.distance_px(blobs[*a.1].at).total_cmp(&middle.distance_px(blobs[*b.1].at)))
        .map_or((0, 0), |(place, _)| *place);
    let [x, y] = view.steps(grid_point(central));
    // y runs down in a photo: a positive cross product turns clockwise as displayed.
    let hand = if x[0] * y[1] - x[1] * y[0] > 0.0 { Hand::Clockwise } else { Hand::CounterClockwise };
    match options.marks {
        Marks::Required => orientation(radius, hand),
        Marks::Absent => Ok(Orientation::without_marks(central, [x[0], y[0]], hand)),
    }
}
