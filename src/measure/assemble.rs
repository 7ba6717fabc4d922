//! Puts everything that is known and seen into one joint problem.

use super::{GAUGE_THROW_M, MeasureError, cameras::Cameras, look::Seen, orders::Ordered, rough::Rough};
use crate::{
    bench::{Air, Bench, Laser, Medium, Pattern, Scale, TargetKind},
    fit::{
        Joint, Knowledge, Parameter, PhotoShape, PrintObservation, PrintPlace, Shape, Sharpness, SpotObservation,
        setup::{self, ThrowStart, ZeroOrderStart},
    },
    frames::PixelCovariance,
    lattice::{self, Expected},
    optics::{
        Attitude, PrintPose, ScreenPose,
        air::{self, AirState},
    },
    quantity::Quantity,
};

/// A point that somebody clicks in a picture is good to half a pixel (common practice).
const CLICK_U_PX: f64 = 0.5;

/// Which photo shows which sample under which laser.
#[derive(Debug, Clone, Copy)]
pub(super) struct Assignment {
    pub(super) sample: usize,
    pub(super) laser: usize,
    pub(super) step_m: Option<Quantity>,
    pub(super) sample_turn_rad: f64,
}

/// The bench file's word on a photo; a photo that it does not list shows the first sample under the first laser.
pub(super) fn assignment(bench: &Bench, photo: usize) -> Assignment {
    match bench.photos.get(photo) {
        Some(entry) => Assignment {
            sample: entry.sample,
            laser: entry.laser,
            step_m: entry.step_m,
            sample_turn_rad: entry.turn_rad.map_or(0.0, |turn| turn.value),
        },
        None => Assignment { sample: 0, laser: 0, step_m: None, sample_turn_rad: 0.0 },
    }
}

/// Rough geometry of a photo from what is known before the fit.
pub(super) fn rough(cameras: &Cameras, bench: &Bench, photo: usize, size_px: [usize; 2]) -> Rough {
    let Assignment { sample, step_m, .. } = assignment(bench, photo);
    let mean = |pair: Option<[Quantity; 2]>| pair.map_or([0.0; 2], |pair| pair.map(|q| q.value));
    let joint = bare_joint(cameras, bench);
    // What a calibration knows goes over what is stated.
    let known = |parameter, stated: f64| joint.layout.value(parameter).unwrap_or(stated);
    let throw_m = known(Parameter::Throw, bench.screen.throw_m.map_or(GAUGE_THROW_M, |q| q.value)) + step_m.map_or(0.0, |q| q.value);
    let tilt_rad = mean(bench.screen.tilt_rad);
    let turn_rad = bench.target.as_ref().and_then(|target| target.turn_rad).map_or(0.0, |q| q.value);
    let camera = joint.camera(&joint.values(), cameras.view_of_photo[photo]);
    let zero_order_m = [0, 1].map(|axis| known(Parameter::ZeroOrderOnPrint { axis }, 0.0));
    #[expect(clippy::cast_precision_loss, reason = "picture sizes are far below 2^53")]
    let size_px = size_px.map(|side| side as f64);
    Rough {
        zero_order: bench.calibration.as_ref().and_then(|_| camera.print_projector()(zero_order_m)),
        camera,
        screen: ScreenPose::new(throw_m, [0, 1].map(|axis| known(Parameter::ScreenTilt { axis }, tilt_rad[axis]))),
        print: PrintPose { zero_order_m, turn_rad: known(Parameter::PrintTurn, turn_rad), seen_from: bench.screen.seen_from },
        attitude: Attitude::turned(mean(bench.samples[sample].incidence_rad)),
        size_px,
    }
}

