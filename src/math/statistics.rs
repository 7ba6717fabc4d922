//! Distributions that uncertainty statements need: normal, Student, chi-square.

use statrs::function::{beta::checked_beta_reg, erf, gamma::checked_gamma_ur};
use std::f64::consts::SQRT_2;

/// Probability that a standard normal deviate is at most `z`.
///
/// `Φ(-|z|) = ½ Q(½, ½z²)`: small tails keep their relative accuracy (1e-13; the `erfc` of the library
/// underneath has only ten digits). Any finite or infinite z; `None` for NaN.
#[must_use]
pub fn normal_probability(z: f64) -> Option<f64> {
    // beyond 40 the tail is below the smallest number
    let tail = 0.5 * chi_square_tail(z.clamp(-40.0, 40.0).powi(2), 1.0)?;
    Some(if z > 0.0 { 1.0 - tail } else { tail })
}

/// The deviate `z` with `Φ(z) = probability`, 0 < probability < 1; `None` elsewhere.
#[must_use]
pub fn normal_quantile(probability: f64) -> Option<f64> {
    (probability > 0.0 && probability < 1.0).then(|| -SQRT_2 * erf::erfc_inv(2.0 * probability))
}

/// Probability that chi-square with `degrees_of_freedom` > 0 exceeds `chi_square` >= 0, `Q(ν/2, χ²/2)`.
///
/// `None` outside these ranges.
#[must_use]
pub fn chi_square_tail(chi_square: f64, degrees_of_freedom: f64) -> Option<f64> {
    let usable = chi_square >= 0.0 && chi_square.is_finite() && degrees_of_freedom > 0.0 && degrees_of_freedom.is_finite();
    if !usable {
        return None;
    }
    if chi_square <= 0.0 {
        return Some(1.0);
    }
    checked_gamma_ur(0.5 * degrees_of_freedom, 0.5 * chi_square).ok().filter(|p| p.is_finite())
}

/// Above this many degrees of freedom Student's factor is taken from its expansion about the normal one,
/// whose next term is then below 1e-12 for coverage up to 0.9999.
const NEARLY_NORMAL: f64 = 1e4;

/// Coverage factor k for an interval that holds the given probability: Student's two-sided `t_p(ν)`.
///
/// - `probability`: strictly between 0 and 1, for example 0.95
/// - `degrees_of_freedom`: at least 0.1, not necessarily whole; infinity gives the normal factor. The
///   tables of the GUM are entered with ν cut off to a whole number (G.4.1); pass `ν.floor()` to reproduce them.
///
/// `None` outside these ranges. Good to 1e-10 relative (`published::student_factors` and, live, SciPy).
///
/// Source: `[JCGM100]` Annex G.3; expansion `[Abramowitz1964]` 26.7.5.
///
/// ```
/// use spotrule::math::statistics::coverage_factor;
/// let k = coverage_factor(0.99, 16.0).unwrap();
/// assert!((k - 2.92).abs() < 0.005); // JCGM 100:2008 H.1.6
/// ```
#[must_use]
pub fn coverage_factor(probability: f64, degrees_of_freedom: f64) -> Option<f64> {
    if !(probability > 0.0 && probability < 1.0 && degrees_of_freedom >= 0.1) {
        return None;
    }
    let normal = -normal_quantile(0.5 * (1.0 - probability))?;
    if degrees_of_freedom >= NEARLY_NORMAL {
        return Some(about_normal(normal, degrees_of_freedom));
    }
    quantile_by_bisection(probability, degrees_of_freedom, normal)
}

/// Probability that Student's t with `degrees_of_freedom` lies within ±`factor`: the inverse of [`coverage_factor`].
///
/// `factor` >= 0; `None` outside the ranges named there.
#[must_use]
pub fn coverage_probability(factor: f64, degrees_of_freedom: f64) -> Option<f64> {
    if !(factor >= 0.0 && degrees_of_freedom >= 0.1) {
        return None;
    }
    if degrees_of_freedom >= NEARLY_NORMAL {
        return Some(1.0 - 2.0 * normal_probability(-normal_about(factor, degrees_of_freedom))?);
    }
    Some(1.0 - outside(factor, degrees_of_freedom)?)
}

/// Probability that |t| exceeds `factor`: `I_x(ν/2, ½)` with `x = ν / (ν + t²)`.
fn outside(factor: f64, nu: f64) -> Option<f64> {
    let x = nu / factor.mul_add(factor, nu);
    checked_beta_reg(0.5 * nu, 0.5, x).ok().filter(|p| p.is_finite())
}

/// Student's quantile from the normal one, up to ν⁻³.
fn about_normal(z: f64, nu: f64) -> f64 {
    if nu.is_infinite() {
        return z;
    }
    let s = z * z;
    let first = z * (s + 1.0) / 4.0;
    let second = z * ((5.0 * s + 16.0) * s + 3.0) / 96.0;
    let third = z * (((3.0 * s + 19.0) * s + 17.0) * s - 15.0) / 384.0;
    z + (first + (second + third / nu) / nu) / nu
}

