//! The examples of JCGM 101:2008 clause 9 by our Monte Carlo, seeded.
//!
//! Source: `[JCGM101]`. Means and u of 9.4 are exact closed forms; where an input or a printed value is from memory it says so.

use crate::live::close;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal, StandardNormal, StudentT, Uniform};
use spotrule::math::monte_carlo::{MonteCarlo, MonteCarloOptions, propagate};

fn run(draw: impl Fn(&mut ChaCha8Rng) -> Option<f64> + Sync) -> MonteCarlo {
    let got = propagate(draw, &MonteCarloOptions { digits: 3, ..MonteCarloOptions::default() }).unwrap();
    assert_eq!(got.failed, 0);
    got
}

fn rectangle(low: f64, high: f64) -> impl Fn(&mut ChaCha8Rng) -> f64 {
    let inside = Uniform::new(low, high).unwrap();
    move |rng| inside.sample(rng)
}

/// 9.2.3: four rectangles of u = 1; the 95 % half-width is 2√3 (2 - (3/5)^¼) = 3.8794 in closed form, printed 3.88 (the GUM gives 3.92).
#[test]
fn sum_of_four_rectangles() {
    let one = rectangle(-3_f64.sqrt(), 3_f64.sqrt());
    let got = run(|rng| Some((0..4).map(|_| one(rng)).sum()));
    close("u", got.u, 2.0, 0.005);
    let half_width = 0.5 * (got.symmetric[1] - got.symmetric[0]);
    close("half-width", half_width, 2.0 * 3_f64.sqrt() * (2.0 - 0.6_f64.powf(0.25)), 0.015);
    assert!(half_width < 3.92 - 0.02, "must differ from the normal one");
}

/// 9.2.4: the fourth rectangle ten times as wide: u = 10.1, 95 % ± 17.0 (the GUM gives 19.9). Values from memory.
#[test]
fn one_wide_rectangle() {
    let (one, wide) = (rectangle(-3_f64.sqrt(), 3_f64.sqrt()), rectangle(-300_f64.sqrt(), 300_f64.sqrt()));
    let got = run(|rng| Some((0..3).map(|_| one(rng)).sum::<f64>() + wide(rng)));
    close("u", got.u, 10.1, 0.08);
    close("half-width", 0.5 * (got.symmetric[1] - got.symmetric[0]), 17.0, 0.1);
}

/// 9.3: mass calibration; printed 1.234, 0.0754 and [1.0834, 1.3825] mg (from memory): first order gives 0.0539.
#[test]
fn mass_calibration() {
    let (mass, correction) = (Normal::new(100_000.0, 0.05).unwrap(), Normal::new(1.234, 0.02).unwrap());
    let (air, weight, reference) = (rectangle(1.1, 1.3), rectangle(7000.0, 9000.0), rectangle(7950.0, 8050.0));
    let got = run(|rng| {
        let buoyancy = (air(rng) - 1.2) * (1.0 / weight(rng) - 1.0 / reference(rng));
        Some((mass.sample(rng) + correction.sample(rng)) * (1.0 + buoyancy) - 100_000.0)
    });
    close("mean / mg", got.mean, 1.234, 0.0005);
    close("u / mg", got.u, 0.0754, 0.0003);
    close("low / mg", got.shortest[0], 1.0834, 0.004);
    close("high / mg", got.shortest[1], 1.3825, 0.004);
}

/// 9.4: y = x1² + x2², u = 0.005, correlated or not: mean x1² + 2u² and variance 4u²x1² + 4u⁴(1 + r²), exact; intervals from memory.
#[test]
fn comparison_loss() {
    let u: f64 = 0.005;
    for (x1, r, ends) in [
        (0.0_f64, 0.0_f64, [0.0, 150e-6]),
        (0.010, 0.0, [0.0, 367e-6]),
        (0.050, 0.0, [1590e-6, 3543e-6]),
        (0.0, 0.9, [0.0, 185e-6]),
        (0.010, 0.9, [13e-6, 398e-6]),
        (0.050, 0.9, [1628e-6, 3555e-6]),
    ] {
        let got = run(|rng| {
            let (a, b): (f64, f64) = (StandardNormal.sample(rng), StandardNormal.sample(rng));
            let second = r * a + (1.0 - r * r).sqrt() * b;
            Some((x1 + u * a).powi(2) + (u * second).powi(2))
        });
        let exact_u = (4.0 * (u * x1).powi(2) + 4.0 * u.powi(4) * (1.0 + r * r)).sqrt();
        close(&format!("mean at {x1}, r = {r}"), got.mean, x1 * x1 + 2.0 * u * u, 0.01 * exact_u);
        close(&format!("u at {x1}, r = {r}"), got.u, exact_u, 0.01 * exact_u);
        for (got, want) in got.shortest.into_iter().zip(ends) {
            close(&format!("end at {x1}, r = {r}"), got, want, 0.05 * exact_u);
        }
    }
}

/// A rectangle whose half-width is itself only known to ±d (`CTrap` of the supplement, 6.4.3).
fn curvilinear_trapezoid(rng: &mut ChaCha8Rng, half_width: f64, doubt: f64) -> f64 {
    let half = half_width + doubt * rectangle(-1.0, 1.0)(rng);
    half * rectangle(-1.0, 1.0)(rng)
}

/// 9.5: the end gauge of GUM H.1 with its inputs as distributions (inputs from memory): printed 838 nm, 36 nm, 99 % [745, 932] nm;
/// the GUM's own 99 % interval is 838 ± 93.
#[test]
fn end_gauge() {
    let t = |nu: f64| StudentT::new(nu).unwrap();
    let (t18, t24, t5, t8) = (t(18.0), t(24.0), t(5.0), t(8.0));
    let (alpha, phase) = (rectangle(9.5e-6, 13.5e-6), rectangle(0.0, std::f64::consts::TAU));
    let mean_theta = Normal::new(-0.1, 0.2).unwrap();
    let options = MonteCarloOptions { probability: 0.99, digits: 2, block: 50_000, ..MonteCarloOptions::default() };
    let got = propagate(
        |rng| {
            let standard = 50_000_623.0 + 25.0 * t18.sample(rng);
            let difference = 215.0 + 6.0 * t24.sample(rng) + 4.0 * t5.sample(rng) + 7.0 * t8.sample(rng);
            let theta = mean_theta.sample(rng) + 0.5 * phase(rng).cos();
            let d_alpha = curvilinear_trapezoid(rng, 1e-6, 0.1e-6);
            let d_theta = curvilinear_trapezoid(rng, 0.05, 0.025);
            Some(standard + difference - standard * (d_alpha * theta + alpha(rng) * d_theta) - 5e7)
        },
        &options,
    )
    .unwrap();
    assert!(got.settled);
    close("mean / nm", got.mean, 838.0, 0.6);
    close("u / nm", got.u, 36.0, 0.6);
    close("low / nm", got.shortest[0], 745.0, 3.0);
    close("high / nm", got.shortest[1], 932.0, 3.0);
}
