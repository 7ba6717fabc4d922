//! One case: drawn, measured, compared with its truth.

use super::classes::{Class, Wanted};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;
use spotrule::{
    bench::{Bench, Pattern, Scale},
    budget::Value,
    frames::PixelPoint,
    measure::{Inputs, Measurement, PhotoFile, Refusal, measure},
    quantity::Quantity,
    synth::{Answer, Dots, Scene, encode, render_marked, render_pattern, render_target},
};
use std::time::Instant;

/// What became of a case.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Verdict {
    /// Measured, with the true lattice (for two lattices: refused by name, or one of them with a note).
    Right,
    /// No result.
    Refused,
    /// Another lattice than the true one, without saying so.
    Misnumbered,
    /// The program broke.
    Panicked,
}

/// A value against its truth.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Pull {
    pub(crate) is_angle: bool,
    /// (found − true) / u.
    pub(crate) z: f64,
    /// Whether U holds the truth.
    pub(crate) inside: bool,
    /// u over the value (pitch) or in rad (angle).
    pub(crate) relative_u: f64,
}

/// One line of the study.
#[derive(Debug, Clone)]
pub(crate) struct Outcome {
    pub(crate) class: char,
    pub(crate) seed: u64,
    pub(crate) verdict: Verdict,
    pub(crate) pulls: Vec<Pull>,
    /// Spots in the fit, Birge factor, wall time (of one of several cases at once).
    pub(crate) spots: usize,
    pub(crate) birge: f64,
    pub(crate) seconds: f64,
    /// Codes of the notes, or code and text of the refusal.
    pub(crate) remarks: String,
}

impl Outcome {
    /// Whether a number is off by more than its uncertainty can bear.
    pub(crate) fn is_far_off(&self) -> bool {
        self.pulls.iter().any(|pull| pull.z.abs() > FAR_OFF)
    }
}

/// Beyond this a value is wrong, u.
const FAR_OFF: f64 = 5.0;
/// The true lattice is found when each value lies within this many u of it, or within `CLOSE` of the value.
const INDEXED: f64 = 8.0;
const CLOSE: f64 = 0.01;
/// However wide u is: a net of index two differs by a factor √2 or more in some value.
const NEXT_LATTICE: f64 = 0.3;

/// The photos of a scene as files.
pub(crate) struct Files {
    pub(crate) pattern: Vec<u8>,
    pub(crate) target: Option<Vec<u8>>,
}

pub(crate) fn drawn(scene: &Scene) -> Files {
    let pattern = if scene.print.dots == Dots::InPattern { render_marked(scene) } else { render_pattern(scene) }.unwrap();
    let target = (scene.print.dots == Dots::OwnPhoto).then(|| encode(scene, &render_target(scene).unwrap()).unwrap());
    Files { pattern: encode(scene, &pattern).unwrap(), target }
}

/// What the operator states; line or plane is left to the program.
pub(crate) fn stated(scene: &Scene) -> Bench {
    let mut bench = scene.bench();
    bench.samples[0].pattern = Pattern::Auto;
    if scene.print.dots == Dots::Nowhere && scene.seed.is_multiple_of(2) {
        bench.camera.scale = Some(clicked_scale(scene));
    }
    bench
}

/// Two points of the screen clicked in the photo (0.5 px) whose distance a ruler gave (0.3 mm).
fn clicked_scale(scene: &Scene) -> Scale {
    let mut random = ChaCha8Rng::seed_from_u64(scene.seed ^ 0x5ca1e);
    let mut normal = || random.sample::<f64, _>(StandardNormal);
    let camera = scene.camera();
    let (width, height) = (f64::from(scene.file.width_px), f64::from(scene.file.height_px));
    let corners = [(0.13, 0.2), (0.87, 0.25)].map(|(x, y)| PixelPoint { x_px: x * width, y_px: y * height });
    let [a, b] = corners.map(|corner| camera.print_point(corner).unwrap());
    let distance_m = (a.x_m - b.x_m).hypot(a.y_m - b.y_m) + 0.3e-3 * normal();
    let points = corners.map(|corner| PixelPoint { x_px: corner.x_px + 0.5 * normal(), y_px: corner.y_px + 0.5 * normal() });
    Scale { points, distance_m: Quantity::normal(distance_m, 0.3e-3) }
}

