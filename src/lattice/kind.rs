//! Which of the five plane lattices it is, as a statistical statement: every higher symmetry is a hypothesis that the cell and its
//! covariance reject or not, together with the deviation that would have been noticed.

use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor, Normal};

use super::{
    LatticeError,
    cell::{Cell, norm, reduce},
};

/// The five Bravais lattices of the plane (International Tables for Crystallography A, chapter 1.3; from memory: mp, op, oc, tp, hp).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LatticeKind {
    /// No mirror lines (mp).
    Oblique,
    /// Angle 90 degrees (op).
    Rectangular,
    /// A rhombus: two equal shortest vectors, or b ending above the middle of a (oc).
    CentredRectangular,
    /// Equal pitches at 90 degrees (tp).
    Square,
    /// Equal pitches at 120 degrees (hp).
    Hexagonal,
}

/// A measured reduced cell: pitches p1 <= p2 in any one unit, the angle between them, and their covariance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CellEstimate {
    /// First pitch.
    pub p1: f64,
    /// Second pitch, same unit.
    pub p2: f64,
    /// Angle between them, radians; 60 to 120 degrees for a reduced cell.
    pub angle_rad: f64,
    /// Covariance of (p1, p2, `angle_rad`).
    pub covariance: [[f64; 3]; 3],
    /// Effective degrees of freedom of the covariance; infinite if it is known.
    pub degrees_of_freedom: f64,
}

/// How the symmetry is tested.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct KindOptions {
    /// Significance level of each test: the share of truly symmetric cells that are denied their symmetry.
    pub level: f64,
    /// A symmetry says nothing if a deviation of this size (relative length, or radians) could have gone unnoticed.
    pub telling: f64,
}

impl Default for KindOptions {
    fn default() -> Self {
        Self { level: 0.01, telling: 0.05 }
    }
}

/// One symmetry as a hypothesis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SymmetryTest {
    /// The symmetry.
    pub kind: LatticeKind,
    /// cᵀ V⁻¹ c of its constraints c.
    pub chi_square: f64,
    /// Number of constraints: 1 for the rectangular kinds, 2 for square and hexagonal.
    pub constraints: usize,
    /// Probability of so large a value if the symmetry holds.
    pub p_value: f64,
    /// Deviation (relative length, or radians) that would have been rejected with probability 0.95; the worst of its constraints.
    pub detectable: f64,
}

/// The kind of a lattice with what speaks for it.
#[derive(Debug, Clone, PartialEq)]
pub struct KindStatement {
    /// The highest symmetry that is not rejected.
    pub kind: LatticeKind,
    /// False if the uncertainty is so wide that the statement is empty.
    pub telling: bool,
    /// Level of the tests.
    pub level: f64,
    /// Hexagonal, square, centred rectangular, rectangular.
    pub tests: Vec<SymmetryTest>,
}

impl CellEstimate {
    /// Estimate from two direct vectors and the covariance of (`a_x`, `a_y`, `b_x`, `b_y`); the cell is reduced first and the covariance carried along.
    ///
    /// # Errors
    /// [`LatticeError::FlatCell`] for parallel vectors, [`LatticeError::BadCovariance`] for an unusable covariance.
    pub fn from_vectors(cell: &Cell, covariance: &[[f64; 4]; 4], degrees_of_freedom: f64) -> Result<Self, LatticeError> {
        let reduced = reduce(cell)?;
        let turn = reduced.transform.jacobian();
        let Cell { a, b } = reduced.cell;
        let (p1, p2) = (norm(a), norm(b));
        let sign = reduced.cell.signed_area().signum();
        // The angle from a to b changes by a turn of b minus a turn of a.
        let read = [
            [a[0] / p1, a[1] / p1, 0.0, 0.0],
            [0.0, 0.0, b[0] / p2, b[1] / p2],
            [sign * a[1] / (p1 * p1), -sign * a[0] / (p1 * p1), -sign * b[1] / (p2 * p2), sign * b[0] / (p2 * p2)],
        ];
        let to_given = read.map(|row| [0, 1, 2, 3].map(|j| (0..4).map(|i| row[i] * turn[i][j]).sum::<f64>()));
        let carried = carry(&to_given, covariance);
        let estimate = Self { p1, p2, angle_rad: reduced.cell.angle_rad(), covariance: carried, degrees_of_freedom };
        estimate.check()?;
        Ok(estimate)
    }

