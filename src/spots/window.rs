//! The pixels around one spot, ready for the fit.

use crate::photo::LinearPhoto;

/// One or several pixels.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cell {
    /// Centre, px from the window's middle.
    pub(super) x_px: f64,
    /// Centre, px from the window's middle.
    pub(super) y_px: f64,
    /// Mean linear light, light of the neighbouring spots taken off.
    pub(super) value: f64,
    /// Light of the neighbouring spots.
    pub(super) neighbours: f64,
    /// Variance of that light.
    pub(super) neighbours_variance: f64,
}

/// Cells without a clipped pixel, around a whole pixel.
#[derive(Debug, Clone)]
pub(super) struct Window {
    /// Middle, px in the photo.
    pub(super) middle_px: [f64; 2],
    /// Half the edge, px.
    pub(super) reach_px: f64,
    /// What may be fitted.
    pub(super) cells: Vec<Cell>,
    /// Pixels in a cell.
    pub(super) pixels_per_cell: f64,
    /// Number of clipped pixels in the window.
    pub(super) clipped_px: usize,
    /// Pixels of the window that lie outside the photo.
    pub(super) missing_px: usize,
}

/// A photo through weights of its channels.
#[derive(Clone, Copy)]
pub(super) struct Mix<'a> {
    pub(super) linear: &'a LinearPhoto<'a>,
    pub(super) weights: [f64; 3],
}

impl Mix<'_> {
    fn value(&self, x: usize, y: usize) -> f64 {
        (0..self.linear.channels())
            .filter(|&c| self.weights[c] != 0.0)
            .map(|c| self.weights[c] * f64::from(self.linear.value(x, y, c)))
            .sum()
    }

    fn is_clipped(&self, x: usize, y: usize) -> bool {
        (0..self.linear.channels()).any(|c| self.weights[c] != 0.0 && self.linear.is_clipped(x, y, c))
    }
}

impl Window {
    /// Cuts a square of `reach_px` to each side of a place, in cells of `bin_px` (rounded down).
    ///
    /// A clipped pixel takes its eight neighbours with it: charge, demosaicing and JPEG spill over.
    ///
    /// - `room`: a view that shows little of the laser; where it is dark the screen is printed, and the spot is not what it would be
    pub(super) fn cut(mix: &Mix, room: Option<&Mix>, at_px: [f64; 2], bin_px: f64, reach_px: f64) -> Self {
        let bin = to_count(bin_px).max(1);
        let cells_reach = to_count((reach_px / bin as f64).ceil()).max(3);
        let side = (2 * cells_reach + 1) * bin;
        let half = (side - 1) / 2;
        let corner = at_px.map(|at| at.round().clamp(-1e6, 1e6) - half as f64);
        let mut raster = Raster::read(mix, corner, side);
        if let Some(room) = room {
            raster.mark_ink(&Raster::read(room, corner, side));
        }
        let mut window = Self {
            middle_px: corner.map(|c| c + 0.5 * (side - 1) as f64),
            reach_px: 0.5 * side as f64,
            cells: Vec::with_capacity(side * side / (bin * bin)),
            pixels_per_cell: (bin * bin) as f64,
            clipped_px: raster.state.iter().filter(|&&s| s == State::Clipped).count(),
            missing_px: raster.state.iter().filter(|&&s| s == State::Missing).count(),
        };
        let cells = side / bin;
        for (row, column) in (0..cells).flat_map(|row| (0..cells).map(move |column| (row, column))) {
            if let Some(value) = raster.cell(column * bin, row * bin, bin) {
                let place = |i: usize| (i * bin) as f64 + 0.5 * (bin - 1) as f64 - 0.5 * (side - 1) as f64;
                window.cells.push(Cell { x_px: place(column), y_px: place(row), value, neighbours: 0.0, neighbours_variance: 0.0 });
            }
        }
        window
    }
}

/// Share of the paper's room light below which a pixel is taken as printed.
const INK_LIGHT: f64 = 0.7;

#[derive(Clone, Copy, PartialEq)]
enum State {
    Good,
    Clipped,
    Ink,
    Missing,
}

struct Raster {
    side: usize,
    value: Vec<f64>,
    state: Vec<State>,
}

impl Raster {
    fn read(mix: &Mix, corner: [f64; 2], side: usize) -> Self {
        let mut raster = Self { side, value: vec![0.0; side * side], state: vec![State::Missing; side * side] };
        for row in 0..side {
            for column in 0..side {
                let (x, y) = (corner[0] + column as f64, corner[1] + row as f64);
                if x < 0.0 || y < 0.0 || x >= mix.linear.width() as f64 || y >= mix.linear.height() as f64 {
                    continue;
                }
                let (x, y) = (to_count(x), to_count(y));
                raster.value[row * side + column] = mix.value(x, y);
                raster.state[row * side + column] = if mix.is_clipped(x, y) { State::Clipped } else { State::Good };
            }
        }
        raster
    }

    /// Marks the pixels around which the room light of `room` falls below `INK_LIGHT` of what the screen reflects here.
    fn mark_ink(&mut self, room: &Self) {
        let side = self.side;
        let mean = |at: usize| -> f64 {
            let (x, y) = (at % side, at / side);
            let rows = y.saturating_sub(1)..(y + 2).min(side);
            let columns = x.saturating_sub(1)..(x + 2).min(side);
            let count = (rows.len() * columns.len()) as f64;
            rows.flat_map(|row| columns.clone().map(move |column| room.value[row * side + column])).sum::<f64>() / count
        };
        let means: Vec<f64> = (0..side * side).map(mean).collect();
        let mut sorted: Vec<f64> =
            means.iter().zip(&self.state).filter(|(_, state)| **state == State::Good).map(|(mean, _)| *mean).collect();
        if sorted.len() < 20 {
            return;
        }
        let bright = sorted.len() * 7 / 10;
        let paper = *sorted.select_nth_unstable_by(bright, f64::total_cmp).1;
        for (state, mean) in self.state.iter_mut().zip(means) {
            if *state == State::Good && mean < INK_LIGHT * paper {
                *state = State::Ink;
            }
        }
    }

    /// Mean of `bin`² pixels; `None` if one of them is missing, clipped, or beside a clipped one.
    fn cell(&self, left: usize, top: usize, bin: usize) -> Option<f64> {
        let mut sum = 0.0;
        for y in top.saturating_sub(1)..(top + bin + 1).min(self.side) {
            for x in left.saturating_sub(1)..(left + bin + 1).min(self.side) {
                let at = y * self.side + x;
                let is_inside = x >= left && y >= top && x < left + bin && y < top + bin;
                match self.state[at] {
                    State::Clipped | State::Ink => return None,
                    State::Missing if is_inside => return None,
                    _ if is_inside => sum += self.value[at],
                    _ => {}
                }
            }
        }
        Some(sum / (bin * bin) as f64)
    }
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped first; NaN gives 0")]
fn to_count(value: f64) -> usize {
    value.clamp(0.0, 1e6) as usize
}
