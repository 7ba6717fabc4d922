//! From blobs with an index to dots: place at full resolution, outliers out, covariances that hold.

use rayon::prelude::*;

use super::{
    centroid::{Darkness, Expected, darkness},
    homography::homography,
    is_mark, median,
    paper::small_f64,
    reading::{Dot, Marks, Reading, grid_point},
    residuals::Residuals,
    view::{Seen, View},
};
use crate::{
    Note,
    frames::{PixelCovariance, PixelPoint},
    photo::Light,
};

/// Radius, in pitches, that is used until it has been measured.
pub(super) const NOMINAL_RADIUS: f64 = 0.2;

/// Farther than this many standard uncertainties from its neighbours' trend a dot is left out.
const OUTLIER: f64 = 5.0;

/// Slack for the outlier test where a photo is nearly free of noise, px.
const OUTLIER_SLACK_PX: f64 = 0.01;

/// Dots left out are worth a note from this share of all on.
const WORTH_A_NOTE: f64 = 0.05;

/// Width of blur that the first look at the dots assumes, px.
const FIRST_BLUR_PX: f64 = 1.5;

/// Dots that are looked at to find the blur.
const BLUR_SAMPLE: usize = 40;

/// A dot known from its thresholded blob only.
pub(super) struct Coarse {
    pub(super) index: (i32, i32),
    pub(super) at: PixelPoint,
    pub(super) radius_pitches: f64,
}

type Found = ((i32, i32), Darkness);

/// The reading at full resolution; `None` when the dots no longer fix a view.
///
/// Covariances are scaled so that the differences between neighbouring residuals about a smooth view agree with them
/// (never down): structure of paper, printing, demosaicing and JPEG is then in them, not only pixel noise.
pub(super) fn refined(grey: &Light, coarse: &[Coarse], marks: Marks) -> Option<Reading> {
    let size = [small_f64(grey.width), small_f64(grey.height)];
    let radii = Radii::of_blobs(coarse, marks)?;
    let seen: Vec<Seen> = coarse
        .iter()
        .map(|dot| Seen { index: grid_point(dot.index), radius_pitches: radii.at(dot.index), at: dot.at, u_px: 1.0 })
        .collect();
    let view = View::fit(&seen, size[0], size[1])?;
    // A sample of the dots tells the blur, which sets the width of the windows.
    let sample: Vec<&Coarse> = coarse.iter().step_by(coarse.len().div_ceil(BLUR_SAMPLE)).collect();
    let mut blurs: Vec<f64> = measured(grey, &view, &radii, FIRST_BLUR_PX, &sample).iter().map(|(_, d)| d.blur_px).collect();
    let blur_px = median(&mut blurs)?.clamp(0.4, 12.0);
    let all: Vec<&Coarse> = coarse.iter().collect();
    let found = measured(grey, &view, &radii, blur_px, &all);
    weeded(&found, &radii.of_darkness(&found)?, size)
}

fn measured(grey: &Light, view: &View, radii: &Radii, blur_px: f64, coarse: &[&Coarse]) -> Vec<Found> {
    let one = |dot: &&Coarse| {
        let (i, j) = dot.index;
        let around = |n: i32| radii.at((i + n % 3 - 1, j + n / 3 - 1));
        let expected = Expected {
            at: dot.at,
            steps_px: view.steps(grid_point(dot.index)),
            radius_pitches: radii.at(dot.index),
            neighbours_pitches: [0, 1, 2, 3, 4, 5, 6, 7, 8].map(around),
            blur_px,
        };
        Some((dot.index, darkness(grey, &expected)?))
    };
    coarse.par_iter().filter_map(one).collect()
}

/// Radii of ordinary dots and of marks, pitches.
struct Radii {
    marks: Marks,
    dot: f64,
    mark: f64,
}

impl Radii {
    /// From thresholded areas.
    fn of_blobs(coarse: &[Coarse], marks: Marks) -> Option<Self> {
        let of = |kind: bool| {
            let mut radii: Vec<f64> = coarse.iter().filter(|dot| marks.mark_at(dot.index) == kind).map(|dot| dot.radius_pitches).collect();
            median(&mut radii)
        };
        let dot = of(false)?;
        Some(Self { marks, dot, mark: of(true).unwrap_or(dot) })
    }

