//! Propagation of distributions by Monte Carlo, until the asked-for digits stand still.

use super::count;
use rand_chacha::{ChaCha8Rng, rand_core::SeedableRng};
use rayon::prelude::*;

/// How many trials, how steady, and which interval.
#[derive(Debug, Clone, PartialEq)]
pub struct MonteCarloOptions {
    /// Probability that the interval holds, strictly between 0 and 1.
    pub probability: f64,
    /// Significant decimal digits of the standard uncertainty that must stand still; 1 or 2 as a rule.
    pub digits: i32,
    /// Trials per block; the scatter of the blocks' results says when to stop.
    pub block: usize,
    /// Never more blocks than this.
    pub most_blocks: usize,
    /// Same seed, same result.
    pub seed: u64,
}

impl Default for MonteCarloOptions {
    /// 95 %, two digits, blocks of 10⁴ trials and at most 10⁶ trials.
    fn default() -> Self {
        Self { probability: 0.95, digits: 2, block: 10_000, most_blocks: 100, seed: 1 }
    }
}

/// What the trials show, each with the standard deviation of its own average over the blocks.
#[derive(Debug, Clone, PartialEq)]
pub struct MonteCarlo {
    /// Mean of the result.
    pub mean: f64,
    /// Standard deviation of the result: its standard uncertainty.
    pub u: f64,
    /// Interval with equal probability on either side.
    pub symmetric: [f64; 2],
    /// Shortest interval that holds the probability.
    pub shortest: [f64; 2],
    /// Trials that gave a value.
    pub trials: usize,
    /// Trials that gave none, or none that is finite. Not zero: the result is conditional on success.
    pub failed: usize,
    /// Whether the asked-for digits stood still before the blocks ran out.
    pub settled: bool,
}

/// Draws a result again and again until its mean, u and symmetric interval stand still.
///
/// After each block of trials the averages of mean, u and both ends over all blocks so far are formed, with
/// their standard deviations. It ends when twice each of these is below half a unit of the last asked-for digit of u.
///
/// - `draw`: one trial, all inputs redrawn from the generator that is passed in; `None` where the model fails
///
/// `None` when an option is out of range, a block holds fewer than two values, or their squares overflow.
///
/// Source: `[JCGM101]` 7.9 (adaptive procedure), 7.7 (intervals).
///
/// ```
/// use rand_distr::{Distribution, Uniform};
/// use spotrule::math::monte_carlo::{MonteCarloOptions, propagate};
/// let side = Uniform::new(-3_f64.sqrt(), 3_f64.sqrt()).unwrap(); // u = 1
/// let sum = propagate(|rng| Some((0..4).map(|_| side.sample(rng)).sum()), &MonteCarloOptions::default()).unwrap();
/// assert!((sum.u - 2.0).abs() < 0.05);
/// ```
#[must_use]
pub fn propagate(draw: impl Fn(&mut ChaCha8Rng) -> Option<f64> + Sync, options: &MonteCarloOptions) -> Option<MonteCarlo> {
    propagate_all(|rng| draw(rng).map(|value| vec![value]), options, &|_| ()).and_then(|mut results| results.pop())
}

/// [`propagate`] for several results of one trial at once, such as the two pitches of a lattice: goes on until all of them stand still.
///
/// - `draw`: one trial; always the same number of values
/// - `progress`: told after each block how many trials have been made
#[must_use]
pub fn propagate_all(
    draw: impl Fn(&mut ChaCha8Rng) -> Option<Vec<f64>> + Sync,
    options: &MonteCarloOptions,
    progress: &dyn Fn(usize),
) -> Option<Vec<MonteCarlo>> {
    let usable = options.probability > 0.0 && options.probability < 1.0 && options.digits >= 1 && options.block >= 100;
    if !usable || options.most_blocks == 0 {
        return None;
    }
    // Every trial has a stream of its own, so that the result does not depend on how the trials fall on the cores.
    let trial = |number: usize| {
        let mut rng = ChaCha8Rng::seed_from_u64(options.seed);
        rng.set_stream(number as u64);
        draw(&mut rng).filter(|values| values.iter().all(|value| value.is_finite()))
    };
    let mut all: Vec<Vec<f64>> = Vec::new();
    let mut blocks: Vec<Vec<[f64; 4]>> = Vec::new();
    let mut made = 0;
    let mut settled = false;
    while made < options.most_blocks * options.block && !settled {
        let drawn: Vec<Vec<f64>> = (made..made + options.block).into_par_iter().filter_map(trial).collect();
        made += options.block;
        let results = drawn.first()?.len();
        all.resize(results, Vec::new());
        blocks.resize(results, Vec::new());
        for result in 0..results {
            let mut block: Vec<f64> = drawn.iter().filter_map(|values| values.get(result).copied()).collect();
            block.sort_unstable_by(f64::total_cmp);
            blocks[result].push(summary(&block, options.probability)?);
            all[result].extend(block);
        }
        settled = blocks.iter().all(|blocks| steady(blocks, options.digits));
        progress(made);
    }
    let gathered = |mut values: Vec<f64>| {
        values.sort_unstable_by(f64::total_cmp);
        let [mean, u, low, high] = summary(&values, options.probability)?;
        let shortest = shortest_interval(&values, options.probability);
        Some(MonteCarlo { mean, u, symmetric: [low, high], shortest, trials: values.len(), failed: made - values.len(), settled })
    };
    all.into_iter().map(gathered).collect()
}

