//! Contrast and grain of the speckle, pooled over the strong spots of a photo.

use super::profile::Profile;
use super::window::Window;

/// Speckle of a photo: contrast², and the area over which it is correlated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Speckle {
    /// Variance of the relative light of one pixel.
    pub(super) contrast2: f64,
    /// Sum of the correlation over all offsets, px².
    pub(super) area_px2: f64,
}

impl Default for Speckle {
    /// Depolarising paper seen by a phone: contrast 0.3, grain of 2 px; where no strong spot tells.
    fn default() -> Self {
        Self { contrast2: 0.09, area_px2: 4.5 }
    }
}

impl Speckle {
    /// Variance relative to the square of the light, per px², at scales above the grain.
    pub(super) fn strength(self) -> f64 {
        self.contrast2 * self.area_px2
    }
}

/// Half the mean square difference of the relative light over 1, 2 and 3 px, and how many pairs stand behind it.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Variogram {
    sum: [f64; 3],
    count: [f64; 3],
}

impl Variogram {
    /// Of one fitted spot, over the pixels above a third of its height.
    ///
    /// Differences over few pixels are free of what the fit has absorbed, which the scatter of the residuals is not.
    ///
    /// The noise of the sensor is not taken off: in spots that are strong enough to be asked it is small against speckle.
    pub(super) fn of_spot(window: &Window, profile: &Profile) -> Self {
        let mut variogram = Self::default();
        let relative: Vec<Option<f64>> = window
            .cells
            .iter()
            .map(|cell| {
                let spot = profile.spot(cell.x_px, cell.y_px);
                let background = profile.background + profile.slope[0] * cell.x_px + profile.slope[1] * cell.y_px;
                (spot > 0.4 * profile.height).then(|| (cell.value - background) / spot)
            })
            .collect();
        let side = 2 * window.reach_px as usize;
        let index = |x: f64, y: f64| ((y + window.reach_px) as usize) * side + (x + window.reach_px) as usize;
        let mut raster: Vec<Option<f64>> = vec![None; side * side];
        for (cell, value) in window.cells.iter().zip(&relative) {
            if let Some(slot) = raster.get_mut(index(cell.x_px, cell.y_px)) {
                *slot = *value;
            }
        }
        for y in 0..side {
            for x in 0..side {
                let Some(here) = raster[y * side + x] else { continue };
                for lag in 1..=3 {
                    let right = (x + lag < side).then(|| raster[y * side + x + lag]).flatten();
                    let below = (y + lag < side).then(|| raster[(y + lag) * side + x]).flatten();
                    for there in [right, below].into_iter().flatten() {
                        variogram.sum[lag - 1] += 0.5 * (here - there).powi(2);
                        variogram.count[lag - 1] += 1.0;
                    }
                }
            }
        }
        variogram
    }

    fn mean(&self) -> Option<[f64; 3]> {
        let mean = [0, 1, 2].map(|lag| self.sum[lag] / self.count[lag]);
        (self.count[2] > 8.0 && mean[1] > 0.0 && mean.iter().all(|g| g.is_finite())).then_some(mean)
    }
}

/// Speckle whose variogram fits the median over the spots.
///
/// Correlation `exp(-r²/4t²)`, so that γ(k) = C² (1 - exp(-k²/4t²)); the ratio γ(1)/γ(2) gives t, γ(2) and γ(3) give C².
pub(super) fn pooled(spots: &[Variogram]) -> Option<Speckle> {
    let means: Vec<[f64; 3]> = spots.iter().filter_map(Variogram::mean).collect();
    if means.len() < 3 {
        return None;
    }
    let gamma = [0, 1, 2].map(|lag| median(means.iter().map(|mean| mean[lag]).collect()));
    if gamma[1] <= 0.0 {
        return None;
    }
    let rise = |t2: f64, lag: f64| 1.0 - (-lag * lag / (4.0 * t2)).exp();
    let target = (gamma[0] / gamma[1]).clamp(0.26, 0.999);
    let (mut low, mut high) = (0.02, 50.0);
    for _ in 0..60 {
        let middle: f64 = (low * high as f64).sqrt();
        if rise(middle, 1.0) / rise(middle, 2.0) > target { low = middle } else { high = middle }
    }
    let t2 = (low * high).sqrt();
    let contrast2 = (gamma[1] + gamma[2]) / (rise(t2, 2.0) + rise(t2, 3.0));
    let area_px2 = (4.0 * std::f64::consts::PI * t2).max(1.0);
    Some(Speckle { contrast2: contrast2.clamp(1e-6, 1.0), area_px2: area_px2.min(40.0) })
}

fn median(mut list: Vec<f64>) -> f64 {
    let middle = list.len() / 2;
    if list.is_empty() { 0.0 } else { *list.select_nth_unstable_by(middle, f64::total_cmp).1 }
}
