//! Photographs of real benches, where that collection is at hand (`SPOTRULE_SHARED` or `../shared`): each is carried to a result that agrees with
//! what is known of the sample, or to a refusal. docs/validation.md tells what the overlays show.

use spotrule::{
    bench::Bench,
    measure::{Inputs, Measurement, PhotoFile, Refusal, measure},
};
use std::path::PathBuf;

/// The rig of the hole array and the double slits: laser, distance and scale as its users read them, the camera's lean guessed.
const SLIT_BENCH: &str = r#"
[laser]
wavelength = "645(10) nm"
[sample]
mode = "transmission"
incidence = ["0(1) deg", "0(1) deg"]
[screen]
throw = "540(5) mm"
tilt = ["0(2) deg", "0(2) deg"]
[camera]
square_on = ["0(10) deg", "0(15) deg"]
scale = { points = [[100.0, 512.0], [1100.0, 512.0]], distance = "49.6(5) mm" }
"#;

/// For photos of which nothing is known: a plausible bench.
const PLAUSIBLE_BENCH: &str = r#"
[laser]
wavelength = "632.8(1) nm"
[sample]
mode = "transmission"
[screen]
throw = "1300(150) mm"
tilt = ["0(2) deg", "0(2) deg"]
[camera]
square_on = ["0(10) deg", "0(10) deg"]
scale = { points = [[400.0, 400.0], [800.0, 400.0]], distance = "100(5) mm" }
"#;

fn collection() -> Option<PathBuf> {
    let shared = std::env::var_os("SPOTRULE_SHARED").map_or_else(|| PathBuf::from("../shared"), PathBuf::from);
    let photos = shared.join("photos");
    if !photos.is_dir() {
        println!("skipped: no photographs at {}", photos.display());
    }
    photos.is_dir().then_some(photos)
}

fn measured(photo: &std::path::Path, bench: &Bench) -> Result<Measurement, Refusal> {
    let bytes = std::fs::read(photo).unwrap();
    measure(&Inputs { patterns: vec![PhotoFile { name: "photo", bytes: &bytes }], targets: vec![] }, bench)
}

fn used(measurement: &Measurement) -> usize {
    measurement.orders.iter().filter(|order| order.used).count()
}

/// A microscope gave 124.7(8) µm along the first axis (scale of a stage micrometer); 21 spots can be told by eye.
#[test]
fn hole_array_agrees_with_the_microscope() {
    let Some(photos) = collection() else { return };
    let bench = Bench::parse(&std::fs::read_to_string(photos.join("benches/hole-array.toml")).unwrap()).unwrap().0;
    let found = measured(&photos.join("hole-array.tiff"), &bench).unwrap();
    let pitch = found.sample.pitch_m[0];
    assert!((pitch.value - 124.7e-6).abs() < pitch.coverage_factor * pitch.u, "{pitch:?}");
    assert!(used(&found) >= 15, "{} spots used", used(&found));
}

/// By hand: pitch ratio 1.007(5), angle 90.6(3)°; spots on the stand and the wall lie on another plane.
#[test]
fn cross_grating_is_numbered_on_the_sheet_alone() {
    let Some(photos) = collection() else { return };
    let bench = Bench::parse(&std::fs::read_to_string(photos.join("benches/cross-grating-on-sheet.toml")).unwrap()).unwrap().0;
    let found = measured(&photos.join("cross-grating-on-sheet.jpg"), &bench).unwrap();
    assert!(used(&found) >= 100, "{} spots used", used(&found));
    let [p, q] = [found.sample.pitch_m[0].value, found.sample.pitch_m[1].value];
    assert!((q / p - 1.007).abs() < 0.015, "ratio {}", q / p);
    let angle = found.sample.lattice_angle_rad.unwrap();
    assert!((angle.value.to_degrees() - 90.56).abs() < 2.0 * angle.u.to_degrees().hypot(0.28), "{angle:?}");
    // Corners of the sheet: (380, 293), (1487, 336), (1421, 1054), (409, 1044).
    let off_the_sheet = |order: &&spotrule::measure::OrderRow| {
        let place = order.at;
        !(370.0..=1495.0).contains(&place.x_px) || place.y_px < 290.0 || place.y_px > 1066.0
    };
    assert_eq!(found.orders.iter().filter(off_the_sheet).count(), 0);
}

/// Slit separations under the microscope, same rig: 129.2 and 252.1 µm.
#[test]
fn double_slits_agree_with_the_microscope() {
    let Some(photos) = collection() else { return };
    let bench = Bench::parse(SLIT_BENCH).unwrap().0;
    for (photo, separation_m) in [("double-slit-129um.tiff", 129.2e-6), ("double-slit-252um.tiff", 252.1e-6)] {
        let found = measured(&photos.join(photo), &bench).unwrap();
        let pitch = found.sample.pitch_m[0];
        assert!(found.sample.pitch_m.len() == 1 && used(&found) >= 8, "{photo}: {} spots", used(&found));
        assert!((pitch.value - separation_m).abs() < pitch.coverage_factor * pitch.u, "{photo}: {pitch:?}");
    }
}

#[test]
fn what_shows_no_single_lattice_is_refused() {
    let Some(photos) = collection() else { return };
    let slits = Bench::parse(SLIT_BENCH).unwrap().0;
    let plausible = Bench::parse(PLAUSIBLE_BENCH).unwrap().0;
    let cases = [
        ("cross-opening-no-lattice.tiff", &slits),
        ("drawn-shapes-no-lattice.png", &plausible),
        ("star-field-no-lattice.tiff", &plausible),
        ("curved-row-figure.jpg", &plausible),
        ("three-double-slits.jpg", &plausible),
        ("dot-sheet-01.jpg", &plausible),
        ("dot-sheet-02.jpg", &plausible),
        ("dot-sheet-03.jpg", &plausible),
        ("dot-sheet-fisheye.jpg", &plausible),
        ("millimetre-paper-same-rig.png", &plausible),
    ];
    for (photo, bench) in cases {
        match measured(&photos.join(photo), bench) {
            Ok(found) => panic!("{photo}: measured {:?} from {} spots", found.sample.pitch_m, used(&found)),
            Err(refusal) => println!("{photo}: {refusal}"),
        }
    }
}
