//! The classes of benches, and what makes each of them hard.

use super::draw::{Draw, Repeat};
use spotrule::{
    bench::Mode,
    frames::Side,
    synth::{Dots, FileKind, Opening, PatternCopy, Scene, SecondLattice, SecondLobe, SensorColour, Sheet, Speckle},
};

/// One class of benches.
pub(crate) struct Class {
    pub(crate) letter: char,
    pub(crate) title: &'static str,
    /// What is rightly done with its photos.
    pub(crate) wanted: Wanted,
    make: fn(&mut Draw) -> Scene,
}

/// What is rightly done with the photos of a class.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Wanted {
    /// The lattice, with an honest uncertainty.
    Measurement,
    /// A refusal by name, or one of the two lattices with the note that there is another.
    BothOrNamed,
}

impl Class {
    /// The bench of a seed: what is stated and what is true of it.
    pub(crate) fn scene(&self, seed: u64) -> Scene {
        let own = u64::from(u32::from(self.letter)) * 1_000_003;
        let seed = own.wrapping_add(seed);
        // Nobody measures a photo with fewer orders; the bench is changed until they show.
        let draws = (0..100_u64).map(|attempt| (self.make)(&mut Draw::new(seed.wrapping_add(attempt << 40))).redrawn(seed));
        draws.clone().find(shows_enough).unwrap_or_else(|| draws.take(1).last().unwrap())
    }
}

/// Fewest orders of a photo that a careful person would take: line, plane.
const FEWEST_ORDERS: [usize; 2] = [5, 8];
/// Peaks above this share of the clipping level are seen by eye.
const SEEN: f64 = 0.02;

fn shows_enough(scene: &Scene) -> bool {
    let seen = spotrule::synth::orders(scene).iter().filter(|order| order.lattice == 0 && order.amplitude > SEEN).count();
    let line = scene.sample.lattice.direct_m().1.is_none();
    seen >= if line { FEWEST_ORDERS[0] } else { FEWEST_ORDERS[1] }
}

const fn class(letter: char, title: &'static str, make: fn(&mut Draw) -> Scene) -> Class {
    Class { letter, title, wanted: Wanted::Measurement, make }
}

/// All classes.
pub(crate) const CLASSES: [Class; 21] = [
    class('A', "line grating", |draw| draw.bench(Repeat::Line)),
    class('B', "square mesh", |draw| draw.bench(Repeat::Square)),
    class('C', "hexagonal film", |draw| draw.bench(Repeat::Hexagonal)),
    class('D', "oblique lattice", |draw| draw.bench(Repeat::Oblique)),
    class('E', "even orders absent along one axis", even_orders_absent),
    class('F', "reflection at 10 to 45 degrees", reflection),
    class('G', "oblique camera with distortion", oblique_camera),
    class('H', "screen tilted by 5 to 12 degrees", tilted_screen),
    class('I', "zero order in a hole", hole),
    class('J', "heavy clipping, strong speckle", clipped),
    class('K', "ghosts, soft patches, edges, dirt", clutter),
    class('L', "underexposed, JPEG quality 70", underexposed),
    class('M', "wide angles, sample turned", wide),
    class('N', "no target", no_target),
    class('O', "16-bit linear", linear),
    class('P', "photo stored on its side", on_its_side),
    class('U', "marks in the pattern photo", marks_in_pattern),
    class('V', "from behind the screen", from_behind),
    class('X', "pattern cut by the frame", cut),
    class('Y', "laser in two modes", two_modes),
    Class { letter: 'W', title: "two lattices at once", wanted: Wanted::BothOrNamed, make: two_lattices },
];

fn even_orders_absent(draw: &mut Draw) -> Scene {
    let mut scene = draw.bench(Repeat::Rectangular);
    let (pitch, _) = scene.sample.lattice.direct_m();
    let second = scene.sample.lattice.direct_m().1.unwrap();
    let (first, second) = (pitch[0].hypot(pitch[1]), second[0].hypot(second[1]));
    let across = draw.between(0.3, 0.46);
    scene.sample.opening = if draw.coin() {
        Opening::Rectangle { size_m: [0.5 * first, across * second] }
    } else {
        Opening::Rectangle { size_m: [across * first, 0.5 * second] }
    };
    scene
}

fn reflection(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.sample.mode = Mode::Reflection;
    let angle = draw.between(10.0, 45.0).to_radians() * draw.sign();
    scene.sample.incidence_rad = [draw.between(-2.0, 2.0).to_radians(), angle];
    draw.restate_incidence(&mut scene);
    scene
}

fn oblique_camera(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    draw.choose_lens(0.72, 0.95);
    let mut scene = draw.bench(repeat);
    let lean = draw.between(27.0, 38.0).to_radians();
    draw.lean(&mut scene, lean);
    scene.camera.lens.radial = [draw.between(-0.1, -0.03), draw.between(-0.01, 0.02)];
    scene
}

fn tilted_screen(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    let (about_x, about_y) = (draw.between(5.0, 12.0).to_radians() * draw.sign(), draw.between(-2.0, 2.0).to_radians());
    scene.screen.tilt_rad = if draw.coin() { [about_x, about_y] } else { [about_y, about_x] };
    draw.restate_tilt(&mut scene);
    scene
}

fn hole(draw: &mut Draw) -> Scene {
    let repeat = if draw.coin() { Repeat::Line } else { draw.any_plane() };
    let mut scene = draw.bench(repeat);
    scene.sample.zero_order_factor = 0.0;
    scene.screen.hole_radius_m = draw.between(0.15, 0.3) * draw.spacing_m(&scene);
    draw.marks_beside_hole(&mut scene);
    scene
}

