//! Sheets and ruled paper in photographs of real benches, where that collection is at hand (`SPOTRULE_SHARED` or `../shared`).

use spotrule::{
    bench::Bench,
    measure::{Inputs, PhotoFile, measure},
    target::{Families, RuledPoint, read_ruling},
};
use std::path::PathBuf;

fn collection() -> Option<PathBuf> {
    let shared = std::env::var_os("SPOTRULE_SHARED").map_or_else(|| PathBuf::from("../shared"), PathBuf::from);
    let photos = shared.join("photos");
    if !photos.is_dir() {
        println!("skipped: no photographs at {}", photos.display());
    }
    photos.is_dir().then_some(photos)
}

const SHEET_BENCH: &str = r#"
[laser]
wavelength = "632.8(1) nm"
[sample]
mode = "transmission"
incidence = ["0(1) deg", "0(1) deg"]
[screen]
throw = "1300(150) mm"
tilt = ["0(2) deg", "0(2) deg"]
[target]
sheet = "a4"
turn = "0(2) deg"
"#;

/// By hand, from the sheet's corners: pitch ratio 1.007(5), angle 90.6(3)°; spots on the stand and the wall lie on another plane.
#[test]
fn cross_grating_by_the_sheet_that_it_falls_on() {
    let Some(photos) = collection() else { return };
    let bench = Bench::parse(SHEET_BENCH).unwrap().0;
    let bytes = std::fs::read(photos.join("cross-grating-on-sheet.jpg")).unwrap();
    let found = measure(&Inputs { patterns: vec![PhotoFile { name: "photo", bytes: &bytes }], targets: vec![] }, &bench).unwrap();
    let used: Vec<_> = found.orders.iter().filter(|order| order.used).collect();
    assert!(used.len() >= 100, "{} spots used", used.len());
    let [p, q] = [found.sample.pitch_m[0].value, found.sample.pitch_m[1].value];
    println!("ratio {:.4}, angle {:?}", q / p, found.sample.lattice_angle_rad);
    assert!((q / p - 1.007).abs() < 0.015, "ratio {}", q / p);
    let angle = found.sample.lattice_angle_rad.unwrap();
    assert!((angle.value.to_degrees() - 90.56).abs() < 2.0 * angle.u.to_degrees().hypot(0.28), "{angle:?}");
    // Corners of the sheet: (380, 293), (1487, 336), (1421, 1054), (409, 1044).
    let on_sheet = |x: f64, y: f64| (370.0..=1495.0).contains(&x) && (285.0..=1066.0).contains(&y);
    assert!(used.iter().all(|order| on_sheet(order.at.x_px, order.at.y_px)));
    assert!(found.sample.budget.iter().any(|line| line.source == "sheet shape"));
}

/// By hand: 20.3 px/mm along x; 20.7 to 21.5 px/mm along y where the screen leans to the camera.
#[test]
fn millimetre_paper_has_its_scale() {
    let Some(photos) = collection() else { return };
    let photo = spotrule::photo::decode(&std::fs::read(photos.join("millimetre-paper-same-rig.png")).unwrap()).unwrap();
    let ruling = read_ruling(&photo.grey()).unwrap();
    assert_eq!(ruling.families, Families::Both);
    assert!(ruling.points.len() >= 50, "{} points", ruling.points.len());
    let crossings: Vec<([f64; 2], [f64; 2])> = ruling
        .points
        .iter()
        .filter_map(|point| match *point {
            RuledPoint::Crossing { at, index, .. } => Some((index.map(f64::from), [at.x_px, at.y_px])),
            RuledPoint::OnLine { .. } => None,
        })
        .collect();
    let map = spotrule::target::homography(&crossings).unwrap();
    let project = |p: [f64; 2]| {
        let [x, y, w] = map.map(|row| row[0] * p[0] + row[1] * p[1] + row[2]);
        [x / w, y / w]
    };
    let off = |(place, at): &([f64; 2], [f64; 2])| (project(*place)[0] - at[0]).hypot(project(*place)[1] - at[1]);
    let rms = (crossings.iter().map(|c| off(c).powi(2)).sum::<f64>() / crossings.len() as f64).sqrt();
    let step = |to: [f64; 2]| (project(to)[0] - project([0.0; 2])[0]).hypot(project(to)[1] - project([0.0; 2])[1]);
    println!(
        "{:.2} px/mm along x, {:.2} along y; {} crossings, {rms:.2} px off a plane",
        step([1.0, 0.0]),
        step([0.0, 1.0]),
        crossings.len()
    );
    assert!((step([1.0, 0.0]) - 20.3).abs() < 0.3, "{}", step([1.0, 0.0]));
    assert!((20.4..21.7).contains(&step([0.0, 1.0])), "{}", step([0.0, 1.0]));
    assert!(rms < 1.0, "{rms} px");
}
