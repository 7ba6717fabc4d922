//! NIST Statistical Reference Datasets against `math::least_squares`.
//!
//! Source: NIST, Statistical Reference Datasets, files as published in `tests/data/nist` (see the README there). Certified values
//! have 11 digits. Every nonlinear set is fitted from *both* published starts, with derivatives by dual numbers;
//! the bar beside each set is the number of correct digits that the worst parameter, and the worst standard
//! deviation, must reach. `digits = -log10(|got - certified| / |certified|)`, capped at 11.

use nalgebra::{DMatrix, DVector};
use num_dual::{DualNum, DualSVec64};
use spotrule::math::{Options, Problem, Solution, finite_difference, least_squares};
use std::f64::consts::PI;

const CERTIFIED_DIGITS: f64 = 11.0;

/// Digits of parameters and of standard deviations that most sets reach (measured: 9.5 to 11).
const NINE: (f64, f64) = (9.0, 9.0);
/// Long curved valleys or parameters that nearly replace each other (measured: 9.0 to 9.5).
const STEEP: (f64, f64) = (8.5, 8.5);
/// Data exact to 14 digits: the residuals are 1e-13 of them, so double precision leaves three digits of their
/// sum of squares, which scales the standard deviations.
const LANCZOS1: (f64, f64) = (9.0, 2.5);

/// A data set as published.
struct Certified {
    starts: [Vec<f64>; 2],
    parameters: Vec<f64>,
    deviations: Vec<f64>,
    residual_sum_of_squares: f64,
    /// y, then the predictors.
    rows: Vec<Vec<f64>>,
}

fn numbers(line: &str) -> Vec<f64> {
    line.split_whitespace().filter_map(|word| word.parse().ok()).collect()
}

fn read(name: &str) -> Certified {
    let path = format!("{}/tests/data/nist/{name}.dat", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
    let table: Vec<Vec<f64>> = text
        .lines()
        .filter(|line| line.trim_start().starts_with('b') && line.contains(" = "))
        .map(numbers)
        .filter(|v| v.len() == 4)
        .collect();
    let column = |k: usize| table.iter().map(|row| row[k]).collect::<Vec<f64>>();
    let after = |label: &str| {
        let line = text.lines().find(|line| line.starts_with(label)).unwrap();
        line.split_whitespace().last().unwrap().parse::<f64>().unwrap()
    };
    // the first "Data:" describes the set, the last one heads the columns
    let data = text.rfind("\nData:").unwrap() + 1;
    let rows: Vec<_> = text[data..].lines().skip(1).map(numbers).filter(|row| row.len() >= 2).collect();
    let count = text.lines().filter(|l| l.contains("Number of Observations:")).map(|l| numbers(l)[0]).next_back().unwrap();
    assert!((rows.len() as f64 - count).abs() < 0.5, "{name}: {} rows read, {count} announced", rows.len());
    Certified {
        starts: [column(0), column(1)],
        parameters: column(2),
        deviations: column(3),
        residual_sum_of_squares: after("Residual Sum of Squares:"),
        rows,
    }
}

/// `y - f(b, x)` with its derivatives, N parameters.
struct Regression<'a, const N: usize> {
    rows: &'a [Vec<f64>],
    response: fn(f64) -> f64,
    model: fn([DualSVec64<N>; N], &[f64]) -> DualSVec64<N>,
}

impl<const N: usize> Problem for Regression<'_, N> {
    fn residuals_and_jacobian(&self, b: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let dual: [DualSVec64<N>; N] = std::array::from_fn(|i| DualSVec64::from_re(b[i]).derivative(i));
        let mut residuals = DVector::zeros(self.rows.len());
        let mut jacobian = DMatrix::zeros(self.rows.len(), N);
        for (i, row) in self.rows.iter().enumerate() {
            let value = (self.model)(dual, &row[1..]) - (self.response)(row[0]);
            residuals[i] = value.re;
            let gradient = value.eps.unwrap_generic(nalgebra::Const::<N>, nalgebra::Const::<1>);
            jacobian.row_mut(i).tr_copy_from(&gradient);
        }
        Some((residuals, jacobian))
    }

    fn residuals(&self, b: &DVector<f64>) -> Option<DVector<f64>> {
        let plain: [DualSVec64<N>; N] = std::array::from_fn(|i| DualSVec64::from_re(b[i]));
        let value = |row: &Vec<f64>| (self.model)(plain, &row[1..]).re - (self.response)(row[0]);
        Some(DVector::from_iterator(self.rows.len(), self.rows.iter().map(value)))
    }
}

