//! What must not matter does not: how the camera was held, the unit of length, which axis is called which.

use super::scenes::{Photos, drawn, measured, small};
use image::{DynamicImage, ImageFormat};
use spotrule::{
    bench::{Bench, TargetKind},
    measure::Measurement,
    quantity::Quantity,
    synth::Scene,
};
use std::io::Cursor;

/// A photo after a change of its pixels, stored without loss.
fn changed(bytes: &[u8], change: impl Fn(DynamicImage) -> DynamicImage) -> Vec<u8> {
    let mut out = Cursor::new(Vec::new());
    change(image::load_from_memory(bytes).unwrap()).write_to(&mut out, ImageFormat::Png).unwrap();
    out.into_inner()
}

fn both_changed(photos: &Photos, change: impl Fn(DynamicImage) -> DynamicImage + Copy) -> Photos {
    Photos { pattern: changed(&photos.pattern, change), target: photos.target.as_ref().map(|bytes| changed(bytes, change)) }
}

fn result(scene: &Scene, photos: &Photos, bench: &Bench) -> Measurement {
    measured(scene, photos, bench).unwrap_or_else(|refusal| panic!("{refusal}"))
}

/// Two results agree within a share of their own standard uncertainty: what differs is how noise falls on turned pixels. The uncertainties
/// agree within a factor `1 + share_of_u`.
fn assert_same(a: &Measurement, b: &Measurement, share_of_u: f64) {
    let angles = |m: &Measurement| m.sample.lattice_angle_rad.into_iter().collect::<Vec<_>>();
    let (mut left, mut right) = (a.sample.pitch_m.clone(), b.sample.pitch_m.clone());
    left.extend(angles(a));
    right.extend(angles(b));
    assert_eq!(left.len(), right.len());
    for (p, q) in left.iter().zip(&right) {
        assert!((p.value - q.value).abs() < share_of_u * p.u.max(q.u), "{p:?} {q:?}");
        assert!((p.u / q.u).ln().abs() < (1.0 + share_of_u).ln(), "{p:?} {q:?}");
    }
}

#[test]
fn a_camera_held_upright_measures_the_same() {
    let scene = small("embossed-film", 0.5);
    let photos = drawn(&scene);
    let plain = both_changed(&photos, |photo| photo);
    let first = result(&scene, &plain, &scene.bench());
    for turn in [DynamicImage::rotate90 as fn(&DynamicImage) -> DynamicImage, DynamicImage::rotate180, DynamicImage::rotate270] {
        let turned = result(&scene, &both_changed(&photos, |photo| turn(&photo)), &scene.bench());
        assert_same(&first, &turned, 0.25);
        // The print carries the axes: orientation does not turn with the camera.
        let (a, b) = (first.sample.orientation_rad, turned.sample.orientation_rad);
        let difference = (a.value - b.value).rem_euclid(std::f64::consts::PI);
        assert!(difference.min(std::f64::consts::PI - difference) < a.u, "{a:?} {b:?}");
    }
}

/// A mirrored photo is a mirrored sample: pitches and angle stay. A print cannot be mirrored, so the bare bench is used; there the lens is
/// fitted from the spots alone, and one spot more or less on the border of what belongs to the model moves the pitch by a good part of u.
#[test]
fn a_mirrored_photo_keeps_pitch_and_angle() {
    for seed in 1..5 {
        let scene = small("no-target", 0.6).redrawn(seed);
        let photos = drawn(&scene);
        let first = result(&scene, &both_changed(&photos, |photo| photo), &scene.bench());
        let mirrored = result(&scene, &both_changed(&photos, |photo| photo.fliph()), &scene.bench());
        // The principal point and the leans are stated around zero, so mirroring leaves what is known unchanged.
        assert_same(&first, &mirrored, 0.5);
    }
}

/// All lengths of the bench three times as large, the pattern's angles unchanged: the same pitch.
#[test]
fn the_unit_of_length_does_not_matter() {
    let scene = small("ruled-grating", 0.5);
    let photos = drawn(&scene);
    let (bench, mut large) = (scene.bench(), scene.bench());
    let times = |q: Quantity, factor: f64| Quantity { value: q.value * factor, u: q.u * factor, ..q };
    large.screen.throw_m = large.screen.throw_m.map(|throw| times(throw, 3.0));
    if let Some(TargetKind::Dots { pitch_m, .. }) = large.target.as_mut().map(|target| &mut target.kind) {
        *pitch_m = times(*pitch_m, 3.0);
    }
    let (first, second) = (result(&scene, &photos, &bench), result(&scene, &photos, &large));
    assert_same(&first, &second, 1e-3);
}

/// The pitch goes with the wavelength: 1 % more of it is 1 % more pitch.
#[test]
fn the_pitch_scales_with_the_wavelength() {
    let scene = small("ruled-grating", 0.5);
    let photos = drawn(&scene);
    let mut longer = scene.bench();
    let wavelength = &mut longer.lasers[0].wavelength_m;
    (wavelength.value, wavelength.u) = (wavelength.value * 1.01, wavelength.u * 1.01);
    let (first, second) = (result(&scene, &photos, &scene.bench()), result(&scene, &photos, &longer));
    let ratio = second.sample.pitch_m[0].value / first.sample.pitch_m[0].value;
    assert!((ratio - 1.01).abs() < 1e-6, "{ratio}");
}
