//! The level of the bare paper everywhere in the photo, also where ink covers it.

use crate::photo::Light;

/// A plane of light averaged over squares of `bin` × `bin` pixels.
#[derive(Debug)]
pub(super) struct Binned {
    pub(super) bin: usize,
    pub(super) width: usize,
    pub(super) height: usize,
    pub(super) value: Vec<f32>,
}

/// Paper level on a coarse raster of cells.
#[derive(Debug)]
pub(super) struct PaperLevel {
    columns: usize,
    rows: usize,
    value: Vec<f32>,
}

/// Side of a raster cell, binned px.
const CELL: usize = 8;

/// Widest dark thing that may be bridged, as a share of the longer side of the photo. The larger dots
/// of a target that shows only 5 × 4 dots span 0.7 / 6 = 12 % of it.
const BRIDGE: f64 = 0.13;

/// Light that a sensible sample cannot exceed; keeps infinities out.
const BRIGHTEST: f32 = 1.0e6;

impl Binned {
    /// Averages `light` over squares of `bin` px; a rest at the right and lower edge is left out.
    pub(super) fn new(light: &Light, bin: usize) -> Self {
        let (width, height) = (light.width / bin, light.height / bin);
        let mut value = Vec::with_capacity(width * height);
        let scale = 1.0 / bin_area(bin);
        let mut sums = vec![0.0_f32; width];
        for row in 0..height {
            sums.fill(0.0);
            for y in row * bin..(row + 1) * bin {
                let line = &light.value[y * light.width..y * light.width + width * bin];
                add_groups(&mut sums, line, bin);
            }
            value.extend(sums.iter().map(|sum| sum * scale));
        }
        Self { bin, width, height, value }
    }

    /// Photo coordinate of the centre of the binned pixel coordinate `x` (fractions allowed), px.
    pub(super) fn photo_px(&self, x: f64) -> f64 {
        let bin = small_f64(self.bin);
        x * bin + (bin - 1.0) / 2.0
    }
}

/// Adds each group of `bin` samples of `line` to its sum; NaN counts as no light.
#[expect(clippy::manual_clamp, reason = "max and min turn NaN into 0, clamp would keep it")]
fn add_groups(sums: &mut [f32], line: &[f32], bin: usize) {
    for (sum, group) in sums.iter_mut().zip(line.chunks_exact(bin)) {
        *sum += group.iter().map(|v| v.max(0.0).min(BRIGHTEST)).sum::<f32>();
    }
}

fn bin_area(bin: usize) -> f32 {
    let bin = f32::from(u8::try_from(bin).unwrap_or(u8::MAX));
    bin * bin
}

/// Exact for all sizes of photos.
pub(super) fn small_f64(n: usize) -> f64 {
    f64::from(u32::try_from(n).unwrap_or(u32::MAX))
}

impl PaperLevel {
    /// Paper level of a binned photo: brightest place of each cell, single bright spots removed (grey
    /// opening), dark things up to 13 % of the photo bridged (grey closing).
    pub(super) fn of(plane: &Binned) -> Self {
        let columns = plane.width.div_ceil(CELL).max(1);
        let rows = plane.height.div_ceil(CELL).max(1);
        let mut value = cell_maxima(plane, columns, rows);
        let long_cells = columns.max(rows);
        let half = bridge_half_width(long_cells);
        value = sliding(&value, columns, rows, 1, darker);
        value = sliding(&value, columns, rows, 1 + half, brighter);
        value = sliding(&value, columns, rows, half, darker);
        Self { columns, rows, value }
    }

    /// Fills `line` with the paper level along row `y` of the binned photo (bilinear between cell centres).
    pub(super) fn row(&self, y: usize, line: &mut [f32]) {
        let (top, below, v) = between(y, self.rows);
        let line_of = |row: usize| &self.value[row * self.columns..(row + 1) * self.columns];
        let cells: Vec<f32> = line_of(top).iter().zip(line_of(below)).map(|(a, b)| a + v * (b - a)).collect();
        for (x, out) in line.iter_mut().enumerate() {
            let (left, right, u) = between(x, self.columns);
            let (a, b) = (cells[left], cells[right]);
            *out = a + u * (b - a);
        }
    }
}

/// Half the bridging width, in cells, for a photo whose longer side has `long_cells` cells.
fn bridge_half_width(long_cells: usize) -> usize {
    // Integer arithmetic: BRIDGE / 2 in thousandths.
    let thousandths = long_cells * 65;
    debug_assert!((BRIDGE - 0.13).abs() < 1e-12);
    (thousandths / 1000).max(2)
}

