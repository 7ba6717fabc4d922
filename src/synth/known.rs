//! What the operator of the scene knows, and the bench file that says it.

use super::{
    orders::{Purpose, random},
    scene::{Dots, FileKind, Lattice, Scene},
};
use crate::{
    bench::{self, Bench, Medium, Mode, Pattern, TargetKind},
    frames::Side,
    quantity::{Quantity, format_concise_digits},
};
use rand_distr::{Distribution as _, StandardNormal};
use serde::{Deserialize, Serialize};
use std::fmt::Write;

/// A stated value with its standard uncertainty (normal law), in SI units; u = 0 means exact.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Stated {
    /// As read.
    pub value: f64,
    /// Standard uncertainty.
    pub u: f64,
}

/// What the operator knows; left out = not known.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Known {
    /// Wavelength in air of the first laser, m. The laser is always known: without this its true wavelength ± 1e-4 is stated.
    pub wavelength_m: Option<Stated>,
    /// Throw, m.
    pub throw_m: Option<Stated>,
    /// Turns of the screen, rad.
    pub tilt_rad: Option<[Stated; 2]>,
    /// Turns of the sample, rad.
    pub incidence_rad: Option<[Stated; 2]>,
    /// Pitch of the printed dots, m. Without it there is no target in the bench file.
    pub dot_pitch_m: Option<Stated>,
    /// Turn of the print, rad.
    pub print_turn_rad: Option<Stated>,
    /// Lean of the camera, right and up, rad.
    pub square_on_rad: Option<[Stated; 2]>,
    /// A line of text on top of the bench file.
    pub headline: String,
}

impl From<Stated> for Quantity {
    fn from(stated: Stated) -> Self {
        if stated.u > 0.0 { Self::normal(stated.value, stated.u) } else { Self::exact(stated.value) }
    }
}

impl Scene {
    /// The same bench on another day: every true value that is known with an uncertainty is drawn anew from what is stated, and all
    /// noise has a new seed. Over many seeds, honest uncertainties then hold the truth as often as they claim.
    #[must_use]
    pub fn redrawn(&self, seed: u64) -> Self {
        let mut generator = random(seed, Purpose::Redraw, 0);
        let mut draw = |stated: Stated| {
            let normal: f64 = StandardNormal.sample(&mut generator);
            stated.value + stated.u * normal
        };
        let (mut scene, known) = (self.clone(), self.known.clone());
        scene.seed = seed;
        if let Some(stated) = known.wavelength_m {
            scene.lasers[0].wavelength_m = draw(stated);
        }
        if let Some(stated) = known.throw_m {
            scene.screen.throw_m = draw(stated);
        }
        if let Some(stated) = known.tilt_rad {
            scene.screen.tilt_rad = stated.map(&mut draw);
        }
        if let Some(stated) = known.incidence_rad {
            scene.sample.incidence_rad = stated.map(&mut draw);
        }
        if let Some(stated) = known.dot_pitch_m {
            scene.print.pitch_m = draw(stated);
        }
        if let Some(stated) = known.print_turn_rad {
            scene.print.turn_rad = draw(stated);
        }
        if let Some(stated) = known.square_on_rad {
            scene.camera.lean_rad = stated.map(&mut draw);
        }
        scene
    }

    /// What the operator knows, as the measurement takes it; the photo of the target is called as in [`Self::target_file`].
    #[must_use]
    pub fn bench(&self) -> Bench {
        let known = &self.known;
        let target = known.dot_pitch_m.map(|pitch| bench::Target {
            kind: TargetKind::Dots {
                photo: (self.print.dots == Dots::OwnPhoto).then(|| self.target_file().to_owned()),
                pitch_m: pitch.into(),
            },
            turn_rad: known.print_turn_rad.map(Quantity::from),
        });
        let pattern = match self.sample.lattice {
            Lattice::Line { .. } => Pattern::Line,
            Lattice::Plane { .. } => Pattern::Plane,
        };
        let pair = |stated: Option<[Stated; 2]>| stated.map(|pair| pair.map(Quantity::from));
        Bench {
            lasers: vec![bench::Laser { name: String::new(), wavelength_m: self.stated_wavelength().into(), medium: Medium::Air }],
            air: standard_air(),
            samples: vec![bench::Sample {
                name: String::new(),
                mode: self.sample.mode,
                pattern,
                incidence_rad: pair(known.incidence_rad),
                pitch_m: Vec::new(),
                lattice_angle_rad: None,
            }],
            screen: bench::Screen {
                throw_m: known.throw_m.map(Quantity::from),
                tilt_rad: pair(known.tilt_rad),
                seen_from: self.screen.seen_from,
            },
            target,
            camera: bench::Camera { square_on_rad: pair(known.square_on_rad), ..bench::Camera::default() },
            photos: Vec::new(),
            calibration: None,
        }
    }

