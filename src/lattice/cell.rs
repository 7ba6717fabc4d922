//! Plane cells: dual bases, the Lagrange-Gauss reduction with its integer transform, and what is read off a cell.

use super::LatticeError;

/// Two vectors that span a plane lattice. Direct or reciprocal is for the caller to say; lengths in the caller's unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cell {
    /// First vector.
    pub a: [f64; 2],
    /// Second vector.
    pub b: [f64; 2],
}

/// A unimodular change of basis: row i holds the integers that make the new vector i from the old ones.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Reduction {
    /// `new_i = rows[i][0] * old_a + rows[i][1] * old_b`; determinant +1 or -1.
    pub rows: [[i64; 2]; 2],
}

/// A reduced cell and how it came from the one given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reduced {
    /// |a| <= |b|, angle from a to b between 90 and 120 degrees (up to the tie tolerance), a and b the shortest pair.
    pub cell: Cell,
    /// The integers that carry the given vectors (and their covariance) to the reduced ones.
    pub transform: Reduction,
}

impl Cell {
    /// Signed area a × b; positive if b lies counter-clockwise of a.
    #[must_use]
    pub fn signed_area(&self) -> f64 {
        self.a[0] * self.b[1] - self.a[1] * self.b[0]
    }

    /// Area of the cell.
    #[must_use]
    pub fn area(&self) -> f64 {
        self.signed_area().abs()
    }

    /// Lengths |a|, |b|: for a reduced direct cell the two pitches.
    #[must_use]
    pub fn lengths(&self) -> [f64; 2] {
        [norm(self.a), norm(self.b)]
    }

    /// Angle between a and b, radians, 0..π.
    #[must_use]
    pub fn angle_rad(&self) -> f64 {
        self.signed_area().abs().atan2(dot(self.a, self.b))
    }

    /// Distances between neighbouring lattice rows: rows along b (spacing `1/|g_1|`), rows along a (spacing `1/|g_2|`).
    /// Not defined (infinite) for a flat cell; use on cells that [`dual`] accepts.
    #[must_use]
    pub fn row_spacings(&self) -> [f64; 2] {
        [self.area() / norm(self.b), self.area() / norm(self.a)]
    }

    /// Metric tensor a·a, a·b, b·b.
    #[must_use]
    pub fn metric(&self) -> [f64; 3] {
        [dot(self.a, self.a), dot(self.a, self.b), dot(self.b, self.b)]
    }
}

impl Reduction {
    /// No change.
    pub const IDENTITY: Self = Self { rows: [[1, 0], [0, 1]] };

    /// The change applied to a pair of vectors.
    #[must_use]
    pub fn apply(&self, cell: &Cell) -> Cell {
        let [p, q] = self.rows;
        Cell { a: combine(p, cell), b: combine(q, cell) }
    }

    /// The change followed by `next`.
    #[must_use]
    pub fn then(&self, next: &Self) -> Self {
        let entry = |i: usize, j: usize| next.rows[i][0] * self.rows[0][j] + next.rows[i][1] * self.rows[1][j];
        Self { rows: [[entry(0, 0), entry(0, 1)], [entry(1, 0), entry(1, 1)]] }
    }

    /// Determinant; +1 keeps the handedness, -1 turns it.
    #[must_use]
    pub fn determinant(&self) -> i64 {
        self.rows[0][0] * self.rows[1][1] - self.rows[0][1] * self.rows[1][0]
    }

    /// The 4×4 Jacobian of (`a_x`, `a_y`, `b_x`, `b_y`) new against old, for carrying a covariance: C' = J C Jᵀ.
    #[must_use]
    #[expect(clippy::cast_precision_loss, reason = "reduction integers are far below 2^53")]
    pub fn jacobian(&self) -> [[f64; 4]; 4] {
        let mut j = [[0.0; 4]; 4];
        for (i, row) in self.rows.iter().enumerate() {
            for (l, &n) in row.iter().enumerate() {
                j[2 * i][2 * l] = n as f64;
                j[2 * i + 1][2 * l + 1] = n as f64;
            }
        }
        j
    }
}

