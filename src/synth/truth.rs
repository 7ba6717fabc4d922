//! What is true of a rendered photo, as data and as JSON (`truth.json`).

use super::{orders::Order, scene::Scene};
use serde::Serialize;

/// The truth behind a photo.
#[derive(Debug, Clone, PartialEq)]
pub struct Truth {
    /// Every drawn order, brightest first.
    pub orders: Vec<OrderTruth>,
    /// What a perfect measurement would report.
    pub answer: Answer,
}

/// One order in the photo.
#[derive(Debug, Clone, PartialEq)]
pub struct OrderTruth {
    /// Place, shape, amplitude.
    pub order: Order,
    /// Peak in the laser's main channel with paper and vignetting, 1 clips.
    pub peak: f64,
    /// Room light and glare below it, same unit.
    pub background: f64,
}

/// The answer of a perfect measurement.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Answer {
    /// One pitch (line) or the two shortest lattice vectors (plane), shortest first, m.
    pub pitch_m: Vec<f64>,
    /// Between the two, 90 to 120 degrees, rad.
    pub lattice_angle_rad: Option<f64>,
}

impl Answer {
    /// Lagrange-Gauss reduction of the scene's lattice.
    #[must_use]
    pub fn new(scene: &Scene) -> Self {
        let (a, Some(b)) = scene.sample.lattice.direct_m() else {
            let (a, _) = scene.sample.lattice.direct_m();
            return Self { pitch_m: vec![a[0].hypot(a[1])], lattice_angle_rad: None };
        };
        let (a, b) = reduced(a, b);
        let (p, q) = (a[0].hypot(a[1]), b[0].hypot(b[1]));
        // The sign of b is free: the obtuse one is reported.
        let cosine = -((a[0] * b[0] + a[1] * b[1]) / (p * q)).abs();
        Self { pitch_m: vec![p, q], lattice_angle_rad: Some(cosine.clamp(-1.0, 1.0).acos()) }
    }
}

/// The two shortest vectors of the lattice, shortest first.
fn reduced(mut a: [f64; 2], mut b: [f64; 2]) -> ([f64; 2], [f64; 2]) {
    let dot = |p: [f64; 2], q: [f64; 2]| p[0] * q[0] + p[1] * q[1];
    loop {
        if dot(b, b) < dot(a, a) {
            std::mem::swap(&mut a, &mut b);
        }
        let share = dot(a, b) / dot(a, a);
        // A hair above one half: in a hexagonal lattice +1/2 and -1/2 would follow each other for ever. NaN ends here too.
        if share.abs().partial_cmp(&(0.5 + 1e-9)) != Some(std::cmp::Ordering::Greater) {
            return (a, b);
        }
        let steps = share.round();
        b = [b[0] - steps * a[0], b[1] - steps * a[1]];
    }
}

/// Form of one order in `truth.json`.
#[derive(Serialize)]
struct OrderLine {
    laser: usize,
    #[serde(skip_serializing_if = "is_first")]
    lattice: usize,
    h: i32,
    k: i32,
    x_px: f64,
    y_px: f64,
    shape_px2: [f64; 3],
    peak: f64,
    background: f64,
}

#[expect(clippy::trivially_copy_pass_by_ref, reason = "the signature that serde calls")]
fn is_first(lattice: &usize) -> bool {
    *lattice == 0
}

impl Truth {
    pub(super) fn new(scene: &Scene, orders: Vec<OrderTruth>) -> Self {
        Self { orders, answer: Answer::new(scene) }
    }

    /// `truth.json`: schema, answer, the whole scene, and one line per order (`shape_px2`: xx, xy, yy).
    ///
    /// # Errors
    /// Only when a number is not finite, which a checked scene does not produce.
    pub fn to_json(&self, scene: &Scene) -> Result<String, serde_json::Error> {
        let lines: Result<Vec<String>, _> = self.orders.iter().map(|truth| serde_json::to_string(&OrderLine::new(truth))).collect();
        Ok(format!(
            "{{\n\"schema\": \"spotrule.truth/1\",\n\"answer\": {},\n\"scene\": {},\n\"orders\": [\n  {}\n]\n}}\n",
            serde_json::to_string(&self.answer)?,
            serde_json::to_string(scene)?,
            lines?.join(",\n  ")
        ))
    }
}

impl OrderLine {
    fn new(truth: &OrderTruth) -> Self {
        let Order { laser, lattice, h, k, at, shape, .. } = truth.order;
        let round = |value: f64, digits: f64| (value * digits).round() / digits;
        Self {
            laser,
            lattice,
            h,
            k,
            x_px: round(at.x_px, 1e5),
            y_px: round(at.y_px, 1e5),
            shape_px2: [round(shape.xx, 1e4), round(shape.xy, 1e4), round(shape.yy, 1e4)],
            peak: round(truth.peak, 1e6),
            background: round(truth.background, 1e6),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::synth::{Lattice, demo_scene};

    #[test]
    fn a_skewed_description_of_a_square_is_still_a_square() {
        let mut scene = demo_scene("filter-mesh").unwrap();
        // a = (1, 0), b = (3, 1) in units of 10 µm
        scene.sample.lattice = Lattice::Plane { pitch_m: [1e-5, 1e-5 * 10.0_f64.sqrt()], angle_rad: (1.0_f64 / 3.0).atan(), turn_rad: 0.2 };
        let answer = Answer::new(&scene);
        assert!(answer.pitch_m.iter().all(|p| (p - 1e-5).abs() < 1e-17), "{answer:?}");
        assert!((answer.lattice_angle_rad.unwrap() - std::f64::consts::FRAC_PI_2).abs() < 1e-9);
    }

    #[test]
    fn a_hexagonal_lattice_is_reported_with_120_degrees() {
        let mut scene = demo_scene("embossed-film").unwrap();
        scene.sample.lattice = Lattice::Plane { pitch_m: [2e-6; 2], angle_rad: std::f64::consts::FRAC_PI_3, turn_rad: -1.0 };
        let answer = Answer::new(&scene);
        assert!((answer.lattice_angle_rad.unwrap().to_degrees() - 120.0).abs() < 1e-9);
    }
}
