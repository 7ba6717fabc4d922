//! Noise model of a photo, from the photo itself.

use super::{Noise, Plane};

/// Classes of brightness in which the scatter is measured.
const CLASSES: usize = 24;
/// Fewest differences that make a class.
const CLASS_MIN: usize = 40;
/// Differences that are used at most; more would not change the second digit.
const SAMPLES: usize = 50_000;

/// Variance = a + b signal, from the scatter of `cells`, each the mean of `pixels_per_cell` pixels.
///
/// In each class of brightness the median of |v - (left + right)/2|, which no gradient and few edges can move, gives a variance
/// (factor 1/0.6745 for a normal law, 2/3 for the three cells). A straight line through the classes, weighted by their numbers and
/// by 1/variance² and kept non-negative, gives a and b.
/// All equal cells give a = b = 0.
pub(super) fn of_cells(cells: &Plane, pixels_per_cell: f64) -> Noise {
    let mut pairs = differences(cells);
    pairs.sort_unstable_by(|p, q| p.0.total_cmp(&q.0));
    let class_size = (pairs.len() / CLASSES).max(CLASS_MIN);
    let classes: Vec<(f64, f64)> = pairs.chunks(class_size).filter(|class| class.len() >= CLASS_MIN).map(class_variance).collect();
    let (a, b) = non_negative_line(&classes);
    Noise { a: a * pixels_per_cell, b: b * pixels_per_cell }
}

/// (local mean, |second difference|) along rows.
fn differences(cells: &Plane) -> Vec<(f32, f32)> {
    let step = (cells.value.len() / SAMPLES).max(1);
    let mut pairs = Vec::new();
    for row in cells.value.chunks_exact(cells.width.max(1)) {
        for three in row.windows(3).step_by(step) {
            let mean = 0.5 * (three[0] + three[2]);
            pairs.push((mean, (three[1] - mean).abs()));
        }
    }
    pairs
}

fn class_variance(class: &[(f32, f32)]) -> (f64, f64) {
    let mut scatter: Vec<f32> = class.iter().map(|pair| pair.1).collect();
    let middle = scatter.len() / 2;
    let (_, median, _) = scatter.select_nth_unstable_by(middle, f32::total_cmp);
    let sigma = f64::from(*median) / 0.6745;
    (f64::from(class[class.len() / 2].0), sigma * sigma / 1.5)
}

fn non_negative_line(classes: &[(f64, f64)]) -> (f64, f64) {
    let floor = classes.iter().map(|class| class.1).fold(0.0, f64::max) * 1e-3;
    if floor <= 0.0 {
        return (0.0, 0.0);
    }
    let mut sums = [0.0; 5];
    for &(signal, variance) in classes {
        let weight = 1.0 / (variance + floor).powi(2);
        for (sum, term) in sums.iter_mut().zip([1.0, signal, signal * signal, variance, signal * variance]) {
            *sum += weight * term;
        }
    }
    let [n, x, xx, y, xy] = sums;
    let determinant = n * xx - x * x;
    let slope = if determinant > 1e-12 * n * xx { (n * xy - x * y) / determinant } else { 0.0 };
    let offset = (y - slope * x) / n;
    match (offset >= 0.0, slope >= 0.0) {
        (true, true) => (offset, slope),
        (false, _) if xx > 0.0 => (0.0, (xy / xx).max(0.0)),
        _ => ((y / n).max(0.0), 0.0),
    }
}

#[cfg(test)]
mod tests {
    use rand::SeedableRng;
    use rand_distr::{Distribution, StandardNormal};

    use super::{Plane, of_cells};

    #[test]
    #[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
    fn known_noise_is_found_again() {
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(4);
        let (width, height) = (400, 400);
        let (a, b) = (4e-6, 3e-4);
        let value = (0..width * height).map(|i| {
            let signal = 0.02 + 0.3 * (i % width) as f64 / width as f64;
            let normal: f64 = StandardNormal.sample(&mut random);
            (signal + normal * (a + b * signal).sqrt()) as f32
        });
        let noise = of_cells(&Plane { width, height, value: value.collect() }, 1.0);
        // 24 classes of 6600 differences: 1 % each, the slope a little worse.
        assert!((noise.b / b - 1.0).abs() < 0.05, "{noise:?}");
        assert!((noise.a / a - 1.0).abs() < 0.8, "{noise:?}");
    }

    #[test]
    fn flat_plane_has_no_noise() {
        let noise = of_cells(&Plane { width: 50, height: 50, value: vec![0.25; 2500] }, 16.0);
        assert!(noise.a.abs() < 1e-30 && noise.b.abs() < 1e-30);
    }
}
