//! Numbers from outside: worked examples of the GUM and its supplement, tables, and general-purpose libraries.
//!
//! Sources (docs/sources.md): `[JCGM100]` JCGM 100:2008, Annex G and H; `[JCGM101]` JCGM 101:2008, clause 9;
//! `[Willink2007]`. Kept outputs of libraries name their version in the file; see `live`.

use crate::live::{close, kept_and_live, list, number, row, rows};
use nalgebra::{DMatrix, DVector, dmatrix, dvector};
use num_dual::{DualNum, DualSVec64};
use spotrule::math::{
    NormalInverse, Options, Problem, VarianceSplit,
    gum::{Contribution, combined, correlation, mean_of_readings, propagated, welch_satterthwaite},
    least_squares,
    statistics::{chi_square_tail, coverage_factor, coverage_probability, normal_probability, normal_quantile},
};

/// Value and gradient of a model of N inputs, by dual numbers.
fn linearised<const N: usize>(model: impl Fn([DualSVec64<N>; N]) -> DualSVec64<N>, at: [f64; N]) -> (f64, DVector<f64>) {
    let value = model(std::array::from_fn(|i| DualSVec64::from_re(at[i]).derivative(i)));
    let gradient = value.eps.unwrap_generic(nalgebra::Const::<N>, nalgebra::Const::<1>);
    (value.re, DVector::from_iterator(N, gradient.iter().copied()))
}

fn variances(u: &[f64]) -> DMatrix<f64> {
    DMatrix::from_diagonal(&DVector::from_iterator(u.len(), u.iter().map(|u| u * u)))
}

/// JCGM 100:2008 H.1, model (H.3): standard, comparator difference, then the difference of the
/// expansion coefficients, the deviation from 20 °C, the coefficient of the standard, the difference of temperatures.
fn end_gauge(x: [DualSVec64<6>; 6]) -> DualSVec64<6> {
    let [standard, difference, d_alpha, theta, alpha, d_theta] = x;
    standard + difference - standard * (d_alpha * theta + alpha * d_theta)
}

/// End gauge of 50 mm in a given unit of length: value, `u_c` and `ν_eff` must not depend on the unit.
fn end_gauge_in(unit_per_nm: f64, u_difference_nm: f64, nu_difference: f64) -> (f64, f64, f64) {
    let at = [50_000_623.0 * unit_per_nm, 215.0 * unit_per_nm, 0.0, -0.1, 11.5e-6, 0.0];
    let (length, gradient) = linearised(end_gauge, at);
    let u = [25.0 * unit_per_nm, u_difference_nm * unit_per_nm, 0.58e-6, 0.41, 1.2e-6, 0.029];
    let known = f64::INFINITY;
    let got = combined(&gradient, &variances(&u), &[18.0, nu_difference, 50.0, known, known, 2.0]).unwrap();
    assert!(got.correlated_inputs.is_empty());
    (length / unit_per_nm, got.u / unit_per_nm, got.degrees_of_freedom)
}

