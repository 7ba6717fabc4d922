//! Which scenes can be drawn: every number finite and in a range that makes a photo.

use super::{
    SynthError,
    opening::Opening,
    scene::{FileKind, Lattice, Scene, SecondLattice},
};
use std::f64::consts::PI;

/// Key, value, range, the range in words.
type Bound = (&'static str, f64, std::ops::RangeInclusive<f64>, &'static str);

const TURN: &str = "an angle between -π and π rad";
const FRACTION: &str = "between 0 and 1";

impl Scene {
    /// Checks every value.
    ///
    /// # Errors
    /// [`SynthError::Value`] names the first key that cannot be drawn.
    pub fn check(&self) -> Result<(), SynthError> {
        let all = [
            self.laser_bounds(),
            self.sample_bounds(),
            lattice_bounds(&self.sample.lattice),
            self.sample.second.as_ref().map_or_else(Vec::new, second_bounds),
            opening_bounds(&self.sample.opening),
            self.screen_bounds(),
            self.print_bounds(),
            self.camera_bounds(),
            self.light_bounds(),
            self.sensor_bounds(),
            self.file_bounds(),
        ];
        for (key, value, range, expected) in all.into_iter().flatten() {
            if !range.contains(&value) {
                return Err(SynthError::Value { key, value, expected });
            }
        }
        Ok(())
    }

    fn laser_bounds(&self) -> Vec<Bound> {
        let mut bounds = vec![
            ("number of [[laser]]", self.lasers.len() as f64, 1.0..=4.0, "1 to 4"),
            ("beam.footprint_radius_m", self.beam.footprint_radius_m, 1e-6..=0.05, "between 1 µm and 5 cm"),
            ("beam.half_divergence_rad", self.beam.half_divergence_rad, 0.0..=0.05, "between 0 and 0.05 rad"),
        ];
        if let Some(lobe) = &self.beam.second_lobe {
            bounds.extend(lobe.apart_rad.map(|slope| ("beam.second_lobe.apart_rad", slope, -0.05..=0.05, "between -0.05 and 0.05 rad")));
            bounds.push(("beam.second_lobe.share", lobe.share, 0.0..=1.0, FRACTION));
        }
        for laser in &self.lasers {
            bounds.push(("laser.wavelength_m", laser.wavelength_m, 1e-7..=5e-6, "between 100 nm and 5 µm, in metres"));
            bounds.extend(laser.colour.map(|share| ("laser.colour", share, 0.0..=1.0, FRACTION)));
        }
        bounds
    }

    fn sample_bounds(&self) -> Vec<Bound> {
        let [a, b] = self.sample.incidence_rad.map(|turn| ("sample.incidence_rad", turn, -1.5..=1.5, "between -1.5 and 1.5 rad"));
        vec![
            a,
            b,
            ("sample.zero_order_factor", self.sample.zero_order_factor, 0.0..=1e5, "between 0 and 1e5"),
            ("sample.order_scatter", self.sample.order_scatter, 0.0..=0.99, "between 0 and 0.99"),
        ]
    }

    fn screen_bounds(&self) -> Vec<Bound> {
        let [a, b] = self.screen.tilt_rad.map(|turn| ("screen.tilt_rad", turn, -1.4..=1.4, "between -1.4 and 1.4 rad"));
        let mut bounds = vec![
            a,
            b,
            ("screen.throw_m", self.screen.throw_m, 1e-3..=100.0, "between 1 mm and 100 m"),
            ("screen.hole_radius_m", self.screen.hole_radius_m, 0.0..=1.0, "between 0 and 1 m"),
            ("screen.texture", self.screen.texture, 0.0..=0.3, "between 0 and 0.3"),
        ];
        if let Some(sheet) = &self.screen.sheet {
            bounds.extend(sheet.edges_m.map(|edge| ("screen.sheet.edges_m", edge, -100.0..=100.0, "within 100 m")));
            bounds.push(("screen.sheet.wall_reflectance", sheet.wall_reflectance, 0.0..=1.0, FRACTION));
        }
        bounds
    }

    fn print_bounds(&self) -> Vec<Bound> {
        let print = &self.print;
        let mut bounds = vec![
            ("print.pitch_m", print.pitch_m, 1e-4..=1.0, "between 0.1 mm and 1 m"),
            ("print.ink_reflectance", print.ink_reflectance, 0.0..=1.0, FRACTION),
            ("print.turn_rad", print.turn_rad, -PI..=PI, TURN),
        ];
        bounds.extend(print.zero_order_m.map(|place| ("print.zero_order_m", place, -100.0..=100.0, "within 100 m")));
        bounds.extend(print.columns.map(|column| ("print.columns", f64::from(column), -500.0..=500.0, "within 500 dots")));
        bounds.extend(print.rows.map(|row| ("print.rows", f64::from(row), -500.0..=500.0, "within 500 dots")));
        bounds
    }