    fn check(&self) -> Result<(), LatticeError> {
        let finite = self.covariance.iter().flatten().all(|v| v.is_finite());
        let least = (0..3).map(|i| self.covariance[i][i]).fold(f64::INFINITY, f64::min);
        if !finite || least < 0.0 || self.degrees_of_freedom.is_nan() || self.degrees_of_freedom < 1.0 {
            return Err(LatticeError::BadCovariance { variance: if least.is_finite() { least } else { 0.0 } });
        }
        let area = self.p1 * self.p2 * self.angle_rad.sin();
        let spans = area.is_finite() && self.p1 > 0.0 && self.p2 > 0.0 && area > 1e-12 * self.p1 * self.p2;
        if spans { Ok(()) } else { Err(LatticeError::FlatCell { area: if area.is_finite() { area } else { 0.0 } }) }
    }
}

/// The highest symmetry that a measured cell does not reject.
///
/// Constraints on the reduced cell (p1 <= p2, angle γ folded to 90..120 degrees): hexagonal ln(p2/p1) = 0 and γ = 120°;
/// square ln(p2/p1) = 0 and γ = 90°; rectangular γ = 90°; centred rectangular either ln(p2/p1) = 0 or cos γ = -p1/(2 p2) (the one
/// that fits better). Each is tested by χ² = cᵀ V⁻¹ c with V = J C Jᵀ; with ν finite degrees of freedom χ²/m is compared with F(m, ν).
/// If square and hexagonal both survive, or a deviation beyond `options.telling` would go unnoticed, the statement is marked as empty.
///
/// # Errors
/// [`LatticeError::FlatCell`] or [`LatticeError::BadCovariance`] for an unusable estimate.
pub fn kind_of_lattice(estimate: &CellEstimate, options: &KindOptions) -> Result<KindStatement, LatticeError> {
    estimate.check()?;
    let level = options.level.clamp(1e-9, 0.5);
    let fold = if estimate.angle_rad < std::f64::consts::FRAC_PI_2 { -1.0 } else { 1.0 };
    let angle = if fold < 0.0 { std::f64::consts::PI - estimate.angle_rad } else { estimate.angle_rad };
    let equal = Constraint { value: (estimate.p2 / estimate.p1).ln(), slope: [-1.0 / estimate.p1, 1.0 / estimate.p2, 0.0] };
    let angle_is = |degrees: f64| Constraint { value: angle - degrees.to_radians(), slope: [0.0, 0.0, fold] };
    let above_middle = Constraint {
        value: angle.cos() + 0.5 * estimate.p1 / estimate.p2,
        slope: [0.5 / estimate.p2, -0.5 * estimate.p1 / (estimate.p2 * estimate.p2), -fold * angle.sin()],
    };
    let test = |kind, constraints: &[Constraint]| symmetry_test(estimate, level, kind, constraints);
    let rhombus = test(LatticeKind::CentredRectangular, &[equal]);
    let centred = test(LatticeKind::CentredRectangular, &[above_middle]);
    let tests = vec![
        test(LatticeKind::Hexagonal, &[equal, angle_is(120.0)]),
        test(LatticeKind::Square, &[equal, angle_is(90.0)]),
        if rhombus.p_value >= centred.p_value { rhombus } else { centred },
        test(LatticeKind::Rectangular, &[angle_is(90.0)]),
    ];
    let holds = |t: &&SymmetryTest| t.p_value >= level;
    let high: Vec<&SymmetryTest> = tests[..2].iter().filter(holds).collect();
    let low = tests[2..].iter().filter(holds);
    let best = |a: &&SymmetryTest, b: &&SymmetryTest| a.p_value.total_cmp(&b.p_value);
    let chosen = high.iter().copied().max_by(best).or_else(|| low.max_by(best));
    let telling = high.len() < 2 && chosen.is_none_or(|t| t.detectable <= options.telling);
    Ok(KindStatement { kind: chosen.map_or(LatticeKind::Oblique, |t| t.kind), telling, level, tests })
}

