//! Painted sheets of known outline: clutter, perspective, a bent lens, quarter turns.

use super::{Outline, read_outline};
use crate::{
    frames::PixelPoint,
    photo::{Light, Noise},
    target::{TargetError, homography},
};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

const SIZE: [usize; 2] = [1400, 1050];
const NOISE: f64 = 0.004;
/// Pixels are sampled on a grid of this many places each way.
const FINE: usize = 4;

/// A sheet, its ground and what lies about.
struct Painted<'a> {
    /// Corners in the undistorted picture, clockwise from upper left.
    corners: [[f64; 2]; 4],
    /// First radial coefficient, over the square of half the picture's width.
    k1: f64,
    /// Light of things in front of sheet and ground at a pixel.
    clutter: &'a dyn Fn(f64, f64) -> Option<f64>,
    seed: u64,
}

const CORNERS: [[f64; 2]; 4] = [[210.0, 180.0], [1180.0, 120.0], [1110.0, 880.0], [270.0, 820.0]];

fn nothing(_: f64, _: f64) -> Option<f64> {
    None
}

impl Painted<'_> {
    fn undistorted(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        let centre = SIZE.map(|side| (side as f64 - 1.0) / 2.0);
        let half = SIZE[0] as f64 / 2.0;
        let (u, v) = ((x - centre[0]) / half, (y - centre[1]) / half);
        let radial = 1.0 + self.k1 * (u * u + v * v);
        [centre[0] + half * u * radial, centre[1] + half * v * radial]
    }

    /// Signed distance to the straight line of a side, positive outside.
    fn outside(&self, side: usize, p: [f64; 2]) -> f64 {
        let (a, b) = (self.corners[side], self.corners[(side + 1) % 4]);
        let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
        (dy * (p[0] - a[0]) - dx * (p[1] - a[1])) / dx.hypot(dy)
    }

    fn light(&self, x: f64, y: f64) -> f64 {
        if let Some(light) = (self.clutter)(x, y) {
            return light;
        }
        let p = self.undistorted([x, y]);
        // A soft step of half a pixel, and shade across sheet and ground.
        let off = (0..4).map(|side| self.outside(side, p)).fold(f64::MIN, f64::max);
        let paper = (0.5 - off).clamp(0.0, 1.0);
        let shade = 1.0 + 0.2 * (x / SIZE[0] as f64 - 0.5);
        shade * (0.08 + 0.42 * paper)
    }

    fn photo(&self) -> Light {
        let mut rng = ChaCha8Rng::seed_from_u64(self.seed);
        let fine = |n: usize| (n as f64 + 0.5) / FINE as f64 - 0.5;
        let pixel = |n: usize| {
            let (x, y) = ((n % SIZE[0]) as f64, (n / SIZE[0]) as f64);
            let places = (0..FINE * FINE).map(|k| self.light(x + fine(k % FINE), y + fine(k / FINE)));
            let mean = places.sum::<f64>() / (FINE * FINE) as f64;
            let noise: f64 = StandardNormal.sample(&mut rng);
            (mean + NOISE * noise) as f32
        };
        let value = (0..SIZE[0] * SIZE[1]).map(pixel).collect();
        Light { width: SIZE[0], height: SIZE[1], value, noise: Noise { a: NOISE * NOISE, b: 0.0 } }
    }

    /// Distances of the points from the painted edges in standard uncertainties and in px.
    fn pulls(&self, outline: &Outline) -> Vec<(f64, f64)> {
        let pull = |point: &super::EdgePoint| {
            let at = self.undistorted([point.at.x_px, point.at.y_px]);
            let nearest = (0..4).map(|side| self.outside(side, at)).min_by(|a, b| a.abs().total_cmp(&b.abs())).unwrap();
            (nearest / point.u_px, nearest)
        };
        outline.edges.iter().flatten().map(pull).collect()
    }
}

fn rms(values: impl Iterator<Item = f64>) -> f64 {
    let (n, sum) = values.fold((0.0, 0.0), |(n, sum), v| (n + 1.0, sum + v * v));
    (sum / n).sqrt()
}

fn assert_points_are_right(painted: &Painted, least: usize, what: &str) {
    let outline = read_outline(&painted.photo()).unwrap();
    let pulls = painted.pulls(&outline);
    let (pull, px) = (rms(pulls.iter().map(|p| p.0)), rms(pulls.iter().map(|p| p.1)));
    println!("{what}: {} points, rms {px:.3} px, pull {pull:.2}", pulls.len());
    assert!(pulls.len() >= least, "{what}: {} points", pulls.len());
    assert!((0.6..1.4).contains(&pull), "{what}: rms pull {pull}");
    assert!(px < 0.1, "{what}: rms {px} px");
    assert!(pulls.iter().all(|p| p.0.abs() < 6.0), "{what}: a point is off by {pulls:?}");
}

#[test]
fn a_sheet_in_perspective() {
    assert_points_are_right(&Painted { corners: CORNERS, k1: 0.0, clutter: &nothing, seed: 1 }, 300, "plain");
}

#[test]
fn a_lens_bends_the_edges() {
    for k1 in [-0.02, 0.02] {
        assert_points_are_right(&Painted { corners: CORNERS, k1, clutter: &nothing, seed: 2 }, 300, "bent");
    }
}