/// JCGM 100:2008 H.1.5 and H.1.6: `l = 50.000 838 mm`, `u_c = 32 nm`, `ν_eff = 16`, `t_99 = 2.92`, `U_99 = 93 nm`.
///
/// Table H.1 rounds u(d) to 9.7 nm with ν 25.6; from its parts (5.8, 3.9, 6.7 nm with ν 24, 5, 8) it is 9.69 nm with ν 25.4. Both must
/// give the printed result, in nanometres and in metres.
#[test]
fn gum_h1_end_gauge() {
    let parts = [(5.8_f64, 24.0), (3.9, 5.0), (6.7, 8.0)].map(|(u, nu)| Contribution { variance: u * u, degrees_of_freedom: nu });
    let nu_difference = welch_satterthwaite(&parts).unwrap();
    let unrounded = parts.iter().map(|part| part.variance).sum::<f64>().sqrt();
    // the printed 25.6 takes the fourth power of the already rounded 9.7 nm; unrounded it is 25.4
    close("ν(d) as printed", nu_difference * (9.7 / unrounded).powi(4), 25.6, 0.05);
    close("ν(d)", nu_difference, 25.447, 0.001);
    close("u(d) / nm", unrounded, 9.7, 0.05);
    for (u, nu) in [(9.7, 25.6), (unrounded, nu_difference)] {
        for unit_per_nm in [1.0, 1e-9] {
            let (length, u_c, nu_eff) = end_gauge_in(unit_per_nm, u, nu);
            close("l / nm", length, 50_000_838.0, 0.5);
            close("u_c / nm", u_c, 32.0, 0.5);
            close("u_c^2 / nm^2 (printed 1002 from rounded terms)", u_c * u_c, 1002.0, 6.0);
            close("ν_eff (printed 16.7)", nu_eff, 16.7, 0.1);
            let k = coverage_factor(0.99, nu_eff.floor()).unwrap();
            close("t_99(16)", k, 2.92, 0.005);
            close("U_99 / nm", k * u_c, 93.0, 0.6);
        }
    }
    // H.1.7: the two products of deviations that first order leaves out
    let second_order =
        (31.71_f64.powi(2) + (50_000_623.0 * 0.58e-6 * 0.41_f64).powi(2) + (50_000_623.0 * 1.2e-6 * 0.029_f64).powi(2)).sqrt();
    close("u_c with second order / nm", second_order, 34.0, 0.5);
}

fn h2_readings() -> DMatrix<f64> {
    // JCGM 100:2008 Table H.2: V / V, I / A, φ / rad
    dmatrix![
        5.007, 19.663e-3, 1.0456;
        4.994, 19.639e-3, 1.0438;
        5.005, 19.640e-3, 1.0468;
        4.990, 19.685e-3, 1.0428;
        4.999, 19.678e-3, 1.0433
    ]
}

/// R, X, Z of H.2 with their gradients as rows.
fn impedance(mean: &DVector<f64>) -> ([f64; 3], DMatrix<f64>) {
    let at = [mean[0], mean[1], mean[2]];
    let (r, dr) = linearised(|[v, i, phi]| v / i * phi.cos(), at);
    let (x, dx) = linearised(|[v, i, phi]| v / i * phi.sin(), at);
    let (z, dz) = linearised(|[v, i, _]: [DualSVec64<3>; 3]| v / i, at);
    ([r, x, z], DMatrix::from_rows(&[dr.transpose(), dx.transpose(), dz.transpose()]))
}

/// JCGM 100:2008 Table H.2 (means, u, r) and Table H.3 (results), from the raw readings.
#[test]
fn gum_h2_correlated_readings() {
    let (mean, covariance) = mean_of_readings(&h2_readings()).unwrap();
    for (what, got, want, half_digit) in [
        ("V", mean[0], 4.9990, 5e-5),
        ("I", mean[1], 19.6610e-3, 5e-8),
        ("φ", mean[2], 1.044_46, 5e-6),
        ("u(V)", covariance[(0, 0)].sqrt(), 0.0032, 5e-5),
        ("u(I)", covariance[(1, 1)].sqrt(), 0.0095e-3, 5e-8),
        ("u(φ)", covariance[(2, 2)].sqrt(), 0.000_75, 5e-6),
    ] {
        close(what, got, want, half_digit);
    }
    let r = correlation(&covariance);
    for (got, want) in [(r[(0, 1)], -0.36), (r[(0, 2)], 0.86), (r[(1, 2)], -0.65)] {
        close("input correlation", got, want, 0.0051);
    }
    let (values, sensitivity) = impedance(&mean);
    let results = propagated(&sensitivity, &covariance).unwrap();
    // u(X) is printed as 0.295; unrounded 0.2956
    let printed = [(127.732, 0.071, 5e-4), (219.847, 0.295, 1e-3), (254.260, 0.236, 5e-4)];
    for (k, (value, u, half_digit)) in printed.into_iter().enumerate() {
        close("result / ohm", values[k], value, 5.1e-4);
        close("u / ohm", results[(k, k)].sqrt(), u, half_digit);
    }
    let r = correlation(&results);
    for (got, want) in [(r[(0, 1)], -0.588), (r[(0, 2)], -0.485), (r[(1, 2)], 0.993)] {
        close("output correlation", got, want, 6e-4);
    }
    // H.2.5: what comes out when the correlations are forgotten
    let forgotten = propagated(&sensitivity, &DMatrix::from_diagonal(&covariance.diagonal())).unwrap();
    for (k, want) in [0.195, 0.201, 0.204].into_iter().enumerate() {
        close("u without correlations / ohm", forgotten[(k, k)].sqrt(), want, 6e-4);
    }
}