/// Wavelengths in the air of the bench, with their uncertainty; the state of the air takes part where a wavelength is stated in vacuum.
pub(super) fn wavelengths_in_air(bench: &Bench) -> Result<Vec<Quantity>, MeasureError> {
    let Air { temperature_celsius: t, pressure_pa: p, humidity: rh } = bench.air;
    let air = AirState { temperature_celsius: t.value, pressure_pa: p.value, humidity: rh.value, co2_ppm: air::USUAL_CO2_PPM };
    let u_air = AirState { temperature_celsius: t.u, pressure_pa: p.u, humidity: rh.u, co2_ppm: CO2_U_PPM };
    let in_air = |laser: &Laser| match laser.medium {
        Medium::Air => Ok(laser.wavelength_m),
        Medium::Vacuum => air::wavelength_in_air_with_u(laser.wavelength_m.value, laser.wavelength_m.u, &air, &u_air)
            .map(|found| Quantity::normal(found.wavelength_m, found.u_m))
            .ok_or(MeasureError::AirOutOfRange { temperature_celsius: t.value, pressure_pa: p.value, humidity: rh.value }),
    };
    bench.lasers.iter().map(in_air).collect()
}

/// CO₂ in a room varies by some 100 ppm, which moves the index by 1.4e-8.
const CO2_U_PPM: f64 = 100.0;

/// What the bench file says of line or plane.
pub(super) fn expected(bench: &Bench, photo: usize) -> Expected {
    match bench.samples[assignment(bench, photo).sample].pattern {
        Pattern::Line => Expected::Line,
        Pattern::Plane => Expected::Plane,
        Pattern::Auto => Expected::Auto,
    }
}

fn bare_joint(cameras: &Cameras, bench: &Bench) -> Joint {
    let shape = Shape { photos: vec![], references: cameras.references.clone(), seen_from: bench.screen.seen_from };
    let (layout, prints) = (cameras.layout.clone(), cameras.prints.clone());
    let correlated = cameras.correlated.clone();
    Joint { layout, shape, spots: vec![], prints, knowledge: vec![], correlated, spot_scale: 1.0, print_scale: 1.0 }
}

/// The joint problem of all photos.
pub(super) fn assemble(seen: &Seen, bench: &Bench, cameras: &Cameras, ordered: &[Ordered], wavelengths_m: &[Quantity]) -> Joint {
    let mut joint = bare_joint(cameras, bench);
    if bench.calibration.is_none() {
        free_the_print(&mut joint, bench, cameras);
    }
    let zero_order =
        if cameras.screen_known { ZeroOrderStart::OnPrint(ordered[0].rough.print.zero_order_m) } else { ZeroOrderStart::Origin };
    if !cameras.screen_known {
        move_bare_cameras(&mut joint, ordered);
    }
    let nothing_has_a_length = !cameras.screen_known && bench.camera.scale.is_none();
    let throw = if nothing_has_a_length { ThrowStart::Gauge(GAUGE_THROW_M) } else { ThrowStart::FromPattern(GAUGE_THROW_M) };
    setup::add_screen(&mut joint.layout, bench, throw, zero_order);
    for (photo, order) in ordered.iter().enumerate() {
        let Assignment { sample, laser, step_m, sample_turn_rad } = assignment(bench, photo);
        setup::add_wavelength(&mut joint.layout, laser, wavelengths_m[laser]);
        setup::add_incidence(&mut joint.layout, sample, &bench.samples[sample]);
        if let Some(step_m) = step_m {
            setup::add_step(&mut joint.layout, photo, step_m);
        }
        setup::add_lattice(&mut joint.layout, sample, &lattice_start(order, wavelengths_m[laser].value));
        joint.shape.photos.push(PhotoShape { view: cameras.view_of_photo[photo], sample, laser, sample_turn_rad });
        add_spots(&mut joint, seen, photo, order);
    }
    add_reference_pitches(&mut joint, bench);
    // A calibration was made with them; they must not count twice.
    if bench.calibration.is_none() {
        add_scale(&mut joint, bench);
        add_square_on(&mut joint, bench, cameras.screen_known);
    }
    joint
}

/// Without a print its origin is the zero order: cameras that were set up before another spot move with it.
fn move_bare_cameras(joint: &mut Joint, ordered: &[Ordered]) {
    let [x, y] = ordered[0].rough.print.zero_order_m;
    for view in 0..joint.shape.references.len() {
        let shift = joint.shape.references[view] * nalgebra::Vector3::new(x, y, 0.0);
        for axis in 0..3 {
            let parameter = Parameter::CameraPlace { view, axis };
            joint.layout.set(parameter, joint.layout.value(parameter).unwrap_or(0.0) + shift[axis]);
        }
    }
}

