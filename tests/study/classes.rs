//! Benches drawn at random, class by class: as wide as careful people set them up.

use super::scenes::small;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use spotrule::{
    bench::Mode,
    frames::Side,
    synth::{Dots, FileKind, Lattice, Opening, Scene, SecondLobe, SensorColour, Speckle, Stated},
};
use std::f64::consts::PI;

/// Name and meaning of each class.
pub(crate) const CLASSES: [(&str, &str); 17] = [
    ("line", "line grating"),
    ("square", "square mesh"),
    ("hexagonal", "hexagonal film"),
    ("oblique", "oblique lattice, 63° to 83°"),
    ("missing", "even orders absent along one axis"),
    ("reflection", "reflection at 10° to 45°"),
    ("slanted", "camera 20° to 35° off, lens distortion"),
    ("tilted", "screen tilted by 5° to 12°"),
    ("clipped", "heavy clipping, strong speckle"),
    ("ghosts", "ghosts, soft patches, glints, specks, hot pixels"),
    ("dark", "underexposed, JPEG quality 70"),
    ("wide", "orders up to 45°, sample turned"),
    ("bare", "no target, wide angles"),
    ("deep", "16-bit linear, mono"),
    ("marked", "dots in the photo of the pattern"),
    ("hole", "zero order in a hole of the screen"),
    ("lobes", "laser in two modes: every spot a pair"),
];

/// Share of the demo's size, so that a study takes minutes.
const FRACTION: f64 = 0.6;

struct Draw(ChaCha8Rng);

impl Draw {
    fn between(&mut self, low: f64, high: f64) -> f64 {
        self.0.random_range(low..high)
    }

    fn signed(&mut self, low: f64, high: f64) -> f64 {
        self.between(low, high) * if self.0.random() { 1.0 } else { -1.0 }
    }

    fn pair(&mut self, most: f64) -> [f64; 2] {
        [self.between(-most, most), self.between(-most, most)]
    }
}

/// The bench of a class and seed; what the operator states is off by its own uncertainty.
pub(crate) fn scene(class: &str, seed: u64) -> Scene {
    let index = CLASSES.iter().position(|(name, _)| *name == class).unwrap() as u64;
    let mut draw = Draw(ChaCha8Rng::seed_from_u64(1000 * index + seed));
    let mut scene = small(if class == "bare" { "no-target" } else { "filter-mesh" }, FRACTION);
    if class == "bare" {
        bare(&mut scene, &mut draw);
    } else {
        ordinary(&mut scene, &mut draw, class == "wide");
        particular(&mut scene, &mut draw, class);
    }
    scene.redrawn(7919 * (index + 1) + seed)
}

/// Laser, throw, pitch, camera and noise of any bench with a target.
fn ordinary(scene: &mut Scene, draw: &mut Draw, wide: bool) {
    let wavelength_m = [405e-9, 532e-9, 632.8e-9, 650e-9][draw.0.random_range(0..4)];
    scene.lasers[0].wavelength_m = wavelength_m;
    scene.lasers[0].colour = match wavelength_m {
        w if w < 480e-9 => [0.15, 0.05, 1.0],
        w if w < 580e-9 => [0.03, 1.0, 0.06],
        _ => [1.0, 0.03, 0.02],
    };
    let throw_m = if wide { draw.between(0.10, 0.16) } else { draw.between(0.4, 2.5) };
    let spacing_m = if wide { draw.between(0.018, 0.03) } else { draw.between(0.008, 0.024) };
    let pitch_m = wavelength_m * throw_m / spacing_m;
    scene.beam.footprint_radius_m = draw.between(0.3e-3, 0.9e-3);
    scene.beam.half_divergence_rad = draw.between(2e-4, 6e-4);
    scene.sample.incidence_rad = [0.0; 2];
    scene.sample.lattice = Lattice::Plane { pitch_m: [pitch_m, pitch_m], angle_rad: PI / 2.0, turn_rad: draw.between(-PI, PI) };
    scene.sample.opening = Opening::Disc { radius_m: pitch_m * draw.between(0.1, 0.18) };
    scene.sample.zero_order_factor = draw.between(3.0, 20.0);
    scene.camera.lean_rad = draw.pair(0.25);
    scene.camera.roll_rad = draw.between(-0.05, 0.05);
    scene.camera.aim_m = draw.pair(0.006);
    scene.camera.lens.radial = [draw.between(-0.06, 0.06), draw.between(-0.02, 0.02)];
    scene.print.zero_order_m = draw.pair(0.01);
    scene.light.brightest_order = draw.between(1.0, 12.0);
    scene.light.speckle = Some(Speckle { contrast: draw.between(0.08, 0.25), grain_px: draw.between(1.0, 2.0) });
    let angle = |u_deg: f64| [Stated { value: 0.0, u: u_deg.to_radians() }; 2];
    scene.known.wavelength_m = Some(Stated { value: wavelength_m, u: wavelength_m * 10_f64.powf(draw.between(-4.5, -3.0)) });
    scene.known.throw_m = Some(Stated { value: throw_m, u: draw.between(0.3e-3, 1.5e-3) });
    scene.known.tilt_rad = Some(angle(draw.between(0.2, 0.8)));
    scene.known.incidence_rad = Some(angle(draw.between(0.2, 0.8)));
    scene.known.dot_pitch_m = Some(Stated { value: 0.01, u: draw.between(1e-6, 8e-6) });
    scene.known.print_turn_rad = Some(Stated { value: 0.0, u: draw.between(0.002, 0.01) });
}