    /// The same as a bench file.
    #[must_use]
    pub fn bench_text(&self) -> String {
        let known = &self.known;
        let mode = match self.sample.mode {
            Mode::Transmission => "transmission",
            Mode::Reflection => "reflection",
        };
        let side = match self.screen.seen_from {
            Side::Front => "front",
            Side::Behind => "behind",
        };
        let mut text = String::new();
        for line in known.headline.lines() {
            let _ = writeln!(text, "# {line}");
        }
        let _ = writeln!(text, "\n[laser]\nwavelength = \"{}\"\nmedium = \"air\"", quantity_text(self.stated_wavelength(), 1e9, "nm"));
        let _ = writeln!(text, "\n[sample]\nmode = \"{mode}\"\npattern = \"auto\"");
        write_pair(&mut text, "incidence", known.incidence_rad);
        let _ = writeln!(text, "\n[screen]");
        if let Some(throw) = known.throw_m {
            let _ = writeln!(text, "throw = \"{}\"", quantity_text(throw, 1e3, "mm"));
        }
        write_pair(&mut text, "tilt", known.tilt_rad);
        let _ = writeln!(text, "seen_from = \"{side}\"");
        self.write_target(&mut text);
        if known.square_on_rad.is_some() {
            let _ = writeln!(text, "\n[camera]");
            write_pair(&mut text, "square_on", known.square_on_rad);
        }
        text
    }

    /// Name of the pattern photo's file.
    #[must_use]
    pub fn pattern_file(&self) -> &'static str {
        match self.file.kind {
            FileKind::Jpeg { .. } => "pattern.jpg",
            FileKind::Png16 => "pattern.png",
        }
    }

    /// Name of the target photo's file.
    #[must_use]
    pub fn target_file(&self) -> &'static str {
        match self.file.kind {
            FileKind::Jpeg { .. } => "target.jpg",
            FileKind::Png16 => "target.png",
        }
    }

    fn stated_wavelength(&self) -> Stated {
        let true_m = self.lasers.first().map_or(0.0, |laser| laser.wavelength_m);
        self.known.wavelength_m.unwrap_or(Stated { value: true_m, u: 1e-4 * true_m })
    }

    fn write_target(&self, text: &mut String) {
        let Some(pitch) = self.known.dot_pitch_m else { return };
        let _ = writeln!(text, "\n[target]");
        if self.print.dots == Dots::OwnPhoto {
            let _ = writeln!(text, "photo = \"{}\"", self.target_file());
        }
        let _ = writeln!(text, "pitch = \"{}\"", quantity_text(pitch, 1e3, "mm"));
        if let Some(turn) = self.known.print_turn_rad {
            let _ = writeln!(text, "turn = \"{}\"", quantity_text(turn, 1.0_f64.to_degrees(), "deg"));
        }
    }
}

/// 20 °C, 1013.25 hPa, half saturated; without weight here, since wavelengths are stated in air.
fn standard_air() -> bench::Air {
    let exact = Quantity::exact;
    bench::Air { temperature_celsius: exact(20.0), pressure_pa: exact(101_325.0), humidity: exact(0.5) }
}

fn write_pair(text: &mut String, key: &str, pair: Option<[Stated; 2]>) {
    let Some(pair) = pair else { return };
    let [x, y] = pair.map(|stated| quantity_text(stated, 1.0_f64.to_degrees(), "deg"));
    let _ = writeln!(text, "{key} = [\"{x}\", \"{y}\"]");
}