/// Dual basis: `a_i · g_j = δ_ij` (no factor 2π). Maps a direct cell to its reciprocal one and back.
///
/// `g_1 = (b_y, -b_x)/A`, `g_2 = (-a_y, a_x)/A` with the signed area A. Lengths come out in the inverse unit.
///
/// # Errors
/// [`LatticeError::FlatCell`] if the vectors are parallel (area below 1e-12 of |a||b|) or not finite.
pub fn dual(cell: &Cell) -> Result<Cell, LatticeError> {
    let area = cell.signed_area();
    check_span(cell)?;
    Ok(Cell { a: [cell.b[1] / area, -cell.b[0] / area], b: [-cell.a[1] / area, cell.a[0] / area] })
}

/// The two shortest independent lattice vectors (Lagrange-Gauss), |a| <= |b|, angle 90 to 120 degrees.
///
/// Ties (square, hexagonal) within a relative 1e-9 are left as they are, so that the result never flips between
/// runs; near-ties wider than that are decided by the numbers. In a tie of three shortest vectors (hexagonal) the pair
/// with the obtuse angle is kept, so the angle is 120 and never 60 degrees.
///
/// Source: the classical reduction of binary quadratic forms, `|2 a·b| <= a·a <= b·b`; then the two vectors are the two
/// successive minima of the lattice.
///
/// # Errors
/// [`LatticeError::FlatCell`] as for [`dual`].
pub fn reduce(cell: &Cell) -> Result<Reduced, LatticeError> {
    check_span(cell)?;
    let mut transform = Reduction::IDENTITY;
    // Each pass shortens a vector by a finite factor; 200 passes are beyond what f64 lengths can hold.
    for _ in 0..200 {
        let now = transform.apply(cell);
        let (aa, ab, bb) = (dot(now.a, now.a), dot(now.a, now.b), dot(now.b, now.b));
        if bb < aa * (1.0 - TIE) {
            transform = transform.then(&Reduction { rows: [[0, 1], [1, 0]] });
            continue;
        }
        let Some(steps) = whole_steps(ab / aa) else { break };
        transform = transform.then(&Reduction { rows: [[1, 0], [-steps, 1]] });
    }
    let now = transform.apply(cell);
    if dot(now.a, now.b) > TIE * dot(now.a, now.a) {
        transform = transform.then(&Reduction { rows: [[1, 0], [0, -1]] });
    }
    Ok(Reduced { cell: transform.apply(cell), transform })
}

/// Relative width within which two lengths, or an angle and its bound, count as equal.
const TIE: f64 = 1e-9;

/// How many times a is to be taken off b; none where b is already within half of a (ties stay).
#[expect(clippy::cast_possible_truncation, reason = "clamped to 1e15")]
fn whole_steps(share: f64) -> Option<i64> {
    (share.abs() > 0.5 + TIE).then(|| share.round().clamp(-1e15, 1e15) as i64).filter(|n| *n != 0)
}

fn check_span(cell: &Cell) -> Result<(), LatticeError> {
    let area = cell.signed_area();
    let [a, b] = cell.lengths();
    let spans = area.is_finite() && (a * b).is_finite() && area.abs() > 1e-12 * a * b && area.abs() > f64::MIN_POSITIVE;
    if spans { Ok(()) } else { Err(LatticeError::FlatCell { area: if area.is_finite() { area } else { 0.0 } }) }
}

#[expect(clippy::cast_precision_loss, reason = "reduction integers are far below 2^53")]
fn combine(n: [i64; 2], cell: &Cell) -> [f64; 2] {
    let (p, q) = (n[0] as f64, n[1] as f64);
    [p * cell.a[0] + q * cell.b[0], p * cell.a[1] + q * cell.b[1]]
}

pub(super) fn dot(p: [f64; 2], q: [f64; 2]) -> f64 {
    p[0] * q[0] + p[1] * q[1]
}

pub(super) fn norm(p: [f64; 2]) -> f64 {
    dot(p, p).sqrt()
}

