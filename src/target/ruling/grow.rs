//! From the clearest window over the whole photo: each window's wave from its neighbour's, with whole lines counted between them.

use super::wave::{Patch, Wave, Window};
use crate::{math::count, photo::Light};
use nalgebra::Vector2;
use rayon::prelude::*;
use std::collections::BinaryHeap;

/// Lines that a window should hold: heavier lines at every fifth place then lie apart from the wave in its spectrum.
const LINES: f64 = 12.0;
/// Sides of windows, px.
const HALF_PX: std::ops::Range<f64> = 32.0..160.0;
/// Most windows; each takes some milliseconds.
const MOST_WINDOWS: f64 = 400.0;
/// A wave has to stand out of its window by this factor.
const CLEAR: f64 = 6.0;
/// Neighbouring windows' counts may differ by this much of a line from what their frequencies say.
const AGREES: f64 = 0.2;
/// Frequency may change by this share from one window to the next.
const CHANGE: f64 = 0.15;

/// Windows in columns and rows over the photo.
pub(super) struct Raster {
    half: usize,
    step: f64,
    columns: usize,
    rows: usize,
}

/// A window that waits for its wave to be joined to the others, the clearest first.
struct Waiting {
    strength: f64,
    place: usize,
    from: Wave,
}

impl PartialEq for Waiting {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other).is_eq()
    }
}

impl Eq for Waiting {}

impl PartialOrd for Waiting {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Waiting {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        self.strength.total_cmp(&other.strength)
    }
}

impl Raster {
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped, or a number of windows in a photo")]
    pub(super) fn of(light: &Light, period_px: f64) -> Self {
        let shorter = count(light.width.min(light.height));
        let half = (LINES * period_px / 2.0).clamp(HALF_PX.start, HALF_PX.end).min(shorter / 4.0) as usize;
        let (width, height) = (count(light.width) - 2.0 * count(half) - 1.0, count(light.height) - 2.0 * count(half) - 1.0);
        let step = count(half).max((width.max(1.0) * height.max(1.0) / MOST_WINDOWS).sqrt());
        Self { half, step, columns: (width / step) as usize + 1, rows: (height / step) as usize + 1 }
    }

    fn window(&self, place: usize) -> Window {
        let at = |n: usize| (count(self.half) + self.step * count(n)).round();
        Window { centre: [at(place % self.columns), at(place / self.columns)], half: self.half }
    }

    fn neighbours(&self, place: usize) -> impl Iterator<Item = (usize, usize)> {
        let (column, row, columns, rows) = (place % self.columns, place / self.columns, self.columns, self.rows);
        let list = [
            (column > 0).then(|| (0, place - 1)),
            (column + 1 < columns).then_some((0, place + 1)),
            (row > 0).then(|| (1, place.wrapping_sub(columns))),
            (row + 1 < rows).then_some((1, place + columns)),
        ];
        list.into_iter().flatten()
    }

    /// The wave of every window that shows it clearly, its count going through all windows.
    pub(super) fn numbered(&self, light: &Light, near: [f64; 2], frequency: Vector2<f64>) -> Vec<Option<Wave>> {
        let patches: Vec<Option<Patch>> =
            (0..self.columns * self.rows).into_par_iter().map(|place| Patch::of(light, self.window(place))).collect();
        let clear = |place: usize, near: Vector2<f64>| {
            let wave = patches[place].as_ref()?.wave(near, CHANGE * near.norm())?;
            (wave.strength > CLEAR).then_some(wave)
        };
        let distance = |place: usize| {
            let [x, y] = self.window(place).centre;
            (x - near[0]).hypot(y - near[1])
        };
        let mut nearest: Vec<usize> = (0..patches.len()).collect();
        nearest.sort_by(|a, b| distance(*a).total_cmp(&distance(*b)));
        let mut waves: Vec<Option<Wave>> = vec![None; patches.len()];
        let Some((start, wave)) = nearest.into_iter().take(4).find_map(|place| Some((place, clear(place, frequency)?))) else {
            return waves;
        };
        let mut waiting = BinaryHeap::new();
        waiting.push(Waiting { strength: wave.strength, place: start, from: wave });
        while let Some(Waiting { place, from, .. }) = waiting.pop() {
            if waves[place].is_some() {
                continue;
            }
            let Some(wave) = clear(place, from.frequency).and_then(|wave| joined(&from, wave)) else { continue };
            waves[place] = Some(wave);
            for (_, next) in self.neighbours(place).filter(|(_, next)| waves[*next].is_none()) {
                waiting.push(Waiting { strength: wave.strength, place: next, from: wave });
            }
        }
        (0..waves.len()).map(|place| self.straightened(&waves, place)).collect()
    }

    /// Takes out what the change of frequency within a window does to its count: half the second derivative of the count times the window's
    /// second moment, along both axes. The derivative comes from the neighbours' frequencies.
    fn straightened(&self, waves: &[Option<Wave>], place: usize) -> Option<Wave> {
        let wave = waves[place]?;
        let mut bend = 0.0;
        for axis in 0..2 {
            let slopes: Vec<f64> = self
                .neighbours(place)
                .filter(|(along, _)| *along == axis)
                .filter_map(|(_, next)| waves[next])
                .map(|next| {
                    let apart = next.window.centre[axis] - wave.window.centre[axis];
                    (next.frequency[axis] - wave.frequency[axis]) / apart
                })
                .collect();
            bend += slopes.iter().sum::<f64>() / count(slopes.len().max(1));
        }
        Some(Wave { count: wave.count - 0.5 * bend * wave.window.moment(), ..wave })
    }
}

/// Adds the whole lines between two windows; `None` when their counts contradict each other.
fn joined(from: &Wave, wave: Wave) -> Option<Wave> {
    let apart = Vector2::from(wave.window.centre) - Vector2::from(from.window.centre);
    let expected = from.count + (from.frequency + wave.frequency).dot(&apart) / 2.0;
    let count = wave.count + (expected - wave.count).round();
    ((count - expected).abs() < AGREES).then_some(Wave { count, ..wave })
}
