//! A sheet of paper as a scale in the plane of the screen: which way it lies, its axes, and its edges as observations.
//!
//! Origin is the corner at the lower left as displayed, X to the right, Y up; sheets look the same after half a turn, so nothing on the
//! sheet could tell more.

use super::{MeasureError, view::pose_from_homography};
use crate::{
    bench::SheetFormat,
    fit::{
        PrintObservation, PrintPlace, Sharpness, SheetEdge,
        setup::{LensKnowledge, ViewStart},
    },
    frames::{PixelPoint, TargetPoint},
    optics::Camera,
    quantity::Quantity,
    target::{self, Outline},
};
use nalgebra::Matrix3;

/// A sheet with the camera that sees it.
pub(super) struct SheetView {
    pub(super) start: ViewStart,
    pub(super) prints: Vec<PrintObservation>,
    /// Along X and along Y, m.
    pub(super) sides_m: [Quantity; 2],
}

/// How far the two axes of a pose may differ in length or from a right angle, relative: corners are good to a pixel or two, and nobody
/// knows the principal point and the lens distortion yet.
const POSE_UR: f64 = 0.03;
/// One way up must fit better than the other by this much, in units of chi-square.
const CLEARLY: f64 = 6.0;

/// The sheet lying lengthwise or upright, whichever a camera with square pixels can see as the outline looks.
pub(super) fn sheet_view(view: usize, outline: &Outline, format: SheetFormat, lens: &LensKnowledge) -> Result<SheetView, MeasureError> {
    let corners = from_lower_left(&outline.corners);
    let ([short, long], [u_short, u_long]) = (format.sides_m(), format.tolerance_m().map(|limit| limit / 3f64.sqrt()));
    let (upright, lengthwise) = (
        [Quantity::normal(short, u_short), Quantity::normal(long, u_long)],
        [Quantity::normal(long, u_long), Quantity::normal(short, u_short)],
    );
    let judged = [upright, lengthwise].map(|sides_m| {
        let pixel_from_metres = homography(&corners, sides_m);
        let misfit = pixel_from_metres.map_or(f64::INFINITY, |h| misfit(&h, lens));
        (misfit, sides_m, pixel_from_metres)
    });
    let (best, other) = if judged[0].0 <= judged[1].0 { (&judged[0], &judged[1]) } else { (&judged[1], &judged[0]) };
    if other.0 - best.0 < CLEARLY {
        return Err(MeasureError::SheetEitherWay);
    }
    let (sides_m, pixel_from_metres) = (best.1, best.2.ok_or(MeasureError::NoPose)?);
    let start = pose_from_homography(&pixel_from_metres, lens).ok_or(MeasureError::NoPose)?;
    let sheet_from_pixel = pixel_from_metres.try_inverse().ok_or(MeasureError::NoPose)?;
    let at_edge = |at: PixelPoint| {
        let place = sheet_from_pixel * nalgebra::Vector3::new(at.x_px, at.y_px, 1.0);
        [place.x / place.z / sides_m[0].value, place.y / place.z / sides_m[1].value]
    };
    let mut prints = Vec::new();
    for (number, edge) in outline.edges.iter().enumerate() {
        // Edge n runs from corner n to the next one; the middle of it tells which side of the sheet it is.
        let [a, b] = [outline.corners[number], outline.corners[(number + 1) % 4]];
        let side = nearest_edge(at_edge(PixelPoint { x_px: f64::midpoint(a.x_px, b.x_px), y_px: f64::midpoint(a.y_px, b.y_px) }));
        prints.extend(edge.iter().map(|point| PrintObservation {
            view,
            at: point.at,
            sharpness: Sharpness::Line { across: point.across, u_px: point.u_px },
            place: PrintPlace::Sheet { edge: side, along: along(side, at_edge(point.at)) },
            weight: 1.0,
        }));
    }
    Ok(SheetView { start, prints, sides_m })
}