/// Correct digits of the worst of several values.
fn digits<'a>(got: impl IntoIterator<Item = f64>, want: impl IntoIterator<Item = &'a f64>) -> f64 {
    let one =
        |(got, want): (f64, &f64)| if got.to_bits() == want.to_bits() { CERTIFIED_DIGITS } else { -((got - want) / want).abs().log10() };
    got.into_iter().zip(want).map(one).fold(CERTIFIED_DIGITS, f64::min)
}

fn deviations(solution: &Solution) -> Vec<f64> {
    let variance = solution.chi_square() / solution.degrees_of_freedom() as f64;
    solution.covariance.diagonal().iter().map(|v| (v * variance).sqrt()).collect()
}

/// Fits one set from both starts and holds it to its bar: (digits of parameters, digits of standard deviations).
fn certify<const N: usize>(name: &str, bar: (f64, f64), model: fn([DualSVec64<N>; N], &[f64]) -> DualSVec64<N>) {
    certify_with(name, bar, |y| y, model);
}

fn certify_with<const N: usize>(
    name: &str,
    bar: (f64, f64),
    response: fn(f64) -> f64,
    model: fn([DualSVec64<N>; N], &[f64]) -> DualSVec64<N>,
) {
    let set = read(name);
    assert_eq!(set.parameters.len(), N, "{name}: parameters in the file");
    let problem = Regression { rows: &set.rows, response, model };
    for (start, from) in set.starts.iter().zip(["1", "2"]) {
        let got = least_squares(&problem, DVector::from_vec(start.clone()), &Options::default()).unwrap();
        let in_parameters = digits(got.parameters.iter().copied(), &set.parameters);
        let in_deviations = digits(deviations(&got), &set.deviations);
        let in_squares = digits([got.chi_square()], &[set.residual_sum_of_squares]);
        println!(
            "{name:9} start {from}: parameters {in_parameters:4.1}, deviations {in_deviations:4.1}, sum of squares {in_squares:4.1} digits; {} evaluations, rank {}, {}",
            got.evaluations, got.rank, got.ending
        );
        assert!(got.ending.was_successful(), "{name} from start {from}: {}", got.ending);
        assert!(in_parameters >= bar.0, "{name} from start {from}: parameters to {in_parameters:.1} digits, bar {}", bar.0);
        assert!(in_deviations >= bar.1, "{name} from start {from}: deviations to {in_deviations:.1} digits, bar {}", bar.1);
    }
    check_derivatives(name, &problem, &set);
}

/// Dual numbers against central differences at the certified parameters, column by column.
fn check_derivatives<const N: usize>(name: &str, problem: &Regression<'_, N>, set: &Certified) {
    let at = DVector::from_vec(set.parameters.clone());
    let (_, exact) = problem.residuals_and_jacobian(&at).unwrap();
    let numeric = finite_difference::jacobian(problem, &at, &at.map(|b| 0.02 * b.abs())).unwrap();
    for (column, (exact, numeric)) in exact.column_iter().zip(numeric.column_iter()).enumerate() {
        let error = (exact - numeric).norm() / exact.norm();
        assert!(error < 1e-6, "{name}: derivative in b{} differs by {error:.1e} of its length", column + 1);
    }
}

fn gaussians(b: [DualSVec64<8>; 8], x: &[f64]) -> DualSVec64<8> {
    let x = x[0];
    let bell = |height: DualSVec64<8>, centre: DualSVec64<8>, width: DualSVec64<8>| height * (-((centre - x) / width).powi(2)).exp();
    b[0] * (-b[1] * x).exp() + bell(b[2], b[3], b[4]) + bell(b[5], b[6], b[7])
}