/// A quantity that is zero if the symmetry holds, and its slopes in (p1, p2, angle).
#[derive(Debug, Clone, Copy)]
struct Constraint {
    value: f64,
    slope: [f64; 3],
}

fn symmetry_test(estimate: &CellEstimate, level: f64, kind: LatticeKind, constraints: &[Constraint]) -> SymmetryTest {
    let covariance = |c: &Constraint, d: &Constraint| -> f64 {
        (0..3).map(|i| (0..3).map(|j| c.slope[i] * estimate.covariance[i][j] * d.slope[j]).sum::<f64>()).sum()
    };
    // An exact input must not divide by zero: 1e-12 is far below any real relative uncertainty.
    let variance = |c: &Constraint| covariance(c, c).max(0.0) + 1e-24;
    let chi_square = match constraints {
        [c, d] => {
            let (v, w, r) = (variance(c), variance(d), covariance(c, d));
            let determinant = (v * w - r * r).max(1e-12 * v * w);
            (w * c.value * c.value - 2.0 * r * c.value * d.value + v * d.value * d.value) / determinant
        }
        _ => constraints.iter().map(|c| c.value * c.value / variance(c)).sum(),
    };
    let noticed = deviation_noticed(level);
    let detectable = constraints.iter().map(|c| noticed * variance(c).sqrt()).fold(0.0, f64::max);
    let p_value = upper_tail(chi_square.max(0.0), constraints.len(), estimate.degrees_of_freedom);
    SymmetryTest { kind, chi_square, constraints: constraints.len(), p_value, detectable }
}

/// Deviation in standard uncertainties that a two-sided test at `level` rejects with probability 0.95.
fn deviation_noticed(level: f64) -> f64 {
    Normal::new(0.0, 1.0).map_or(4.22, |n| n.inverse_cdf(1.0 - 0.5 * level) + n.inverse_cdf(0.95))
}

fn upper_tail(chi_square: f64, constraints: usize, degrees_of_freedom: f64) -> f64 {
    let m = super::evidence::real(constraints);
    let tail = if degrees_of_freedom < 1e6 {
        FisherSnedecor::new(m, degrees_of_freedom).ok().map(|f| f.sf(chi_square / m))
    } else {
        ChiSquared::new(m).ok().map(|c| c.sf(chi_square))
    };
    tail.unwrap_or(0.0).clamp(0.0, 1.0)
}

