//! A spot that the fit rejects must not decide the numbering.
//!
//! Indexing sees places only roughly; a stray near an in-between node makes it number all orders on a net twice as dense. The fit knows
//! places to a fraction of a pixel and throws the stray out. What is left then shares a factor, and the numbering is taken back to it:
//! with nothing seen between them, the orders that are seen are the lattice.

use super::{assemble::assignment, orders::Ordered};
use crate::{
    bench::Bench,
    fit::Fit,
    lattice::{Cell, Shape, Warning, reduce},
};

/// The orders renumbered on the net that the spots used in the fit span, where that is coarser than the present one.
pub(super) fn coarser_numbering(bench: &Bench, ordered: &[Ordered], fit: &Fit) -> Option<Vec<Ordered>> {
    let mut renumbered = ordered.to_vec();
    let mut changed = false;
    for sample in 0..bench.samples.len() {
        let photos: Vec<usize> = (0..ordered.len()).filter(|&photo| assignment(bench, photo).sample == sample).collect();
        let used: Vec<(i64, i64)> = fit
            .joint
            .spots
            .iter()
            .filter(|spot| spot.weight > 0.5 && photos.contains(&spot.photo))
            .map(|spot| (spot.order.0.into(), spot.order.1.into()))
            .collect();
        let Some(first) = photos.first() else { continue };
        let Some(net) = Net::spanned(&used, ordered[*first].indexed.shape == Shape::Line).filter(|net| net.index() > 1) else { continue };
        for &photo in &photos {
            net.renumber(&mut renumbered[photo])?;
        }
        changed = true;
    }
    changed.then_some(renumbered)
}

/// A sublattice of the orders: its basis in the old orders, as rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Net {
    rows: [[i64; 2]; 2],
    line: bool,
}

impl Net {
    /// The smallest sublattice that holds all orders, in Hermite normal form; `None` where they do not span a plane (a line: are all zero).
    fn spanned(orders: &[(i64, i64)], line: bool) -> Option<Self> {
        let [mut top, mut low] = [[0, 0], [0, 0]];
        for &(h, k) in orders {
            let mut row = [h, k];
            // Euclid's algorithm on the first column leaves one row with a first entry.
            while row[0] != 0 {
                let times = top[0] / row[0];
                let rest = [top[0] - times * row[0], top[1] - times * row[1]];
                top = row;
                row = rest;
            }
            low[1] = greatest_common_divisor(low[1], row[1]);
        }
        if line {
            return (top[0] != 0).then_some(Self { rows: [[top[0].abs(), 0], [0, 1]], line });
        }
        (top[0] != 0 && low[1] != 0).then_some(Self { rows: [top, low], line })
    }

    /// How many times coarser than all orders.
    fn index(&self) -> i64 {
        self.determinant().abs()
    }

    fn determinant(&self) -> i64 {
        self.rows[0][0] * self.rows[1][1] - self.rows[0][1] * self.rows[1][0]
    }

    /// The order in this basis; `None` off the net.
    fn order(&self, (h, k): (i32, i32)) -> Option<(i32, i32)> {
        let (h, k, [[a, b], [c, d]], whole) = (i64::from(h), i64::from(k), self.rows, self.determinant());
        let (along, across) = (h * d - k * c, k * a - h * b);
        if along % whole != 0 || across % whole != 0 {
            return None;
        }
        Some((i32::try_from(along / whole).ok()?, i32::try_from(across / whole).ok()?))
    }

    fn renumber(self, photo: &mut Ordered) -> Option<()> {
        let indexed = &mut photo.indexed;
        let mut net = self;
        let mut steps = net.steps(indexed.g);
        if !self.line {
            let reduced = reduce(&Cell { a: steps[0], b: steps[1] }).ok()?;
            steps = [reduced.cell.a, reduced.cell.b];
            let row = |r: [i64; 2]| [0, 1].map(|axis| r[0] * self.rows[0][axis] + r[1] * self.rows[1][axis]);
            net.rows = reduced.transform.rows.map(row);
        }
        indexed.g = steps;
        for order in &mut indexed.order {
            *order = order.and_then(|order| net.order(order));
        }
        indexed.warnings.retain(|warning| !matches!(warning, Warning::FewDeciders { .. } | Warning::FaintBetween { .. }));
        Some(())
    }

    #[expect(clippy::cast_precision_loss, reason = "orders are far below 2^53")]
    fn steps(&self, g: [[f64; 2]; 2]) -> [[f64; 2]; 2] {
        self.rows.map(|[p, q]| [0, 1].map(|axis| p as f64 * g[0][axis] + q as f64 * g[1][axis]))
    }
}

fn greatest_common_divisor(a: i64, b: i64) -> i64 {
    let (mut a, mut b) = (a.abs(), b.abs());
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn a_centred_net_is_seen() {
        let net = Net::spanned(&[(0, 0), (1, 1), (-1, 1), (2, 0), (3, 1)], false).unwrap();
        assert_eq!(net.index(), 2);
        assert!(net.order((1, 0)).is_none() && net.order((5, 3)).is_some());
    }

    #[test]
    fn one_decider_that_is_used_keeps_the_numbering() {
        assert_eq!(Net::spanned(&[(1, 1), (-1, 1), (2, 0), (1, 0)], false).unwrap().index(), 1);
    }

    #[test]
    fn a_row_may_share_a_factor() {
        let net = Net::spanned(&[(-4, 0), (0, 0), (2, 0), (6, 0)], true).unwrap();
        assert_eq!((net.index(), net.order((6, 0)), net.order((3, 0))), (2, Some((3, 0)), None));
    }

    #[test]
    fn one_row_spans_no_plane() {
        assert!(Net::spanned(&[(2, 2), (4, 4), (0, 0)], false).is_none());
    }

    proptest! {
        /// Orders made from a planted sublattice come back as whole orders whose place is the same.
        #[test]
        fn renumbered_orders_keep_their_place(
            rows in prop::array::uniform2(prop::array::uniform2(-4_i64..=4)),
            orders in prop::collection::vec((-6_i64..=6, -6_i64..=6), 3..20),
        ) {
            let planted = |(m, n): (i64, i64)| (m * rows[0][0] + n * rows[1][0], m * rows[0][1] + n * rows[1][1]);
            let all: Vec<(i64, i64)> = orders.into_iter().map(planted).collect();
            let Some(net) = Net::spanned(&all, false) else { return Ok(()) };
            for (h, k) in all {
                let (m, n) = net.order((i32::try_from(h).unwrap(), i32::try_from(k).unwrap())).unwrap();
                let (m, n) = (i64::from(m), i64::from(n));
                prop_assert_eq!((m * net.rows[0][0] + n * net.rows[1][0], m * net.rows[0][1] + n * net.rows[1][1]), (h, k));
            }
        }
    }
}
