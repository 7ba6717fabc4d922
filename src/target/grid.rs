//! Giving each blob its place on a regular grid, growing outward from a seed with locally predicted steps.

use std::collections::{BTreeMap, HashMap, VecDeque};

use super::{blobs::Blob, paper::small_f64};
use crate::frames::PixelPoint;

/// Which blob sits at which grid place. Origin and axes are arbitrary until the marks are known.
/// Sorted, so that the same photo always gives the same figures to the last digit.
pub(super) type Places = BTreeMap<(i32, i32), usize>;

/// A displacement in the photo, px.
type Step = [f64; 2];

/// Farthest that a neighbour may lie from its predicted place, in steps.
const GROW_TOLERANCE: f64 = 0.22;

/// Seeds that are tried before the largest grid so far is taken.
const MOST_SEEDS: usize = 24;

/// The four ways along the grid.
const WAYS: [(i32, i32); 4] = [(1, 0), (-1, 0), (0, 1), (0, -1)];

/// The largest regular grid among the blobs.
pub(super) fn largest_grid(blobs: &[Blob]) -> Places {
    let near = Buckets::new(blobs);
    let mut crosses: Vec<Cross> = (0..blobs.len()).filter_map(|n| Cross::at(n, blobs, &near)).collect();
    crosses.sort_by(|a, b| a.misfit.total_cmp(&b.misfit));
    let mut best = Places::new();
    let mut used = vec![false; blobs.len()];
    let mut tried = 0;
    for cross in &crosses {
        if tried == MOST_SEEDS || 2 * best.len() > blobs.len() {
            break;
        }
        if used[cross.blob] {
            continue;
        }
        tried += 1;
        let places = grow(cross, blobs, &near);
        for blob in places.values() {
            used[*blob] = true;
        }
        if places.len() > best.len() {
            best = places;
        }
    }
    best
}

/// A blob with a neighbour on either side along two directions.
struct Cross {
    blob: usize,
    steps: [Step; 2],
    misfit: f64,
}

impl Cross {
    /// The cross around blob `n`. Neighbours are compared after the blob's own ellipse has been made a
    /// circle, which takes the obliquity of the view away: there the grid is square.
    fn at(n: usize, blobs: &[Blob], near: &Buckets) -> Option<Self> {
        let centre = blobs[n].at;
        let round = Rounding::of(&blobs[n])?;
        let mut around: Vec<(Step, Step, f64)> = near
            .nearest(centre, 12, n)
            .into_iter()
            .map(|m| {
                let step = [blobs[m].at.x_px - centre.x_px, blobs[m].at.y_px - centre.y_px];
                let rounded = round.apply(step);
                (step, rounded, rounded[0].hypot(rounded[1]))
            })
            .collect();
        around.sort_by(|a, b| a.2.total_cmp(&b.2));
        let (first, first_back) = around.iter().find_map(|a| Some((a, opposite(a, &around)?)))?;
        let (second, second_back) = around.iter().find_map(|b| {
            let cosine = (first.1[0] * b.1[0] + first.1[1] * b.1[1]) / (first.2 * b.2);
            let square = cosine.abs() < 0.45 && (0.7..1.45).contains(&(b.2 / first.2));
            square.then(|| Some((b, opposite(b, &around)?)))?
        })?;
        let mean = |a: &Step, b: &Step| [(a[0] - b[0]) / 2.0, (a[1] - b[1]) / 2.0];
        let misfit = closure(&first.0, &first_back) + closure(&second.0, &second_back) + (second.2 / first.2).ln().abs();
        Some(Self { blob: n, steps: [mean(&first.0, &first_back), mean(&second.0, &second_back)], misfit })
    }
}

/// The neighbour that lies opposite `a`, if there is one.
fn opposite(a: &(Step, Step, f64), around: &[(Step, Step, f64)]) -> Option<Step> {
    around.iter().map(|b| b.0).filter(|b| closure(&a.0, b) < 0.2).min_by(|p, q| closure(&a.0, p).total_cmp(&closure(&a.0, q)))
}

/// How far two opposite steps are from cancelling, in steps.
fn closure(a: &Step, b: &Step) -> f64 {
    (a[0] + b[0]).hypot(a[1] + b[1]) / a[0].hypot(a[1]).max(f64::MIN_POSITIVE)
}

/// The symmetric map that makes a blob's ellipse a circle (inverse square root of its moments).
struct Rounding([f64; 3]);

impl Rounding {
    fn of(blob: &Blob) -> Option<Self> {
        let [xx, xy, yy] = blob.moments_px2;
        let root_det = (xx * yy - xy * xy).sqrt();
        let trace_root = (xx + yy + 2.0 * root_det).sqrt();
        // sqrt(M) = (M + sqrt(det) 1) / sqrt(tr M + 2 sqrt(det)); its inverse has swapped diagonal over the determinant.
        let (sxx, sxy, syy) = ((xx + root_det) / trace_root, xy / trace_root, (yy + root_det) / trace_root);
        let det = sxx * syy - sxy * sxy;
        (det > 0.0 && det.is_finite()).then(|| Self([syy / det, -sxy / det, sxx / det]))
    }

    fn apply(&self, s: Step) -> Step {
        [self.0[0] * s[0] + self.0[1] * s[1], self.0[1] * s[0] + self.0[2] * s[1]]
    }
}