/// Dark clips over the edge, a bright hand that touches it from outside, a lamp elsewhere, magnets within.
#[test]
fn clutter_about_the_edges_is_left_out() {
    let disc = |x: f64, y: f64, at: [f64; 2], radius: f64| (x - at[0]).hypot(y - at[1]) < radius;
    let clutter = |x: f64, y: f64| {
        let clip = disc(x, y, [600.0, 155.0], 45.0) || disc(x, y, [240.0, 500.0], 30.0) || disc(x, y, [700.0, 500.0], 60.0);
        let hand = (1100.0..1400.0).contains(&x) && (600.0..720.0).contains(&y);
        let lamp = x < 120.0 && y < 90.0;
        if clip {
            Some(0.02)
        } else if hand {
            Some(0.4)
        } else {
            lamp.then_some(1.0)
        }
    };
    assert_points_are_right(&Painted { corners: CORNERS, k1: 0.0, clutter: &clutter, seed: 3 }, 220, "clutter");
}

#[test]
fn a_corner_beyond_the_rim() {
    let corners = [[-60.0, 60.0], [1180.0, 120.0], [1110.0, 880.0], [200.0, 860.0]];
    let painted = Painted { corners, k1: 0.0, clutter: &nothing, seed: 4 };
    assert_points_are_right(&painted, 250, "cut");
    let outline = read_outline(&painted.photo()).unwrap();
    let near = |corner: &PixelPoint| corner.distance_px(PixelPoint { x_px: -60.0, y_px: 60.0 }) < 5.0;
    assert!(outline.corners.iter().any(near), "{:?}", outline.corners);
}

/// The fitted plane view: all edge points together, by the corners that the edges' lines make.
#[test]
fn corners_pull_near_one_over_many_photos() {
    let mut squares = Vec::new();
    for seed in 10..22 {
        let painted = Painted { corners: CORNERS, k1: 0.0, clutter: &nothing, seed };
        let outline = read_outline(&painted.photo()).unwrap();
        // Mean offset of every edge in its own uncertainty.
        for edge in &outline.edges {
            let weights: f64 = edge.iter().map(|p| p.u_px.powi(-2)).sum();
            let side = (0..4).min_by(|a, b| {
                let off = |side: usize| edge.iter().map(|p| painted.outside(side, [p.at.x_px, p.at.y_px]).abs()).sum::<f64>();
                off(*a).total_cmp(&off(*b))
            });
            let off = |p: &super::EdgePoint| painted.outside(side.unwrap(), [p.at.x_px, p.at.y_px]);
            let mean = edge.iter().map(|p| off(p) * p.u_px.powi(-2)).sum::<f64>() / weights;
            squares.push(mean * weights.sqrt());
        }
    }
    let pull = rms(squares.iter().copied());
    println!("offsets of whole edges: rms pull {pull:.2}");
    assert!((0.6..1.4).contains(&pull), "{pull}");
}

/// A photo turned by 90° shows the same edges, turned.
#[test]
fn a_quarter_turn_turns_the_outline() {
    let light = Painted { corners: CORNERS, k1: 0.01, clutter: &nothing, seed: 5 }.photo();
    let (w, h) = (light.width, light.height);
    // Clockwise: (x, y) goes to (h - 1 - y, x).
    let value = (0..w * h).map(|n| light.value[(h - 1 - n % h) * w + n / h]).collect();
    let turned = Light { width: h, height: w, value, noise: light.noise };
    let (a, b) = (read_outline(&light).unwrap(), read_outline(&turned).unwrap());
    let turn = |p: PixelPoint| [(h - 1) as f64 - p.y_px, p.x_px];
    let pairs: Vec<_> = a.corners.iter().map(|c| turn(*c)).collect();
    for corner in b.corners {
        let off = pairs.iter().map(|p| (p[0] - corner.x_px).hypot(p[1] - corner.y_px)).fold(f64::MAX, f64::min);
        assert!(off < 2.0, "{corner:?}: {pairs:?}");
    }
    // The unit square to the corners of both: the same map up to the turn.
    assert!(homography(&[[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]].into_iter().zip(pairs).collect::<Vec<_>>()).is_some());
    let count = |outline: &Outline| outline.edges.iter().map(Vec::len).sum::<usize>();
    assert!(count(&a).abs_diff(count(&b)) < 20, "{} {}", count(&a), count(&b));
}

#[test]
fn no_sheet_is_refused() {
    let mut rng = ChaCha8Rng::seed_from_u64(9);
    let mut noise = |scale: f64| -> f64 { scale * Distribution::<f64>::sample(&StandardNormal, &mut rng) };
    let flat = (0..640 * 480).map(|_| (0.3 + noise(0.01)) as f32).collect();
    let disc = (0..640_usize * 480).map(|n| {
        let (x, y) = ((n % 640) as f64, (n / 640) as f64);
        if (x - 320.0).hypot(y - 240.0) < 180.0 { 0.6 } else { 0.1 }
    });
    for value in [flat, disc.collect()] {
        let light = Light { width: 640, height: 480, value, noise: Noise { a: 1e-4, b: 0.0 } };
        let error = read_outline(&light).unwrap_err();
        assert!(matches!(error, TargetError::NoSheet { .. } | TargetError::SheetEdgesHidden { .. }), "{error}");
    }
    let small = Light { width: 9, height: 9, value: vec![0.0; 81], noise: Noise { a: 0.0, b: 0.0 } };
    assert!(matches!(read_outline(&small), Err(TargetError::PhotoTooSmall { .. })));
    let nan = Light { width: 64, height: 64, value: vec![f32::NAN; 64 * 64], noise: Noise { a: 0.0, b: 0.0 } };
    assert!(read_outline(&nan).is_err());
}