/// Welch-Satterthwaite must not be used on inputs from the same readings (Willink 2007): the pairs are named, and the
/// readings as one group have n - 1 = 4 degrees of freedom, as approach 2 of H.2 finds from five values of R.
#[test]
fn correlated_inputs_are_flagged_not_hidden() {
    let (mean, covariance) = mean_of_readings(&h2_readings()).unwrap();
    let (_, sensitivity) = impedance(&mean);
    let got = combined(&sensitivity.row(0).transpose(), &covariance, &[4.0; 3]).unwrap();
    assert_eq!(got.correlated_inputs, [(0, 1), (0, 2), (1, 2)]);
    assert!(got.degrees_of_freedom < 1.0, "the formula alone gives {}, far from 4", got.degrees_of_freedom);
    let group = [Contribution { variance: got.u * got.u, degrees_of_freedom: 4.0 }];
    close("ν of the group", welch_satterthwaite(&group).unwrap(), 4.0, 1e-12);
    // approach 2: each set of readings gives one R
    let each: Vec<f64> = h2_readings().row_iter().map(|row| row[0] / row[1] * row[2].cos()).collect();
    let (_, of_means) = mean_of_readings(&DMatrix::from_column_slice(5, 1, &each)).unwrap();
    close("u(R) by approach 2 / ohm", of_means[(0, 0)].sqrt(), 0.071, 5e-4);
}

/// JCGM 100:2008 Table H.6: a line through thermometer corrections, b = y1 + y2 (t - 20 °C).
struct Thermometer;

const H3_T: [f64; 11] = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511];
const H3_B: [f64; 11] = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160];

impl Problem for Thermometer {
    fn residuals_and_jacobian(&self, y: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let jacobian = DMatrix::from_fn(11, 2, |i, j| if j == 0 { 1.0 } else { H3_T[i] - 20.0 });
        Some((&jacobian * y - DVector::from_column_slice(&H3_B), jacobian))
    }
}

/// JCGM 100:2008 H.3.3 and H.3.4.
#[test]
fn gum_h3_calibration_line() {
    let fit = least_squares(&Thermometer, dvector![0.0, 0.0], &Options::default()).unwrap();
    assert_eq!(fit.degrees_of_freedom(), 9);
    let scatter = (fit.chi_square() / 9.0).sqrt();
    let covariance = &fit.covariance * (scatter * scatter);
    close("y1 / °C", fit.parameters[0], -0.1712, 5e-5);
    close("y2", fit.parameters[1], 0.002_18, 5e-6);
    close("s(y1) / °C", covariance[(0, 0)].sqrt(), 0.0029, 5e-5);
    close("s(y2)", covariance[(1, 1)].sqrt(), 0.000_67, 5e-6);
    close("r(y1, y2)", correlation(&covariance)[(0, 1)], -0.930, 6e-4);
    close("s / °C", scatter, 0.0035, 5e-5);
    let at_30 = dvector![1.0, 10.0];
    close("b(30 °C) / °C", fit.parameters.dot(&at_30), -0.1494, 5e-5);
    close("u(b(30 °C)) / °C", fit.variance(&at_30).unwrap().sqrt() * scatter, 0.0041, 5e-5);
}

