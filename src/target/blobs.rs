//! Dark, round, complete blobs on lighter paper.

use super::paper::{Binned, PaperLevel, small_f64};
use crate::frames::PixelPoint;
use image::GrayImage;
use imageproc::contrast::otsu_level;

/// A dark connected patch that may be a dot, in pixels of the photo.
#[derive(Debug, Clone, Copy)]
pub(super) struct Blob {
    /// Mean place of its pixels.
    pub(super) at: PixelPoint,
    /// Area, px².
    pub(super) area_px2: f64,
    /// Second central moments xx, xy, yy, px².
    pub(super) moments_px2: [f64; 3],
}

/// The least number of binned pixels that shows a shape.
const LEAST_AREA: f64 = 7.0;

/// Least ratio of minor to major axis. A disc seen 60° obliquely has 0.5; below 0.3 it is a stroke.
const LEAST_AXIS_RATIO: f64 = 0.3;

/// How far the area may differ from that of the ellipse with the same moments, beside pixel steps.
const ELLIPSE_TOLERANCE: f64 = 0.12;

/// Grey levels per paper level, so that glare up to twice the paper's light keeps its place.
const GREY_OF_PAPER: f32 = 128.0;
/// Every so many rows count.
const ROW_STEP: usize = 5;

/// Share of the paper level that parts ink from paper in this photo, by Otsu's criterion (largest
/// variance between the two classes; N. Otsu, IEEE Trans. SMC 9 (1979) 62, eq. 14 from memory).
pub(super) fn ink_threshold(plane: &Binned, paper: &PaperLevel) -> f32 {
    let mut ratios = GrayImage::new(image_side(plane.width), image_side(plane.height.div_ceil(ROW_STEP)));
    let mut line = vec![0.0_f32; plane.width];
    for (y, row) in (0..plane.height).step_by(ROW_STEP).zip(ratios.chunks_exact_mut(plane.width)) {
        paper.row(y, &mut line);
        let samples = &plane.value[y * plane.width..(y + 1) * plane.width];
        for ((sample, paper), grey) in samples.iter().zip(&line).zip(row) {
            *grey = if *paper > 0.0 { grey_level(sample / paper) } else { u8::MAX };
        }
    }
    (f32::from(otsu_level(&ratios)) + 1.0) / GREY_OF_PAPER
}

