//! Ruled and millimetre paper: its lines numbered over the whole photo. Start reading at [`read_ruling`].
//!
//! Lines of one family are a wave of darkness across the photo. Its phase, over 2π, counts lines; heavier lines at every fifth or tenth
//! place change the wave's strength, hardly its phase. Pencil and magnets move the phase of the few windows that they run through by more than
//! its stated uncertainty: the fit has to drop these points.

mod grow;
#[cfg(test)]
#[expect(clippy::cast_possible_truncation, reason = "test scenes are small")]
mod painted_check;
mod spectrum;
mod wave;

use super::error::TargetError;
use crate::{
    frames::{PixelCovariance, PixelPoint},
    photo::Light,
};
use nalgebra::{Matrix2, Vector2};
use wave::{Wave, Window};

/// A point of the ruling with the numbers of its lines, counted to the right and up from a line near the middle of the photo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum RuledPoint {
    /// Where a line of each family cross.
    Crossing {
        /// Place in the photo.
        at: PixelPoint,
        /// Numbers of the upright line and of the level line.
        index: [i32; 2],
        /// Covariance of the place, px².
        covariance: PixelCovariance,
    },
    /// On a line, where the photo shows only one family.
    OnLine {
        /// Place in the photo.
        at: PixelPoint,
        /// Number of the line.
        index: i32,
        /// Unit vector across the line (x, y).
        across: [f64; 2],
        /// Standard uncertainty across, px.
        u_px: f64,
    },
}

/// Which families of lines are there.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Families {
    /// Both, nearly square to each other: points are [`RuledPoint::Crossing`].
    Both,
    /// Lines that run up: their number counts along X.
    Upright,
    /// Lines that run from left to right: their number counts along Y.
    Level,
}

/// Ruled paper as seen in a photo.
#[derive(Debug, Clone, PartialEq)]
pub struct Ruling {
    /// Which families were found.
    pub families: Families,
    /// One point for each part of the photo where the lines are clear.
    pub points: Vec<RuledPoint>,
    /// Distance of neighbouring lines where they are clearest, px.
    pub period_px: f64,
}

/// Least distance of lines that can be told apart for certain, px.
const LEAST_PERIOD_PX: f64 = 4.0;
/// Fewest parts of the photo that have to show the ruling.
const LEAST_POINTS: usize = 8;
/// Least side of a photo, px.
const LEAST_SIDE_PX: usize = 96;

/// Reads ruled or millimetre paper from a plane of linear light: the finest lines that the photo resolves.
///
/// Give the plane with the least laser light where the pattern is in the same photo.
///
/// # Errors
/// [`TargetError`] says what was seen and what was needed.
pub fn read_ruling(grey: &Light) -> Result<Ruling, TargetError> {
    let (width, height) = (grey.width, grey.height);
    if width.min(height) < LEAST_SIDE_PX || Some(grey.value.len()) != width.checked_mul(height) {
        return Err(TargetError::PhotoTooSmall { width, height, samples: grey.value.len(), needed_px: LEAST_SIDE_PX });
    }
    let first = spectrum::strongest(grey).ok_or(TargetError::NoRuling { parts: 0, needed: LEAST_POINTS })?;
    let period_px = 1.0 / first.waves[0].norm();
    if first.waves.iter().any(|wave| wave.norm() > 1.0 / LEAST_PERIOD_PX) {
        return Err(TargetError::RulingTooFine { period_px, least_px: LEAST_PERIOD_PX });
    }
    let ordered = oriented(&first.waves);
    let raster = grow::Raster::of(grey, period_px);
    let numbered: Vec<Vec<Option<Wave>>> = ordered.iter().map(|wave| raster.numbered(grey, first.centre, *wave)).collect();
    let families = match (numbered.len(), ordered[0].x.abs() > ordered[0].y.abs()) {
        (2, _) => Families::Both,
        (_, true) => Families::Upright,
        (_, false) => Families::Level,
    };
    let windows = (0..numbered[0].len()).filter_map(|n| numbered.iter().map(|waves| waves[n]).collect::<Option<Vec<Wave>>>());
    let points: Vec<RuledPoint> = windows.filter_map(|waves| point(&waves)).collect();
    if points.len() < LEAST_POINTS {
        return Err(TargetError::NoRuling { parts: points.len(), needed: LEAST_POINTS });
    }
    Ok(Ruling { families, points, period_px })
}

/// Waves that count to the right and up, the one of the upright lines first.
fn oriented(waves: &[Vector2<f64>]) -> Vec<Vector2<f64>> {
    let upright = |wave: &Vector2<f64>| wave.x.abs() / wave.norm();
    let mut ordered = waves.to_vec();
    ordered.sort_by(|a, b| upright(b).total_cmp(&upright(a)));
    let counts_along_x = |n: usize, wave: &Vector2<f64>| if waves.len() == 2 { n == 0 } else { wave.x.abs() > wave.y.abs() };
    let positive = |(n, wave): (usize, Vector2<f64>)| {
        // y runs down in a photo.
        let forward = if counts_along_x(n, &wave) { wave.x > 0.0 } else { wave.y < 0.0 };
        if forward { wave } else { -wave }
    };
    ordered.into_iter().enumerate().map(positive).collect()
}

/// The crossing, or the point of a line, nearest to the middle of a window.
#[expect(clippy::cast_possible_truncation, reason = "a photo shows some thousand lines")]
fn point(waves: &[Wave]) -> Option<RuledPoint> {
    let Window { centre, .. } = waves[0].window;
    if let [a, b] = waves {
        let steps = Matrix2::new(a.frequency.x, a.frequency.y, b.frequency.x, b.frequency.y).try_inverse()?;
        let index = [a.count.round(), b.count.round()];
        let at = Vector2::from(centre) + steps * Vector2::new(index[0] - a.count, index[1] - b.count);
        let covariance = steps * Matrix2::new(a.u_count.powi(2), 0.0, 0.0, b.u_count.powi(2)) * steps.transpose();
        return Some(RuledPoint::Crossing {
            at: PixelPoint { x_px: at.x, y_px: at.y },
            index: index.map(|n| n as i32),
            covariance: PixelCovariance { xx: covariance[(0, 0)], xy: covariance[(0, 1)], yy: covariance[(1, 1)] },
        });
    }
    let wave = waves[0];
    let index = wave.count.round();
    let norm = wave.frequency.norm();
    let at = Vector2::from(centre) + wave.frequency * ((index - wave.count) / norm.powi(2));
    Some(RuledPoint::OnLine {
        at: PixelPoint { x_px: at.x, y_px: at.y },
        index: index as i32,
        across: [wave.frequency.x / norm, wave.frequency.y / norm],
        u_px: wave.u_count / norm,
    })
}
