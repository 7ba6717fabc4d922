//! How far the screen is known to reach: not beyond the marks, where only these tell, and not beyond a sheet's edges.

use super::look::{Print, Seen};
use crate::{
    bench::{Bench, Target, TargetKind},
    frames::PixelPoint,
    spots::Spot,
};

/// Spots this far outside the outermost marks, as a share of the marks' extent, still count as inside; likewise corners of a sheet.
const MARGIN: f64 = 0.01;

/// The part of a photo that shows the screen; all of it where nothing tells.
#[derive(Debug, Clone)]
pub(super) struct Reach(Option<Vec<[f64; 2]>>);

impl Reach {
    /// Of a photo of the pattern, from the marks or the sheet of its view.
    pub(super) fn of(photo: usize, view: usize, seen: &Seen, bench: &Bench) -> Self {
        let sheet = |print: &Print| match print {
            Print::Sheet(outline) => Some(outline.corners.map(|corner| [corner.x_px, corner.y_px]).to_vec()),
            Print::Dots(_) | Print::Ruling(_) => None,
        };
        let corners = match &bench.target {
            Some(Target { kind: TargetKind::Marks { marks, .. }, .. }) => {
                Some(marks.iter().map(|(pixel, _)| [pixel.x_px, pixel.y_px]).collect())
            }
            Some(_) => seen.targets.get(view).map(|target| &target.print).or(seen.patterns[photo].print.as_ref()).and_then(sheet),
            None => None,
        };
        Self(corners.map(|corners| widened(&convex_hull(corners))))
    }

    /// Whether a spot lies on the screen.
    pub(super) fn holds(&self, spot: &Spot) -> bool {
        self.0.as_ref().is_none_or(|hull| inside(hull, spot.at))
    }
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