/// The same three examples to all digits, by `uncertainties` and `statsmodels`.
#[test]
fn gum_examples_by_other_hands() {
    kept_and_live("gum_examples", |reference| {
        let (length, u, _) = end_gauge_in(1.0, 9.7, 25.6);
        close("H.1 l / nm", length, number(&reference["h1"], "length_nm"), 1e-6);
        close("H.1 u / nm", u, number(&reference["h1"], "u_nm"), 1e-9);
        let (mean, covariance) = mean_of_readings(&h2_readings()).unwrap();
        let (values, sensitivity) = impedance(&mean);
        let results = propagated(&sensitivity, &covariance).unwrap();
        let r = correlation(&results);
        for k in 0..3 {
            close("H.2 value", values[k], row(&reference["h2"]["values_ohm"])[k], 1e-10);
            close("H.2 u", results[(k, k)].sqrt(), row(&reference["h2"]["u_ohm"])[k], 1e-10);
            let pair = [(0, 1), (0, 2), (1, 2)][k];
            close("H.2 r", r[pair], row(&reference["h2"]["r_RX_RZ_XZ"])[k], 1e-9);
        }
        let fit = least_squares(&Thermometer, dvector![0.0, 0.0], &Options::default()).unwrap();
        let scatter = (fit.chi_square() / 9.0).sqrt();
        for k in 0..2 {
            close("H.3 y", fit.parameters[k], row(&reference["h3"]["y"])[k], 1e-12);
            close("H.3 u", fit.covariance[(k, k)].sqrt() * scatter, row(&reference["h3"]["u"])[k], 1e-12);
        }
        close("H.3 r", correlation(&fit.covariance)[(0, 1)], number(&reference["h3"], "r"), 1e-10);
        close("H.3 s", scatter, number(&reference["h3"], "s"), 1e-12);
    });
}

/// JCGM 101:2008 clause 9, as far as it prints what *first-order propagation* gives, and exact forms to see its limits.
#[test]
fn jcgm_101_what_propagation_gives() {
    // 9.2.2 / 9.2.3: four inputs of u = 1, y = sum: u = 2, 95 % half-width 3.92
    let ones = DVector::repeat(4, 1.0);
    let sum = combined(&ones, &variances(&[1.0; 4]), &[f64::INFINITY; 4]).unwrap();
    let k95 = coverage_factor(0.95, sum.degrees_of_freedom).unwrap();
    close("9.2.2 u", sum.u, 2.0, 1e-14);
    close("9.2.2 half-width", k95 * sum.u, 3.92, 0.005);
    // 9.2.4: one input ten times as uncertain: 10.1 and 19.9
    let uneven = combined(&ones, &variances(&[1.0, 1.0, 1.0, 10.0]), &[f64::INFINITY; 4]).unwrap();
    close("9.2.4 u", uneven.u, 10.1, 0.05);
    close("9.2.4 half-width", k95 * uneven.u, 19.9, 0.05);
    // 9.3: mass calibration (value from memory): first order sees only the two masses, u = 0.0539 mg
    let (value, gradient) = linearised(
        |[mass, correction, air, weight, reference]: [DualSVec64<5>; 5]| {
            (mass + correction) * ((air - 1.2) * (weight.recip() - reference.recip()) + 1.0) - 100_000.0
        },
        [100_000.0, 1.234, 1.2, 8000.0, 8000.0],
    );
    let u = [0.05, 0.02, 0.1 / 3_f64.sqrt(), 1000.0 / 3_f64.sqrt(), 50.0 / 3_f64.sqrt()];
    close("9.3 δm / mg", value, 1.234, 5e-7);
    let mass = combined(&gradient, &variances(&u), &[f64::INFINITY; 5]).unwrap();
    close("9.3 u / mg", mass.u, 0.0539, 5e-5);
    // 9.4: y = x1² + x2² at x1 = 0.050, u = 0.005: first order 500e-6, exact 502e-6; at the origin first order sees nothing
    for (x1, want) in [(0.050, 500e-6), (0.0, 0.0)] {
        let (_, gradient) = linearised(|[a, b]: [DualSVec64<2>; 2]| a * a + b * b, [x1, 0.0]);
        let loss = combined(&gradient, &variances(&[0.005, 0.005]), &[f64::INFINITY; 2]).unwrap();
        close("9.4 u", loss.u, want, 1e-12);
    }
}