/// The edge that a place, in shares of width and height, lies nearest to.
fn nearest_edge(place: [f64; 2]) -> SheetEdge {
    let off = |edge: &SheetEdge| {
        let (axis, level) = edge.level();
        (place[axis] - level).abs()
    };
    SheetEdge::ALL.into_iter().min_by(|a, b| off(a).total_cmp(&off(b))).unwrap_or(SheetEdge::Left)
}

/// Place along an edge of a place near it.
fn along(edge: SheetEdge, place: [f64; 2]) -> f64 {
    place[1 - edge.level().0]
}

/// Moves each point's place along its edge to where the camera sees it, once the camera is known.
///
/// Across the edge nothing changes. Along it the place need not be better than some pixels: what counts is the distance from the edge.
pub(super) fn slide(prints: &mut [PrintObservation], view: usize, camera: &Camera<f64>, sides_m: [f64; 2]) {
    for print in prints.iter_mut().filter(|print| print.view == view) {
        let (PrintPlace::Sheet { edge, .. }, Some(TargetPoint { x_m, y_m })) = (print.place, camera.print_point(print.at)) else {
            continue;
        };
        print.place = PrintPlace::Sheet { edge, along: along(edge, [x_m / sides_m[0], y_m / sides_m[1]]) };
    }
}

/// Corners counter-clockwise as displayed, from the lower left one: the turn that points X most to the right.
fn from_lower_left(clockwise: &[PixelPoint; 4]) -> [PixelPoint; 4] {
    let [a, b, c, d] = *clockwise;
    let turning = [d, c, b, a];
    let turned = |n: usize| -> [PixelPoint; 4] { std::array::from_fn(|corner| turning[(corner + n) % 4]) };
    let rightness = |corners: &[PixelPoint; 4]| {
        let (dx, dy) = (corners[1].x_px - corners[0].x_px, corners[1].y_px - corners[0].y_px);
        let (ex, ey) = (corners[2].x_px - corners[3].x_px, corners[2].y_px - corners[3].y_px);
        dx / dx.hypot(dy) + ex / ex.hypot(ey)
    };
    (0..4).map(turned).max_by(|a, b| rightness(a).total_cmp(&rightness(b))).unwrap_or(turning)
}

fn homography(corners: &[PixelPoint; 4], [width, height]: [Quantity; 2]) -> Option<Matrix3<f64>> {
    let (w, h) = (width.value, height.value);
    let places = [[0.0, 0.0], [w, 0.0], [w, h], [0.0, h]];
    let pairs: Vec<([f64; 2], [f64; 2])> = places.into_iter().zip(corners.iter().map(|c| [c.x_px, c.y_px])).collect();
    target::homography(&pairs).map(|h| Matrix3::from_fn(|row, column| h[row][column]))
}

/// Chi-square of "both axes equally long and at right angles" over all focal lengths that the lens may have.
///
/// Source: the two constraints on the homography of a plane, `[Zhang2000]` section 2.3.
fn misfit(pixel_from_metres: &Matrix3<f64>, lens: &LensKnowledge) -> f64 {
    const STEPS: i32 = 30;
    let [cx, cy] = lens.size_px.map(|size| (size - 1.0) / 2.0);
    let ur = lens.u_focal_px / lens.focal_px;
    let at = |step: i32| {
        let z = 3.0 * f64::from(step) / f64::from(STEPS);
        let focal = lens.focal_px * (z * ur).exp();
        let axis = |column: usize| {
            let h = pixel_from_metres.column(column);
            nalgebra::Vector3::new((h[0] - cx * h[2]) / focal, (h[1] - cy * h[2]) / focal, h[2])
        };
        let (x, y) = (axis(0), axis(1));
        let cosine = x.dot(&y) / (x.norm() * y.norm());
        let ratio = (x.norm() / y.norm()).ln();
        (cosine.powi(2) + ratio.powi(2)) / POSE_UR.powi(2) + z * z
    };
    (-STEPS..=STEPS).map(at).fold(f64::INFINITY, f64::min)
}
