//! How likely a true value conforms, given a measured one.

use super::Tolerance;
use crate::{
    budget::Value,
    math::statistics::{coverage_probability, normal_probability},
};

/// Probability that the true value lies within `tolerance`, given the measured value: `F((T_U - y)/u) - F((T_L - y)/u)`.
///
/// F is the normal law where the degrees of freedom are infinite, else Student's law, scaled by u and shifted to y (`[JCGM101]` 6.4.9).
/// Without uncertainty the answer is 0 or 1. Nothing but the measurement is known of the item: no process knowledge enters.
///
/// `None` where a number is not finite or u is negative.
///
/// Source: `[JCGM106]` 7.2 to 7.4, formulas (7), (9) and (10) (numbers of the formulas from memory); checked with its examples in this file.
#[must_use]
pub fn conformance_probability(value: Value, tolerance: Tolerance) -> Option<f64> {
    let given = [Some(value.value), Some(value.u), tolerance.lower, tolerance.upper];
    if given.into_iter().flatten().any(|number| !number.is_finite()) || value.u < 0.0 {
        return None;
    }
    if value.u <= 0.0 {
        return Some(if tolerance.holds(value.value) { 1.0 } else { 0.0 });
    }
    let freedom = value.effective_degrees_of_freedom;
    // Tails are small where it matters; their sum keeps digits that the difference of two numbers near 1 would lose.
    let below = tolerance.lower.map_or(Some(0.0), |lower| probability_below((lower - value.value) / value.u, freedom))?;
    let above = tolerance.upper.map_or(Some(0.0), |upper| probability_below((value.value - upper) / value.u, freedom))?;
    Some((1.0 - below - above).clamp(0.0, 1.0))
}

/// Probability that a standardised deviate is below `z`.
fn probability_below(z: f64, freedom: f64) -> Option<f64> {
    if freedom.is_infinite() {
        return normal_probability(z);
    }
    let within = coverage_probability(z.abs(), freedom)?;
    Some(if z < 0.0 { 0.5 * (1.0 - within) } else { 0.5 * (1.0 + within) })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn normal(value: f64, u: f64) -> Value {
        Value { value, u, coverage_factor: 2.0, effective_degrees_of_freedom: f64::INFINITY }
    }

    const fn between(lower: f64, upper: f64) -> Tolerance {
        Tolerance { lower: Some(lower), upper: Some(upper) }
    }

    const fn at_least(lower: f64) -> Tolerance {
        Tolerance { lower: Some(lower), upper: None }
    }

    /// Inputs and results from memory, the arithmetic checked against a normal law of our own and of the reference values.
    #[test]
    fn worked_examples_of_jcgm_106() {
        // 7.4: two-sided, limits 12.5 and 16.3, measured 13.6 with u = 1.8: printed as 66 %
        let two_sided = conformance_probability(normal(13.6, 1.8), between(12.5, 16.3)).unwrap();
        assert!((two_sided - 0.6626).abs() < 5e-5, "{two_sided}");
        // 7.3.3: a breakdown voltage of at least 5.40, measured 5.47 with u = 0.05: printed as 92 %
        let one_sided = conformance_probability(normal(5.47, 0.05), at_least(5.40)).unwrap();
        assert!((one_sided - 0.9192).abs() < 5e-5, "{one_sided}");
        // 8.3.3.2: speeds above 100 km/h, u = 2 % of the reading, sure to 99.9 %: printed as 107 km/h
        let surely_speeding = |speed: f64| conformance_probability(normal(speed, 0.02 * speed), at_least(100.0)).unwrap() >= 0.999;
        assert!(surely_speeding(106.6) && !surely_speeding(106.57));
    }

    /// `[JCGM106]` 8.3: with w = U = 2u the risk at the edge of acceptance is 2.3 % for a one-sided limit; w = 1.65 u gives 5 % (ISO 14253-1:2017).
    #[test]
    fn risk_at_the_edge_of_a_guard_band() {
        for (band_u, risk) in [(2.0, 0.022_750), (1.65, 0.049_471), (3.0, 0.001_350), (0.0, 0.5)] {
            let accepted = conformance_probability(normal(10.0 + band_u * 0.3, 0.3), at_least(10.0)).unwrap();
            assert!((1.0 - accepted - risk).abs() < 1e-6, "{band_u}: {}", 1.0 - accepted);
        }
    }

    #[test]
    fn few_degrees_of_freedom_make_tails_heavier() {
        let few = Value { effective_degrees_of_freedom: 4.0, ..normal(0.0, 1.0) };
        // Student's law with 4 degrees of freedom: 95 % within 2.776 (table of the GUM, G.2)
        let within = conformance_probability(few, between(-2.776, 2.776)).unwrap();
        assert!((within - 0.95).abs() < 1e-4, "{within}");
        assert!(conformance_probability(few, at_least(-2.0)).unwrap() < conformance_probability(normal(0.0, 1.0), at_least(-2.0)).unwrap());
    }

    #[test]
    fn far_and_exact_values() {
        assert!((conformance_probability(normal(20.0, 1e-9), between(19.0, 21.0)).unwrap() - 1.0).abs() < 1e-15);
        assert!(conformance_probability(normal(25.0, 1e-9), between(19.0, 21.0)).unwrap() < 1e-15);
        for (value, wanted) in [(21.0, 1.0), (21.000_1, 0.0)] {
            assert!((conformance_probability(normal(value, 0.0), between(19.0, 21.0)).unwrap() - wanted).abs() < 1e-15);
        }
        assert_eq!(conformance_probability(normal(f64::NAN, 1.0), at_least(0.0)), None);
        assert_eq!(conformance_probability(normal(1.0, -1.0), at_least(0.0)), None);
    }
}
