//! One level of the scale space: a plane binned by 2, 4, 8 … px, its response to blobs of about that size, and the noise of it.

use rayon::prelude::*;

use crate::photo::Plane;

/// Variance of the response to white noise of unit variance per cell: the sum of squares of the kernel, computed in
/// the test `kernel_energy_is_the_sum_of_squares`.
pub(super) const KERNEL_ENERGY: f64 = 0.040_27;
/// A dip within so many cells of something so much higher is its rim, not noise.
const RIM_CELLS: usize = 6;
const RIM_RATIO: f64 = 2.5;
/// Edge of the tiles in which the noise of the response is measured, cells.
const TILE_CELLS: usize = 32;
const HALF_TILE: usize = TILE_CELLS / 2;
/// Cells of a tile that enter its noise estimate.
const TILE_SAMPLES: usize = 128;
/// Quantile of |response| that gives the noise. Below the median, so that spots may cover a third of a tile.
const QUANTILE: f64 = 0.4;
/// |x| that a standard normal variable stays below with probability `QUANTILE`.
const QUANTILE_SIGMA: f64 = 0.524_401;

/// Response of one level. Cell (i, j) is centred on pixel `cell_px * (i + ½) - ½`.
pub(super) struct Level {
    /// Edge of a cell, px.
    pub(super) cell_px: f64,
    /// Cells in a row.
    pub(super) width: usize,
    /// Rows.
    pub(super) height: usize,
    /// Difference of two Gaussians (standard deviations 1 and √5 cells): the matched filter of a blob on an uneven background.
    pub(super) response: Vec<f32>,
    /// The wider Gaussian: what lies around a cell.
    pub(super) surround: Vec<f32>,
    tiles: Tiles,
}

/// A local maximum of the response.
#[derive(Debug, Clone, Copy)]
pub(super) struct Peak {
    /// Centre, px.
    pub(super) x_px: f64,
    /// Centre, px.
    pub(super) y_px: f64,
    /// Edge of the level's cells, px.
    pub(super) cell_px: f64,
    /// Height of the response, linear light.
    pub(super) response: f64,
    /// Response over its local noise.
    pub(super) signal_to_noise: f64,
    /// Variance of one pixel around the peak, as a fit over many pixels feels it.
    pub(super) pixel_variance: f64,
    /// Light around the peak.
    pub(super) surround: f64,
}

/// Local maxima and minima; a minimum is told as if it were a maximum.
#[derive(Debug, Default)]
pub(super) struct Extremes {
    pub(super) peaks: Vec<Peak>,
    pub(super) dips: Vec<Peak>,
}

impl Level {
    /// Filters a plane of cells of `cell_px`.
    pub(super) fn of(plane: &Plane, cell_px: f64) -> Self {
        let (width, height) = (plane.width, plane.height);
        let mut response = blurred(&plane.value, width, 1);
        let surround = blurred(&response, width, 2);
        response.par_chunks_mut(1 << 14).zip(surround.par_chunks(1 << 14)).for_each(|(response, surround)| {
            response.iter_mut().zip(surround).for_each(|(narrow, wide)| *narrow -= wide);
        });
        let tiles = Tiles::of(&response, &surround, width, height);
        Self { cell_px, width, height, response, surround, tiles }
    }

    /// Local maxima and minima beyond `threshold` times the local noise that are no ridges.
    ///
    /// Minima that are the dark rim of something bright are left out: what noise alone does in either direction shows in the rest
    /// undisturbed.
    ///
    /// - `floor`: noise of the response that is assumed at least, as a function of the light there
    pub(super) fn extremes(&self, threshold: f64, floor: &(impl Fn(f64) -> f64 + Sync)) -> Extremes {
        if self.width < 3 || self.height < 3 {
            return Extremes::default();
        }
        let rows = (1..self.height - 1).into_par_iter().with_min_len(16);
        let found = rows.fold(Extremes::default, |mut found, y| {
            self.scan_row(y, threshold, floor, &mut found);
            found
        });
        found.reduce(Extremes::default, |mut all, more| {
            all.peaks.extend(more.peaks);
            all.dips.extend(more.dips);
            all
        })
    }