    fn camera_bounds(&self) -> Vec<Bound> {
        let (setup, lens) = (&self.camera, &self.camera.lens);
        let mut bounds = vec![
            ("camera.lens.focal_px", lens.focal_px, 10.0..=1e6, "between 10 and 1e6 px"),
            ("camera.lens.blur_px", lens.blur_px, 0.3..=50.0, "between 0.3 and 50 px"),
            ("camera.lens.vignetting", lens.vignetting, 0.0..=0.9, "between 0 and 0.9"),
            ("camera.distance_m", setup.distance_m, 1e-3..=100.0, "between 1 mm and 100 m"),
            ("camera.roll_rad", setup.roll_rad, -PI..=PI, TURN),
        ];
        bounds.extend(lens.principal_px.map(|place| ("camera.lens.principal_px", place, -1e5..=1e5, "within 1e5 px")));
        bounds.extend(lens.radial.map(|k| ("camera.lens.radial", k, -1.0..=1.0, "between -1 and 1")));
        bounds.extend(lens.tangential.map(|p| ("camera.lens.tangential", p, -0.1..=0.1, "between -0.1 and 0.1")));
        bounds.extend(setup.aim_m.map(|place| ("camera.aim_m", place, -100.0..=100.0, "within 100 m")));
        bounds.extend(setup.lean_rad.map(|lean| ("camera.lean_rad", lean, -1.4..=1.4, "between -1.4 and 1.4 rad")));
        bounds
    }

    fn light_bounds(&self) -> Vec<Bound> {
        let (light, room) = (&self.light, &self.light.room);
        let mut bounds = vec![
            ("light.brightest_order", light.brightest_order, 1e-4..=1e4, "between 1e-4 and 1e4"),
            ("light.skirt", light.skirt, 0.0..=0.5, "between 0 and 0.5"),
            ("light.room.pattern_level", room.pattern_level, 0.0..=1.0, FRACTION),
            ("light.room.target_level", room.target_level, 0.0..=1.0, FRACTION),
        ];
        bounds.extend(room.tint.map(|share| ("light.room.tint", share, 0.0..=1.0, FRACTION)));
        bounds.extend(room.gradient.map(|slope| ("light.room.gradient", slope, -2.0..=2.0, "between -2 and 2")));
        if let Some(speckle) = &light.speckle {
            bounds.push(("light.speckle.contrast", speckle.contrast, 0.01..=1.0, "between 0.01 and 1; leave [light.speckle] out for none"));
            bounds.push(("light.speckle.grain_px", speckle.grain_px, 1.0..=50.0, "between 1 and 50 px"));
        }
        if let Some(glare) = &light.glare {
            bounds.push(("light.glare.share", glare.share, 0.0..=0.5, "between 0 and 0.5"));
            bounds.push(("light.glare.core_px", glare.core_px, 2.0..=1e3, "between 2 and 1000 px"));
            bounds.push(("light.glare.power", glare.power, 1.05..=5.0, "between 1.05 and 5"));
        }
        bounds
    }

    fn sensor_bounds(&self) -> Vec<Bound> {
        let sensor = &self.sensor;
        let mut bounds = vec![
            ("sensor.bits", f64::from(sensor.bits), 4.0..=16.0, "4 to 16"),
            ("sensor.black_level", sensor.black_level, 0.0..=0.5, "between 0 and 0.5"),
            ("stray.ghosts", f64::from(self.stray.ghosts), 0.0..=1000.0, "at most 1000"),
            ("stray.ghost_level", self.stray.ghost_level, 0.0..=1e3, "between 0 and 1000"),
            ("stray.blobs", f64::from(self.stray.blobs), 0.0..=1000.0, "at most 1000"),
            ("stray.blob_level", self.stray.blob_level, 0.0..=1e3, "between 0 and 1000"),
            ("stray.glints", f64::from(self.stray.glints), 0.0..=100.0, "at most 100"),
            ("stray.glint_level", self.stray.glint_level, 0.0..=1e3, "between 0 and 1000"),
            ("stray.hot_pixels", f64::from(self.stray.hot_pixels), 0.0..=1e5, "at most 100000"),
            ("stray.specks", f64::from(self.stray.specks), 0.0..=1e4, "at most 10000"),
        ];
        bounds.extend(sensor.white_balance.map(|gain| ("sensor.white_balance", gain, 1.0..=10.0, "between 1 and 10")));
        if let Some(copy) = &self.stray.copy {
            bounds.push(("stray.copy.share", copy.share, 0.0..=1.0, FRACTION));
            bounds.extend(copy.shift_px.map(|shift| ("stray.copy.shift_px", shift, -1e4..=1e4, "within 10000 px")));
        }
        if let Some(noise) = &sensor.noise {
            bounds.push(("sensor.noise.full_well_e", noise.full_well_e, 100.0..=1e7, "between 100 and 1e7 electrons"));
            bounds.push(("sensor.noise.read_noise_e", noise.read_noise_e, 0.0..=1e3, "between 0 and 1000 electrons"));
        }
        bounds
    }

