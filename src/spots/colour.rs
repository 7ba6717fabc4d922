//! Which channels carry the laser, found from the spots themselves.

use super::scale::{Level, Peak};
use crate::photo::HalfPlanes;

/// A channel that carries at least this share of the strongest one joins it in the plane of laser light.
const JOIN_SHARE: f64 = 0.35;
/// Light of a cell above which its colour is not trusted: part of it may clip.
const TRUSTED_LIGHT: f64 = 0.6;
/// Signal-to-noise ratio of a peak whose colour counts.
const STRONG: f64 = 10.0;

/// Colour of the laser and how to see it best.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Colour {
    /// Share of the spots' light in red, green, blue (sums to 1); all 0 for grey.
    pub(super) share: [f64; 3],
    /// Weights of the channels in the plane of laser light.
    pub(super) weights: [f64; 3],
    /// The strongest channel.
    pub(super) main: usize,
}

/// Colour of the spots in the photo.
///
/// The response of the matched filter at cells of 4 and 8 px, summed over the strong peaks that clip nowhere. The weights scale the sum so
/// that a spot is as high as in its main channel: `w_c = s_c s_main / Σ s²` over the channels used.
pub(super) fn of_spots(half: &HalfPlanes) -> Colour {
    if half.planes.len() < 3 {
        return Colour { share: [0.0; 3], weights: [1.0, 0.0, 0.0], main: 0 };
    }
    let fine: Vec<_> = half.planes.iter().map(|plane| plane.halved()).collect();
    let coarse: Vec<_> = fine.iter().map(|plane| plane.halved()).collect();
    let light = |planes: &[crate::photo::Plane], cell_px| {
        let levels: Vec<Level> = planes.iter().map(|plane| Level::of(plane, cell_px)).collect();
        light_of_spots(&levels)
    };
    let (fine, coarse) = (light(&fine, 4.0), light(&coarse, 8.0));
    let sum = |trusted: bool| {
        let pick = |light: &[[f64; 3]; 2]| light[usize::from(!trusted)];
        let (a, b) = (pick(&fine), pick(&coarse));
        [a[0] + b[0], a[1] + b[1], a[2] + b[2]]
    };
    let trusted = sum(true);
    let light = if trusted.iter().sum::<f64>() > 0.0 { trusted } else { sum(false) };
    weigh(light)
}

fn weigh(light: [f64; 3]) -> Colour {
    let total: f64 = light.iter().sum();
    let share = if total > 0.0 { light.map(|part| part / total) } else { [1.0 / 3.0; 3] };
    let main = (0..3).max_by(|&a, &b| share[a].total_cmp(&share[b])).unwrap_or(0);
    let used = share.map(|part| if part >= JOIN_SHARE * share[main] { part } else { 0.0 });
    let energy: f64 = used.iter().map(|part| part * part).sum();
    Colour { share, weights: used.map(|part| part * share[main] / energy), main }
}

/// Light of the strong peaks per channel: of those that clip nowhere, and of all.
fn light_of_spots(levels: &[Level]) -> [[f64; 3]; 2] {
    let mut light = [[0.0; 3]; 2];
    for level in levels {
        for peak in level.peaks(STRONG, &|_| 1e-7) {
            let Some(heights) = heights(levels, &peak) else { continue };
            let is_trusted = heights.iter().all(|&(height, around)| height * 2.0 + around < TRUSTED_LIGHT);
            for (channel, (height, _)) in heights.into_iter().enumerate() {
                light[1][channel] += height.max(0.0);
                light[0][channel] += if is_trusted { height.max(0.0) } else { 0.0 };
            }
        }
    }
    light
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "peaks lie inside their level")]
fn heights(levels: &[Level], peak: &Peak) -> Option<[(f64, f64); 3]> {
    let cell = |at_px: f64| ((at_px + 0.5) / peak.cell_px).max(0.0) as usize;
    let at = |level: &Level| {
        let at = cell(peak.y_px).min(level.height - 1) * level.width + cell(peak.x_px).min(level.width - 1);
        (f64::from(level.response[at]), f64::from(level.surround[at]))
    };
    let [red, green, blue] = levels else { return None };
    Some([at(red), at(green), at(blue)])
}

#[cfg(test)]
mod tests {
    use super::weigh;

    #[test]
    fn weights_keep_the_height_of_the_main_channel() {
        for light in [[0.0, 5.0, 0.0], [0.4, 0.1, 0.5], [1.0, 1.0, 1.0]] {
            let colour = weigh(light);
            let height: f64 = (0..3).map(|c| colour.weights[c] * colour.share[c]).sum();
            assert!((height - colour.share[colour.main]).abs() < 1e-12, "{colour:?}");
        }
    }

    #[test]
    fn nothing_seen_is_treated_as_white() {
        assert!((weigh([0.0; 3]).weights.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }
}