/// The stated value in a unit of the bench file, u with one digit where it has only one.
fn quantity_text(stated: Stated, units_per_si: f64, unit: &str) -> String {
    let (value, u) = (stated.value * units_per_si, stated.u * units_per_si);
    let one_digit = u * 10.0_f64.powf(-u.log10().floor());
    let digits = if u > 0.0 && (one_digit - one_digit.round()).abs() > 0.01 { 2 } else { 1 };
    format_concise_digits(value, u, unit, digits)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::synth::{DEMO_NAMES, demo_scene};

    #[test]
    fn quantities_are_written_as_the_bench_file_wants_them() {
        let text = |value, u, scale, unit| quantity_text(Stated { value, u }, scale, unit);
        assert_eq!(text(0.812, 0.0008, 1e3, "mm"), "812.0(8) mm");
        assert_eq!(text(632.82e-9, 0.01e-9, 1e9, "nm"), "632.82(1) nm");
        assert_eq!(text(0.0, 0.5_f64.to_radians(), 1.0_f64.to_degrees(), "deg"), "0.0(5) deg");
        assert_eq!(text(0.02, 15e-6, 1e3, "mm"), "20.000(15) mm");
        assert_eq!(text(0.01, 0.0, 1e3, "mm"), "10 mm (exact)");
    }

    #[test]
    fn the_bench_file_says_the_same_as_the_bench() {
        for name in DEMO_NAMES {
            let scene = demo_scene(name).unwrap();
            let (read, _) = Bench::parse(&scene.bench_text()).unwrap();
            let (told, stated) = (scene.bench(), |quantity: Option<Quantity>| quantity.map(|q| (q.value, q.u)));
            let near = |a: Option<Quantity>, b: Option<Quantity>| match (stated(a), stated(b)) {
                (Some(a), Some(b)) => (a.0 - b.0).abs() < 0.01 * b.1 && (a.1 / b.1 - 1.0).abs() < 0.01,
                (a, b) => a.is_none() && b.is_none(),
            };
            assert!(near(read.screen.throw_m, told.screen.throw_m), "{name}");
            assert!(near(Some(read.lasers[0].wavelength_m), Some(told.lasers[0].wavelength_m)), "{name}");
            let first = |pair: Option<[Quantity; 2]>| pair.map(|pair| pair[0]);
            let second = |pair: Option<[Quantity; 2]>| pair.map(|pair| pair[1]);
            for (a, b) in [
                (read.screen.tilt_rad, told.screen.tilt_rad),
                (read.samples[0].incidence_rad, told.samples[0].incidence_rad),
                (read.camera.square_on_rad, told.camera.square_on_rad),
            ] {
                assert!(near(first(a), first(b)) && near(second(a), second(b)), "{name}: {a:?} {b:?}");
            }
            assert_eq!((read.samples[0].mode, read.screen.seen_from), (told.samples[0].mode, told.screen.seen_from));
            assert_eq!(read.target.is_some(), told.target.is_some());
        }
    }

    /// The scenes are fair: what is stated lies within 2.5 u of what is true.
    #[test]
    fn what_the_demo_benches_state_is_true() {
        for name in DEMO_NAMES {
            let scene = demo_scene(name).unwrap();
            let known = &scene.known;
            let mut pairs = vec![(known.wavelength_m, scene.lasers[0].wavelength_m), (known.throw_m, scene.screen.throw_m)];
            pairs.push((known.dot_pitch_m, scene.print.pitch_m));
            pairs.push((known.print_turn_rad, scene.print.turn_rad));
            for i in 0..2 {
                pairs.push((known.tilt_rad.map(|pair| pair[i]), scene.screen.tilt_rad[i]));
                pairs.push((known.incidence_rad.map(|pair| pair[i]), scene.sample.incidence_rad[i]));
                pairs.push((known.square_on_rad.map(|pair| pair[i]), scene.camera.lean_rad[i]));
            }
            for (stated, truth) in pairs.into_iter().filter_map(|(stated, truth)| Some((stated?, truth))) {
                assert!((stated.value - truth).abs() <= 2.5 * stated.u, "{name}: {stated:?} {truth}");
            }
        }
    }

    #[test]
    fn a_redrawn_bench_differs_within_what_is_stated() {
        let scene = demo_scene("embossed-film").unwrap();
        let stated = scene.known.throw_m.unwrap();
        let z: Vec<f64> = (0..200).map(|seed| (scene.redrawn(seed).screen.throw_m - stated.value) / stated.u).collect();
        let mean = z.iter().sum::<f64>() / 200.0;
        let deviation = (z.iter().map(|z| z * z).sum::<f64>() / 200.0).sqrt();
        // Standard errors 0.07 and 0.05; four of each.
        assert!(mean.abs() < 0.28 && (deviation - 1.0).abs() < 0.2, "{mean} {deviation}");
        assert_eq!(scene.redrawn(5), scene.redrawn(5));
    }
}
