//! What the paper looks like: texture, printed dots, the edges of the sheet, specks of dirt.

use super::{
    field::Tile,
    orders::{Purpose, random},
    pixels::{covered, single},
    scene::{Print, Scene},
};
use crate::{frames::PixelPoint, optics::Camera};
use rand::Rng;
use rayon::prelude::*;
use statrs::function::erf::erf;

/// Whether the print's ink is on the screen when the photo is taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Ink {
    Printed,
    Absent,
}

/// Diameter of a dot over the pitch.
const DOT: f64 = 0.4;
/// Diameter of a mark over the pitch.
const MARK: f64 = 0.7;
/// What little light comes back out of a hole.
const HOLE_REFLECTANCE: f64 = 0.01;
/// Dots that are marks: origin, X and handedness.
const MARKS: [[i32; 2]; 3] = [[0, 0], [2, 0], [0, 1]];

/// Reflectance of the screen at every pixel.
pub(super) fn reflectance(scene: &Scene, ink: Ink) -> Vec<f32> {
    let (width, height) = (scene.file.width_px as usize, scene.file.height_px as usize);
    let mut plane = vec![1.0_f32; width * height];
    if scene.screen.texture > 0.0 {
        let paper = Tile::paper(scene.seed, scene.screen.texture);
        plane.par_chunks_mut(width).enumerate().for_each(|(y, row)| {
            for (x, value) in row.iter_mut().enumerate() {
                *value *= paper.at(x, y).max(0.0);
            }
        });
    }
    let surface = Surface { camera: scene.camera(), sigma_px: scene.camera.lens.blur_px.hypot(12.0_f64.sqrt().recip()) };
    surface.shade_wall(scene, &mut plane, width);
    if scene.screen.hole_radius_m > 0.0 {
        let hole = DotPlace { centre_m: scene.print.zero_order_m, radius_m: scene.screen.hole_radius_m };
        surface.print_dot(&hole, HOLE_REFLECTANCE, &mut plane, width, height);
    }
    if ink == Ink::Printed {
        surface.print_dots(&scene.print, &mut plane, width, height);
    }
    shade_specks(scene, &mut plane, width, height);
    plane
}

/// Share of a blurred half-plane at a signed distance from its edge, inside positive.
fn edge(distance_px: f64, sigma_px: f64) -> f64 {
    0.5 * (1.0 + erf(distance_px / sigma_px / std::f64::consts::SQRT_2))
}

/// The plane of the print as the camera sees it.
struct Surface {
    camera: Camera<f64>,
    sigma_px: f64,
}

/// A dot on the print.
struct DotPlace {
    centre_m: [f64; 2],
    radius_m: f64,
}

impl Surface {
    /// Dots are drawn through the exact inverse of the camera, so that perspective and distortion bend each of them as they should.
    fn print_dots(&self, print: &Print, plane: &mut [f32], width: usize, height: usize) {
        for row in print.rows[0]..=print.rows[1] {
            for column in print.columns[0]..=print.columns[1] {
                let diameter = if MARKS.contains(&[column, row]) { MARK } else { DOT } * print.pitch_m;
                let centre_m = [f64::from(column) * print.pitch_m, f64::from(row) * print.pitch_m];
                self.print_dot(&DotPlace { centre_m, radius_m: diameter / 2.0 }, print.ink_reflectance, plane, width, height);
            }
        }
    }

    fn print_dot(&self, dot: &DotPlace, ink: f64, plane: &mut [f32], width: usize, height: usize) -> Option<()> {
        let project = self.camera.print_projector();
        let [x, y] = project(dot.centre_m)?;
        // Dots far outside the frame may lie beyond the fold of the distortion.
        let far = 2.0 * width.max(height) as f64;
        if x.abs() > far || y.abs() > far {
            return None;
        }
        let right = project([dot.centre_m[0] + dot.radius_m, dot.centre_m[1]])?;
        let up = project([dot.centre_m[0], dot.centre_m[1] + dot.radius_m])?;
        // The dot's ellipse lies within the sum of its two half axes; perspective adds a few per cent.
        let reach = |i: usize, middle: f64| ((right[i] - middle).abs() + (up[i] - middle).abs()) * 1.2 + 6.0 * self.sigma_px;
        for row in covered(y, reach(1, y), height) {
            for column in covered(x, reach(0, x), width) {
                let cover = self.dot_cover(dot, column as f64, row as f64);
                plane[row * width + column] *= single(1.0 - (1.0 - ink) * cover);
            }
        }
        Some(())
    }

    /// Share of ink at a pixel, blurred as a straight edge: `Φ(distance from the edge / σ)`.
    fn dot_cover(&self, dot: &DotPlace, x_px: f64, y_px: f64) -> f64 {
        let radius_at = |x_px: f64, y_px: f64| {
            let point = self.camera.print_point(PixelPoint { x_px, y_px })?;
            Some((point.x_m - dot.centre_m[0]).hypot(point.y_m - dot.centre_m[1]))
        };
        let cover = || {
            let here = radius_at(x_px, y_px)?;
            let outside_m = here - dot.radius_m;
            // Far from the edge nothing depends on the slope.
            if here < 0.2 * dot.radius_m {
                return Some(1.0);
            }
            let slope = (radius_at(x_px + 0.5, y_px)? - radius_at(x_px - 0.5, y_px)?)
                .hypot(radius_at(x_px, y_px + 0.5)? - radius_at(x_px, y_px - 0.5)?);
            Some(edge(-outside_m / slope, self.sigma_px))
        };
        cover().unwrap_or(0.0)
    }

    /// Darkens what lies outside the sheet.
    fn shade_wall(&self, scene: &Scene, plane: &mut [f32], width: usize) {
        let Some(sheet) = &scene.screen.sheet else { return };
        let [left, bottom, right, top] = sheet.edges_m;
        plane.par_chunks_mut(width).enumerate().for_each(|(row, line)| {
            for (column, value) in line.iter_mut().enumerate() {
                let at = PixelPoint { x_px: column as f64, y_px: row as f64 };
                let on_sheet = self.camera.print_point(at).map_or(0.0, |point| {
                    let inside_m = (point.x_m - left).min(right - point.x_m).min((point.y_m - bottom).min(top - point.y_m));
                    let metres_per_px = self.camera.eye_m().norm() / self.camera.focal_px;
                    edge(inside_m / metres_per_px, self.sigma_px)
                });
                *value *= single(on_sheet + (1.0 - on_sheet) * sheet.wall_reflectance);
            }
        });
    }
}

/// Small dark discs of dirt on the paper.
fn shade_specks(scene: &Scene, plane: &mut [f32], width: usize, height: usize) {
    for number in 0..scene.stray.specks {
        let mut generator = random(scene.seed, Purpose::Specks, u64::from(number));
        let (x, y) = (generator.random_range(0.0..width as f64), generator.random_range(0.0..height as f64));
        let (radius_px, depth): (f64, f64) = (generator.random_range(0.8..3.0), generator.random_range(0.1..0.5));
        for row in covered(y, radius_px + 4.0, height) {
            for column in covered(x, radius_px + 4.0, width) {
                let outside = (row as f64 - y).hypot(column as f64 - x) - radius_px;
                plane[row * width + column] *= single(1.0 - depth * edge(-outside, 1.0));
            }
        }
    }
}
