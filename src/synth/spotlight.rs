//! The laser's light on the screen as the lens draws it: spots with speckle, and the veiling glare of each.

use super::{
    field::Tile,
    orders::{Order, Purpose, random},
    pixels::{covered, single},
    scene::{Glare, Scene, SecondLobe},
    spot_shape::SpotShape,
};
use crate::frames::{PixelCovariance, PixelPoint};
use rand::Rng;
use rayon::prelude::*;
use std::f64::consts::PI;

/// A spot to be drawn: an order or a ghost.
#[derive(Debug, Clone, Copy)]
struct Blob {
    at: PixelPoint,
    shape: PixelCovariance,
    amplitude: f64,
    /// Where its own piece of the speckle tile begins.
    speckle_at: [usize; 2],
}

/// Light of one laser over the frame.
#[derive(Debug)]
pub(super) struct LaserLight {
    spots: Vec<f32>,
    glare: GlareGrid,
    width: usize,
}

/// Rows drawn by one task.
const BAND: usize = 32;

/// Where a bell is cut: its level there, as a share of the clipping level.
const CUT: f64 = 2e-6;

/// Width of the skirt over the width of the spot.
const SKIRT_WIDTH: f64 = 4.0;

impl LaserLight {
    /// Draws the spots of one laser, ghosts included.
    pub(super) fn draw(scene: &Scene, orders: &[Order], laser: usize, speckle: Option<&Tile>) -> Self {
        let (width, height) = (scene.file.width_px as usize, scene.file.height_px as usize);
        let blobs = blobs(scene, orders, laser);
        let mut spots = vec![0.0_f32; width * height];
        spots.par_chunks_mut(width * BAND).enumerate().for_each(|(band, rows)| {
            for blob in &blobs {
                draw_blob(rows, band * BAND, width, blob, scene.light.skirt, speckle);
            }
        });
        Self { spots, glare: GlareGrid::new(scene.light.glare.as_ref(), &blobs, width, height), width }
    }

    /// Light that falls on the paper, and light that the lens adds.
    pub(super) fn at(&self, x: usize, y: usize) -> (f64, f64) {
        (f64::from(self.spots[y * self.width + x]), self.glare.at(x, y))
    }
}

fn blobs(scene: &Scene, orders: &[Order], laser: usize) -> Vec<Blob> {
    let own = orders.iter().filter(|order| order.laser == laser);
    let mut blobs: Vec<Blob> = own
        .map(|order| {
            let part = (u64::from(order.h.cast_unsigned()) << 32) | u64::from(order.k.cast_unsigned());
            let mut generator = random(scene.seed.wrapping_add(laser as u64), Purpose::SpeckleOffset, part);
            let speckle_at = [generator.random_range(0..4096_u16).into(), generator.random_range(0..4096_u16).into()];
            Blob { at: order.at, shape: order.shape, amplitude: order.amplitude, speckle_at }
        })
        .collect();
    if let Some(lobe) = &scene.beam.second_lobe {
        blobs = pairs(scene, orders, laser, &blobs, lobe);
    }
    if let Some(copy) = &scene.stray.copy {
        let shifted = |blob: &Blob| Blob {
            at: PixelPoint { x_px: blob.at.x_px + copy.shift_px[0], y_px: blob.at.y_px + copy.shift_px[1] },
            amplitude: blob.amplitude * copy.share,
            ..*blob
        };
        blobs.extend_from_within(..);
        let half = blobs.len() / 2;
        blobs[half..].iter_mut().for_each(|blob| *blob = shifted(blob));
    }
    if laser == 0
        && let Some(model) = blobs.first().copied()
    {
        blobs.extend((0..scene.stray.ghosts).map(|number| stray_like(scene, &model, Strays::GHOSTS, u64::from(number))));
        blobs.extend((0..scene.stray.blobs).map(|number| stray_like(scene, &model, Strays::BLOBS, u64::from(number))));
    }
    blobs
}

/// Each spot as a pair whose centroid is the spot's place.
fn pairs(scene: &Scene, orders: &[Order], laser: usize, blobs: &[Blob], lobe: &SecondLobe) -> Vec<Blob> {
    let rays = SpotShape::new(scene);
    let own = orders.iter().filter(|order| order.laser == laser);
    let lobes = own.zip(blobs).flat_map(|(order, blob)| {
        let frequency = scene.frequency_per_m(order);
        [(-lobe.share, 1.0 - lobe.share), (1.0 - lobe.share, lobe.share)].map(|(along, share)| {
            let ray = [along * lobe.apart_rad[0], along * lobe.apart_rad[1], 0.0, 0.0];
            let [x_px, y_px] = rays.pixel_of_ray(scene.lasers[laser].wavelength_m, frequency, ray)?;
            Some(Blob { at: PixelPoint { x_px, y_px }, amplitude: blob.amplitude * share, ..*blob })
        })
    });
    lobes.flatten().collect()
}

/// A family of stray light: how much wider than an order (variance), its random numbers, its level.
struct Strays {
    widening: std::ops::Range<f64>,
    purpose: Purpose,
    level: fn(&Scene) -> f64,
}

impl Strays {
    /// Stray reflections: one to three times as wide as an order.
    const GHOSTS: Self = Self { widening: 1.0..9.0, purpose: Purpose::Ghosts, level: |scene| scene.stray.ghost_level };
    /// Soft patches.
    const BLOBS: Self = Self { widening: 9.0..64.0, purpose: Purpose::Blobs, level: |scene| scene.stray.blob_level };
}

