//! Reading the printed dots from a photo.

use std::collections::HashMap;

use super::{
    blobs::{Blob, ink_threshold, round_blobs},
    centroid::{Darkness, Expected, darkness},
    error::TargetError,
    grid::{Places, largest_grid},
    homography::homography,
    is_mark,
    marks::{Hand, Orientation, orientation},
    median,
    paper::{Binned, PaperLevel, small_f64},
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
    /// Centroid of the dot's darkness (not corrected for perspective).
    pub at: PixelPoint,
    /// Covariance of `at`, px².
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

/// Radii, in pitches, that are used until they have been measured.
const NOMINAL_RADIUS: f64 = 0.2;

/// Reads the dot target from a plane of linear light.
///
/// Give the plane with the least laser light where the pattern is in the same photo. The dots may be
/// seen obliquely, distorted, cut off by the photo's rim (cut dots are left out), in uneven light.
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
    let marks = matches!(options.marks, Marks::Required);
    let coarse: Vec<Coarse> = places
        .iter()
        .map(|(place, blob)| Coarse { index: print.index(*place), blob: &blobs[*blob], radius_pitches: radius[place] })
        .collect();
    refine(grey, &coarse, marks, needed).ok_or_else(|| no_grid(places.len()))
}

/// A dot known from its thresholded blob only.
struct Coarse<'a> {
    index: (i32, i32),
    blob: &'a Blob,
    radius_pitches: f64,
}