fn exponentials(b: [DualSVec64<6>; 6], x: &[f64]) -> DualSVec64<6> {
    b[0] * (-b[1] * x[0]).exp() + b[2] * (-b[3] * x[0]).exp() + b[4] * (-b[5] * x[0]).exp()
}

fn cubic_over_cubic(b: [DualSVec64<7>; 7], x: &[f64]) -> DualSVec64<7> {
    let x = x[0];
    (((b[3] * x + b[2]) * x + b[1]) * x + b[0]) / (((b[6] * x + b[5]) * x + b[4]) * x + 1.0)
}

fn saturation(b: [DualSVec64<2>; 2], x: &[f64]) -> DualSVec64<2> {
    b[0] * -(-b[1] * x[0]).exp_m1()
}

#[test]
fn misra1a() {
    certify("Misra1a", NINE, saturation);
}

#[test]
fn chwirut1_and_2() {
    let model = |b: [DualSVec64<3>; 3], x: &[f64]| (-b[0] * x[0]).exp() / (b[2] * x[0] + b[1]);
    certify("Chwirut1", NINE, model);
    certify("Chwirut2", NINE, model);
}

#[test]
fn lanczos1_to_3() {
    certify("Lanczos1", LANCZOS1, exponentials);
    certify("Lanczos2", STEEP, exponentials);
    certify("Lanczos3", NINE, exponentials);
}

#[test]
fn gauss1_to_3() {
    certify("Gauss1", NINE, gaussians);
    certify("Gauss2", NINE, gaussians);
    certify("Gauss3", NINE, gaussians);
}

#[test]
fn dan_wood() {
    certify("DanWood", NINE, |b: [DualSVec64<2>; 2], x| b[0] * (b[1] * x[0].ln()).exp());
}

#[test]
fn misra1b_to_d() {
    certify("Misra1b", NINE, |b: [DualSVec64<2>; 2], x| b[0] * (-(b[1] * (x[0] / 2.0) + 1.0).powi(-2) + 1.0));
    certify("Misra1c", NINE, |b: [DualSVec64<2>; 2], x| b[0] * (-(b[1] * (2.0 * x[0]) + 1.0).sqrt().recip() + 1.0));
    certify("Misra1d", NINE, |b: [DualSVec64<2>; 2], x| b[0] * b[1] * x[0] / (b[1] * x[0] + 1.0));
}

#[test]
fn kirby2() {
    certify("Kirby2", NINE, |b: [DualSVec64<5>; 5], x| {
        let x = x[0];
        ((b[2] * x + b[1]) * x + b[0]) / ((b[4] * x + b[3]) * x + 1.0)
    });
}

#[test]
fn hahn1_and_thurber() {
    certify("Hahn1", NINE, cubic_over_cubic);
    certify("Thurber", NINE, cubic_over_cubic);
}

/// The response is the logarithm of the observed voltage.
#[test]
fn nelson() {
    certify_with("Nelson", NINE, f64::ln, |b: [DualSVec64<3>; 3], x| b[0] - b[1] * x[0] * (-b[2] * x[1]).exp());
}

#[test]
fn mgh09() {
    certify("MGH09", STEEP, |b: [DualSVec64<4>; 4], x| {
        let x = x[0];
        b[0] * (b[1] * x + x * x) / (b[2] * x + b[3] + x * x)
    });
}

#[test]
fn mgh10() {
    certify("MGH10", STEEP, |b: [DualSVec64<3>; 3], x| b[0] * (b[1] / (b[2] + x[0])).exp());
}

#[test]
fn mgh17() {
    certify("MGH17", NINE, |b: [DualSVec64<5>; 5], x| b[0] + b[1] * (-b[3] * x[0]).exp() + b[2] * (-b[4] * x[0]).exp());
}

#[test]
fn enso() {
    certify("ENSO", STEEP, |b: [DualSVec64<9>; 9], x| {
        let turn = 2.0 * PI * x[0];
        let (first, second) = (b[3].recip() * turn, b[6].recip() * turn);
        b[0] + b[1] * (turn / 12.0).cos()
            + b[2] * (turn / 12.0).sin()
            + b[4] * first.cos()
            + b[5] * first.sin()
            + b[7] * second.cos()
            + b[8] * second.sin()
    });
}