/// The two cells around a binned pixel and the share of the second.
fn between(x: usize, cells: usize) -> (usize, usize, f32) {
    let half = CELL / 2;
    if x < half {
        return (0, 0, 0.0);
    }
    let left = (x - half) / CELL;
    let rest = (x - half) % CELL;
    let share = (f32::from(u8::try_from(rest).unwrap_or(0)) + 0.5) / f32::from(u8::try_from(CELL).unwrap_or(1));
    (left.min(cells - 1), (left + 1).min(cells - 1), share)
}

/// Brightest 2 × 2 mean of each cell: a bright paper pixel counts, a noisy one does not.
fn cell_maxima(plane: &Binned, columns: usize, rows: usize) -> Vec<f32> {
    let mut value = vec![0.0_f32; columns * rows];
    for (y, pair) in plane.value.chunks_exact(2 * plane.width).enumerate() {
        let (upper, lower) = pair.split_at(plane.width);
        let row = 2 * y / CELL;
        let cells = &mut value[row * columns..(row + 1) * columns];
        for (cell, (u, l)) in cells.iter_mut().zip(upper.chunks(CELL).zip(lower.chunks(CELL))) {
            let squares = u.chunks_exact(2).zip(l.chunks_exact(2)).map(|(u, l)| (u[0] + u[1] + l[0] + l[1]) / 4.0);
            *cell = squares.fold(*cell, brighter);
        }
    }
    value
}

/// The plain comparison, several times faster than `f32::max`: all samples are numbers here.
fn brighter(a: f32, b: f32) -> f32 {
    if b > a { b } else { a }
}

fn darker(a: f32, b: f32) -> f32 {
    if b < a { b } else { a }
}

/// Separable sliding extremum over (2 half + 1)² cells; at the rim over the cells that exist.
fn sliding(value: &[f32], columns: usize, rows: usize, half: usize, pick: impl Fn(f32, f32) -> f32) -> Vec<f32> {
    // Whole shifted lines at a time: the compiler turns that into vector instructions.
    let merge = |best: &mut [f32], line: &[f32]| best.iter_mut().zip(line).for_each(|(best, v)| *best = pick(*best, *v));
    let mut across = value.to_vec();
    for (best, line) in across.chunks_exact_mut(columns).zip(value.chunks_exact(columns)) {
        for shift in 1..=half.min(columns - 1) {
            merge(&mut best[..columns - shift], &line[shift..]);
            merge(&mut best[shift..], &line[..columns - shift]);
        }
    }
    let mut down = across.clone();
    for (y, best) in down.chunks_exact_mut(columns).enumerate() {
        for line in across[y.saturating_sub(half) * columns..(y + half + 1).min(rows) * columns].chunks_exact(columns) {
            merge(best, line);
        }
    }
    down
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::photo::Noise;

    fn light(width: usize, height: usize, value: impl Fn(usize, usize) -> f32) -> Light {
        let value = (0..width * height).map(|n| value(n % width, n / width)).collect();
        Light { width, height, value, noise: Noise { a: 0.0, b: 0.0 } }
    }

    #[test]
    fn binning_keeps_the_mean_and_the_place() {
        let plane = Binned::new(&light(10, 6, |x, _| x as f32), 2);
        assert_eq!((plane.width, plane.height), (5, 3));
        assert!((plane.value[3] - 6.5).abs() < 1e-6, "got {}", plane.value[3]);
        assert!((plane.photo_px(3.0) - 6.5).abs() < 1e-12);
    }

    #[test]
    fn dots_are_bridged_and_the_gradient_is_kept() {
        let paper = |x: usize| 0.5 + 0.0005 * x as f32;
        let photo = light(640, 480, |x, y| if (x % 80) < 30 && (y % 80) < 30 { 0.05 } else { paper(x) });
        let plane = Binned::new(&photo, 1);
        let level = PaperLevel::of(&plane);
        let mut line = vec![0.0; 640];
        for y in [15, 100, 175, 300] {
            level.row(y, &mut line);
            for x in (40..600).step_by(7) {
                let ratio = line[x] / paper(x);
                assert!((0.97..1.06).contains(&ratio), "at {x}, {y}: {ratio}");
            }
        }
    }

    #[test]
    fn not_a_number_is_no_light() {
        let plane = Binned::new(&light(8, 8, |x, _| if x == 0 { f32::NAN } else { f32::INFINITY }), 1);
        assert!(plane.value.iter().all(|v| v.is_finite()));
    }
}