fn pitch_of(scene: &Scene) -> f64 {
    match scene.sample.lattice {
        Lattice::Line { pitch_m, .. } => pitch_m,
        Lattice::Plane { pitch_m, .. } => pitch_m[0],
    }
}

/// What makes the class.
fn particular(scene: &mut Scene, draw: &mut Draw, class: &str) {
    let pitch_m = pitch_of(scene);
    let turn_rad = draw.between(-PI, PI);
    let moved =
        |stated: Option<[Stated; 2]>, to: [f64; 2]| stated.map(|[a, b]| [Stated { value: to[0], u: a.u }, Stated { value: to[1], u: b.u }]);
    match class {
        "line" => {
            scene.sample.lattice = Lattice::Line { pitch_m, turn_rad };
            scene.sample.opening = Opening::Slit { width_m: pitch_m * draw.between(0.12, 0.3) };
        }
        "hexagonal" => scene.sample.lattice = Lattice::Plane { pitch_m: [pitch_m; 2], angle_rad: 2.0 * PI / 3.0, turn_rad },
        "oblique" => {
            let (ratio, angle_rad) = (draw.between(1.05, 1.5), PI - draw.between(63.0, 83.0).to_radians());
            scene.sample.lattice = Lattice::Plane { pitch_m: [pitch_m, pitch_m * ratio], angle_rad, turn_rad };
        }
        "missing" => scene.sample.opening = Opening::Rectangle { size_m: [0.5 * pitch_m, 0.3 * pitch_m] },
        "reflection" => {
            scene.sample.mode = Mode::Reflection;
            let incidence = draw.signed(10.0, 45.0).to_radians();
            scene.known.incidence_rad = moved(scene.known.incidence_rad, [0.0, incidence]);
        }
        "slanted" => {
            scene.camera.lean_rad = [draw.signed(20.0, 35.0).to_radians(), draw.between(-0.2, 0.2)];
            scene.camera.lens.radial = [draw.signed(0.05, 0.2), draw.between(-0.05, 0.05)];
        }
        "tilted" => {
            let tilt = [draw.signed(5.0, 12.0).to_radians(), draw.signed(5.0, 12.0).to_radians()];
            scene.known.tilt_rad = moved(scene.known.tilt_rad, tilt);
        }
        "clipped" => {
            scene.light.brightest_order = draw.between(30.0, 120.0);
            scene.light.speckle = Some(Speckle { contrast: draw.between(0.3, 0.5), grain_px: draw.between(1.5, 2.5) });
        }
        "ghosts" => {
            scene.stray.ghosts = draw.0.random_range(3..10);
            (scene.stray.blobs, scene.stray.glints) = (draw.0.random_range(1..4), draw.0.random_range(1..4));
            (scene.stray.hot_pixels, scene.stray.specks) = (20, 20);
        }
        "dark" => {
            scene.light.brightest_order = draw.between(0.1, 0.4);
            if let FileKind::Jpeg { quality, .. } = &mut scene.file.kind {
                *quality = 70;
            }
        }
        "deep" => {
            scene.file.kind = FileKind::Png16;
            scene.sensor.colour = SensorColour::Mono;
        }
        "marked" => scene.print.dots = Dots::InPattern,
        "hole" => (scene.screen.hole_radius_m, scene.sample.zero_order_factor) = (0.003, 0.0),
        "lobes" => {
            let apart_rad = [draw.signed(5e-4, 1.2e-3), draw.signed(5e-4, 1.2e-3)];
            scene.beam.second_lobe = Some(SecondLobe { apart_rad, share: draw.between(0.2, 0.5) });
        }
        _ => {}
    }
    if class == "marked" {
        scene.light.room.target_level = draw.between(0.04, 0.12);
    }
    if scene.light.brightest_order > 20.0 && draw.0.random() {
        scene.screen.seen_from = Side::Behind;
    }
}

/// Nothing known but the laser, and that the camera looked straight on.
fn bare(scene: &mut Scene, draw: &mut Draw) {
    let pitch_m = draw.between(1.7e-6, 2.6e-6);
    let turn_rad = draw.between(-PI, PI);
    scene.sample.lattice = Lattice::Plane { pitch_m: [pitch_m, pitch_m * draw.between(1.0, 1.2)], angle_rad: PI / 2.0, turn_rad };
    scene.sample.opening = Opening::Disc { radius_m: 0.22 * pitch_m };
    scene.screen.throw_m = draw.between(0.09, 0.12);
    scene.camera.lens.radial = [draw.between(-0.02, 0.02), 0.0];
    scene.camera.roll_rad = draw.between(-0.2, 0.2);
}