fn clipped(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.light.brightest_order = draw.scaled(15.0, 120.0);
    scene.sample.zero_order_factor = draw.scaled(100.0, 1000.0);
    scene.light.speckle = Some(Speckle { contrast: draw.between(0.45, 0.65), grain_px: draw.between(1.5, 2.8) });
    scene.light.skirt = 0.04;
    if let Some(glare) = &mut scene.light.glare {
        glare.share = draw.between(0.03, 0.05);
    }
    scene
}

fn clutter(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    let spacing_px = draw.spacing_px(&scene);
    let turn = draw.between(0.0, std::f64::consts::TAU);
    let shift = draw.between(0.2, 0.8) * spacing_px;
    scene.stray.copy = Some(PatternCopy { share: draw.scaled(0.01, 0.06), shift_px: [shift * turn.cos(), shift * turn.sin()] });
    scene.stray.blobs = draw.count(4, 8);
    scene.stray.blob_level = draw.between(0.05, 0.3);
    scene.stray.glints = draw.count(0, 3);
    scene.stray.glint_level = draw.between(0.5, 1.5);
    scene.stray.ghosts = draw.count(2, 8);
    scene.stray.ghost_level = draw.between(0.1, 0.5);
    scene.stray.specks = draw.count(5, 20);
    scene.stray.hot_pixels = draw.count(10, 40);
    let field = draw.field_m();
    let edge = |draw: &mut Draw, share: f64| draw.between(0.38, 0.6) * field * share;
    scene.screen.sheet = Some(Sheet {
        edges_m: [-edge(draw, 1.0), -edge(draw, 0.75), edge(draw, 1.0), edge(draw, 0.75)],
        wall_reflectance: draw.between(0.3, 0.7),
    });
    scene
}

fn underexposed(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.light.brightest_order = draw.scaled(0.2, 1.0);
    scene.light.room.pattern_level = 0.003;
    if let Some(noise) = &mut scene.sensor.noise {
        noise.full_well_e = 4000.0;
    }
    scene.file.kind = FileKind::Jpeg { quality: 70, s_curve: draw.pick(&[0.0, 0.08, 0.15]) };
    scene
}

fn wide(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    draw.choose_lens(0.95, 1.45);
    draw.choose_throw(0.1, 0.13);
    let mut scene = draw.bench(repeat);
    let turned = [draw.between(3.0, 12.0).to_radians() * draw.sign(), draw.between(-4.0, 4.0).to_radians()];
    scene.sample.incidence_rad = turned;
    draw.restate_incidence(&mut scene);
    scene
}

fn no_target(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    draw.choose_throw(0.1, 0.16);
    draw.choose_lens(1.2, 1.6);
    let mut scene = draw.bench(repeat);
    draw.without_target(&mut scene);
    scene
}

fn linear(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.file.kind = FileKind::Png16;
    scene.file.exif = None;
    if draw.between(0.0, 1.0) < 0.67 {
        scene.sensor.colour = SensorColour::Mono;
        scene.sensor.black_level = draw.between(0.0, 0.02);
    }
    scene
}

fn on_its_side(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    if let Some(exif) = &mut scene.file.exif {
        exif.orientation = draw.pick(&[6, 8]);
    }
    scene
}

fn marks_in_pattern(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.print.dots = Dots::InPattern;
    scene.light.room.target_level = draw.between(0.05, 0.12);
    scene.light.brightest_order = draw.scaled(3.0, 25.0);
    scene
}

fn from_behind(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    scene.screen.seen_from = Side::Behind;
    scene.light.skirt = 0.06;
    scene
}

/// The zero order near or beyond an edge or a corner of the photo; the target still fills it.
fn cut(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    draw.more_orders(1.6);
    let mut scene = draw.bench(repeat);
    let field = draw.field_m();
    scene.camera.aim_m = [draw.between(0.3, 0.55) * field * draw.sign(), draw.between(0.0, 0.3) * field * draw.sign()];
    draw.print_in_view(&mut scene);
    scene
}

/// Two transverse modes (pairs of spots, alike everywhere), or two longitudinal modes (pairs that part with the angle).
fn two_modes(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    if draw.coin() {
        let turn = draw.between(0.0, std::f64::consts::TAU);
        let width = scene.beam.half_divergence_rad.hypot(scene.beam.footprint_radius_m / scene.screen.throw_m);
        let apart = draw.between(0.8, 2.2) * width;
        scene.beam.second_lobe = Some(SecondLobe { apart_rad: [apart * turn.cos(), apart * turn.sin()], share: draw.between(0.2, 0.5) });
    } else {
        let mut other = scene.lasers[0].clone();
        other.wavelength_m += draw.between(0.1e-9, 0.4e-9);
        other.colour = other.colour.map(|channel| channel * 0.5);
        scene.lasers.push(other);
    }
    scene
}

/// Two meshes in one beam, turned against each other.
fn two_lattices(draw: &mut Draw) -> Scene {
    let repeat = draw.any_plane();
    let mut scene = draw.bench(repeat);
    let other = draw.any_plane();
    let spacing = draw.spacing_m(&scene);
    let lattice = draw.lattice(other, draw.pitch_for(spacing * 0.8, &scene), 1.25);
    scene.sample.second = Some(SecondLattice { lattice, power: draw.scaled(0.3, 1.0) });
    scene.light.brightest_order = draw.scaled(3.0, 25.0);
    scene
}
