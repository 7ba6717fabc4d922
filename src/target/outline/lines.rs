//! Straight lines among points, most of which may belong to other lines or to none.

use crate::math::count;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// A line `normal · p = offset`, `normal` of unit length.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Line {
    pub(super) normal: [f64; 2],
    pub(super) offset: f64,
}

/// Pairs of points tried for each line: a line that holds a tenth of the points is missed once in 400 times.
const TRIALS: usize = 600;
/// Refits of a line to the points near it.
const REFITS: usize = 3;

impl Line {
    pub(super) fn through(a: [f64; 2], b: [f64; 2]) -> Option<Self> {
        let length = (b[0] - a[0]).hypot(b[1] - a[1]);
        let normal = [(a[1] - b[1]) / length, (b[0] - a[0]) / length];
        (length > 0.0).then(|| Self { normal, offset: normal[0] * a[0] + normal[1] * a[1] })
    }

    /// Signed distance, positive on the side of the normal.
    pub(super) fn distance(&self, p: [f64; 2]) -> f64 {
        self.normal[0] * p[0] + self.normal[1] * p[1] - self.offset
    }

    /// The same line with its normal towards `p`.
    pub(super) fn facing(self, p: [f64; 2]) -> Self {
        if self.distance(p) >= 0.0 { self } else { Self { normal: self.normal.map(|n| -n), offset: -self.offset } }
    }

    pub(super) fn crossing(&self, other: &Self) -> Option<[f64; 2]> {
        let ([a, b], [c, d]) = (self.normal, other.normal);
        let sine = a * d - b * c;
        let point = [(self.offset * d - other.offset * b) / sine, (a * other.offset - c * self.offset) / sine];
        (sine.abs() > 1e-6).then_some(point)
    }

    /// Least squares of the distances: the line along the longer principal axis.
    fn fitted(points: &[[f64; 2]]) -> Option<Self> {
        let n = count(points.len());
        let mean = [0, 1].map(|c| points.iter().map(|p| p[c]).sum::<f64>() / n);
        let (xx, xy, yy) = points
            .iter()
            .map(|p| [p[0] - mean[0], p[1] - mean[1]])
            .fold((0.0, 0.0, 0.0), |(xx, xy, yy), [x, y]| (xx + x * x, xy + x * y, yy + y * y));
        let along = 0.5 * (2.0 * xy).atan2(xx - yy);
        let normal = [-along.sin(), along.cos()];
        (points.len() > 1).then(|| Self { normal, offset: normal[0] * mean[0] + normal[1] * mean[1] })
    }
}

/// The lines that hold most of the points, one after the other, each without the points of those before.
///
/// - `within`: distance up to which a point belongs to a line
/// - `least`: fewest points of a line
/// - `most`: number of lines
///
/// Random sample consensus (Fischler & Bolles 1981) with a fixed seed, each line refitted to its points.
pub(super) fn dominant_lines(points: &[[f64; 2]], within: f64, least: usize, most: usize) -> Vec<Line> {
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    let mut rest = points.to_vec();
    let mut lines = Vec::new();
    while lines.len() < most && rest.len() >= least.max(2) {
        let near = |line: &Line| rest.iter().filter(|p| line.distance(**p).abs() <= within).count();
        let pair = |_| Line::through(rest[rng.random_range(0..rest.len())], rest[rng.random_range(0..rest.len())]);
        let best = (0..TRIALS).filter_map(pair).map(|line| (near(&line), line)).max_by_key(|(points, _)| *points);
        let Some((_, mut line)) = best else { break };
        for _ in 0..REFITS {
            let own: Vec<[f64; 2]> = rest.iter().copied().filter(|p| line.distance(*p).abs() <= within).collect();
            line = Line::fitted(&own).unwrap_or(line);
        }
        let before = rest.len();
        rest.retain(|p| line.distance(*p).abs() > within);
        if before - rest.len() < least {
            break;
        }
        lines.push(line);
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_lines_among_as_many_strays() {
        let mut points: Vec<[f64; 2]> = (0..200).map(f64::from).flat_map(|t| [[t, 10.0 + 0.1 * t], [50.0 - 0.2 * t, t]]).collect();
        points.extend((0..100).map(f64::from).map(|t| [t + 20.0, 150.0 - t]));
        points.extend((0..500).map(f64::from).map(|n| [(n * 37.7) % 200.0, (n * 91.3) % 200.0]));
        let lines = dominant_lines(&points, 1.0, 50, 8);
        let truth = [([0.0, 10.0], [100.0, 20.0]), ([50.0, 0.0], [30.0, 100.0]), ([20.0, 150.0], [120.0, 50.0])];
        for (a, b) in truth {
            assert!(lines.iter().any(|line| line.distance(a).abs() < 0.5 && line.distance(b).abs() < 0.5), "{a:?} {b:?}: {lines:?}");
        }
    }

    #[test]
    fn crossing_of_two_lines() {
        let a = Line::through([0.0, 0.0], [2.0, 2.0]).unwrap();
        let b = Line::through([0.0, 4.0], [4.0, 0.0]).unwrap();
        let [x, y] = a.crossing(&b).unwrap();
        assert!((x - 2.0).abs() < 1e-12 && (y - 2.0).abs() < 1e-12);
        assert!(a.crossing(&a).is_none() && Line::through([1.0, 1.0], [1.0, 1.0]).is_none());
    }
}