    fn scan_row(&self, y: usize, threshold: f64, floor: &impl Fn(f64) -> f64, found: &mut Extremes) {
        // Between the centres of two tiles the least noise is one number, so that most cells cost one comparison.
        let mut left = 1;
        while left < self.width - 1 {
            let right = ((left / HALF_TILE + 1) * HALF_TILE).min(self.width - 1);
            let limit = to_f32(threshold) * self.tiles.least(left, y);
            let row = &self.response[y * self.width + left..y * self.width + right];
            if row.iter().fold(false, |any, height| any | (height.abs() > limit)) {
                for x in (left..right).filter(|x| row[x - left].abs() > limit) {
                    let sign = self.response[y * self.width + x].signum();
                    let Some(extreme) = self.extreme_at(sign, x, y, threshold, floor) else { continue };
                    if sign > 0.0 {
                        found.peaks.push(extreme);
                    } else if !self.is_rim(&extreme) {
                        found.dips.push(extreme);
                    }
                }
            }
            left = right;
        }
    }

    fn extreme_at(&self, sign: f32, x: usize, y: usize, threshold: f64, floor: &impl Fn(f64) -> f64) -> Option<Peak> {
        let at = y * self.width + x;
        if !self.is_extreme(sign, at) {
            return None;
        }
        let height = f64::from(sign * self.response[at]);
        let around = f64::from(self.surround[at]);
        let (tile_sigma, tile_light) = self.tiles.at(x, y);
        // Shot noise grows with the light above the tile's own.
        let (least, tile_least) = (floor(around), floor(tile_light));
        let sigma = (tile_sigma.powi(2).max(tile_least.powi(2)) + (least.powi(2) - tile_least.powi(2)).max(0.0)).sqrt();
        if height <= threshold * sigma {
            return None;
        }
        let [dx, dy] = self.crest(at)?;
        Some(Peak {
            x_px: self.cell_px * (x as f64 + dx + 0.5) - 0.5,
            y_px: self.cell_px * (y as f64 + dy + 0.5) - 0.5,
            cell_px: self.cell_px,
            response: height,
            signal_to_noise: if sigma > 0.0 { height / sigma } else { f64::from(f32::MAX) },
            pixel_variance: sigma.powi(2) / KERNEL_ENERGY * self.cell_px.powi(2),
            surround: around,
        })
    }

    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "extremes lie inside the plane")]
    fn is_rim(&self, dip: &Peak) -> bool {
        let cell = |at_px: f64| ((at_px + 0.5) / self.cell_px).max(0.0) as usize;
        let (x, y) = (cell(dip.x_px), cell(dip.y_px));
        let span = |at: usize, size: usize| at.saturating_sub(RIM_CELLS)..(at + RIM_CELLS + 1).min(size);
        let limit = RIM_RATIO * dip.response;
        span(y, self.height).any(|y| span(x, self.width).any(|x| f64::from(self.response[y * self.width + x]) > limit))
    }

    fn is_extreme(&self, sign: f32, at: usize) -> bool {
        let height = sign * self.response[at];
        let (up, down) = (at - self.width, at + self.width);
        // Of a flat top the first cell wins.
        let before = [at - 1, up - 1, up, up + 1].iter().all(|&i| sign * self.response[i] < height);
        before && [at + 1, down - 1, down, down + 1].iter().all(|&i| sign * self.response[i] <= height)
    }

    /// Offset of the crest of the parabola through the 3×3 cells, in cells; `None` on a ridge or saddle.
    fn crest(&self, at: usize) -> Option<[f64; 2]> {
        let v = |i: usize| f64::from(self.response[i]);
        let (up, down) = (at - self.width, at + self.width);
        let gradient = [0.5 * (v(at + 1) - v(at - 1)), 0.5 * (v(down) - v(up))];
        let xx = v(at + 1) + v(at - 1) - 2.0 * v(at);
        let yy = v(down) + v(up) - 2.0 * v(at);
        let xy = 0.25 * (v(down + 1) - v(down - 1) - v(up + 1) + v(up - 1));
        let determinant = xx * yy - xy * xy;
        // Curvatures in a ratio above 10: a line or an edge, not a spot.
        if determinant <= 0.0 || (xx + yy).powi(2) > determinant * 12.1 {
            return None;
        }
        let dx = -(yy * gradient[0] - xy * gradient[1]) / determinant;
        let dy = -(xx * gradient[1] - xy * gradient[0]) / determinant;
        Some([dx.clamp(-0.7, 0.7), dy.clamp(-0.7, 0.7)])
    }
}

