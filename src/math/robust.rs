//! Statistics that a few wild values cannot move.

/// Huber's bound for 95 % efficiency on normal data, in units of the scale.
pub const HUBER_BOUND: f64 = 1.345;
/// Tukey's bound for 95 % efficiency on normal data, in units of the scale.
pub const TUKEY_BOUND: f64 = 4.685;
/// Turns a median absolute deviation of normal data into a standard deviation, `1 / Φ⁻¹(3/4)`.
pub const MAD_TO_SIGMA: f64 = 1.482_602_218_505_602;

/// Middle value; the mean of the two middle ones when their number is even.
///
/// `None` for no values or when one is NaN.
#[must_use]
pub fn median(values: &[f64]) -> Option<f64> {
    if values.is_empty() || values.iter().any(|v| v.is_nan()) {
        return None;
    }
    let mut sorted = values.to_vec();
    let middle = sorted.len() / 2;
    let (below, &mut upper, _) = sorted.select_nth_unstable_by(middle, f64::total_cmp);
    if values.len() % 2 == 1 {
        return Some(upper);
    }
    let lower = below.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    Some(lower + 0.5 * (upper - lower)).filter(|v| v.is_finite())
}

/// The value at which half of the weight lies below and half above; the middle between two values when
/// the halves meet exactly between them. Minimises `Σ w_i |x_i - m|`.
///
/// `weights` are not negative and not all zero. `None` otherwise, or when lengths differ or a number is not finite.
#[must_use]
pub fn weighted_median(values: &[f64], weights: &[f64]) -> Option<f64> {
    let usable = |(value, weight): (&f64, &f64)| value.is_finite() && weight.is_finite() && *weight >= 0.0;
    let total: f64 = weights.iter().sum();
    if values.len() != weights.len() || !values.iter().zip(weights).all(usable) || !(total > 0.0 && total.is_finite()) {
        return None;
    }
    let mut order: Vec<usize> = (0..values.len()).filter(|&i| weights[i] > 0.0).collect();
    order.sort_by(|&i, &j| values[i].total_cmp(&values[j]));
    let mut below = 0.0;
    for (place, &i) in order.iter().enumerate() {
        below += weights[i];
        let excess = below - 0.5 * total;
        if excess.abs() <= 1e-12 * total {
            let next = order.get(place + 1).map_or(values[i], |&j| values[j]);
            return Some(values[i] + 0.5 * (next - values[i]));
        }
        if excess > 0.0 {
            return Some(values[i]);
        }
    }
    order.last().map(|&i| values[i])
}

/// Standard deviation as the middle half of the values shows it: 1.4826 × the median distance from the median.
///
/// Up to half of the values may be wild. Zero when more than half are equal. `None` as in [`median`].
#[must_use]
pub fn mad_scale(values: &[f64]) -> Option<f64> {
    let centre = median(values)?;
    let distances: Vec<f64> = values.iter().map(|v| (v - centre).abs()).collect();
    median(&distances).map(|distance| MAD_TO_SIGMA * distance)
}

/// Huber's weight of a residual in units of its scale: 1 within `bound`, then `bound / |z|`.
///
/// `bound` > 0. A NaN residual weighs nothing.
#[must_use]
pub fn huber_weight(z: f64, bound: f64) -> f64 {
    let distance = z.abs();
    if distance.is_nan() {
        0.0
    } else if distance <= bound {
        1.0
    } else {
        bound / distance
    }
}

/// Tukey's biweight of a residual in units of its scale: `(1 - (z/bound)²)²` within `bound`, then zero.
///
/// `bound` > 0. A NaN residual weighs nothing.
#[must_use]
pub fn tukey_weight(z: f64, bound: f64) -> f64 {
    let inside = 1.0 - (z / bound).powi(2);
    // a NaN compares false and falls to zero
    if inside > 0.0 { inside * inside } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: Option<f64>, want: f64) {
        let got = got.unwrap();
        assert!((got - want).abs() < 1e-12, "got {got}, want {want}");
    }

    #[test]
    fn medians_by_hand() {
        close(median(&[3.0, 1.0, 2.0]), 2.0);
        close(median(&[4.0, 1.0, 2.0, 3.0]), 2.5);
        close(median(&[-f64::MAX, f64::MAX, 1.0]), 1.0);
        close(weighted_median(&[3.0, 1.0, 2.0], &[1.0, 1.0, 1.0]), 2.0);
        close(weighted_median(&[1.0, 2.0, 3.0], &[0.2, 0.3, 0.5]), 2.5);
        close(weighted_median(&[1.0, 2.0, 3.0], &[0.0, 0.0, 0.5]), 3.0);
        close(weighted_median(&[1.0, 10.0], &[3.0, 1.0]), 1.0);
    }

    #[test]
    fn half_the_values_may_be_wild() {
        let mut values = vec![1.0, 1.1, 0.9, 1.05, 0.95];
        let clean = mad_scale(&values).unwrap();
        values.extend([1e9, -1e9, 1e12, -1e12]);
        assert!(mad_scale(&values).unwrap() < 3.0 * clean);
        close(median(&values), 1.0);
    }

    /// 1.4826 = 1 / Φ⁻¹(3/4): quantiles of a normal distribution have MAD scale 1.
    #[test]
    fn mad_of_a_normal_sample_is_its_sigma() {
        let sample: Vec<f64> = (0..2001).map(|i| crate::math::statistics::normal_quantile((i as f64 + 0.5) / 2001.0).unwrap()).collect();
        assert!((mad_scale(&sample).unwrap() - 1.0).abs() < 1e-3);
        let three_quarters = crate::math::statistics::normal_quantile(0.75).unwrap();
        assert!((MAD_TO_SIGMA * three_quarters - 1.0).abs() < 1e-14);
    }

    #[test]
    fn weights_fall_where_they_should() {
        close(Some(huber_weight(-1.0, HUBER_BOUND)), 1.0);
        close(Some(huber_weight(2.69, HUBER_BOUND)), 0.5);
        close(Some(tukey_weight(0.0, TUKEY_BOUND)), 1.0);
        close(Some(tukey_weight(TUKEY_BOUND / 2.0, TUKEY_BOUND)), 0.5625);
        for z in [TUKEY_BOUND, 1e300, f64::INFINITY, f64::NAN] {
            close(Some(tukey_weight(z, TUKEY_BOUND)), 0.0);
        }
        close(Some(huber_weight(f64::NAN, HUBER_BOUND)), 0.0);
        close(Some(huber_weight(f64::INFINITY, HUBER_BOUND)), 0.0);
    }

    #[test]
    fn nothing_from_nothing() {
        assert!(median(&[]).is_none() && median(&[f64::NAN]).is_none() && mad_scale(&[]).is_none());
        assert!(weighted_median(&[1.0], &[0.0]).is_none() && weighted_median(&[1.0], &[-1.0]).is_none());
        assert!(weighted_median(&[1.0], &[]).is_none() && weighted_median(&[f64::NAN], &[1.0]).is_none());
    }
}