    fn file_bounds(&self) -> Vec<Bound> {
        let file = &self.file;
        let mut bounds = vec![
            ("file.width_px", f64::from(file.width_px), 16.0..=12_000.0, "between 16 and 12000 px"),
            ("file.height_px", f64::from(file.height_px), 16.0..=12_000.0, "between 16 and 12000 px"),
        ];
        if let FileKind::Jpeg { quality, s_curve } = file.kind {
            bounds.push(("file.kind.quality", f64::from(quality), 1.0..=100.0, "1 to 100"));
            bounds.push(("file.kind.s_curve", s_curve, 0.0..=1.0, FRACTION));
        }
        if let Some(exif) = &file.exif {
            bounds.push(("file.exif.orientation", f64::from(exif.orientation), 1.0..=8.0, "1 to 8"));
            bounds.push(("file.exif.focal_length_m", exif.focal_length_m, 1e-4..=10.0, "between 0.1 mm and 10 m"));
            bounds.push(("file.exif.exposure_s", exif.exposure_s, 1e-6..=1e4, "between 1 µs and 10000 s"));
            bounds.push(("file.exif.f_number", exif.f_number, 0.5..=200.0, "between 0.5 and 200"));
        }
        bounds
    }
}

fn second_bounds(second: &SecondLattice) -> Vec<Bound> {
    let mut bounds = lattice_bounds(&second.lattice);
    bounds.push(("sample.second.power", second.power, 0.0..=1e3, "between 0 and 1000"));
    bounds
}

fn lattice_bounds(lattice: &Lattice) -> Vec<Bound> {
    const PITCH: &str = "between 0.1 µm and 0.5 mm, in metres";
    match *lattice {
        Lattice::Line { pitch_m, turn_rad } => {
            vec![("sample.lattice.pitch_m", pitch_m, 1e-7..=5e-4, PITCH), ("sample.lattice.turn_rad", turn_rad, -PI..=PI, TURN)]
        }
        Lattice::Plane { pitch_m, angle_rad, turn_rad } => vec![
            ("sample.lattice.pitch_m", pitch_m[0], 1e-7..=5e-4, PITCH),
            ("sample.lattice.pitch_m", pitch_m[1], 1e-7..=5e-4, PITCH),
            ("sample.lattice.angle_rad", angle_rad, 0.1..=3.0, "between 0.1 and 3.0 rad"),
            ("sample.lattice.turn_rad", turn_rad, -PI..=PI, TURN),
        ],
    }
}

fn opening_bounds(opening: &Opening) -> Vec<Bound> {
    const SIZE: &str = "between 0 and 1 mm, in metres";
    match *opening {
        Opening::Disc { radius_m } => vec![("sample.opening.radius_m", radius_m, 0.0..=5e-4, SIZE)],
        Opening::Rectangle { size_m } => size_m.map(|size| ("sample.opening.size_m", size, 0.0..=1e-3, SIZE)).to_vec(),
        Opening::Slit { width_m } => vec![("sample.opening.width_m", width_m, 0.0..=1e-3, SIZE)],
    }
}

#[cfg(test)]
mod tests {
    use crate::synth::{Scene, SynthError, demo_scene};

    fn text() -> String {
        crate::synth::demo::demo_text("ruled-grating").unwrap().to_owned()
    }

    #[test]
    fn an_unknown_key_is_refused_by_name() {
        let with_typo = text().replace("texture =", "texure =");
        let message = Scene::from_toml(&with_typo).unwrap_err().to_string();
        assert!(message.contains("texure") && message.contains("texture"), "{message}");
    }

    #[test]
    fn a_missing_key_is_named() {
        let without = text().replace("seed =", "# seed =");
        assert!(Scene::from_toml(&without).unwrap_err().to_string().contains("seed"));
    }

    #[test]
    fn values_outside_their_range_are_named_with_the_range() {
        let mut scene = demo_scene("ruled-grating").unwrap();
        scene.screen.throw_m = f64::NAN;
        assert!(matches!(scene.check(), Err(SynthError::Value { key: "screen.throw_m", .. })));
        let millimetres = text().replace("throw_m = 0.", "throw_m = 900.");
        let message = Scene::from_toml(&millimetres).unwrap_err().to_string();
        assert!(message.contains("screen.throw_m") && message.contains("between 1 mm and 100 m"), "{message}");
    }

    #[test]
    fn a_scene_that_looks_past_the_pattern_is_refused() {
        let mut scene = demo_scene("ruled-grating").unwrap();
        scene.camera.aim_m = [0.0, 50.0];
        assert!(matches!(crate::synth::render_pattern(&scene), Err(SynthError::NothingInFrame)));
    }
}