/// On its own the print had to take its nominal size as exact; in the joint problem it is what the bench file says.
fn free_the_print(joint: &mut Joint, bench: &Bench, cameras: &Cameras) {
    match bench.target.as_ref().map(|target| &target.kind) {
        Some(TargetKind::Dots { pitch_m, .. } | TargetKind::Ruling { pitch_m, .. }) => {
            joint.layout = joint.layout.without(Parameter::TargetPitch);
            setup::add_target_pitch(&mut joint.layout, *pitch_m);
        }
        Some(TargetKind::Sheet { .. }) => {
            for axis in 0..2 {
                joint.layout = joint.layout.without(Parameter::SheetSide { axis });
            }
            if let Some(sides_m) = cameras.sheet_sides_m {
                setup::add_sheet(&mut joint.layout, sides_m);
            }
        }
        Some(TargetKind::Marks { .. }) | None => {}
    }
}

fn lattice_start(order: &Ordered, wavelength_m: f64) -> Vec<[f64; 2]> {
    let count = if order.indexed.shape == lattice::Shape::Line { 1 } else { 2 };
    order.indexed.g[..count].iter().map(|g| g.map(|component| component / wavelength_m)).collect()
}

fn add_spots(joint: &mut Joint, seen: &Seen, photo: usize, order: &Ordered) {
    let spots = &seen.patterns[photo].spots.spots;
    joint.spots.extend(order.orders().map(|(spot, order)| SpotObservation {
        photo,
        spot,
        at: spots[spot].at,
        covariance: spots[spot].covariance,
        order,
        weight: 1.0,
    }));
}

fn add_reference_pitches(joint: &mut Joint, bench: &Bench) {
    for (sample, known) in bench.samples.iter().enumerate() {
        if !joint.shape.photos.iter().any(|photo| photo.sample == sample) {
            continue;
        }
        let mut pitches: Vec<Quantity> = known.pitch_m.clone();
        pitches.sort_by(|a, b| a.value.total_cmp(&b.value));
        joint.knowledge.extend(pitches.iter().enumerate().map(|(which, pitch)| Knowledge::Pitch {
            sample,
            which,
            mean_m: pitch.value,
            u_m: pitch.u.max(1e-9 * pitch.value),
        }));
        if let Some(angle) = known.lattice_angle_rad {
            joint.knowledge.push(Knowledge::LatticeAngle { sample, mean_rad: angle.value, u_rad: angle.u.max(1e-9) });
        }
    }
}

fn add_scale(joint: &mut Joint, bench: &Bench) {
    let Some(Scale { points, distance_m }) = bench.camera.scale else { return };
    let camera = joint.camera(&joint.values(), 0);
    let Some([a, b]) = camera.print_point(points[0]).zip(camera.print_point(points[1])).map(|(a, b)| [[a.x_m, a.y_m], [b.x_m, b.y_m]])
    else {
        return;
    };
    setup::add_scale_ends(&mut joint.layout, [a, b]);
    joint.prints.extend(points.into_iter().enumerate().map(|(end, at)| PrintObservation {
        view: 0,
        at,
        sharpness: Sharpness::Point(PixelCovariance::isotropic(CLICK_U_PX)),
        place: PrintPlace::ScaleEnd(end),
        weight: 1.0,
    }));
    joint.knowledge.push(Knowledge::Distance { mean_m: distance_m.value, u_m: distance_m.u.max(1e-9 * distance_m.value) });
}

/// Without a print somebody must say how square-on the camera stood; 5° by eye where nobody does.
fn add_square_on(joint: &mut Joint, bench: &Bench, screen_known: bool) {
    let stated = bench.camera.square_on_rad.map(|pair| pair.map(|q| (q.value, q.u.max(1e-9))));
    let lean = match stated {
        Some(lean) => lean,
        None if screen_known => return,
        None => [(0.0, setup::SQUARE_ON_BY_EYE_RAD); 2],
    };
    for view in 0..joint.shape.references.len() {
        joint.knowledge.extend((0..2).map(|axis| Knowledge::SquareOn { view, axis, mean_rad: lean[axis].0, u_rad: lean[axis].1 }));
    }
}