    /// From integrated darkness over the contrast of ink and paper: blur does not change it.
    fn of_darkness(&self, found: &[Found]) -> Option<Self> {
        let contrast = typical_contrast(found, self.marks)?;
        let of = |kind: bool| {
            let radius = |d: &Darkness| (d.sum_px2 / (contrast * std::f64::consts::PI * d.cell_px2)).sqrt();
            let mut radii: Vec<f64> =
                found.iter().filter(|(index, _)| self.marks.mark_at(*index) == kind).map(|(_, d)| radius(d)).collect();
            median(&mut radii)
        };
        let dot = of(false)?;
        // No mark measured: the blobs still tell the ratio.
        Some(Self { marks: self.marks, dot, mark: of(true).unwrap_or(dot * self.mark / self.dot) })
    }

    fn at(&self, index: (i32, i32)) -> f64 {
        if self.marks.mark_at(index) { self.mark } else { self.dot }
    }
}

impl Marks {
    fn mark_at(self, index: (i32, i32)) -> bool {
        matches!(self, Self::Required) && is_mark(index)
    }
}

/// Contrast of ink and paper, from the larger dots where there are any: their cores are least blurred.
fn typical_contrast(found: &[Found], marks: Marks) -> Option<f64> {
    let mut of_all: Vec<f64> = found.iter().map(|(_, d)| d.contrast).collect();
    let mut of_marks: Vec<f64> = found.iter().filter(|(index, _)| marks.mark_at(*index)).map(|(_, d)| d.contrast).collect();
    Some(median(&mut of_all)?.max(median(&mut of_marks).unwrap_or(0.0)))
}

/// Outliers out, covariances scaled, and the start homography.
fn weeded(found: &[Found], radii: &Radii, size: [f64; 2]) -> Option<Reading> {
    let seen: Vec<Seen> = found
        .iter()
        .map(|(index, d)| Seen {
            index: grid_point(*index),
            radius_pitches: radii.at(*index),
            at: d.at,
            u_px: f64::midpoint(d.covariance.xx, d.covariance.yy).sqrt(),
        })
        .collect();
    let view = View::fit(&seen, size[0], size[1])?;
    let residuals = Residuals::of(found.iter().map(|(index, _)| *index).zip(&seen), &view);
    let scale = residuals.scatter().unwrap_or_else(|| view.scatter(&seen)).max(1.0);
    let kept = found.iter().zip(&seen).filter(|((index, _), dot)| {
        let limit = OUTLIER * scale * dot.u_px + OUTLIER_SLACK_PX;
        residuals.off_px(*index).is_some_and(|off| off <= limit)
    });
    let dots: Vec<Dot> = kept
        .map(|((index, d), _)| {
            let [xx, xy, yy] = [d.covariance.xx, d.covariance.xy, d.covariance.yy].map(|c| c * scale * scale);
            Dot { index: *index, at: d.at, covariance: PixelCovariance { xx, xy, yy }, mark: radii.marks.mark_at(*index) }
        })
        .collect();
    let pairs: Vec<_> = dots.iter().map(|dot| (grid_point(dot.index), [dot.at.x_px, dot.at.y_px])).collect();
    Some(Reading {
        notes: notes(found, &dots, radii.marks),
        dot_radius_pitches: radii.dot,
        mark_radius_pitches: radii.mark,
        pixel_from_pitches: homography(&pairs)?,
        dots,
    })
}

fn notes(found: &[Found], dots: &[Dot], marks: Marks) -> Vec<Note> {
    let mut notes = Vec::new();
    let (left_out, kept) = (found.len() - dots.len(), dots.len());
    if small_f64(left_out) > WORTH_A_NOTE * small_f64(found.len()) {
        notes.push(Note::TargetDotsLeftOut { left_out, kept });
    }
    if matches!(marks, Marks::Required) {
        let hidden = super::MARKS.into_iter().filter(|mark| !found.iter().any(|(index, _)| index == mark));
        notes.extend(hidden.map(|index| Note::TargetMarkHidden { index }));
    }
    notes
}
