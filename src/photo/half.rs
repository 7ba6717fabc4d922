//! Means of 2×2 pixels of every channel: the finest plane on which a whole photo is searched.

use rayon::prelude::*;

use super::{LinearPhoto, Samples};

/// A plane of numbers, row-major.
#[derive(Debug, Clone)]
pub struct Plane {
    /// Cells in a row.
    pub width: usize,
    /// Rows.
    pub height: usize,
    /// Row-major values.
    pub value: Vec<f32>,
}

/// One [`Plane`] per channel, each cell the mean linear light of 2×2 pixels; an odd last row or column is left out.
///
/// Cell (i, j) is centred on pixel (2 i + ½, 2 j + ½).
#[derive(Debug, Clone)]
pub struct HalfPlanes {
    /// One or three planes of the same size.
    pub planes: Vec<Plane>,
}

impl LinearPhoto<'_> {
    /// All channels at half the resolution.
    #[must_use]
    pub fn half_planes(&self) -> HalfPlanes {
        let (width, height) = (self.width() / 2, self.height() / 2);
        let mut planes: Vec<Plane> = (0..self.channels()).map(|_| Plane { width, height, value: vec![0.0; width * height] }).collect();
        match &self.photo().samples {
            Samples::U8(codes) => fill(&mut planes, codes, self.width(), self.table()),
            Samples::U16(codes) => fill(&mut planes, codes, self.width(), self.table()),
        }
        HalfPlanes { planes }
    }
}

fn fill<T: Copy + Into<u16> + Sync>(planes: &mut [Plane], codes: &[T], photo_width: usize, table: &[f32]) {
    match planes {
        [grey] => {
            let width = grey.width.max(1);
            grey.value.par_chunks_mut(width).enumerate().for_each(|(row, grey)| {
                fill_row::<T, 1>([grey], rows_of(codes, row, photo_width), table);
            });
        }
        [red, green, blue] => {
            let width = red.width.max(1);
            let rows = red.value.par_chunks_mut(width).zip(green.value.par_chunks_mut(width)).zip(blue.value.par_chunks_mut(width));
            rows.enumerate().for_each(|(row, ((red, green), blue))| {
                fill_row::<T, 3>([red, green, blue], rows_of(codes, row, photo_width * 3), table);
            });
        }
        _ => {}
    }
}

fn rows_of<T>(codes: &[T], half_row: usize, stride: usize) -> (&[T], &[T]) {
    codes[2 * half_row * stride..(2 * half_row + 2) * stride].split_at(stride)
}

fn fill_row<T: Copy + Into<u16>, const CHANNELS: usize>(to: [&mut [f32]; CHANNELS], (upper, lower): (&[T], &[T]), table: &[f32]) {
    let light = |code: T| table[usize::from(code.into()).min(table.len() - 1)];
    let pairs = upper.as_chunks::<CHANNELS>().0.as_chunks::<2>().0.iter().zip(lower.as_chunks::<CHANNELS>().0.as_chunks::<2>().0);
    for (cell, (upper, lower)) in pairs.enumerate() {
        for channel in 0..CHANNELS {
            let sum = light(upper[0][channel]) + light(upper[1][channel]) + light(lower[0][channel]) + light(lower[1][channel]);
            to[channel][cell] = 0.25 * sum;
        }
    }
}

impl HalfPlanes {
    /// Sum of `weights[c]` times plane c (a grey photo has one plane and ignores the weights).
    #[must_use]
    #[expect(clippy::cast_possible_truncation, reason = "rounding to f32 is meant")]
    pub fn mixed(&self, weights: [f64; 3]) -> Plane {
        let weights = weights.map(|weight| weight as f32);
        match self.planes.as_slice() {
            [red, green, blue] => {
                let mut value = vec![0.0; red.value.len()];
                value.par_chunks_mut(ROW_TASK).enumerate().for_each(|(task, to)| {
                    for (plane, &weight) in [red, green, blue].into_iter().zip(&weights).filter(|(_, weight)| **weight != 0.0) {
                        to.iter_mut().zip(&plane.value[task * ROW_TASK..]).for_each(|(to, from)| *to += weight * from);
                    }
                });
                Plane { width: red.width, height: red.height, value }
            }
            [grey, ..] => grey.clone(),
            [] => Plane { width: 0, height: 0, value: Vec::new() },
        }
    }
}

/// Cells that one task takes.
const ROW_TASK: usize = 1 << 14;

impl Plane {
    /// Noise of one pixel from these cells, each the mean of `pixels_per_cell` pixels.
    #[must_use]
    pub fn noise(&self, pixels_per_cell: f64) -> super::Noise {
        super::noise::of_cells(self, pixels_per_cell)
    }

    /// Means of 2×2 cells; an odd last row or column is left out.
    #[must_use]
    pub fn halved(&self) -> Self {
        let (width, height) = (self.width / 2, self.height / 2);
        let mut value = vec![0.0; width * height];
        value.par_chunks_mut(width.max(1)).enumerate().for_each(|(row, to)| {
            let (upper, lower) = rows_of(&self.value, row, self.width);
            for ((to, a), b) in to.iter_mut().zip(upper.as_chunks::<2>().0).zip(lower.as_chunks::<2>().0) {
                *to = 0.25 * (a[0] + a[1] + b[0] + b[1]);
            }
        });
        Self { width, height, value }
    }
}

#[cfg(test)]
mod tests {
    use crate::photo::{Exif, Photo, Samples};

    #[test]
    fn odd_sizes_lose_their_last_row_and_column() {
        let samples = Samples::U16(vec![0, 65535, 9, 0, 65535, 9, 9, 9, 9]);
        let photo = Photo { width: 3, height: 3, channels: 1, samples, exif: Exif::default() };
        let half = photo.linear().half_planes();
        assert_eq!((half.planes[0].width, half.planes[0].height), (1, 1));
        assert!((half.planes[0].value[0] - 0.5).abs() < 1e-6);
    }
}