/// Binomial blur (1 4 6 4 1)/16 along both axes with its taps `stride` cells apart; edges repeat.
fn blurred(value: &[f32], width: usize, stride: usize) -> Vec<f32> {
    let mut out = vec![0.0; value.len()];
    if width == 0 {
        return out;
    }
    let height = value.len() / width;
    out.par_chunks_mut(width).enumerate().for_each_init(
        || vec![0.0; width],
        |column, (y, out)| {
            let row = |offset: usize| {
                let y = (y + offset).saturating_sub(2 * stride).min(height - 1);
                &value[y * width..(y + 1) * width]
            };
            let taps = [row(0), row(stride), row(2 * stride), row(3 * stride), row(4 * stride)];
            weigh(column, taps);
            blur_row(column, out, stride);
        },
    );
    out
}

fn weigh(out: &mut [f32], [a, b, c, d, e]: [&[f32]; 5]) {
    for (i, out) in out.iter_mut().enumerate() {
        *out = 0.0625 * (a[i] + e[i]) + 0.25 * (b[i] + d[i]) + 0.375 * c[i];
    }
}

fn blur_row(row: &[f32], out: &mut [f32], stride: usize) {
    let width = row.len();
    let reach = 2 * stride;
    if width > 2 * reach {
        let inner = width - 2 * reach;
        let tap = |k: usize| &row[k * stride..k * stride + inner];
        weigh(&mut out[reach..reach + inner], [tap(0), tap(1), tap(2), tap(3), tap(4)]);
    }
    let edge = reach.min(width);
    for x in (0..edge).chain(width.saturating_sub(edge).max(edge)..width) {
        let at = |k: usize| row[(x + k * stride).saturating_sub(reach).min(width - 1)];
        out[x] = 0.0625 * (at(0) + at(4)) + 0.25 * (at(1) + at(3)) + 0.375 * at(2);
    }
}

/// Noise of the response and light, per tile.
struct Tiles {
    columns: usize,
    rows: usize,
    sigma: Vec<f32>,
    light: Vec<f32>,
}

impl Tiles {
    fn of(response: &[f32], surround: &[f32], width: usize, height: usize) -> Self {
        let (columns, rows) = (width.div_ceil(TILE_CELLS).max(1), height.div_ceil(TILE_CELLS).max(1));
        let of_tile = |tile: usize| {
            let (left, top) = (tile % columns * TILE_CELLS, tile / columns * TILE_CELLS);
            let (right, bottom) = ((left + TILE_CELLS).min(width), (top + TILE_CELLS).min(height));
            let cells = (top..bottom).flat_map(|y| (left..right).map(move |x| y * width + x));
            let step = ((right - left) * (bottom - top) / TILE_SAMPLES).max(1) | 1;
            let (mut scatter, mut light): (Vec<f32>, Vec<f32>) = cells.step_by(step).map(|at| (response[at].abs(), surround[at])).unzip();
            (quantile(&mut scatter, QUANTILE) / to_f32(QUANTILE_SIGMA), quantile(&mut light, 0.5))
        };
        let (sigma, light) = (0..columns * rows).into_par_iter().map(of_tile).unzip();
        Self { columns, rows, sigma, light }
    }

    /// The least noise among the tiles that share in the interpolation at a cell.
    fn least(&self, x: usize, y: usize) -> f32 {
        let ([left, right], [top, bottom], _, _) = self.neighbours(x, y);
        let sigma = |column: usize, row: usize| self.sigma[row * self.columns + column];
        sigma(left, top).min(sigma(right, top)).min(sigma(left, bottom)).min(sigma(right, bottom))
    }