/// Mean, standard deviation and the ends of the symmetric interval of sorted values.
fn summary(sorted: &[f64], probability: f64) -> Option<[f64; 4]> {
    if sorted.len() < 2 {
        return None;
    }
    let mean = sorted.iter().sum::<f64>() / count(sorted.len());
    let squares: f64 = sorted.iter().map(|value| (value - mean).powi(2)).sum();
    let u = (squares / count(sorted.len() - 1)).sqrt();
    let ends = [quantile(sorted, 0.5 - 0.5 * probability), quantile(sorted, 0.5 + 0.5 * probability)];
    (mean.is_finite() && u.is_finite()).then_some([mean, u, ends[0], ends[1]])
}

/// Sample quantile of sorted values, linear between neighbours.
fn quantile(sorted: &[f64], probability: f64) -> f64 {
    let last = sorted.len() - 1;
    let place = probability.clamp(0.0, 1.0) * count(last);
    let below = floor_index(place).min(last);
    let above = (below + 1).min(last);
    sorted[below] + (place - count(below)) * (sorted[above] - sorted[below])
}

/// The narrowest window over sorted values that holds the wanted fraction of them.
fn shortest_interval(sorted: &[f64], probability: f64) -> [f64; 2] {
    let span = floor_index(probability * count(sorted.len())).clamp(1, sorted.len() - 1);
    let width = |start: &usize| sorted[start + span] - sorted[*start];
    let start = (0..sorted.len() - span).min_by(|a, b| width(a).total_cmp(&width(b))).unwrap_or(0);
    [sorted[start], sorted[start + span]]
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a fraction of a length: not negative, no larger than it")]
fn floor_index(place: f64) -> usize {
    place.max(0.0) as usize
}

/// Whether twice the standard deviation of every averaged number is below half a unit of the last digit of u.
fn steady(blocks: &[[f64; 4]], digits: i32) -> bool {
    let h = count(blocks.len());
    if blocks.len() < 2 {
        return false;
    }
    let average = |k: usize| blocks.iter().map(|block| block[k]).sum::<f64>() / h;
    let u = average(1);
    if u <= 0.0 {
        return true;
    }
    // u = c · 10^l with c a whole number of the asked-for digits; δ = ½ · 10^l
    let delta = 0.5 * 10_f64.powf(u.log10().floor() + 1.0 - f64::from(digits));
    (0..4).all(|k| {
        let mean = average(k);
        let squares: f64 = blocks.iter().map(|block| (block[k] - mean).powi(2)).sum();
        2.0 * (squares / (h * (h - 1.0))).sqrt() < delta
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand_distr::{Distribution, Exp1, StandardNormal};

    /// Normal: both intervals are ±1.96; exponential: the shortest begins at zero and ends at -ln 0.05.
    #[test]
    fn intervals_of_known_distributions() {
        let normal = propagate(|rng| Some(StandardNormal.sample(rng)), &MonteCarloOptions::default()).unwrap();
        for (got, want) in [(normal.mean, 0.0), (normal.u, 1.0), (normal.symmetric[1], 1.96), (normal.symmetric[0], -1.96)] {
            // δ is 0.05 in u = 1.0
            assert!((got - want).abs() < 0.05, "got {got}, want {want}");
        }
        assert!(normal.settled && normal.failed == 0);
        let exponential = propagate(|rng| Some(Exp1.sample(rng)), &MonteCarloOptions::default()).unwrap();
        let end = -(0.05_f64.ln());
        assert!(exponential.shortest[0] < 0.01 && (exponential.shortest[1] - end).abs() < 0.06, "{exponential:?}");
        assert!((exponential.symmetric[0] + 0.975_f64.ln()).abs() < 0.01, "{exponential:?}");
    }

    #[test]
    fn same_seed_same_result_and_failures_are_counted() {
        let half = |rng: &mut ChaCha8Rng| Some(StandardNormal.sample(rng)).filter(|value: &f64| *value > 0.0);
        let options = MonteCarloOptions { digits: 1, ..MonteCarloOptions::default() };
        let (first, second) = (propagate(half, &options).unwrap(), propagate(half, &options).unwrap());
        assert_eq!(first, second);
        let share = count(first.failed) / count(first.failed + first.trials);
        assert!((share - 0.5).abs() < 0.02);
        assert_ne!(first, propagate(half, &MonteCarloOptions { seed: 2, ..options }).unwrap());
    }

    #[test]
    fn a_constant_has_no_spread() {
        let got = propagate(|_| Some(3.0), &MonteCarloOptions::default()).unwrap();
        assert_eq!((got.mean, got.u, got.shortest, got.settled), (3.0, 0.0, [3.0, 3.0], true));
    }

    #[test]
    fn nothing_to_draw_gives_nothing() {
        assert!(propagate(|_| None, &MonteCarloOptions::default()).is_none());
        assert!(propagate(|_| Some(f64::NAN), &MonteCarloOptions::default()).is_none());
        for options in [
            MonteCarloOptions { probability: 1.0, ..MonteCarloOptions::default() },
            MonteCarloOptions { digits: 0, ..MonteCarloOptions::default() },
            MonteCarloOptions { block: 1, ..MonteCarloOptions::default() },
            MonteCarloOptions { most_blocks: 0, ..MonteCarloOptions::default() },
        ] {
            assert!(propagate(|_| Some(1.0), &options).is_none(), "{options:?}");
        }
    }
}