fn carry(j: &[[f64; 4]; 3], covariance: &[[f64; 4]; 4]) -> [[f64; 3]; 3] {
    let entry = |p: usize, q: usize| (0..4).map(|i| (0..4).map(|l| j[p][i] * covariance[i][l] * j[q][l]).sum::<f64>()).sum();
    [0, 1, 2].map(|p| [0, 1, 2].map(|q| entry(p, q)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::SeedableRng;
    use rand_distr::Distribution;

    fn estimate(p1: f64, p2: f64, degrees: f64, ur: f64, u_deg: f64) -> CellEstimate {
        let (v1, v2, v3) = ((ur * p1).powi(2), (ur * p2).powi(2), u_deg.to_radians().powi(2));
        let covariance = [[v1, 0.0, 0.0], [0.0, v2, 0.0], [0.0, 0.0, v3]];
        CellEstimate { p1, p2, angle_rad: degrees.to_radians(), covariance, degrees_of_freedom: f64::INFINITY }
    }

    fn kind(p1: f64, p2: f64, degrees: f64) -> LatticeKind {
        kind_of_lattice(&estimate(p1, p2, degrees, 1e-3, 0.05), &KindOptions::default()).unwrap().kind
    }

    #[test]
    fn the_five_kinds() {
        assert_eq!(kind(10.0, 13.0, 104.0), LatticeKind::Oblique);
        assert_eq!(kind(10.0, 13.0, 90.05), LatticeKind::Rectangular);
        assert_eq!(kind(10.0, 10.01, 104.0), LatticeKind::CentredRectangular);
        // b above the middle of a: the conventional cell is 10 x 24, the half diagonal 13 at cos γ = -5/13.
        assert_eq!(kind(10.0, 13.0, (-5.0_f64 / 13.0).acos().to_degrees()), LatticeKind::CentredRectangular);
        assert_eq!(kind(10.0, 10.01, 90.05), LatticeKind::Square);
        assert_eq!(kind(10.0, 10.01, 119.95), LatticeKind::Hexagonal);
        assert_eq!(kind(10.0, 10.01, 60.05), LatticeKind::Hexagonal);
    }

    #[test]
    fn wide_uncertainty_makes_an_empty_statement() {
        let vague = kind_of_lattice(&estimate(10.0, 10.2, 100.0, 0.1, 12.0), &KindOptions::default()).unwrap();
        assert!(!vague.telling);
        let sharp = kind_of_lattice(&estimate(10.0, 10.01, 90.05, 1e-3, 0.05), &KindOptions::default()).unwrap();
        assert!(sharp.telling);
        // 2.576 + 1.645 standard deviations of ln(p2/p1), u = 1e-3 √2 (normal quantiles 0.995 and 0.95).
        let square = sharp.tests.iter().find(|t| t.kind == LatticeKind::Square).unwrap();
        assert!((square.detectable - 4.2207 * 1e-3 * 2.0_f64.sqrt()).abs() < 1e-6, "{}", square.detectable);
    }

    #[test]
    fn unusable_estimates_are_refused() {
        let mut bad = estimate(1.0, 1.0, 90.0, 1e-3, 0.1);
        bad.covariance[0][0] = -1.0;
        assert!(kind_of_lattice(&bad, &KindOptions::default()).is_err());
        assert!(kind_of_lattice(&estimate(1.0, f64::NAN, 90.0, 1e-3, 0.1), &KindOptions::default()).is_err());
        assert!(kind_of_lattice(&estimate(1.0, 1.0, 0.0, 1e-3, 0.1), &KindOptions::default()).is_err());
        assert!(kind_of_lattice(&estimate(1.0, 1.0, 90.0, 0.0, 0.0), &KindOptions::default()).is_ok());
    }

    /// A truly hexagonal or square cell is denied its symmetry as often as the level says, whichever of the equal vectors
    /// noise makes the shortest: 4000 draws at level 0.05, binomial standard deviation 0.0034, allowed 4 of them.
    #[test]
    fn the_level_is_kept() {
        let mut random = rand_chacha::ChaCha8Rng::seed_from_u64(7);
        let noise = rand_distr::Normal::new(0.0, 1e-3).unwrap();
        let covariance = [0, 1, 2, 3].map(|i| [0, 1, 2, 3].map(|j| if i == j { 1e-6 } else { 0.0 }));
        let options = KindOptions { level: 0.05, telling: 0.05 };
        for (angle, wanted) in [(120.0_f64, LatticeKind::Hexagonal), (90.0, LatticeKind::Square)] {
            let (sin, cos) = angle.to_radians().sin_cos();
            let denied = (0..4000)
                .filter(|_| {
                    let mut draw = || noise.sample(&mut random);
                    let cell = Cell { a: [1.0 + draw(), draw()], b: [cos + draw(), sin + draw()] };
                    let e = CellEstimate::from_vectors(&cell, &covariance, f64::INFINITY).unwrap();
                    kind_of_lattice(&e, &options).unwrap().kind != wanted
                })
                .count();
            let share = crate::lattice::evidence::real(denied) / 4000.0;
            assert!((share - 0.05).abs() < 0.014, "{wanted:?} denied in {share} of draws");
        }
    }
}