fn measured(scene: &Scene, files: &Files) -> Result<Measurement, Refusal> {
    let patterns = vec![PhotoFile { name: scene.pattern_file(), bytes: &files.pattern }];
    let targets = files.target.iter().map(|bytes| PhotoFile { name: scene.target_file(), bytes }).collect();
    measure(&Inputs { patterns, targets }, &stated(scene))
}

/// Runs one case.
pub(crate) fn run(class: &Class, seed: u64) -> Outcome {
    let scene = class.scene(seed);
    let files = drawn(&scene);
    let start = Instant::now();
    let result = std::panic::catch_unwind(|| measured(&scene, &files));
    let mut outcome = Outcome {
        class: class.letter,
        seed,
        verdict: Verdict::Panicked,
        pulls: Vec::new(),
        spots: 0,
        birge: f64::NAN,
        seconds: start.elapsed().as_secs_f64(),
        remarks: String::new(),
    };
    match result {
        Err(_) => {}
        Ok(Err(refusal)) => {
            outcome.remarks = format!("{}: {refusal}", refusal.error.code());
            let named = class.wanted == Wanted::BothOrNamed && refusal.error.code() == "two-lattices";
            outcome.verdict = if named { Verdict::Right } else { Verdict::Refused };
        }
        Ok(Ok(found)) => judge(class, &scene, &found, &mut outcome),
    }
    outcome
}

fn judge(class: &Class, scene: &Scene, found: &Measurement, outcome: &mut Outcome) {
    let notes: Vec<&str> = found.notes.iter().map(spotrule::Note::code).collect();
    outcome.remarks = notes.join(" ");
    outcome.spots = found.fit.spots_used;
    outcome.birge = found.fit.birge_factor;
    let mut truths = vec![Answer::new(scene)];
    if let Some(second) = &scene.sample.second {
        let mut other = scene.clone();
        other.sample.lattice = second.lattice;
        truths.push(Answer::new(&other));
    }
    let best = truths.iter().filter_map(|truth| pulls(found, truth)).find(|pulls| pulls.iter().all(|(_, close)| *close));
    let named = class.wanted != Wanted::BothOrNamed || notes.contains(&"second-lattice");
    outcome.verdict = if best.is_some() && named { Verdict::Right } else { Verdict::Misnumbered };
    let all = best.or_else(|| pulls(found, &truths[0])).unwrap_or_default();
    outcome.pulls = all.into_iter().map(|(pull, _)| pull).collect();
    if outcome.verdict == Verdict::Misnumbered {
        let pitches: Vec<String> = found.sample.pitch_m.iter().map(|pitch| format!("{:.4}", pitch.value * 1e6)).collect();
        let wanted: Vec<String> = truths.iter().flat_map(|truth| &truth.pitch_m).map(|pitch| format!("{:.4}", pitch * 1e6)).collect();
        outcome.remarks = format!("{} um for {} um; {}", pitches.join(" "), wanted.join(" "), outcome.remarks);
    }
}

/// Each value against its truth, and whether it is close enough for the same lattice; `None` when line and plane differ.
fn pulls(found: &Measurement, truth: &Answer) -> Option<Vec<(Pull, bool)>> {
    let sample = &found.sample;
    if sample.pitch_m.len() != truth.pitch_m.len() {
        return None;
    }
    let mut pitches: Vec<Value> = sample.pitch_m.clone();
    pitches.sort_by(|a, b| a.value.total_cmp(&b.value));
    let mut all: Vec<(Pull, bool)> = pitches.iter().zip(&truth.pitch_m).map(|(value, &truth)| pull(value, truth, false)).collect();
    all.extend(sample.lattice_angle_rad.iter().zip(truth.lattice_angle_rad).map(|(value, truth)| pull(value, truth, true)));
    Some(all)
}

fn pull(value: &Value, truth: f64, is_angle: bool) -> (Pull, bool) {
    let error = value.value - truth;
    let size = if is_angle { 1.0 } else { truth };
    let pull = Pull { is_angle, z: error / value.u, inside: error.abs() <= value.expanded(), relative_u: value.u / size };
    (pull, error.abs() <= (INDEXED * value.u).min(NEXT_LATTICE * size).max(CLOSE * size))
}