/// A spot of stray light anywhere.
fn stray_like(scene: &Scene, model: &Blob, family: Strays, number: u64) -> Blob {
    let mut generator = random(scene.seed, family.purpose, number);
    let at = PixelPoint {
        x_px: generator.random_range(0.0..f64::from(scene.file.width_px)),
        y_px: generator.random_range(0.0..f64::from(scene.file.height_px)),
    };
    let widening: f64 = generator.random_range(family.widening);
    let shape = PixelCovariance { xx: model.shape.xx * widening, xy: model.shape.xy * widening, yy: model.shape.yy * widening };
    let amplitude = (family.level)(scene) * generator.random_range(0.2..1.0);
    Blob { at, shape, amplitude, speckle_at: [generator.random_range(0..4096_u16).into(), generator.random_range(0..4096_u16).into()] }
}

/// Adds one spot to the rows of a band: a bell and its skirt, both centred on the chief ray, times speckle.
fn draw_blob(rows: &mut [f32], first_row: usize, width: usize, blob: &Blob, skirt: f64, speckle: Option<&Tile>) {
    let core = Bell::new(blob.shape, blob.amplitude);
    let wide = PixelCovariance { xx: blob.shape.xx * 16.0, xy: blob.shape.xy * 16.0, yy: blob.shape.yy * 16.0 };
    let skirt = Bell::new(wide, blob.amplitude * skirt / (1.0 - skirt) / (SKIRT_WIDTH * SKIRT_WIDTH));
    let reach = [core.reach_px[0].max(skirt.reach_px[0]), core.reach_px[1].max(skirt.reach_px[1])];
    let last_row = first_row + rows.len() / width;
    for y in covered(blob.at.y_px, reach[1], last_row) {
        if y < first_row {
            continue;
        }
        let dy = y as f64 - blob.at.y_px;
        for x in covered(blob.at.x_px, reach[0], width) {
            let dx = x as f64 - blob.at.x_px;
            let grain = speckle.map_or(1.0, |tile| tile.at(x + blob.speckle_at[0], y + blob.speckle_at[1]));
            rows[(y - first_row) * width + x] += single(core.at(dx, dy) + skirt.at(dx, dy)) * grain;
        }
    }
}

/// `peak · exp(−dᵀ Σ⁻¹ d / 2)`, cut where it no longer matters.
struct Bell {
    peak: f64,
    inverse: [f64; 3],
    /// Exponent at the cut.
    cut: f64,
    /// Half size of the box that holds the ellipse of the cut.
    reach_px: [f64; 2],
}

impl Bell {
    fn new(shape: PixelCovariance, peak: f64) -> Self {
        let determinant = shape.xx * shape.yy - shape.xy * shape.xy;
        let cut = (peak / CUT).ln().max(0.0);
        let reach = |variance: f64| (2.0 * cut * variance).sqrt();
        Self {
            peak,
            inverse: [shape.yy / determinant, -shape.xy / determinant, shape.xx / determinant],
            cut,
            reach_px: [reach(shape.xx), reach(shape.yy)],
        }
    }

    fn at(&self, dx: f64, dy: f64) -> f64 {
        let exponent = 0.5 * (dx * dx * self.inverse[0] + 2.0 * dx * dy * self.inverse[1] + dy * dy * self.inverse[2]);
        if exponent > self.cut { 0.0 } else { self.peak * (-exponent).exp() }
    }
}

/// Glare is smooth: worked out on every eighth pixel and interpolated.
#[derive(Debug)]
struct GlareGrid {
    value: Vec<f64>,
    columns: usize,
}

/// Distance of the grid's nodes, px.
const NODE: usize = 8;

impl GlareGrid {
    fn new(glare: Option<&Glare>, blobs: &[Blob], width: usize, height: usize) -> Self {
        let (columns, rows) = (width / NODE + 2, height / NODE + 2);
        let Some(glare) = glare else { return Self { value: vec![0.0; columns * rows], columns } };
        // ∫ (1 + (r/c)²)^(-p) dA = π c² / (p − 1)
        let norm = glare.share * (glare.power - 1.0) / (PI * glare.core_px * glare.core_px);
        let light = |blob: &Blob| 2.0 * PI * blob.amplitude * (blob.shape.xx * blob.shape.yy - blob.shape.xy * blob.shape.xy).sqrt();
        let sources: Vec<(PixelPoint, f64)> = blobs.iter().map(|blob| (blob.at, norm * light(blob))).collect();
        let node = |index: usize| {
            let (x, y) = ((index % columns * NODE) as f64, (index / columns * NODE) as f64);
            let from = |(at, light): &(PixelPoint, f64)| {
                let r2 = (x - at.x_px).powi(2) + (y - at.y_px).powi(2);
                light * (1.0 + r2 / (glare.core_px * glare.core_px)).powf(-glare.power)
            };
            sources.iter().map(from).sum()
        };
        Self { value: (0..columns * rows).into_par_iter().map(node).collect(), columns }
    }

    fn at(&self, x: usize, y: usize) -> f64 {
        let (column, row) = (x / NODE, y / NODE);
        let (right, down) = ((x % NODE) as f64 / NODE as f64, (y % NODE) as f64 / NODE as f64);
        let node = |i: usize, j: usize| self.value[j * self.columns + i];
        let upper = node(column, row) * (1.0 - right) + node(column + 1, row) * right;
        let lower = node(column, row + 1) * (1.0 - right) + node(column + 1, row + 1) * right;
        upper * (1.0 - down) + lower * down
    }
}