/// Grows a grid from a cross, each step predicted from the steps next to it.
fn grow(cross: &Cross, blobs: &[Blob], near: &Buckets) -> Places {
    let mut places = Places::new();
    let mut taken = vec![false; blobs.len()];
    let mut queue = VecDeque::from([((0, 0), cross.steps)]);
    places.insert((0, 0), cross.blob);
    taken[cross.blob] = true;
    while let Some((index, inherited)) = queue.pop_front() {
        let Some(&here) = places.get(&index) else { continue };
        let steps = [0, 1].map(|axis| local_step(index, axis, &places, blobs).unwrap_or(inherited[axis]));
        for way in WAYS {
            let next = (index.0 + way.0, index.1 + way.1);
            if places.contains_key(&next) {
                continue;
            }
            let step = [0, 1].map(|c| f64::from(way.0) * steps[0][c] + f64::from(way.1) * steps[1][c]);
            let at = PixelPoint { x_px: blobs[here].at.x_px + step[0], y_px: blobs[here].at.y_px + step[1] };
            let reach = GROW_TOLERANCE * step[0].hypot(step[1]);
            let Some(found) = near.closest(at, reach, blobs).filter(|m| !taken[*m]) else { continue };
            places.insert(next, found);
            taken[found] = true;
            queue.push_back((next, steps));
        }
    }
    places
}

/// Step along `axis` at a place, from its neighbours on the grid, where there are any.
fn local_step(index: (i32, i32), axis: usize, places: &Places, blobs: &[Blob]) -> Option<Step> {
    let (di, dj) = if axis == 0 { (1, 0) } else { (0, 1) };
    let at = |n: i32| places.get(&(index.0 + n * di, index.1 + n * dj)).map(|m| blobs[*m].at);
    let step = |from: PixelPoint, to: PixelPoint, over: f64| [(to.x_px - from.x_px) / over, (to.y_px - from.y_px) / over];
    match (at(-1), at(0), at(1)) {
        (Some(a), _, Some(b)) => Some(step(a, b, 2.0)),
        (Some(a), Some(b), None) | (None, Some(a), Some(b)) => Some(step(a, b, 1.0)),
        _ => None,
    }
}

/// Blobs sorted into squares of the photo, for finding neighbours.
struct Buckets {
    side_px: f64,
    squares: HashMap<(i32, i32), Vec<usize>>,
    points: Vec<PixelPoint>,
}

impl Buckets {
    fn new(blobs: &[Blob]) -> Self {
        let points: Vec<PixelPoint> = blobs.iter().map(|blob| blob.at).collect();
        let span = |v: fn(&PixelPoint) -> f64| {
            let (low, high) = points.iter().map(v).fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), x| (l.min(x), h.max(x)));
            (high - low).max(1.0)
        };
        let area = if points.is_empty() { 1.0 } else { span(|p| p.x_px) * span(|p| p.y_px) };
        let side_px = (area / small_f64(points.len().max(1))).sqrt().max(4.0);
        let mut squares: HashMap<(i32, i32), Vec<usize>> = HashMap::new();
        for (n, point) in points.iter().enumerate() {
            squares.entry(square_of(*point, side_px)).or_default().push(n);
        }
        Self { side_px, squares, points }
    }

    /// Up to `count` nearest blobs (of the square and its surroundings) without blob `me`.
    fn nearest(&self, at: PixelPoint, count: usize, me: usize) -> Vec<usize> {
        let mut found: Vec<usize> = Vec::new();
        for ring in 2..6 {
            found = self.within_ring(at, ring).filter(|n| *n != me).collect();
            if found.len() >= count {
                break;
            }
        }
        found.sort_by(|a, b| at.distance_px(self.points[*a]).total_cmp(&at.distance_px(self.points[*b])));
        found.truncate(count);
        found
    }

    /// The blob nearest to `at` within `reach_px`.
    fn closest(&self, at: PixelPoint, reach_px: f64, blobs: &[Blob]) -> Option<usize> {
        let ring = ring_for(reach_px / self.side_px);
        self.within_ring(at, ring)
            .map(|n| (n, at.distance_px(blobs[n].at)))
            .filter(|(_, distance)| *distance <= reach_px)
            .min_by(|a, b| a.1.total_cmp(&b.1))
            .map(|(n, _)| n)
    }

    fn within_ring(&self, at: PixelPoint, ring: i32) -> impl Iterator<Item = usize> + '_ {
        let (x, y) = square_of(at, self.side_px);
        (y - ring..=y + ring)
            .flat_map(move |y| (x - ring..=x + ring).map(move |x| (x, y)))
            .filter_map(|square| self.squares.get(&square))
            .flatten()
            .copied()
    }
}

#[expect(clippy::cast_possible_truncation, reason = "photo coordinates over at least 4 px lie far inside i32; the cast saturates")]
fn square_of(at: PixelPoint, side_px: f64) -> (i32, i32) {
    ((at.x_px / side_px).floor() as i32, (at.y_px / side_px).floor() as i32)
}

#[expect(clippy::cast_possible_truncation, reason = "clamped to 1..=8")]
fn ring_for(squares: f64) -> i32 {
    squares.ceil().clamp(1.0, 8.0) as i32
}
