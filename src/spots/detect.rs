//! Candidates: blobs of any size that stand out of their surroundings, each once.

use statrs::distribution::{ContinuousCDF, Normal};

use super::scale::{KERNEL_ENERGY, Level, Peak};
use crate::photo::{Noise, Plane};

/// Levels of the scale space beyond the first: cells of 2, 4, 8, 16 and 32 px.
const LEVELS: usize = 5;
/// Favour of a coarse level over the next finer one when both see a blob in the same place: a speckled spot is one spot
/// although its grains rise by half of it, and a field of spots is no blob although its mean rises.
const LEVEL_FAVOUR: f64 = 0.5;

/// Signal-to-noise ratio beyond which nothing is noise.
const TAIL_END: f64 = 11.0;

/// What was found, and what it took.
pub(super) struct Detection {
    /// Strongest first.
    pub(super) peaks: Vec<Peak>,
    /// Signal-to-noise ratio that the false-alarm rate asks for.
    pub(super) threshold: f64,
    /// The strongest thing below the threshold, for the message where nothing was found.
    pub(super) best_reject: Option<Peak>,
}

/// Searches a plane of cells of 2 px and its binnings.
///
/// - `false_spots`: number of false spots per photo that normal noise may give; with `n` cells in all levels the threshold starts at the
///   normal quantile at `1 - false_spots / n`, and rises where the photo's own dips show that its noise has longer tails
/// - `noise`: of one pixel of the photo, the least that is assumed anywhere
pub(super) fn detect(half: &Plane, noise: Noise, false_spots: f64) -> Detection {
    let levels = levels(half);
    let cells: usize = levels.iter().map(|level| level.response.len()).sum();
    let floor = |cell_px: f64| move |light: f64| (noise.variance(light) * KERNEL_ENERGY).sqrt() / cell_px;
    let extremes_beyond = |threshold: f64| {
        let of_level = |level: &Level| level.extremes(threshold, &floor(level.cell_px));
        levels.iter().map(of_level).fold((Vec::new(), Vec::new()), |(mut peaks, mut dips), more| {
            peaks.extend(more.peaks);
            dips.extend(more.dips);
            (peaks, dips)
        })
    };
    let normal = threshold(cells, false_spots);
    let (mut peaks, dips) = extremes_beyond(normal);
    let threshold = with_tails(normal, &peaks, &dips);
    peaks.retain(|peak| peak.signal_to_noise > threshold);
    peaks.sort_by(|a, b| rank(b).total_cmp(&rank(a)));
    let peaks = one_per_place(peaks, half);
    let best_reject = if peaks.is_empty() {
        extremes_beyond(0.5 * normal).0.into_iter().max_by(|a, b| a.signal_to_noise.total_cmp(&b.signal_to_noise))
    } else {
        None
    };
    Detection { peaks, threshold, best_reject }
}

/// The lowest threshold above which dips are few: noise (JPEG blocks, demosaicing) makes as many dips as peaks.
///
/// At most two dips, or one for every twenty peaks, may remain between the threshold and `TAIL_END`; deeper ones are dark things
/// (marks, dust, a ruler), not noise.
fn with_tails(normal: f64, peaks: &[Peak], dips: &[Peak]) -> f64 {
    let above =
        |list: &[Peak], threshold: f64, end: f64| list.iter().filter(|p| p.signal_to_noise > threshold && p.signal_to_noise < end).count();
    let mut threshold = normal;
    while threshold < TAIL_END {
        let allowed = (above(peaks, threshold, f64::INFINITY) / 20).max(2);
        if above(dips, threshold, TAIL_END) <= allowed {
            break;
        }
        threshold += 0.25;
    }
    threshold
}

/// Level by level, each at half the resolution of the one before.
fn levels(half: &Plane) -> Vec<Level> {
    let mut levels = vec![Level::of(half, 2.0)];
    let mut plane = half.halved();
    let mut cell_px = 4.0;
    while levels.len() < LEVELS && plane.width >= 8 && plane.height >= 8 {
        levels.push(Level::of(&plane, cell_px));
        plane = plane.halved();
        cell_px *= 2.0;
    }
    levels
}

fn threshold(cells: usize, false_spots: f64) -> f64 {
    let share = (false_spots / cells.max(1) as f64).clamp(1e-15, 0.01);
    Normal::standard().inverse_cdf(share).abs()
}

fn rank(peak: &Peak) -> f64 {
    peak.response * peak.cell_px.powf(LEVEL_FAVOUR)
}

/// Keeps the first of all peaks that share a place; `peaks` come best first.
fn one_per_place(peaks: Vec<Peak>, half: &Plane) -> Vec<Peak> {
    let mut grid = Grid::new(2 * half.width, 2 * half.height);
    let mut kept: Vec<Peak> = Vec::new();
    for peak in peaks {
        let reach = 2.0 * 32.0;
        let is_taken = grid.near(peak.x_px, peak.y_px, reach).any(|other| {
            let other = kept[other];
            let distance = (peak.x_px - other.x_px).hypot(peak.y_px - other.y_px);
            distance < (2.0 * other.cell_px).max(1.3 * peak.cell_px)
        });
        if !is_taken {
            grid.insert(peak.x_px, peak.y_px, kept.len());
            kept.push(peak);
        }
    }
    kept
}

/// Buckets of 32 px, so that neighbours are found without comparing all with all.
pub(super) struct Grid {
    columns: usize,
    rows: usize,
    buckets: Vec<Vec<usize>>,
}

const BUCKET_PX: f64 = 32.0;

impl Grid {
    pub(super) fn new(width_px: usize, height_px: usize) -> Self {
        let (columns, rows) = (bucket(width_px as f64) + 1, bucket(height_px as f64) + 1);
        Self { columns, rows, buckets: vec![Vec::new(); columns * rows] }
    }

    pub(super) fn insert(&mut self, x_px: f64, y_px: f64, index: usize) {
        let (column, row) = (bucket(x_px).min(self.columns - 1), bucket(y_px).min(self.rows - 1));
        self.buckets[row * self.columns + column].push(index);
    }

    /// Everything in the buckets within `reach_px`; some of it is farther away.
    pub(super) fn near(&self, x_px: f64, y_px: f64, reach_px: f64) -> impl Iterator<Item = usize> {
        let span = |at: f64, count: usize| bucket(at - reach_px).min(count - 1)..=bucket(at + reach_px).min(count - 1);
        let columns = span(x_px, self.columns);
        span(y_px, self.rows)
            .flat_map(move |row| columns.clone().flat_map(move |column| self.buckets[row * self.columns + column].iter().copied()))
    }
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the photo first")]
fn bucket(at_px: f64) -> usize {
    (at_px / BUCKET_PX).clamp(0.0, 65_536.0) as usize
}

#[cfg(test)]
mod tests {
    use super::{Grid, threshold};

    #[test]
    fn threshold_is_the_normal_quantile() {
        // One in a million and one in a thousand, one-sided: 4.753424 and 3.090232 (standard normal tables).
        assert!((threshold(1_000_000, 1.0) - 4.753_424).abs() < 1e-4);
        assert!((threshold(1000, 1.0) - 3.090_232).abs() < 1e-4);
    }

    #[test]
    fn grid_finds_neighbours_at_the_rim() {
        let mut grid = Grid::new(100, 100);
        grid.insert(-0.4, 99.5, 7);
        assert_eq!(grid.near(5.0, 90.0, 20.0).collect::<Vec<_>>(), [7]);
        assert_eq!(grid.near(95.0, 5.0, 20.0).count(), 0);
    }
}
