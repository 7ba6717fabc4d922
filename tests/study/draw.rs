//! Draws benches: pitch, throw, camera, light and noise over the ranges of careful benches, and what the operator would state.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use spotrule::{
    bench::Mode,
    frames::Side,
    synth::{
        Beam, CameraSetup, Dots, ExifData, FileFormat, FileKind, Glare, Known, Laser, Lattice, Lens, Light, Opening, Print, Room, Sample,
        Scene, ScreenSetup, Sensor, SensorColour, SensorNoise, Speckle, Stated, Stray,
    },
};
use std::f64::consts::{FRAC_PI_2, FRAC_PI_3, TAU};

/// Kind of the repeat.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Repeat {
    Line,
    Square,
    Hexagonal,
    Rectangular,
    Oblique,
}

/// Size of the photos, px: half of a usual three-megapixel photo.
const SIZE_PX: [u32; 2] = [1280, 960];
const WIDTH_PX: f64 = 1280.0;

/// Wavelength, its standard uncertainty, response of red, green and blue.
const LASERS: [(f64, f64, [f64; 3]); 4] = [
    (405e-9, 1.5e-9, [0.16, 0.05, 1.0]),
    (532e-9, 0.1e-9, [0.06, 1.0, 0.12]),
    (632.8e-9, 0.01e-9, [1.0, 0.05, 0.03]),
    (650e-9, 2e-9, [1.0, 0.04, 0.03]),
];

/// Random choices of one bench.
pub(crate) struct Draw {
    random: ChaCha8Rng,
    seed: u64,
    /// Focal length over the width of the photo.
    lens: f64,
    distance_m: f64,
    throw_m: Option<f64>,
    /// Order spacings from the middle of the photo to its upper edge.
    orders: f64,
}

