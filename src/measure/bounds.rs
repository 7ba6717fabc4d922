//! How far the screen is known to reach, where only marks tell: not beyond them.

use crate::{
    bench::{Bench, Target, TargetKind},
    frames::PixelPoint,
    spots::Spot,
};

/// Spots this far outside the outermost marks, as a share of the marks' extent, still count as inside.
const MARGIN: f64 = 0.01;

/// Whether a spot lies on the part of the screen that the marks enclose; always so where no marks are stated.
pub(super) fn on_screen(bench: &Bench, spot: &Spot) -> bool {
    let Some(Target { kind: TargetKind::Marks { marks, .. }, .. }) = &bench.target else { return true };
    let hull = convex_hull(marks.iter().map(|(pixel, _)| [pixel.x_px, pixel.y_px]).collect());
    inside(&widened(&hull), spot.at)
}

/// Corners of the convex hull, counter-clockwise in a frame with y up (Andrew's monotone chain).
fn convex_hull(mut points: Vec<[f64; 2]>) -> Vec<[f64; 2]> {
    points.sort_by(|a, b| a[0].total_cmp(&b[0]).then(a[1].total_cmp(&b[1])));
    let chain = |points: &mut dyn Iterator<Item = [f64; 2]>| {
        let mut hull: Vec<[f64; 2]> = Vec::new();
        for point in points {
            while hull.len() >= 2 && turn(hull[hull.len() - 2], hull[hull.len() - 1], point) <= 0.0 {
                hull.pop();
            }
            hull.push(point);
        }
        hull.pop();
        hull
    };
    let mut hull = chain(&mut points.iter().copied());
    hull.extend(chain(&mut points.iter().rev().copied()));
    hull
}

/// Twice the signed area of a triangle.
fn turn(a: [f64; 2], b: [f64; 2], c: [f64; 2]) -> f64 {
    (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
}

fn widened(hull: &[[f64; 2]]) -> Vec<[f64; 2]> {
    #[expect(clippy::cast_precision_loss, reason = "a handful of marks")]
    let count = hull.len().max(1) as f64;
    let centre = [0, 1].map(|axis| hull.iter().map(|corner| corner[axis]).sum::<f64>() / count);
    hull.iter().map(|corner| [0, 1].map(|axis| centre[axis] + (corner[axis] - centre[axis]) * (1.0 + MARGIN))).collect()
}

fn inside(hull: &[[f64; 2]], at: PixelPoint) -> bool {
    let point = [at.x_px, at.y_px];
    (0..hull.len()).all(|i| turn(hull[i], hull[(i + 1) % hull.len()], point) >= 0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_point_inside_the_corners_is_inside_whatever_their_order() {
        for corners in [[[0.0, 0.0], [10.0, 0.0], [10.0, 8.0], [0.0, 8.0]], [[10.0, 8.0], [0.0, 0.0], [0.0, 8.0], [10.0, 0.0]]] {
            let hull = convex_hull(corners.to_vec());
            assert_eq!(hull.len(), 4);
            assert!(inside(&hull, PixelPoint { x_px: 5.0, y_px: 4.0 }));
            assert!(!inside(&hull, PixelPoint { x_px: 11.0, y_px: 4.0 }));
        }
    }
}