pub(super) fn minus(p: [f64; 2], q: [f64; 2]) -> [f64; 2] {
    [p[0] - q[0], p[1] - q[1]]
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn cell(a: [f64; 2], b: [f64; 2]) -> Cell {
        Cell { a, b }
    }

    fn close(got: f64, want: f64, tolerance: f64) {
        assert!((got - want).abs() <= tolerance, "got {got}, want {want}, difference {}", got - want);
    }

    #[test]
    fn a_long_thin_pair_becomes_its_short_one() {
        // (1,0),(5.3,1.1): the second is 5 first ones and (0.3,1.1); its obtuse partner is (-0.3,-1.1).
        let reduced = reduce(&cell([1.0, 0.0], [5.3, 1.1])).unwrap();
        let [p, q] = reduced.cell.lengths();
        close(p, 1.0, 1e-12);
        close(q, 0.3_f64.hypot(1.1), 1e-12);
        assert!(reduced.cell.angle_rad() >= std::f64::consts::FRAC_PI_2);
        let square = reduce(&cell([3.0, 1.0], [7.0, 2.0])).unwrap();
        close(square.cell.lengths()[0], 1.0, 1e-12);
        close(square.cell.lengths()[1], 1.0, 1e-12);
        close(square.cell.angle_rad().to_degrees(), 90.0, 1e-9);
    }

    #[test]
    fn hexagonal_keeps_120_degrees_whatever_pair_is_given() {
        let half = 0.75_f64.sqrt();
        for (a, b) in [([1.0, 0.0], [0.5, half]), ([0.5, half], [-0.5, half]), ([1.5, half], [2.0, 2.0 * half])] {
            let reduced = reduce(&cell(a, b)).unwrap();
            close(reduced.cell.angle_rad().to_degrees(), 120.0, 1e-6);
            close(reduced.cell.lengths()[1], 1.0, 1e-9);
        }
    }

    #[test]
    fn dual_of_a_hexagon_has_rows_at_a_root3_over_2() {
        let a = 2.5;
        let direct = cell([a, 0.0], [-a / 2.0, a * 0.75_f64.sqrt()]);
        let reciprocal = dual(&direct).unwrap();
        close(norm(reciprocal.a), 2.0 / (3.0_f64.sqrt() * a), 1e-14);
        close(direct.row_spacings()[0], 1.0 / norm(reciprocal.a), 1e-12);
    }

    #[test]
    fn parallel_or_infinite_vectors_are_refused() {
        assert!(reduce(&cell([1.0, 0.0], [2.0, 0.0])).is_err());
        assert!(dual(&cell([0.0, 0.0], [2.0, 0.0])).is_err());
        assert!(reduce(&cell([f64::NAN, 0.0], [2.0, 1.0])).is_err());
        assert!(reduce(&cell([f64::INFINITY, 0.0], [2.0, 1.0])).is_err());
    }

    proptest! {
        /// Reduction gives the two successive minima (against a search), keeps the area and is unimodular; dual of dual is the cell.
        #[test]
        fn reduced_pairs_are_the_shortest(ax in -3.0..3.0f64, ay in -3.0..3.0f64, bx in -3.0..3.0f64, by in -3.0..3.0f64) {
            let given = cell([ax, ay], [bx, by]);
            prop_assume!(given.area() > 0.05 * norm(given.a) * norm(given.b) && norm(given.a) > 0.1 && norm(given.b) > 0.1);
            let reduced = reduce(&given).unwrap();
            prop_assert!(reduced.transform.determinant().abs() == 1);
            prop_assert!((reduced.cell.area() - given.area()).abs() < 1e-9 * given.area());
            let [p, q] = reduced.cell.lengths();
            prop_assert!(p <= q * (1.0 + 1e-8));
            let angle = reduced.cell.angle_rad().to_degrees();
            prop_assert!((90.0 - 1e-6..=120.0 + 1e-6).contains(&angle));
            for i in -4i64..=4 {
                for j in -4i64..=4 {
                    if (i, j) == (0, 0) { continue; }
                    let length = norm(combine([i, j], &reduced.cell));
                    prop_assert!(length >= p * (1.0 - 1e-9));
                    if j != 0 { prop_assert!(length >= q * (1.0 - 1e-8)); }
                }
            }
            let back = dual(&dual(&given).unwrap()).unwrap();
            prop_assert!((back.a[0] - ax).abs() + (back.b[1] - by).abs() < 1e-9);
            let g = dual(&given).unwrap();
            prop_assert!((dot(g.a, given.a) - 1.0).abs() < 1e-9 && dot(g.a, given.b).abs() < 1e-9);
        }
    }
}