/// JCGM 100:2008 Table G.2, as printed to two decimals (ν, then p = 90, 95, 95.45, 99, 99.73 %).
#[test]
fn student_factors() {
    let table = [
        (1.0, [6.31, 12.71, 13.97, 63.66, 235.80]),
        (2.0, [2.92, 4.30, 4.53, 9.92, 19.21]),
        (3.0, [2.35, 3.18, 3.31, 5.84, 9.22]),
        (4.0, [2.13, 2.78, 2.87, 4.60, 6.62]),
        (5.0, [2.02, 2.57, 2.65, 4.03, 5.51]),
        (10.0, [1.81, 2.23, 2.28, 3.17, 3.96]),
        (16.0, [1.75, 2.12, 2.17, 2.92, 3.54]),
        (20.0, [1.72, 2.09, 2.13, 2.85, 3.42]),
        (50.0, [1.68, 2.01, 2.05, 2.68, 3.16]),
        (f64::INFINITY, [1.645, 1.960, 2.000, 2.576, 3.000]),
    ];
    for (nu, factors) in table {
        for (p, want) in [0.90, 0.95, 0.9545, 0.99, 0.9973].into_iter().zip(factors) {
            let got = coverage_factor(p, nu).unwrap();
            // the table prints 235.80 for p = 99.73 %, which is the factor of the rounded normal 3 σ (235.78 here)
            let half_digit = if want > 200.0 { 0.03 } else { 0.0051 };
            close(&format!("t_{p}({nu})"), got, want, half_digit);
        }
    }
}

/// Distributions to all digits, by SciPy.
#[test]
fn distributions_by_scipy() {
    kept_and_live("distributions", |reference| {
        for entry in rows(&reference["student"]) {
            let [p, nu, want] = entry[..] else { panic!("three numbers") };
            let got = coverage_factor(p, nu).unwrap();
            close(&format!("t_{p}({nu})"), got / want, 1.0, 1e-10);
            close(&format!("p of {want} at ν = {nu}"), coverage_probability(want, nu).unwrap(), p, 1e-11);
        }
        for entry in rows(&reference["normal"]) {
            let [z, want] = entry[..] else { panic!("two numbers") };
            close(&format!("Φ({z})"), normal_probability(z).unwrap() / want, 1.0, 1e-12);
        }
        for entry in rows(&reference["normal_quantile"]) {
            let [p, want] = entry[..] else { panic!("two numbers") };
            close(&format!("Φ⁻¹({p})"), normal_quantile(p).unwrap(), want, 1e-12 * want.abs().max(1.0));
        }
        for entry in rows(&reference["chi_square"]) {
            let [x, nu, want] = entry[..] else { panic!("three numbers") };
            close(&format!("χ² tail({x}, {nu})"), chi_square_tail(x, nu).unwrap() / want, 1.0, 1e-11);
        }
        assert_eq!(list(reference, "student").len(), 162);
    });
}

/// The fixed problem of `tests/reference/scipy_fit.py`, with derivatives by dual numbers.
struct Wide {
    orders: Vec<f64>,
    readings: Vec<f64>,
    u_reading: f64,
    priors: Vec<Vec<f64>>,
}

