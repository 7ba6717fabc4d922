//! Which channels carry the laser, found from the spots themselves.

use nalgebra::{Matrix3, Vector3};

use super::scale::{KERNEL_ENERGY, Level, Peak};
use crate::photo::HalfPlanes;

/// Share of the channels' own variance that is added before the inversion, so that no weight rests on a rounding error.
const LOADING: f64 = 0.1;
/// A channel of less relative weight is not worth reading.
const LEAST_WEIGHT: f64 = 0.03;
/// Cells that enter the covariance of the channels.
const NOISE_SAMPLES: usize = 40_000;
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
    /// Variance of one pixel of each channel, as a fit over many pixels feels it.
    pub(super) pixel_variance: [f64; 3],
}

/// Colour of the spots in the photo, and the weights that show them best.
///
/// Colour: the response of the matched filter at cells of 4 px, summed over the strong peaks that clip nowhere.
pub(super) fn of_spots(half: &HalfPlanes) -> Colour {
    if half.planes.len() < 3 {
        return Colour { share: [0.0; 3], weights: [1.0, 0.0, 0.0], main: 0, pixel_variance: [0.0; 3] };
    }
    let levels: Vec<Level> = half.planes.iter().map(|plane| Level::of(&plane.halved(), 4.0)).collect();
    let [trusted, all] = light_of_spots(&levels);
    let light = if trusted.iter().sum::<f64>() > 0.0 { trusted } else { all };
    weigh(light, noise_covariance(&levels))
}

/// Weights `w = k N⁻¹ s` give the best signal-to-noise ratio for a spot of colour `s` in noise of covariance `N`
/// between the channels; k keeps a spot as high as in its main channel, `Σ w s = s_main`.
///
/// The chroma rounding of a JPEG, for one, moves red against green and drops out of their sum.
fn weigh(light: [f64; 3], noise: Matrix3<f64>) -> Colour {
    let total: f64 = light.iter().sum();
    let share = if total > 0.0 { light.map(|part| part / total) } else { [1.0 / 3.0; 3] };
    let main = (0..3).max_by(|&a, &b| share[a].total_cmp(&share[b])).unwrap_or(0);
    let loaded = noise + Matrix3::from_diagonal(&noise.diagonal()) * LOADING + Matrix3::identity() * (LOADING * noise.trace() / 3.0);
    // The response of cells of 4 px has KERNEL_ENERGY / 16 of the variance of a pixel.
    let pixel_variance = (noise.diagonal() * (16.0 / KERNEL_ENERGY)).into();
    Colour { share, weights: non_negative_weights(share, main, loaded).into(), main, pixel_variance }
}

/// The best weights of which none is negative or tiny: the channel with the lowest one is left out until none is.
///
/// A difference of channels would see the laser alone in theory; in practice it brings in what tone curves and chroma
/// rounding do to each of them.
fn non_negative_weights(share: [f64; 3], main: usize, noise: Matrix3<f64>) -> Vector3<f64> {
    let mut used = [true; 3];
    loop {
        let kept = |i: usize| f64::from(u8::from(used[i]));
        let shares = Vector3::from_fn(|i, _| share[i] * kept(i));
        let noise = Matrix3::from_fn(|i, j| if i == j && !used[i] { 1.0 } else { noise[(i, j)] * kept(i) * kept(j) });
        let only_main = Vector3::from_fn(|i, _| f64::from(u8::from(i == main)));
        let Some(best) = noise.cholesky().map(|factor| factor.solve(&shares)) else { return only_main };
        let scale = share[main] / best.dot(&shares);
        let unused_last = Vector3::from_fn(|i, _| if used[i] { best[i] } else { f64::INFINITY });
        let lowest = unused_last.imin();
        if !scale.is_finite() || scale <= 0.0 {
            return only_main;
        }
        if best[lowest] >= LEAST_WEIGHT * best.amax() {
            return best * scale;
        }
        used[lowest] = false;
    }
}

/// Covariance of the channels' responses, without their outliers.
///
/// Spots that remain do no harm: they add a multiple of `s s'`, which leaves the direction of `N⁻¹ s` alone.
fn noise_covariance(levels: &[Level]) -> Matrix3<f64> {
    let [red, green, blue] = levels else { return Matrix3::identity() };
    let step = (red.response.len() / NOISE_SAMPLES).max(1) | 1;
    let at = |i: usize| [red, green, blue].map(|level| f64::from(level.response[i]));
    let samples: Vec<[f64; 3]> = (0..red.response.len()).step_by(step).map(at).collect();
    let limit = [0, 1, 2].map(|channel| {
        let mut scatter: Vec<f64> = samples.iter().map(|sample| sample[channel].abs()).collect();
        let at = scatter.len() * 3 / 5;
        if scatter.is_empty() { 0.0 } else { 25.0 * *scatter.select_nth_unstable_by(at, f64::total_cmp).1 }
    });
    let quiet = samples.iter().filter(|sample| (0..3).all(|c| sample[c].abs() <= limit[c]));
    let (sum, count) = quiet.fold((Matrix3::zeros(), 0.0), |(sum, count), sample| {
        let sample = Vector3::from(*sample);
        (sum + sample * sample.transpose(), count + 1.0)
    });
    if count > 10.0 { sum / count } else { Matrix3::identity() }
}

/// Light of the strong peaks per channel: of those that clip nowhere, and of all.
fn light_of_spots(levels: &[Level]) -> [[f64; 3]; 2] {
    let mut light = [[0.0; 3]; 2];
    for level in levels {
        for peak in level.extremes(STRONG, &|_| 1e-7).peaks {
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
            let colour = weigh(light, nalgebra::Matrix3::new(2.0, -0.5, 0.1, -0.5, 1.0, 0.2, 0.1, 0.2, 3.0));
            let height: f64 = (0..3).map(|c| colour.weights[c] * colour.share[c]).sum();
            assert!((height - colour.share[colour.main]).abs() < 1e-12, "{colour:?}");
        }
    }

    #[test]
    fn nothing_seen_is_treated_as_white() {
        assert!((weigh([0.0; 3], nalgebra::Matrix3::identity()).weights.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }
}