    /// Noise and light at a cell, interpolated between the centres of the tiles.
    fn at(&self, x: usize, y: usize) -> (f64, f64) {
        let ([left, right], [top, bottom], u, v) = self.neighbours(x, y);
        let blend = |of: &[f32]| {
            let at = |column: usize, row: usize| f64::from(of[row * self.columns + column]);
            (1.0 - v) * ((1.0 - u) * at(left, top) + u * at(right, top)) + v * ((1.0 - u) * at(left, bottom) + u * at(right, bottom))
        };
        (blend(&self.sigma), blend(&self.light))
    }

    fn neighbours(&self, x: usize, y: usize) -> ([usize; 2], [usize; 2], f64, f64) {
        let axis = |at: usize, count: usize| {
            let low = (at + TILE_CELLS / 2) / TILE_CELLS;
            let share = ((at + TILE_CELLS / 2) % TILE_CELLS) as f64 / TILE_CELLS as f64;
            ([low.saturating_sub(1).min(count - 1), low.min(count - 1)], share)
        };
        let ((columns, u), (rows, v)) = (axis(x, self.columns), axis(y, self.rows));
        (columns, rows, u, v)
    }
}

#[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
fn to_f32(value: f64) -> f32 {
    value as f32
}

/// Value below which a share of the list lies (0 for an empty list).
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "an index below the length")]
fn quantile(list: &mut [f32], share: f64) -> f32 {
    if list.is_empty() {
        return 0.0;
    }
    let at = ((list.len() - 1) as f64 * share) as usize;
    *list.select_nth_unstable_by(at, f32::total_cmp).1
}

#[cfg(test)]
mod tests {
    use super::{KERNEL_ENERGY, Level};
    use crate::photo::Plane;

    #[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
    fn level(paint: impl Fn(f64, f64) -> f64) -> Level {
        let (width, height) = (64, 48);
        let value = (0..width * height).map(|i| paint((i % width) as f64, (i / width) as f64) as f32).collect();
        Level::of(&Plane { width, height, value }, 2.0)
    }

    #[test]
    fn kernel_energy_is_the_sum_of_squares() {
        let impulse = level(|x, y| if (x - 30.0).hypot(y - 20.0) < 0.5 { 1.0 } else { 0.0 });
        let energy: f64 = impulse.response.iter().map(|&v| f64::from(v).powi(2)).sum();
        assert!((energy - KERNEL_ENERGY).abs() < 1e-4, "{energy}");
    }

    #[test]
    fn blob_on_a_slope_gives_one_peak_at_its_place() {
        let seen = level(|x, y| 0.3 + 0.004 * x + (-((x - 30.3).powi(2) + (y - 20.6).powi(2)) / 4.0).exp());
        let peaks = seen.extremes(5.0, &|_| 1e-3).peaks;
        assert_eq!(peaks.len(), 1);
        // Cell 30.3 of 2 px is pixel 2 * 30.8 - 0.5; the parabola is good to a tenth of a cell.
        assert!((peaks[0].x_px - 61.1).abs() < 0.2 && (peaks[0].y_px - 41.7).abs() < 0.2, "{peaks:?}");
    }

    #[test]
    fn line_and_edge_give_no_peak() {
        let line = level(|x, y| (-(x - 0.4 * y - 20.0).powi(2)).exp());
        assert_eq!(line.extremes(5.0, &|_| 1e-2).peaks.iter().filter(|p| (20.0..70.0).contains(&p.y_px)).count(), 0);
        let edge = level(|x, _| if x < 30.0 { 1.0 } else { 0.0 });
        assert_eq!(edge.extremes(5.0, &|_| 1e-3).peaks.len(), 0);
    }

    #[test]
    fn tiny_planes_give_nothing() {
        let plane = Plane { width: 1, height: 2, value: vec![1.0, 2.0] };
        assert!(Level::of(&plane, 2.0).extremes(3.0, &|_| 0.0).peaks.is_empty());
    }
}