impl Draw {
    pub(crate) fn new(seed: u64) -> Self {
        let mut draw = Self { random: ChaCha8Rng::seed_from_u64(seed), seed, lens: 1.45, distance_m: 0.6, throw_m: None, orders: 0.0 };
        draw.lens = draw.pick(&[0.95, 1.45, 1.45, 2.2, 2.2, 3.0]);
        draw.distance_m = draw.between(0.5, 0.72);
        draw.orders = draw.scaled(2.2, 8.0);
        draw
    }

    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        self.random.random_range(low..high)
    }

    /// Uniform in the logarithm.
    pub(crate) fn scaled(&mut self, low: f64, high: f64) -> f64 {
        self.between(low.ln(), high.ln()).exp()
    }

    pub(crate) fn coin(&mut self) -> bool {
        self.random.random_bool(0.5)
    }

    pub(crate) fn sign(&mut self) -> f64 {
        if self.coin() { 1.0 } else { -1.0 }
    }

    pub(crate) fn count(&mut self, low: u32, high: u32) -> u32 {
        self.random.random_range(low..=high)
    }

    pub(crate) fn pick<T: Copy>(&mut self, list: &[T]) -> T {
        list[self.random.random_range(0..list.len())]
    }

    pub(crate) fn any_plane(&mut self) -> Repeat {
        self.pick(&[Repeat::Square, Repeat::Square, Repeat::Hexagonal, Repeat::Rectangular, Repeat::Oblique])
    }

    pub(crate) fn choose_lens(&mut self, low: f64, high: f64) {
        self.lens = self.between(low, high);
    }

    pub(crate) fn choose_throw(&mut self, low_m: f64, high_m: f64) {
        self.throw_m = Some(self.between(low_m, high_m));
    }

    pub(crate) fn more_orders(&mut self, factor: f64) {
        self.orders *= factor;
    }

    /// Width of the screen that the photo shows, m.
    pub(crate) fn field_m(&self) -> f64 {
        self.distance_m / self.lens
    }

    /// Distance of the first order from the zero order on the screen, m.
    pub(crate) fn spacing_m(&self, scene: &Scene) -> f64 {
        let (a, _) = scene.sample.lattice.direct_m();
        scene.lasers[0].wavelength_m / a[0].hypot(a[1]) * scene.screen.throw_m
    }

    pub(crate) fn spacing_px(&self, scene: &Scene) -> f64 {
        self.spacing_m(scene) / self.field_m() * WIDTH_PX
    }

    /// Pitch whose first order falls this far from the zero order, m.
    pub(crate) fn pitch_for(&self, spacing_m: f64, scene: &Scene) -> f64 {
        scene.lasers[0].wavelength_m * spacing_m.hypot(scene.screen.throw_m) / spacing_m
    }

    /// A bench without special difficulties.
    pub(crate) fn bench(&mut self, repeat: Repeat) -> Scene {
        let (wavelength_m, u_wavelength, colour) = self.pick(&LASERS);
        let spacing_m = self.field_m() * 0.375 / self.orders;
        let throw_m = self.throw_m.unwrap_or_else(|| self.scaled(0.12, 2.7)).min(spacing_m * 120e-6 / wavelength_m);
        // No pitch below 1.5 wavelengths and no first order beyond 35 degrees.
        let throw_m = throw_m.max(1.4 * spacing_m);
        let pitch_m = wavelength_m * spacing_m.hypot(throw_m) / spacing_m;
        let lattice = self.lattice(repeat, pitch_m, 1.5);
        let opening = self.opening(&lattice);
        let u_throw = if throw_m < 0.14 { 0.3e-3 } else { self.pick(&[0.5e-3, 1e-3, 2e-3]) };
        let print = self.print();
        let mut scene = Scene {
            seed: self.seed,
            lasers: vec![Laser { wavelength_m, colour }],
            beam: self.beam(spacing_m, throw_m),
            sample: Sample {
                mode: Mode::Transmission,
                incidence_rad: [0.0; 2],
                lattice,
                second: None,
                opening,
                zero_order_factor: self.scaled(3.0, 150.0),
                order_scatter: 0.3,
            },
            screen: ScreenSetup {
                throw_m,
                tilt_rad: [0.0; 2],
                seen_from: Side::Front,
                sheet: None,
                hole_radius_m: 0.0,
                texture: self.between(0.008, 0.018),
            },
            known: Known {
                wavelength_m: Some(Stated { value: wavelength_m, u: u_wavelength }),
                throw_m: Some(Stated { value: round_to(throw_m, 1e-3), u: u_throw }),
                dot_pitch_m: Some(Stated { value: print.pitch_m, u: 3e-4 * print.pitch_m }),
                print_turn_rad: Some(Stated { value: 0.0, u: self.pick(&[0.3_f64, 0.5, 1.0]).to_radians() }),
                ..Known::default()
            },
            print,
            camera: self.camera(),
            light: self.light(),
            sensor: self.sensor(),
            stray: Stray { hot_pixels: self.count(0, 8), ..Stray::default() },
            file: FileFormat {
                width_px: SIZE_PX[0],
                height_px: SIZE_PX[1],
                kind: FileKind::Jpeg { quality: self.pick(&[82, 85, 88, 91, 94, 97]), s_curve: self.pick(&[0.0, 0.0, 0.08, 0.15]) },
                exif: Some(ExifData { orientation: 1, focal_length_m: 0.035, exposure_s: 0.05, f_number: 5.6, iso: 200 }),
            },
        };
        self.restate_tilt(&mut scene);
        self.restate_incidence(&mut scene);
        scene
    }

    /// A lattice whose first vector has this length; the ratio of the lengths stays below `most`.
    pub(crate) fn lattice(&mut self, repeat: Repeat, pitch_m: f64, most: f64) -> Lattice {
        let turn_rad = self.between(0.0, TAU) - TAU / 2.0;
        let ratio = self.between(1.02, most);
        let (second, angle_rad) = match repeat {
            Repeat::Line => return Lattice::Line { pitch_m, turn_rad },
            Repeat::Square => (pitch_m, FRAC_PI_2),
            Repeat::Hexagonal => (pitch_m, FRAC_PI_3),
            Repeat::Rectangular => (pitch_m * ratio, FRAC_PI_2),
            Repeat::Oblique => (pitch_m * ratio, self.between(66.0, 87.0).to_radians()),
        };
        Lattice::Plane { pitch_m: [pitch_m, second], angle_rad, turn_rad }
    }

    fn opening(&mut self, lattice: &Lattice) -> Opening {
        let share = self.between(0.26, 0.55);
        match *lattice {
            Lattice::Line { pitch_m, .. } => Opening::Slit { width_m: share.min(0.4) * pitch_m },
            Lattice::Plane { pitch_m, .. } if self.coin() => Opening::Disc { radius_m: 0.5 * share * pitch_m[0] },
            Lattice::Plane { pitch_m, .. } => Opening::Rectangle { size_m: [share * pitch_m[0], self.between(0.3, 0.55) * pitch_m[1]] },
        }
    }

    /// Spots no wider (1/e² diameter) than a third of their distance.
    fn beam(&mut self, spacing_m: f64, throw_m: f64) -> Beam {
        let (footprint, divergence) = (self.between(0.3e-3, 0.93e-3), self.between(0.2e-3, 0.7e-3));
        let scale = (spacing_m / 6.0 / footprint.hypot(throw_m * divergence)).min(1.0);
        Beam { footprint_radius_m: footprint * scale, half_divergence_rad: divergence * scale, second_lobe: None }
    }

    fn camera(&mut self) -> CameraSetup {
        let (aim, field) = (0.08, self.field_m());
        let lean = self.between(3.0, 17.0).to_radians();
        let azimuth = self.between(0.0, TAU);
        let middle = [(WIDTH_PX - 1.0) / 2.0, (f64::from(SIZE_PX[1]) - 1.0) / 2.0];
        CameraSetup {
            lens: Lens {
                focal_px: self.lens * WIDTH_PX,
                principal_px: middle.map(|place| place + self.between(-0.015, 0.015) * WIDTH_PX),
                radial: [self.between(-0.03, 0.03), self.between(-0.01, 0.01)],
                tangential: [self.between(-4e-4, 4e-4), self.between(-4e-4, 4e-4)],
                blur_px: self.between(0.7, 1.4),
                vignetting: self.between(0.1, 0.35),
            },
            aim_m: [self.between(-aim, aim) * field, self.between(-aim, aim) * field],
            distance_m: self.distance_m,
            lean_rad: [lean * azimuth.cos(), lean * azimuth.sin()],
            roll_rad: self.between(-2.0, 2.0).to_radians(),
        }
    }

    /// Leans the camera, mostly sideways.
    pub(crate) fn lean(&mut self, scene: &mut Scene, angle_rad: f64) {
        let azimuth = self.between(-0.6, 0.6);
        scene.camera.lean_rad = [angle_rad * azimuth.cos() * self.sign(), angle_rad * azimuth.sin()];
    }

    /// Dots over the whole photo and beyond it, some twenty across it.
    fn print(&mut self) -> Print {
        let wanted = self.field_m() / 21.0;
        let sizes = [2.5e-3, 5e-3, 1e-2, 2e-2, 2.5e-2];
        let distance = |size: f64| (size / wanted).ln().abs();
        let pitch_m = sizes.into_iter().min_by(|a, b| distance(*a).total_cmp(&distance(*b))).unwrap_or(1e-2);
        let mut print = Print {
            dots: Dots::OwnPhoto,
            pitch_m,
            columns: [0; 2],
            rows: [0; 2],
            ink_reflectance: self.between(0.04, 0.08),
            zero_order_m: [self.between(-1.5, 1.5) * pitch_m, self.between(-1.5, 1.5) * pitch_m],
            turn_rad: 0.0,
        };
        self.lay_dots(&mut print, [0.0; 2]);
        print
    }

    fn lay_dots(&self, print: &mut Print, middle_m: [f64; 2]) {
        let reach = |half: f64, middle: f64| {
            let dots = |place: f64| (place / print.pitch_m).round() as i32;
            [dots(middle - half).min(-2), dots(middle + half).max(3)]
        };
        print.columns = reach(0.75 * self.field_m(), middle_m[0]);
        print.rows = reach(0.6 * self.field_m(), middle_m[1]);
    }

    /// Moves the print's marks under the camera again.
    pub(crate) fn print_in_view(&mut self, scene: &mut Scene) {
        let aim = scene.camera.aim_m;
        scene.print.zero_order_m = [-aim[0] + 0.5 * scene.print.pitch_m, -aim[1] - 0.5 * scene.print.pitch_m];
        self.lay_dots(&mut scene.print, [0.0; 2]);
    }

    /// Sets the print's marks to the upper right of the hole.
    pub(crate) fn marks_beside_hole(&mut self, scene: &mut Scene) {
        let beside = -(scene.screen.hole_radius_m + 1.5 * scene.print.pitch_m);
        scene.print.zero_order_m = [beside, beside];
        self.lay_dots(&mut scene.print, [0.0; 2]);
    }

    fn light(&mut self) -> Light {
        Light {
            brightest_order: self.scaled(0.5, 25.0),
            skirt: self.between(0.006, 0.03),
            speckle: Some(Speckle { contrast: self.between(0.14, 0.4), grain_px: self.between(1.0, 2.4) }),
            glare: Some(Glare { share: self.between(0.006, 0.03), core_px: self.between(4.0, 8.5), power: self.between(1.22, 1.45) }),
            room: Room {
                pattern_level: self.scaled(0.004, 0.05),
                target_level: self.between(0.4, 0.65),
                tint: self.pick(&[[1.0, 0.97, 0.93], [0.93, 0.97, 1.0], [1.0, 0.88, 0.7]]),
                gradient: [self.between(-0.3, 0.3), self.between(-0.3, 0.3)],
            },
        }
    }

    fn sensor(&mut self) -> Sensor {
        Sensor {
            colour: SensorColour::Bayer,
            noise: Some(SensorNoise { full_well_e: self.scaled(4500.0, 13_000.0), read_noise_e: self.between(3.0, 6.0) }),
            bits: self.pick(&[12, 14]),
            black_level: 0.0,
            white_balance: [self.pick(&[1.5, 1.8, 2.0]), 1.0, self.pick(&[1.5, 1.7, 1.9])],
        }
    }

    /// What the operator says of the screen's tilt as it stands now.
    pub(crate) fn restate_tilt(&mut self, scene: &mut Scene) {
        let u = self.pick(&[0.3_f64, 0.5, 1.0]).to_radians();
        scene.known.tilt_rad = Some(scene.screen.tilt_rad.map(|value| Stated { value, u }));
    }

    /// What the operator says of the sample's turn as it stands now.
    pub(crate) fn restate_incidence(&mut self, scene: &mut Scene) {
        let u = self.pick(&[0.3_f64, 0.5]).to_radians();
        scene.known.incidence_rad = Some(scene.sample.incidence_rad.map(|value| Stated { value, u }));
    }

    /// No print: a camera square-on behind the screen, with little distortion. Every other bench has two clicked points at a known distance.
    pub(crate) fn without_target(&mut self, scene: &mut Scene) {
        let (known, lens) = (&mut scene.known, &mut scene.camera.lens);
        known.dot_pitch_m = None;
        known.print_turn_rad = None;
        known.square_on_rad = Some([Stated { value: 0.0, u: 0.6_f64.to_radians() }; 2]);
        known.tilt_rad = Some([Stated { value: 0.0, u: 0.3_f64.to_radians() }; 2]);
        known.throw_m = known.throw_m.map(|stated| Stated { u: 0.5e-3, ..stated });
        scene.print.dots = Dots::Nowhere;
        scene.screen.seen_from = Side::Behind;
        lens.radial = [self.between(-0.002, 0.002), 0.0];
        lens.tangential = [0.0; 2];
        scene.camera.roll_rad = 0.0;
    }
}

fn round_to(value: f64, step: f64) -> f64 {
    (value / step).round() * step
}
