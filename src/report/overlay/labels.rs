//! Finds room for labels beside their spots: what is drawn already is never covered where that can be avoided.

use super::canvas::{Place, index};

/// Which cells of the picture are taken.
#[derive(Debug)]
pub(super) struct Occupied {
    columns: u32,
    rows: u32,
    cell_px: f64,
    taken: Vec<bool>,
}

/// What to do when every place beside a spot is taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Crowded {
    /// Leave the label out.
    Skip,
    /// Take the place that covers least.
    LeastCovered,
}

/// Directions in which a label is tried: right, left, above, below, then the corners.
const DIRECTIONS: [[f64; 2]; 8] = [[1.0, 0.0], [-1.0, 0.0], [0.0, -1.0], [0.0, 1.0], [0.8, -0.8], [0.8, 0.8], [-0.8, -0.8], [-0.8, 0.8]];

impl Occupied {
    pub(super) fn new(size_px: [f64; 2], cell_px: f64) -> Self {
        let cell_px = cell_px.max(1.0);
        let [columns, rows] = size_px.map(|side| index((side / cell_px).ceil(), 1 << 15));
        let cells = usize::try_from(u64::from(columns) * u64::from(rows)).unwrap_or(0);
        Self { columns, rows, cell_px, taken: vec![false; cells] }
    }

    /// Marks a box around a place as taken.
    pub(super) fn take(&mut self, low: Place, high: Place) {
        for cell in self.cells(low, high) {
            if let Some(taken) = self.taken.get_mut(cell) {
                *taken = true;
            }
        }
    }

    /// Marks the cells along a line as taken.
    pub(super) fn take_line(&mut self, from: Place, to: Place) {
        let steps = index(((to[0] - from[0]).hypot(to[1] - from[1]) / self.cell_px).ceil(), 4096).max(1);
        for step in 0..=steps {
            let t = f64::from(step) / f64::from(steps);
            let at = [from[0] + t * (to[0] - from[0]), from[1] + t * (to[1] - from[1])];
            self.take(at, at);
        }
    }

    /// Top left corner of a label of this size beside a spot, and takes that room; `None` when there is none.
    ///
    /// `gap_px`: distance that the label keeps from the spot's centre, the radius of its mark.
    pub(super) fn place(&mut self, spot: Place, size_px: [f64; 2], gap_px: f64, crowded: Crowded) -> Option<Place> {
        let corner = |[right, down]: [f64; 2]| {
            [
                spot[0] + right * (gap_px + size_px[0] / 2.0) - size_px[0] / 2.0,
                spot[1] + down * (gap_px + size_px[1] / 2.0) - size_px[1] / 2.0,
            ]
        };
        let far = |[x, y]: Place| [x + size_px[0], y + size_px[1]];
        let candidates = DIRECTIONS.map(corner).into_iter().filter(|&at| self.holds(at, far(at)));
        let (covered, at) = candidates.map(|at| (self.covered(at, far(at)), at)).min_by_key(|&(covered, _)| covered)?;
        if covered > 0 && crowded == Crowded::Skip {
            return None;
        }
        self.take(at, far(at));
        Some(at)
    }

    fn holds(&self, low: Place, high: Place) -> bool {
        let size = [f64::from(self.columns) * self.cell_px, f64::from(self.rows) * self.cell_px];
        (0..2).all(|axis| low[axis] >= 0.0 && high[axis] <= size[axis])
    }

    fn covered(&self, low: Place, high: Place) -> usize {
        self.cells(low, high).filter(|&cell| self.taken.get(cell).copied().unwrap_or(false)).count()
    }

    /// Cells of a box; empty when it lies outside.
    fn cells(&self, low: Place, high: Place) -> impl Iterator<Item = usize> + use<> {
        let range = |low: f64, high: f64, limit: u32| match high >= 0.0 && low.is_finite() {
            true => index(low / self.cell_px, limit)..index(high / self.cell_px + 1.0, limit),
            false => 0..0,
        };
        let (across, down) = (range(low[0], high[0], self.columns), range(low[1], high[1], self.rows));
        let columns = u64::from(self.columns);
        down.flat_map(move |row| across.clone().map(move |column| u64::from(row) * columns + u64::from(column)))
            .filter_map(|cell| usize::try_from(cell).ok())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const LABEL: [f64; 2] = [20.0, 8.0];

    #[test]
    fn labels_of_one_spot_do_not_overlap() {
        let mut occupied = Occupied::new([100.0, 100.0], 1.0);
        let mut boxes: Vec<Place> = vec![];
        while let Some(at) = occupied.place([50.0, 50.0], LABEL, 6.0, Crowded::Skip) {
            assert!(boxes.iter().all(|b| (b[0] - at[0]).abs() >= LABEL[0] || (b[1] - at[1]).abs() >= LABEL[1]), "{boxes:?} {at:?}");
            boxes.push(at);
        }
        assert!(boxes.len() >= 4, "{boxes:?}");
        assert!(occupied.place([50.0, 50.0], LABEL, 6.0, Crowded::LeastCovered).is_some());
    }

    #[test]
    fn labels_stay_inside_the_picture() {
        let mut occupied = Occupied::new([60.0, 40.0], 1.0);
        let [x, y] = occupied.place([57.0, 20.0], LABEL, 4.0, Crowded::Skip).unwrap();
        assert!(x >= 0.0 && x + LABEL[0] <= 60.0 && y >= 0.0 && y + LABEL[1] <= 40.0, "{x} {y}");
        for nowhere in [[-500.0, 20.0], [f64::NAN, 0.0], [1e300, 1e300]] {
            assert_eq!(occupied.place(nowhere, LABEL, 4.0, Crowded::LeastCovered), None);
        }
    }
}