impl Wide {
    fn row(&self, i: usize, p: [DualSVec64<3>; 3]) -> Option<DualSVec64<3>> {
        let [k, q, c] = p;
        let Some(&order) = self.orders.get(i) else {
            let prior = &self.priors[i - self.orders.len()];
            return Some((p[i - self.orders.len()] - prior[0]) / prior[1]);
        };
        let u = q * order;
        let inside = -(u * u) + 1.0;
        (inside.re > 0.0).then(|| (k * u / inside.sqrt() + c - self.readings[i]) / self.u_reading)
    }
}

impl Problem for Wide {
    fn residuals_and_jacobian(&self, p: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let dual: [DualSVec64<3>; 3] = std::array::from_fn(|i| DualSVec64::from_re(p[i]).derivative(i));
        let rows: Option<Vec<_>> = (0..self.orders.len() + self.priors.len()).map(|i| self.row(i, dual)).collect();
        let rows = rows?;
        let gradient = |i: usize| rows[i].eps.unwrap_generic(nalgebra::Const::<3>, nalgebra::Const::<1>);
        let jacobian = DMatrix::from_fn(rows.len(), 3, |i, j| gradient(i)[j]);
        Some((DVector::from_iterator(rows.len(), rows.iter().map(|value| value.re)), jacobian))
    }
}

/// Parameters and covariance of a weighted fit with priors, by SciPy's MINPACK; and the exact split of its variance.
#[test]
fn weighted_fit_with_priors_by_scipy() {
    kept_and_live("scipy_fit", |reference| {
        let problem = Wide {
            orders: row(&reference["orders"]),
            readings: row(&reference["readings"]),
            u_reading: number(reference, "u_reading"),
            priors: rows(&reference["priors"]),
        };
        let fit = least_squares(&problem, DVector::from_vec(row(&reference["start"])), &Options::default()).unwrap();
        assert!(fit.ending.was_successful(), "{}", fit.ending);
        let covariance = rows(&reference["covariance"]);
        for (i, &want) in row(&reference["parameters"]).iter().enumerate() {
            let u = covariance[i][i].sqrt();
            close(&format!("parameter {i} in units of its u"), (fit.parameters[i] - want) / u, 0.0, 1e-6);
            for (j, of_j) in covariance.iter().enumerate() {
                let scale = u * of_j[j].sqrt();
                close(&format!("covariance {i} {j}, scaled"), fit.covariance[(i, j)] / scale, of_j[i] / scale, 1e-8);
            }
        }
        close("χ²", fit.chi_square(), number(reference, "chi_square"), 1e-9);
        for (k, &want) in row(&reference["singular_values_of_scaled_jacobian"]).iter().enumerate() {
            close("singular value", fit.normal_inverse.singular_values[k], want, 1e-8);
        }
        split_adds_up(&fit.jacobian, &fit.normal_inverse);
    });
}

/// Shares of readings (7 rows) and of the two priors in the variance of q: sum to one, and equal to what redrawing each
/// group alone would give, `Σ_g K_g K_gᵀ` with `K = C Jᵀ`.
fn split_adds_up(jacobian: &DMatrix<f64>, inverse: &NormalInverse) {
    let groups = [0, 0, 0, 0, 0, 0, 0, 1, 2];
    let q = dvector![0.0, 1.0, 0.0];
    let split = VarianceSplit::new(jacobian, &inverse.covariance, &q, &groups, 3).unwrap();
    close("shares", split.shares().iter().sum(), 1.0, 1e-14);
    let gain = &inverse.covariance * jacobian.transpose();
    for (group, part) in split.parts.iter().enumerate() {
        let of_group: f64 = (0..9).filter(|&i| groups[i] == group).map(|i| gain[(1, i)].powi(2)).sum();
        close("part", part / of_group, 1.0, 1e-12);
    }
    close("variance", split.variance() / inverse.covariance[(1, 1)], 1.0, 1e-12);
}