fn grid_point(place: (i32, i32)) -> [f64; 2] {
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

fn radii(places: &Places, blobs: &[Blob], view: &View) -> HashMap<(i32, i32), f64> {
    places.iter().map(|(place, blob)| (*place, relative_radius(&blobs[*blob], *place, view))).collect()
}

fn find_orientation(
    places: &Places,
    blobs: &[Blob],
    view: &View,
    radius: &HashMap<(i32, i32), f64>,
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

/// Full-resolution centroids, weeded and with covariances that match their scatter about a smooth view.
fn refine(grey: &Light, coarse: &[Coarse], marks: bool, needed: usize) -> Option<Reading> {
    let (width, height) = (small_f64(grey.width), small_f64(grey.height));
    let mut radius = [false, true].map(|mark| {
        let mut of_kind: Vec<f64> =
            coarse.iter().filter(|dot| (marks && is_mark(dot.index)) == mark).map(|dot| dot.radius_pitches).collect();
        median(&mut of_kind)
    });
    radius[1] = radius[1].or(radius[0]);
    let of_index = |index: (i32, i32)| if marks && is_mark(index) { radius[1] } else { radius[0] }.unwrap_or(NOMINAL_RADIUS);
    let seen: Vec<Seen> = coarse
        .iter()
        .map(|dot| Seen { index: grid_point(dot.index), radius_pitches: of_index(dot.index), at: dot.blob.at, u_px: 1.0 })
        .collect();
    let view = View::fit(&seen, width, height)?;
    let measure = |blur_px: f64, indices: &[((i32, i32), PixelPoint)]| -> Vec<((i32, i32), Darkness)> {
        use rayon::prelude::*;
        indices
            .par_iter()
            .filter_map(|(index, at)| {
                let expected = Expected {
                    at: *at,
                    steps_px: view.steps(grid_point(*index)),
                    radius_pitches: of_index(*index),
                    neighbours_pitches: std::array::from_fn(|n| {
                        let (i, j) = [(-1, -1), (0, -1), (1, -1), (-1, 0), (0, 0), (1, 0), (-1, 1), (0, 1), (1, 1)][n];
                        of_index((index.0 + i, index.1 + j))
                    }),
                    blur_px,
                };
                Some((*index, darkness(grey, &expected)?))
            })
            .collect()
    };
    let starts: Vec<((i32, i32), PixelPoint)> = coarse.iter().map(|dot| (dot.index, dot.blob.at)).collect();
    // A sample of the dots tells the blur, which sets the width of the window.
    let every = starts.len().div_ceil(40);
    let sample: Vec<_> = starts.iter().step_by(every).copied().collect();
    let mut blurs: Vec<f64> = measure(1.5, &sample).iter().map(|(_, d)| d.blur_px).collect();
    let blur_px = median(&mut blurs)?.clamp(0.4, 12.0);
    let found = measure(blur_px, &starts);
    finish(&found, marks, needed, width, height)
}

/// Radii from the darkness, outliers out, covariances scaled, and the start homography.
fn finish(found: &[((i32, i32), Darkness)], marks: bool, needed: usize, width: f64, height: f64) -> Option<Reading> {
    let kind = |index: (i32, i32)| marks && is_mark(index);
    let contrast = typical_contrast(found, marks)?;
    let radius_of = |mark: bool| {
        let mut of_kind: Vec<f64> = found
            .iter()
            .filter(|(index, _)| kind(*index) == mark)
            .map(|(_, d)| (d.sum_px2 / (contrast * std::f64::consts::PI * d.cell_px2)).sqrt())
            .collect();
        median(&mut of_kind)
    };
    let dot_radius_pitches = radius_of(false)?;
    let mark_radius_pitches = radius_of(true).unwrap_or(dot_radius_pitches);
    let seen = |index: (i32, i32), d: &Darkness| Seen {
        index: grid_point(index),
        radius_pitches: if kind(index) { mark_radius_pitches } else { dot_radius_pitches },
        at: d.at,
        u_px: f64::midpoint(d.covariance.xx, d.covariance.yy).sqrt(),
    };
    let all: Vec<Seen> = found.iter().map(|(index, d)| seen(*index, d)).collect();
    let view = View::fit(&all, width, height)?;
    let local = Residuals::of(found, &all, &view);
    let scale = local.scatter().unwrap_or_else(|| view.scatter(&all)).max(1.0);
    let mut dots: Vec<Dot> = Vec::new();
    for ((index, d), dot) in found.iter().zip(&all) {
        if local.off_px(*index, dot) <= OUTLIER * scale * dot.u_px + 0.01 {
            let c = d.covariance;
            let s2 = scale * scale;
            let covariance = PixelCovariance { xx: c.xx * s2, xy: c.xy * s2, yy: c.yy * s2 };
            dots.push(Dot { index: *index, at: d.at, covariance, mark: kind(*index) });
        }
    }
    if dots.len() < needed {
        return None;
    }
    dots.sort_by_key(|dot| (dot.index.1, dot.index.0));
    let pairs: Vec<_> = dots.iter().map(|dot| (grid_point(dot.index), [dot.at.x_px, dot.at.y_px])).collect();
    let pixel_from_pitches = homography(&pairs)?;
    Some(Reading { dots, dot_radius_pitches, mark_radius_pitches, pixel_from_pitches, notes: Vec::new() })
}

/// Farther than this many standard uncertainties from its neighbours' trend a dot is left out.
const OUTLIER: f64 = 5.0;

/// Residuals about the smooth view, seen against those of the neighbours: what a real lens does beyond
/// the view's few terms is smooth and cancels there, noise and glare do not.
struct Residuals {
    at: HashMap<(i32, i32), ([f64; 2], f64)>,
}

impl Residuals {
    fn of(found: &[((i32, i32), Darkness)], seen: &[Seen], view: &View) -> Self {
        let at = found.iter().zip(seen).map(|((index, _), dot)| (*index, (view.residual_px(dot), dot.u_px))).collect();
        Self { at }
    }

    fn neighbours(&self, (i, j): (i32, i32)) -> impl Iterator<Item = &([f64; 2], f64)> {
        let around = [(-1, 0), (1, 0), (0, -1), (0, 1), (-1, -1), (1, 1), (-1, 1), (1, -1)];
        around.into_iter().filter_map(move |(di, dj)| self.at.get(&(i + di, j + dj)))
    }

    /// Robust scatter of the differences to the mean of the neighbours, in units of their stated uncertainty.
    fn scatter(&self) -> Option<f64> {
        let mut sizes: Vec<f64> = Vec::new();
        for (index, (residual, u_px)) in &self.at {
            let (mut n, mut mean, mut u2) = (0.0, [0.0; 2], 0.0);
            for (other, u) in self.neighbours(*index) {
                n += 1.0;
                mean = [mean[0] + other[0], mean[1] + other[1]];
                u2 += u * u;
            }
            if n >= 5.0 {
                let expected = (u_px * u_px + u2 / (n * n)).sqrt();
                sizes.extend([0, 1].map(|c| ((residual[c] - mean[c] / n) / expected).abs()));
            }
        }
        (sizes.len() >= 30).then(|| median(&mut sizes))?.map(|m| 1.4826 * m)
    }

    /// Distance from the median of the neighbours' residuals, or from the view where there are too few.
    fn off_px(&self, index: (i32, i32), dot: &Seen) -> f64 {
        let trend = [0, 1].map(|c| {
            let mut values: Vec<f64> = self.neighbours(index).map(|(r, _)| r[c]).collect();
            if values.len() < 5 { None } else { median(&mut values) }
        });
        let own = self.at.get(&index).map_or([0.0; 2], |(r, _)| *r);
        let _ = dot;
        (own[0] - trend[0].unwrap_or(0.0)).hypot(own[1] - trend[1].unwrap_or(0.0))
    }
}

/// Contrast of ink and paper, from the larger dots where there are any: their cores are least blurred.
fn typical_contrast(found: &[((i32, i32), Darkness)], marks: bool) -> Option<f64> {
    let mut of_marks: Vec<f64> = found.iter().filter(|(index, _)| marks && is_mark(*index)).map(|(_, d)| d.contrast).collect();
    let mut of_all: Vec<f64> = found.iter().map(|(_, d)| d.contrast).collect();
    Some(median(&mut of_all)?.max(median(&mut of_marks).unwrap_or(0.0)))
}
