//! Ruled paper as a scale in the plane of the screen: the camera that sees it roughly so, and its points as observations.
//!
//! Any crossing may be the origin; X counts the upright lines to the right, Y the level lines up.

use super::{MeasureError, view::pose_from_homography};
use crate::{
    fit::{
        PrintObservation, PrintPlace, Sharpness,
        setup::{LensKnowledge, ViewStart},
    },
    frames::{PixelCovariance, PixelPoint, TargetPoint},
    optics::Camera,
    quantity::Quantity,
    target::{self, Families, RuledPoint, Ruling},
};
use nalgebra::{Matrix3, Vector3};

/// Ruled paper with the camera that sees it.
pub(super) struct RulingView {
    pub(super) start: ViewStart,
    pub(super) prints: Vec<PrintObservation>,
}

/// Along lines of one family nothing has a place; one point is given one, which fixes the origin and says nothing else. px
const ORIGIN_U_PX: f64 = 1.0;

pub(super) fn ruling_view(view: usize, ruling: &Ruling, pitch_m: Quantity, lens: &LensKnowledge) -> Result<RulingView, MeasureError> {
    let pixel_from_pitches = match ruling.families {
        Families::Both => across_both(&ruling.points),
        Families::Upright | Families::Level => across_one(ruling),
    };
    let pixel_from_pitches = pixel_from_pitches.ok_or(MeasureError::NoPose)?;
    let scale = Matrix3::from_diagonal(&Vector3::new(1.0 / pitch_m.value, 1.0 / pitch_m.value, 1.0));
    let start = pose_from_homography(&(pixel_from_pitches * scale), lens).ok_or(MeasureError::NoPose)?;
    let pitches_from_pixel = pixel_from_pitches.try_inverse().ok_or(MeasureError::NoPose)?;
    let place = |at: PixelPoint| {
        let place = pitches_from_pixel * Vector3::new(at.x_px, at.y_px, 1.0);
        [place.x / place.z, place.y / place.z]
    };
    let middle = lens.size_px.map(|size| size / 2.0);
    let from_middle = |point: &RuledPoint| (at_of(point).x_px - middle[0]).hypot(at_of(point).y_px - middle[1]);
    let origin = ruling.points.iter().min_by(|a, b| from_middle(a).total_cmp(&from_middle(b)));
    let print = |point: &RuledPoint| {
        let (sharpness, place) = match *point {
            RuledPoint::Crossing { index, covariance, .. } => (Sharpness::Point(covariance), index.map(f64::from)),
            RuledPoint::OnLine { at, index, across, u_px } => {
                let on_line = place_on_line(ruling.families, index, place(at));
                let line = Sharpness::Line { across, u_px };
                (if origin == Some(point) { pinned(across, u_px) } else { line }, on_line)
            }
        };
        PrintObservation { view, at: at_of(point), sharpness, place: PrintPlace::Lines(place), weight: 1.0 }
    };
    Ok(RulingView { start, prints: ruling.points.iter().map(print).collect() })
}

fn at_of(point: &RuledPoint) -> PixelPoint {
    match *point {
        RuledPoint::Crossing { at, .. } | RuledPoint::OnLine { at, .. } => at,
    }
}

fn place_on_line(families: Families, index: i32, seen: [f64; 2]) -> [f64; 2] {
    match families {
        Families::Level => [seen[0], f64::from(index)],
        Families::Upright | Families::Both => [f64::from(index), seen[1]],
    }
}

fn pinned([x, y]: [f64; 2], u_px: f64) -> Sharpness {
    let (across, along) = (u_px * u_px, ORIGIN_U_PX * ORIGIN_U_PX);
    Sharpness::Point(PixelCovariance {
        xx: x * x * across + y * y * along,
        xy: x * y * (across - along),
        yy: y * y * across + x * x * along,
    })
}

/// Moves points of single lines along them to where the camera sees them, but for the one that fixes the origin.
pub(super) fn slide(prints: &mut [PrintObservation], view: usize, camera: &Camera<f64>, families: Families, pitch_m: f64) {
    for print in prints.iter_mut().filter(|print| print.view == view && matches!(print.sharpness, Sharpness::Line { .. })) {
        let (PrintPlace::Lines(place), Some(TargetPoint { x_m, y_m })) = (print.place, camera.print_point(print.at)) else { continue };
        print.place = PrintPlace::Lines(match families {
            Families::Level => [x_m / pitch_m, place[1]],
            Families::Upright | Families::Both => [place[0], y_m / pitch_m],
        });
    }
}

fn across_both(points: &[RuledPoint]) -> Option<Matrix3<f64>> {
    let pair = |point: &RuledPoint| match *point {
        RuledPoint::Crossing { at, index, .. } => Some((index.map(f64::from), [at.x_px, at.y_px])),
        RuledPoint::OnLine { .. } => None,
    };
    let pairs: Vec<([f64; 2], [f64; 2])> = points.iter().filter_map(pair).collect();
    target::homography(&pairs).map(|h| Matrix3::from_fn(|row, column| h[row][column]))
}

/// Square-on, scale and direction as the middle of the points shows them.
fn across_one(ruling: &Ruling) -> Option<Matrix3<f64>> {
    let lines: Vec<(PixelPoint, f64, [f64; 2])> = ruling
        .points
        .iter()
        .filter_map(|point| match *point {
            RuledPoint::OnLine { at, index, across, .. } => Some((at, f64::from(index), across)),
            RuledPoint::Crossing { .. } => None,
        })
        .collect();
    let (at, index, [x, y]) = *lines.get(lines.len() / 2)?;
    let p = ruling.period_px;
    // `across` points where numbers rise: to the right for upright lines, up for level ones. y runs down in a photo.
    let (right, up, number) = match ruling.families {
        Families::Level => ([-y * p, x * p], [x * p, y * p], [0.0, index]),
        Families::Upright | Families::Both => ([x * p, y * p], [y * p, -x * p], [index, 0.0]),
    };
    let origin = [0, 1].map(|c| [at.x_px, at.y_px][c] - number[0] * right[c] - number[1] * up[c]);
    Some(Matrix3::new(right[0], up[0], origin[0], right[1], up[1], origin[1], 0.0, 0.0, 1.0))
}
