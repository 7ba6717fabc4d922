//! In: readings in the order of time. Out: control limits for individuals and moving ranges, and the points that speak of an assignable cause.
//! Must never know: what was measured, how a chart looks.
//! Start reading at [`individuals`].

mod rules;

pub use rules::{Test, Violation};

/// Mean range of two normal deviates in standard deviations, 2/√π (d₂ for n = 2).
const D2: f64 = 2.0 * std::f64::consts::FRAC_2_SQRT_PI / 2.0;

/// Upper limit of the moving range over its mean (D₄ for n = 2): 1 + 3 d₃/d₂ with d₃ = √(2 - 4/π).
const D4: f64 = 3.266_531_919_288_601;

/// Fewest readings from which limits are computed; limits from fewer than 20 are provisional (common practice).
pub const FEWEST: usize = 4;

/// A chart of individuals and moving ranges.
#[derive(Debug, Clone, PartialEq)]
pub struct ControlChart {
    /// Mean of the readings.
    pub centre: f64,
    /// Short-term standard deviation, mean moving range over d₂.
    pub sigma: f64,
    /// centre - 3 sigma.
    pub lower: f64,
    /// centre + 3 sigma.
    pub upper: f64,
    /// Distance of each reading from the one before it: one fewer than readings.
    pub ranges: Vec<f64>,
    /// Mean of the ranges.
    pub range_centre: f64,
    /// Upper control limit of the ranges, D₄ times their mean; the lower one is zero.
    pub range_upper: f64,
    /// What speaks of an assignable cause, test by test.
    pub violations: Vec<Violation>,
}

/// Control limits and tests for readings in the order of time; `None` for fewer than [`FEWEST`], for a value that is not finite, and where all are equal.
///
/// Limits: mean ± 3 MR̄/d₂ for the individuals, D₄ MR̄ for the moving ranges of two.
///
/// Source: ISO 7870-2 (from memory): constants for n = 2 and the eight tests of [`Test`].
///
/// ```
/// let chart = spotrule::control::individuals(&[10.0, 11.0, 10.0, 11.0]).unwrap();
/// assert!((chart.upper - (10.5 + 2.6587)).abs() < 1e-4);
/// ```
#[must_use]
pub fn individuals(readings: &[f64]) -> Option<ControlChart> {
    if readings.len() < FEWEST || readings.iter().any(|reading| !reading.is_finite()) {
        return None;
    }
    let mean = |values: &[f64]| values.iter().sum::<f64>() / values.len() as f64;
    let ranges: Vec<f64> = readings.windows(2).map(|pair| (pair[1] - pair[0]).abs()).collect();
    let (centre, range_centre) = (mean(readings), mean(&ranges));
    let sigma = range_centre / D2;
    if !(sigma > 0.0 && sigma.is_finite() && centre.is_finite()) {
        return None;
    }
    let deviations: Vec<f64> = readings.iter().map(|reading| (reading - centre) / sigma).collect();
    let range_upper = D4 * range_centre;
    let mut violations = rules::violations(&deviations);
    violations.extend(
        ranges.iter().enumerate().filter(|(_, range)| **range > range_upper).map(|(i, _)| Violation { test: Test::Range, last: i + 1 }),
    );
    Some(ControlChart {
        centre,
        sigma,
        lower: centre - 3.0 * sigma,
        upper: centre + 3.0 * sigma,
        ranges,
        range_centre,
        range_upper,
        violations,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Constants as every table prints them (from memory): d₂ = 1.128, D₄ = 3.267, E₂ = 3/d₂ = 2.660.
    #[test]
    fn constants_of_the_tables() {
        let d3 = (2.0 - 4.0 / std::f64::consts::PI).sqrt();
        // The tables divide by the rounded d₂, which moves E₂ by 0.0013.
        assert!((D2 - 1.128).abs() < 5e-4 && (D4 - 3.267).abs() < 5e-4 && (3.0 / D2 - 2.660).abs() < 2e-3);
        assert!((D4 - (1.0 + 3.0 * d3 / D2)).abs() < 1e-12, "{}", 1.0 + 3.0 * d3 / D2);
    }

    #[test]
    fn too_little_or_nonsense_gives_no_chart() {
        for readings in [&[1.0, 2.0, 3.0][..], &[1.0; 9], &[1.0, 2.0, f64::NAN, 3.0]] {
            assert_eq!(individuals(readings), None);
        }
    }

    #[test]
    fn a_jump_is_found_in_both_charts() {
        let mut readings: Vec<f64> = (0..30).map(|i| f64::from(i % 3)).collect();
        readings[20] = 14.0;
        let chart = individuals(&readings).unwrap();
        let tests: Vec<(Test, usize)> = chart.violations.iter().map(|violation| (violation.test, violation.last)).collect();
        assert!(
            tests.contains(&(Test::Beyond, 20)) && tests.contains(&(Test::Range, 20)) && tests.contains(&(Test::Range, 21)),
            "{tests:?}"
        );
    }
}