/// The normal deviate that [`about_normal`] turns into `factor`, by two Newton steps with slope 1.
fn normal_about(factor: f64, nu: f64) -> f64 {
    // far out the expansion means nothing and the probability is 1 to all digits
    if nu.is_infinite() || factor > 30.0 {
        return factor;
    }
    (0..8).fold(factor, |z, _| z - (about_normal(z, nu) - factor))
}

/// Bisection on a logarithmic scale: slow, sure, and without a derivative that could mislead.
fn quantile_by_bisection(probability: f64, nu: f64, normal: f64) -> Option<f64> {
    let beyond = 1.0 - probability;
    let mut low = normal.max(f64::MIN_POSITIVE);
    let mut high = 2.0 * low;
    while outside(high, nu)? > beyond {
        low = high;
        high *= 2.0;
        if !high.is_finite() {
            return None;
        }
    }
    for _ in 0..80 {
        let middle = 0.5 * (low + high);
        if outside(middle, nu)? > beyond { low = middle } else { high = middle }
    }
    Some(0.5 * (low + high))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn normal_tails_keep_their_digits() {
        // SciPy 1.17.1, norm.cdf (tests/reference/distributions.py)
        for (z, want) in [(-8.0, 6.220_960_574_271_74e-16), (-3.0, 1.349_898_031_630_093e-3), (0.1, 0.539_827_837_277_029)] {
            assert!((normal_probability(z).unwrap() / want - 1.0).abs() < 1e-13, "Φ({z})");
        }
        assert_eq!(normal_probability(f64::NEG_INFINITY).map(|p| p < 1e-300), Some(true));
        for p in [1e-9, 0.02, 0.5, 0.9] {
            assert!((normal_probability(normal_quantile(p).unwrap()).unwrap() / p - 1.0).abs() < 1e-13, "{p}");
        }
    }

    #[test]
    fn factor_and_probability_undo_each_other() {
        for nu in [0.5, 1.0, 2.0, 3.7, 16.7, 100.0, 999.0, 9.999e3, 1e4, 1.001e4, 1e6, f64::INFINITY] {
            for p in [0.01, 0.5, 0.6827, 0.95, 0.9973, 0.9999] {
                let k = coverage_factor(p, nu).unwrap();
                let back = coverage_probability(k, nu).unwrap();
                assert!((back - p).abs() < 2e-11, "ν = {nu}, p = {p}: k = {k}, back {back}");
            }
        }
    }

    /// Both ways of computing meet where one hands over to the other.
    #[test]
    fn expansion_meets_the_exact_quantile() {
        for p in [0.5, 0.95, 0.9973] {
            let exact = coverage_factor(p, 9_999.0).unwrap();
            let expanded = about_normal(coverage_factor(p, f64::INFINITY).unwrap(), 9_999.0);
            assert!((exact - expanded).abs() < 1e-10, "p = {p}: {exact} against {expanded}");
        }
    }

    /// ν = 1 is Cauchy: t = tan(π p / 2); ν = 2 is algebraic: t = p √2 / √(1 - p²).
    #[test]
    fn closed_forms_at_one_and_two() {
        for p in [0.1, 0.5, 0.95, 0.9973] {
            let cauchy = (std::f64::consts::FRAC_PI_2 * p).tan();
            let two = p * SQRT_2 / (1.0 - p * p).sqrt();
            assert!((coverage_factor(p, 1.0).unwrap() / cauchy - 1.0).abs() < 1e-11);
            assert!((coverage_factor(p, 2.0).unwrap() / two - 1.0).abs() < 1e-11);
        }
    }

    /// ν = 2: exactly exp(-χ²/2).
    #[test]
    fn chi_square_of_two_degrees_is_exponential() {
        for x in [0.0, 0.1, 2.0, 30.0] {
            assert!((chi_square_tail(x, 2.0).unwrap() / (-0.5 * x).exp() - 1.0).abs() < 1e-12);
        }
    }

    #[test]
    fn nonsense_gives_nothing() {
        for (p, nu) in [(0.0, 5.0), (1.0, 5.0), (0.95, 0.0), (0.95, -1.0), (f64::NAN, 5.0), (0.95, f64::NAN)] {
            assert!(coverage_factor(p, nu).is_none(), "{p}, {nu}");
        }
        assert!(coverage_probability(-1.0, 5.0).is_none());
        assert!(normal_quantile(0.0).is_none() && normal_quantile(1.5).is_none() && normal_probability(f64::NAN).is_none());
        assert!(chi_square_tail(-1.0, 3.0).is_none() && chi_square_tail(1.0, 0.0).is_none());
    }
}