#[test]
fn roszman1() {
    certify("Roszman1", NINE, |b: [DualSVec64<4>; 4], x| b[0] - b[1] * x[0] - (b[2] / (-b[3] + x[0])).atan() / PI);
}

#[test]
fn rat42_and_43() {
    certify("Rat42", NINE, |b: [DualSVec64<3>; 3], x| b[0] / ((b[1] - b[2] * x[0]).exp() + 1.0));
    certify("Rat43", NINE, |b: [DualSVec64<4>; 4], x| b[0] * (-((b[1] - b[2] * x[0]).exp().ln_1p()) / b[3]).exp());
}

#[test]
fn eckerle4() {
    certify("Eckerle4", NINE, |b: [DualSVec64<3>; 3], x| b[0] / b[1] * (((-b[2] + x[0]) / b[1]).powi(2) * -0.5).exp());
}

#[test]
fn box_bod() {
    certify("BoxBOD", NINE, saturation);
}

#[test]
fn bennett5() {
    certify("Bennett5", NINE, |b: [DualSVec64<3>; 3], x| b[0] * (-(b[1] + x[0]).ln() / b[2]).exp());
}

/// A linear model as a problem: one column of the design per parameter.
struct Linear {
    design: DMatrix<f64>,
    response: DVector<f64>,
}

impl Problem for Linear {
    fn residuals_and_jacobian(&self, b: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
        Some((&self.design * b - &self.response, self.design.clone()))
    }
}

impl Linear {
    /// Rows of `y x1 x2 …` below the last line that starts with "Data:"; a constant comes first.
    fn read(name: &str) -> Self {
        let path = format!("{}/tests/data/nist/{name}.dat", env!("CARGO_MANIFEST_DIR"));
        let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
        let data = text.rfind("\nData:").unwrap() + 1;
        let rows: Vec<Vec<f64>> = text[data..].lines().skip(1).map(numbers).filter(|row| row.len() >= 2).collect();
        let design = DMatrix::from_fn(rows.len(), rows[0].len(), |i, j| if j == 0 { 1.0 } else { rows[i][j] });
        Self { design, response: DVector::from_fn(rows.len(), |i, _| rows[i][0]) }
    }

    fn certify(&self, bar: (f64, f64), parameters: &[f64], deviations_certified: &[f64], residual_deviation: f64) {
        let start = DVector::zeros(parameters.len());
        let got = least_squares(self, start, &Options::default()).unwrap();
        let in_parameters = digits(got.parameters.iter().copied(), parameters);
        let in_deviations = digits(deviations(&got), deviations_certified);
        let scatter = (got.chi_square() / got.degrees_of_freedom() as f64).sqrt();
        println!("linear: parameters {in_parameters:.1}, deviations {in_deviations:.1} digits; {}", got.ending);
        assert_eq!(got.rank, parameters.len());
        assert!(in_parameters >= bar.0 && in_deviations >= bar.1, "{in_parameters:.1}, {in_deviations:.1} digits");
        assert!((scatter / residual_deviation - 1.0).abs() < 1e-9);
    }
}

/// Low difficulty; certified to 15 digits.
#[test]
fn norris() {
    let (b, sd) = ([-0.262323073774029, 1.00211681802045], [0.232818234301152, 0.429796848199937e-3]);
    let set = Linear::read("Norris");
    assert_eq!(set.response.len(), 36);
    set.certify((10.5, 10.5), &b, &sd, 0.884796396144373);
}

/// High difficulty: predictors that nearly repeat each other, condition 5e9 before columns are scaled.
#[test]
fn longley() {
    let b = [
        -3482258.63459582,
        15.0618722713733,
        -0.0358191792925910,
        -2.02022980381683,
        -1.03322686717359,
        -0.0511041056535807,
        1829.15146461355,
    ];
    let sd =
        [890420.383607373, 84.9149257747669, 0.0334910077722432, 0.488399681651699, 0.214274163161675, 0.226073200069370, 455.478499142212];
    let set = Linear::read("Longley");
    assert_eq!(set.response.len(), 16);
    set.certify((9.5, 9.5), &b, &sd, 304.854073561965);
}