fn image_side(pixels: usize) -> u32 {
    u32::try_from(pixels).unwrap_or(u32::MAX)
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a cast to u8 saturates; NaN gives 0")]
fn grey_level(ratio: f32) -> u8 {
    (ratio * GREY_OF_PAPER) as u8
}

/// All dark patches below `threshold` × paper that look like complete discs seen from somewhere.
pub(super) fn round_blobs(plane: &Binned, paper: &PaperLevel, threshold: f32) -> Vec<Blob> {
    let patches = dark_patches(plane, paper, threshold);
    patches.iter().filter_map(|patch| patch.as_blob(plane)).collect()
}

/// Sums over the pixels of a connected patch, binned px.
#[derive(Debug, Clone, Copy, Default)]
struct Patch {
    n: f64,
    x: f64,
    y: f64,
    xx: f64,
    xy: f64,
    yy: f64,
    at_rim: bool,
}

/// Pixels `start..end` of one row.
#[derive(Debug, Clone, Copy)]
struct Run {
    start: usize,
    end: usize,
    label: usize,
}

/// Connected dark patches (4-neighbourhood), by runs and union-find.
fn dark_patches(plane: &Binned, paper: &PaperLevel, threshold: f32) -> Vec<Patch> {
    let mut parents: Vec<usize> = Vec::new();
    let mut patches: Vec<Patch> = Vec::new();
    let (mut previous, mut current): (Vec<Run>, Vec<Run>) = (Vec::new(), Vec::new());
    let mut line = vec![0.0_f32; plane.width];
    for y in 0..plane.height {
        paper.row(y, &mut line);
        current.clear();
        find_runs(&plane.value[y * plane.width..(y + 1) * plane.width], &line, threshold, &mut current);
        let mut from = 0;
        for run in &mut current {
            run.label = patches.len();
            parents.push(run.label);
            patches.push(Patch::of_run(*run, y, plane));
            while from < previous.len() && previous[from].end <= run.start {
                from += 1;
            }
            for above in previous[from..].iter().take_while(|above| above.start < run.end) {
                let (a, b) = (root(&mut parents, above.label), root(&mut parents, run.label));
                parents[a.max(b)] = a.min(b);
            }
        }
        std::mem::swap(&mut previous, &mut current);
    }
    for label in (0..patches.len()).rev() {
        let root = parents[label];
        if root != label {
            let part = patches[label];
            patches[root].add(&part);
            patches[label] = Patch::default();
        }
    }
    patches
}

fn root(parents: &mut [usize], mut label: usize) -> usize {
    while parents[label] != label {
        parents[label] = parents[parents[label]];
        label = parents[label];
    }
    label
}

fn find_runs(samples: &[f32], paper: &[f32], threshold: f32, runs: &mut Vec<Run>) {
    let mut start = None;
    for (x, (sample, paper)) in samples.iter().zip(paper).enumerate() {
        match (*sample < threshold * paper, start) {
            (true, None) => start = Some(x),
            (false, Some(from)) => {
                runs.push(Run { start: from, end: x, label: 0 });
                start = None;
            }
            _ => {}
        }
    }
    if let Some(from) = start {
        runs.push(Run { start: from, end: samples.len(), label: 0 });
    }
}

impl Patch {
    fn of_run(run: Run, y: usize, plane: &Binned) -> Self {
        let n = small_f64(run.end - run.start);
        let y_f = small_f64(y);
        let middle = (small_f64(run.start) + small_f64(run.end) - 1.0) / 2.0;
        let x = n * middle;
        // Sum of squares of n consecutive integers about their middle: n (n² - 1) / 12.
        let xx = x * middle + n * (n * n - 1.0) / 12.0;
        let at_rim = run.start == 0 || run.end == plane.width || y == 0 || y + 1 == plane.height;
        Self { n, x, y: n * y_f, xx, xy: x * y_f, yy: n * y_f * y_f, at_rim }
    }

    fn add(&mut self, other: &Self) {
        self.n += other.n;
        self.x += other.x;
        self.y += other.y;
        self.xx += other.xx;
        self.xy += other.xy;
        self.yy += other.yy;
        self.at_rim |= other.at_rim;
    }

    /// The patch as a blob in photo pixels if it is complete, large enough and an ellipse.
    fn as_blob(&self, plane: &Binned) -> Option<Blob> {
        if self.n < LEAST_AREA || self.at_rim {
            return None;
        }
        let (x, y) = (self.x / self.n, self.y / self.n);
        // A pixel is a square with second moment 1/12 of its own.
        let xx = self.xx / self.n - x * x + 1.0 / 12.0;
        let yy = self.yy / self.n - y * y + 1.0 / 12.0;
        let xy = self.xy / self.n - x * y;
        let determinant = xx * yy - xy * xy;
        let (half_trace, spread) = ((xx + yy) / 2.0, ((xx - yy) / 2.0).hypot(xy));
        if determinant <= 0.0 || half_trace - spread < LEAST_AXIS_RATIO * LEAST_AXIS_RATIO * (half_trace + spread) {
            return None;
        }
        let ellipse = self.n / (4.0 * std::f64::consts::PI * determinant.sqrt());
        if (ellipse - 1.0).abs() > ELLIPSE_TOLERANCE + 0.5 / self.n.sqrt() {
            return None;
        }
        let bin = small_f64(plane.bin);
        let scale = bin * bin;
        Some(Blob {
            at: PixelPoint { x_px: plane.photo_px(x), y_px: plane.photo_px(y) },
            area_px2: self.n * scale,
            moments_px2: [xx * scale, xy * scale, yy * scale],
        })
    }
}
