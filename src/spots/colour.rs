//! Which channels carry the laser, found from the spots themselves.

use nalgebra::{Matrix3, Vector3};

use super::scale::{KERNEL_ENERGY, Level, Peak};
use crate::photo::HalfPlanes;

/// Share of the channels' own variance that is added before the inversion, so that no weight rests on a rounding error.
const LOADING: f64 = 0.1;
/// Response over surrounding room light of a dark mark; a black dot of the filter's size gives 0.4.
const MARK_DEPTH: f64 = 0.12;
/// A channel of less relative weight is not worth reading.
const LEAST_WEIGHT: f64 = 0.03;
const GREY: [f64; 3] = [1.0, 0.0, 0.0];
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
    /// Weights of the channels in the plane of laser light in which spots are measured; none is negative.
    pub(super) weights: [f64; 3],
    /// Weights with as much room light taken off as cancels what is printed or drawn on the screen.
    pub(super) without_room: [f64; 3],
    /// The channel with the least laser light, which shows what is printed on the screen; all 0 for grey.
    pub(super) paper_weights: [f64; 3],
    /// Number of dark marks on the screen (a dark blob counts once in each channel).
    pub(super) marks: usize,
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
        return Colour {
            share: [0.0; 3],
            weights: GREY,
            without_room: GREY,
            paper_weights: [0.0; 3],
            marks: 0,
            main: 0,
            pixel_variance: [0.0; 3],
        };
    }
    let levels: Vec<Level> = half.planes.iter().map(|plane| Level::of(&plane.halved(), 4.0)).collect();
    let (Light { trusted, all }, dips) = light_of_blobs(&levels);
    let light = if trusted.iter().sum::<f64>() > 0.0 { trusted } else { all };
    weigh(light, &dips, noise_covariance(&levels))
}

/// Weights `w = k N⁻¹ s` give the best signal-to-noise ratio for a spot of colour `s` in noise of covariance `N`
/// between the channels; k keeps a spot as high as in its main channel, `Σ w s = s_main`.
///
/// The chroma rounding of a JPEG, for one, moves red against green and drops out of their sum.
fn weigh(light: [f64; 3], dips: &[Seen], noise: Matrix3<f64>) -> Colour {
    let total: f64 = light.iter().sum();
    let share = if total > 0.0 { light.map(|part| part / total) } else { [1.0 / 3.0; 3] };
    let main = (0..3).max_by(|&a, &b| share[a].total_cmp(&share[b])).unwrap_or(0);
    let loaded = noise + Matrix3::from_diagonal(&noise.diagonal()) * LOADING + Matrix3::identity() * (LOADING * noise.trace() / 3.0);
    let weights = non_negative_weights(share, main, loaded);
    // The response of cells of 4 px has KERNEL_ENERGY / 16 of the variance of a pixel.
    let pixel_variance = (noise.diagonal() * (16.0 / KERNEL_ENERGY)).into();
    let room_weights = room_weights(share, main);
    let (marks, depth) = marks_of(dips, room_weights);
    let without_room = without_room(weights, Vector3::from(room_weights), Vector3::from(depth));
    Colour {
        share,
        weights: weights.into(),
        without_room: without_room.into(),
        paper_weights: room_weights.map(|w| f64::from(u8::from(w > 0.0))),
        marks,
        main,
        pixel_variance,
    }
}

/// Number of dips that are dark in room light, and how much each channel loses there.
fn marks_of(dips: &[Seen], room_weights: [f64; 3]) -> (usize, [f64; 3]) {
    let in_room = |seen: &Seen| {
        (0..3).fold((0.0, 0.0), |(response, around), c| (response + room_weights[c] * seen[c].0, around + room_weights[c] * seen[c].1))
    };
    let is_mark = |seen: &&Seen| {
        let (response, around) = in_room(seen);
        around > 0.0 && -response > MARK_DEPTH * around
    };
    let mut depth = [0.0; 3];
    let mut count = 0;
    for seen in dips.iter().filter(is_mark) {
        count += 1;
        depth.iter_mut().zip(seen).for_each(|(depth, (response, _))| *depth -= response);
    }
    (count, depth)
}

/// `weights` less so much of the view without laser that what is drawn on the screen cancels.
///
/// - `marks`: how much room light the marks take from each channel
fn without_room(weights: Vector3<f64>, room_weights: Vector3<f64>, marks: Vector3<f64>) -> Vector3<f64> {
    let (seen, in_room) = (weights.dot(&marks), room_weights.dot(&marks));
    if in_room > 0.1 * seen && seen > 0.0 { weights - room_weights * (seen / in_room) } else { weights }
}

/// The channel with the least laser light, the laser's share of it taken off by the main channel.
fn room_weights(share: [f64; 3], main: usize) -> [f64; 3] {
    let least = (0..3).min_by(|&a, &b| share[a].total_cmp(&share[b])).unwrap_or(0);
    let mut weights = [0.0; 3];
    if share[least] < 0.5 * share[main] {
        weights[least] = 1.0;
        weights[main] = -share[least] / share[main];
    }
    weights
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

/// Responses per channel, summed over strong blobs.
#[derive(Default)]
struct Light {
    /// Bright ones that clip nowhere.
    trusted: [f64; 3],
    /// All bright ones.
    all: [f64; 3],
}

/// Response and surround in each channel.
type Seen = [(f64, f64); 3];

/// Light of the bright blobs, and what is seen at the dark ones.
fn light_of_blobs(levels: &[Level]) -> (Light, Vec<Seen>) {
    let mut light = Light::default();
    let add = |sum: &mut [f64; 3], heights: [f64; 3]| sum.iter_mut().zip(heights).for_each(|(sum, height)| *sum += height.max(0.0));
    let mut dips = Vec::new();
    for level in levels {
        let strong = level.extremes(STRONG, &|_| 1e-7);
        for seen in strong.peaks.iter().filter_map(|peak| heights(levels, peak)) {
            let is_trusted = seen.iter().all(|&(height, around)| height * 2.0 + around < TRUSTED_LIGHT);
            let heights = seen.map(|(height, _)| height);
            add(&mut light.all, heights);
            if is_trusted {
                add(&mut light.trusted, heights);
            }
        }
        dips.extend(strong.dips.iter().filter_map(|dip| heights(levels, dip)));
    }
    (light, dips)
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "peaks lie inside their level")]
fn heights(levels: &[Level], peak: &Peak) -> Option<Seen> {
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
            let colour = weigh(light, &[], nalgebra::Matrix3::new(2.0, -0.5, 0.1, -0.5, 1.0, 0.2, 0.1, 0.2, 3.0));
            let height: f64 = (0..3).map(|c| colour.weights[c] * colour.share[c]).sum();
            assert!((height - colour.share[colour.main]).abs() < 1e-12, "{colour:?}");
        }
    }

    #[test]
    fn nothing_seen_is_treated_as_white() {
        assert!((weigh([0.0; 3], &[], nalgebra::Matrix3::identity()).weights.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }
}
