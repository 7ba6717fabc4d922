//! A bench or a camera calibrated, saved, read back and used: against the joint measurement, against planted truth, against OpenCV; and
//! whatever is not what was written is refused.

use super::{
    live::{close, kept_and_live, list, number, row, rows},
    scenes::{drawn, small, truth},
};
use nalgebra::{DMatrix, dmatrix};
use proptest::prelude::*;
use spotrule::{
    bench::{Bench, sections},
    calibration::{
        self, Calibration, CalibrationError, Certificate, Kind, MadeFrom, MadePhoto, Posterior, Shows, TakenWith, UncertainValue,
    },
    digest::sha256_hex,
    frames::PixelPoint,
    measure::{Inputs, PhotoFile, PointPair, calibrate, calibrate_camera, lens_from_points, measure},
    quantity::Quantity,
    synth::{Lattice, Scene, encode, render_pattern, render_target},
};
use std::path::{Path, PathBuf};

/// A calibration with every key that a file can have.
fn example() -> Calibration {
    let value = |name: &str, unit: &str, value: f64, u: f64| UncertainValue { name: name.to_owned(), unit: unit.to_owned(), value, u };
    let photo = |file: &str, shows| MadePhoto { file: file.to_owned(), sha256: sha256_hex(file.as_bytes()), shows };
    Calibration {
        kind: Kind::Bench,
        made_from: MadeFrom {
            program: "1.2.3".to_owned(),
            date: "2026-01-02T03:04:05Z".to_owned(),
            bench_sha256: sha256_hex(b"bench"),
            photos: vec![photo("reference.jpg", Shows::Pattern), photo("odd \"name\" \\.jpg", Shows::Target)],
            certificates: vec![Certificate { of: "reference".to_owned(), pitch: "2.0000(5) µm".to_owned() }],
            sections: sections("[laser]\nwavelength = \"632.8(1) nm\"").unwrap(),
            rms_px: 0.0625,
        },
        taken_with: TakenWith {
            size_px: [2000, 1500],
            camera: Some("Invented One".to_owned()),
            focal_length_m: Some(0.035),
            focal_length_35mm_m: Some(0.052),
        },
        camera_reference: Some([[1.0, 0.0, 0.0], [0.0, -1.0, 0.0], [0.0, 0.0, -1.0]]),
        posterior: Posterior {
            values: vec![
                value("throw", "mm", 0.812_034_567_891_234_5, 3.1e-4),
                value("screen tilt x", "deg", -0.012_3, 0.004_5),
                value("wavelength", "nm", 632.817e-9, 0.008e-9),
                value("camera turn z (view 1)", "deg", 0.0, 0.0),
            ],
            correlation: dmatrix![1.0, 1.0 / 3.0, -0.999_999_9; 1.0 / 3.0, 1.0, -0.333_3; -0.999_999_9, -0.333_3, 1.0],
        },
    }
}

#[test]
fn a_calibration_reads_back_as_it_was_written() {
    let written = example();
    let read = calibration::read(&calibration::text(&written)).unwrap().unwrap();
    assert_eq!((&read.made_from, read.kind, read.camera_reference), (&written.made_from, written.kind, written.camera_reference));
    assert_eq!(read.posterior.correlation, written.posterior.correlation, "every digit of a correlation counts");
    for (read, written) in read.posterior.values.iter().zip(&written.posterior.values) {
        assert_eq!((&read.name, &read.unit), (&written.name, &written.unit));
        // two correctly rounded changes of unit
        close(&written.name, read.value, written.value, 4e-16 * written.value.abs());
        close(&written.name, read.u, written.u, 4e-16 * written.u);
    }
    assert_eq!(read.taken_with, written.taken_with);
}

/// The text is what the checksum guards: it must not change within one format.
#[test]
fn the_text_of_a_calibration_is_held_word_for_word() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/golden/calibration.toml");
    if std::env::var_os("UPDATE").is_some() {
        std::fs::write(&path, calibration::text(&example())).unwrap();
    }
    let kept = std::fs::read_to_string(&path).unwrap();
    assert_eq!(kept, calibration::text(&example()), "UPDATE=1 rewrites the file; then raise the version of the format");
    assert!(calibration::read(&kept).unwrap().is_some());
}

#[test]
fn spaces_and_comments_may_change_values_may_not() {
    let text = calibration::text(&example());
    let tidied = format!("# mine\n{}", text.replace(" = ", "=").replace(",\n", ", # c\r\n"));
    assert!(calibration::read(&tidied).is_ok(), "{:?}", calibration::read(&tidied));
    for (from, to) in [
        ("value = 812.", "value = 813."),
        ("u = 0.31", "u = 0.11"),
        ("0.3333333333333333", "0.3333333333333334"),
        ("size_px = [2000, 1500]", "size_px = [2000, 1501]"),
        ("2.0000(5)", "2.0000(1)"),
        ("reference.jpg", "other.jpg"),
        ("camera = \"Invented One\"\n", ""),
    ] {
        assert!(text.contains(from), "{from}");
        let refused = calibration::read(&text.replacen(from, to, 1)).unwrap_err();
        assert!(matches!(refused, CalibrationError::Edited { .. }), "{to}: {refused}");
        assert!(refused.to_string().contains("spotrule calibrate"));
    }
}

/// A right checksum does not make a wrong content right.
#[test]
fn impossible_contents_are_refused_even_with_their_checksum() {
    let refused = |change: &dyn Fn(&mut Calibration)| {
        let mut calibration = example();
        change(&mut calibration);
        calibration::read(&calibration::text(&calibration)).unwrap_err().to_string()
    };
    let same_name = |c: &mut Calibration| c.posterior.values[1].name = "throw".to_owned();
    assert!(refused(&same_name).contains("twice"));
    assert!(refused(&|c| c.posterior.correlation[(1, 0)] = 1.5).contains("correlation"));
    assert!(refused(&|c| c.posterior.correlation[(1, 0)] = -0.9).contains("positive definite"));
    assert!(refused(&|c| c.posterior.correlation = DMatrix::identity(2, 2)).contains("lower triangle"));
    assert!(refused(&|c| c.posterior.values[0].unit = "parsec".to_owned()).contains("parsec"));
    assert!(refused(&|c| c.posterior.values[0].value = 1e30).contains("throw"));
    assert!(refused(&|c| c.camera_reference = Some([[2.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]])).contains("rotation"));
    assert!(refused(&|c| c.camera_reference = None).contains("camera_reference"));
    assert!(refused(&|c| c.posterior.values.clear()).contains("0 parameters"));
    let other = calibration::text(&example()).replace("spotrule.calibration/1", "spotrule.calibration/9");
    assert!(calibration::read(&other).unwrap_err().to_string().contains("calibration/9"));
}

proptest! {
    /// Files damaged by hand never panic, and never pass for another calibration.
    #[test]
    fn damaged_files_are_refused(at in 0..2600_usize, cut in 0..40_usize, put in "[-\\[\\]{}\"=.,0-9a-z±° \n#']{0,12}") {
        let text = calibration::text(&example());
        let letters: Vec<char> = text.chars().collect();
        let (at, end) = (at.min(letters.len()), (at + cut).min(letters.len()));
        let damaged: String = letters[..at].iter().copied().chain(put.chars()).chain(letters[end..].iter().copied()).collect();
        match calibration::read(&damaged) {
            Ok(Some(read)) => prop_assert_eq!(Some(read), calibration::read(&text).unwrap()),
            Ok(None) => {}
            Err(error) => prop_assert!(!error.to_string().is_empty()),
        }
    }

    #[test]
    fn no_bytes_panic(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
        let text = String::from_utf8_lossy(&bytes);
        let _ = calibration::read(&text);
        let _ = calibration::read(&format!("[calibration]\n{text}"));
        let _ = Bench::parse(&format!("[laser]\nwavelength = \"650(5) nm\"\n[calibration]\n{text}"));
    }
}

/// A reference grating and a film in turn on one bench, in front of an untouched camera.
struct OneBench {
    reference: Vec<u8>,
    sample: Vec<u8>,
    target: Vec<u8>,
    scene: Scene,
    bench: String,
}

fn one_bench(seed: u64) -> OneBench {
    let scene = small("embossed-film", 0.5).redrawn(seed);
    let mut reference = scene.clone();
    reference.sample.lattice = Lattice::Line { pitch_m: 5.000_4e-6, turn_rad: 0.05 };
    let photos = drawn(&scene);
    let bench = scene.bench_text().replace("[sample]", "[sample.film]")
        + "\n[sample.reference]\npattern = \"line\"\npitch = \"5.0000(5) um\"\nincidence = [\"0.0(5) deg\", \"0.0(5) deg\"]\n";
    OneBench {
        reference: encode(&reference, &render_pattern(&reference).unwrap()).unwrap(),
        sample: photos.pattern,
        target: photos.target.unwrap(),
        scene,
        bench,
    }
}

impl OneBench {
    fn photos(&self, names: &[&str]) -> String {
        let sample = |name: &str| if name == "reference.jpg" { "reference" } else { "film" };
        names.iter().map(|name| format!("\n[[photo]]\nfile = \"{name}\"\nsample = \"{}\"\n", sample(name))).collect()
    }

    fn inputs(&self, names: &[&'static str], with_target: bool) -> Inputs<'_> {
        let bytes = |name: &str| if name == "reference.jpg" { &self.reference } else { &self.sample };
        Inputs {
            patterns: names.iter().map(|name| PhotoFile { name, bytes: bytes(name) }).collect(),
            targets: if with_target { vec![PhotoFile { name: "target.jpg", bytes: &self.target }] } else { vec![] },
        }
    }

    /// The bench file with the calibration from the reference alone.
    fn calibrated(&self) -> String {
        let text = self.bench.clone() + &self.photos(&["reference.jpg"]);
        let (bench, _) = Bench::to_calibrate(&text).unwrap();
        let (_, mut calibration) = calibrate(&self.inputs(&["reference.jpg"], true), &bench).unwrap();
        calibration.made_from.sections = sections(&text).unwrap();
        format!("{text}\n{}", calibration::text(&calibration))
    }
}

/// The reference measured first and kept as a calibration gives the pitch that reference and sample in one problem give: values apart by a
/// share of u, u alike within 25 %. They differ because in one problem the few spots of the reference share the Birge factor of the many
/// of the sample.
#[test]
fn a_calibration_stands_for_the_photos_it_was_made_from() {
    for seed in 300..303 {
        let bench = one_bench(seed);
        let (together, _) = Bench::parse(&(bench.bench.clone() + &bench.photos(&["reference.jpg", "pattern.jpg"]))).unwrap();
        let joint = measure(&bench.inputs(&["reference.jpg", "pattern.jpg"], true), &together).unwrap();
        let (calibrated, notes) = Bench::parse(&bench.calibrated()).unwrap();
        assert!(notes.is_empty() && calibrated.photos.is_empty(), "the reference is not measured again");
        let found = measure(&bench.inputs(&["pattern.jpg"], false), &calibrated).unwrap();
        let (pitches, _) = truth(&bench.scene);
        for ((found, joint), true_m) in found.sample.pitch_m.iter().zip(&joint.sample.pitch_m).zip(&pitches) {
            let (apart, ratio) = ((found.value - joint.value) / joint.u, found.u / joint.u);
            println!("seed {seed}: apart by {apart:.3} u, u ratio {ratio:.3}, z {:.2}", (found.value - true_m) / found.u);
            assert!(apart.abs() < 0.5 && (0.8..1.25).contains(&ratio), "seed {seed}: apart by {apart} u, ratio {ratio}");
            assert!((found.value - true_m).abs() < 4.5 * found.u);
        }
        let codes: Vec<&str> = found.notes.iter().map(|note| note.code()).filter(|code| code.starts_with("calibration")).collect();
        assert!(codes.is_empty(), "an untouched bench: {codes:?}");
        let line = found.sample.budget.iter().find(|line| line.source == "calibration").unwrap();
        assert!(line.share[0] > 0.05, "{line:?}");
        let old = ["throw", "wavelength", "target dots", "target pitch", "lens", "focal length", "screen tilt", "reference pitch"];
        assert!(found.sample.budget.iter().all(|line| !old.contains(&line.source.as_str())), "counted twice: {:?}", found.sample.budget);
        assert!((found.sample.budget.iter().map(|line| line.share[0]).sum::<f64>() - 1.0).abs() < 1e-9);
    }
}

/// The same on rendered photos of another maker, where they are at hand.
#[test]
fn corpus_references_calibrate_their_benches() {
    let shared = std::env::var("SPOTRULE_SHARED").unwrap_or_else(|_| "../shared".to_owned());
    let cases = PathBuf::from(shared).join("corpus/cases");
    let Ok(folder) = std::fs::read_dir(&cases) else {
        println!("skipped: no corpus at {}", cases.display());
        return;
    };
    let mut folders: Vec<PathBuf> = folder.map(|entry| entry.unwrap().path()).collect();
    folders.retain(|path| path.file_name().is_some_and(|name| name.to_string_lossy().starts_with("R-")));
    folders.sort();
    for case in folders {
        let given: serde_json::Value = serde_json::from_slice(&std::fs::read(case.join("given.json")).unwrap()).unwrap();
        let common = corpus_bench(&given);
        let [reference, sample, target] =
            ["reference.jpg", "pattern.jpg", "target.jpg"].map(|name| std::fs::read(case.join(name)).unwrap());
        let file = |name, bytes| PhotoFile { name, bytes };
        let targets = || vec![file("target.jpg", &target)];
        let with_reference = format!("{common}\n[[photo]]\nfile = \"reference.jpg\"\nsample = \"reference\"\n");
        let (bench, _) = Bench::to_calibrate(&with_reference).unwrap();
        let inputs = Inputs { patterns: vec![file("reference.jpg", &reference)], targets: targets() };
        let (_, mut calibration) = calibrate(&inputs, &bench).unwrap();
        calibration.made_from.sections = sections(&with_reference).unwrap();
        let (bench, _) = Bench::parse(&format!("{with_reference}\n{}", calibration::text(&calibration))).unwrap();
        let found = measure(&Inputs { patterns: vec![file("pattern.jpg", &sample)], targets: vec![] }, &bench).unwrap();
        let (bench, _) = Bench::parse(&format!("{with_reference}\n[[photo]]\nfile = \"pattern.jpg\"\nsample = \"unknown\"\n")).unwrap();
        let patterns = vec![file("reference.jpg", &reference), file("pattern.jpg", &sample)];
        let joint = measure(&Inputs { patterns, targets: targets() }, &bench).unwrap();
        for (found, joint) in found.sample.pitch_m.iter().zip(&joint.sample.pitch_m) {
            let (apart, ratio) = ((found.value - joint.value) / joint.u, found.u / joint.u);
            println!("{}: apart by {apart:.3} u, u ratio {ratio:.3}", case.display());
            assert!(apart.abs() < 0.3 && (0.8..1.25).contains(&ratio), "{}: apart by {apart} u, ratio {ratio}", case.display());
        }
    }
}

/// What an operator would write down for a case of class R.
fn corpus_bench(given: &serde_json::Value) -> String {
    let quantity = |known: &serde_json::Value, unit: &str| format!("\"{} ± {} {unit} (k=1)\"", number(known, "value"), number(known, "u"));
    let pair = |known: &serde_json::Value| format!("[{}, {}]", quantity(&known["x"], "deg"), quantity(&known["y"], "deg"));
    let (reference, target) = (&given["reference"], &given["target"]);
    format!(
        "[laser]\nwavelength = {}\n[sample.unknown]\nmode = {mode}\nincidence = {}\n[sample.reference]\nmode = {mode}\npattern = {}\npitch = {}\n\
         incidence = {}\n[screen]\nthrow = {}\ntilt = {}\nseen_from = {}\n[target]\nphoto = \"target.jpg\"\npitch = {}\nturn = {}\n",
        quantity(&given["wavelength_nm"], "nm"),
        pair(&given["incidence_deg"]),
        reference["pattern"],
        quantity(&reference["pitch_um"], "um"),
        pair(&reference["incidence_deg"]),
        quantity(&given["throw_mm"], "mm"),
        pair(&given["screen_tilt_deg"]),
        given["view"],
        quantity(&target["pitch_mm"], "mm"),
        quantity(&target["rotation_deg"], "deg"),
        mode = given["mode"],
    )
}

#[test]
fn a_calibrated_bench_refuses_what_does_not_belong_to_it() {
    let bench = one_bench(310);
    let text = bench.calibrated();
    let refusal = |text: &str| Bench::parse(text).unwrap_err().to_string();
    let throw = text.lines().find(|line| line.starts_with("throw")).unwrap();
    assert!(refusal(&text.replace(throw, "throw = \"5.000(1) m\"")).contains("[screen] is not what it was"));
    assert!(refusal(&text.replace("medium = \"air\"", "medium = \"vacuum\"")).contains("[laser] is not what it was"));
    assert!(refusal(&text.replace("kind = \"bench\"", "kind = \"camera\"")).contains("checksum"));
    assert!(Bench::to_calibrate(&text).unwrap_err().to_string().contains("already"));
    // A further sample may be described.
    let further = text.replace("[sample.film]", "[sample.film]\n# a comment");
    let (calibrated, _) = Bench::parse(&further).unwrap();
    let measured = |name: &'static str, bytes: &[u8]| {
        measure(&Inputs { patterns: vec![PhotoFile { name, bytes }], targets: vec![] }, &calibrated).unwrap_err().to_string()
    };
    assert!(measured("copy.jpg", &bench.reference).contains("count twice"));
    let mut smaller = small("embossed-film", 0.4);
    smaller.file.exif.clone_from(&bench.scene.file.exif);
    assert!(measured("smaller.jpg", &drawn(&smaller).pattern).contains("smaller.jpg: the photo has"));
    let mut zoomed = bench.scene.clone();
    if let Some(exif) = &mut zoomed.file.exif {
        exif.focal_length_m *= 2.0;
        assert!(measured("zoomed.jpg", &drawn(&zoomed).pattern).contains("focal length"));
    }
}

/// A bench that was touched is noticed where the photo can tell: here the camera was shifted.
#[test]
fn a_moved_camera_is_noticed() {
    let bench = one_bench(320);
    let (calibrated, _) = Bench::parse(&bench.calibrated()).unwrap();
    let mut moved = bench.scene.clone();
    moved.camera.aim_m[0] += 2e-3;
    let photo = drawn(&moved).pattern;
    let found = measure(&Inputs { patterns: vec![PhotoFile { name: "moved.jpg", bytes: &photo }], targets: vec![] }, &calibrated).unwrap();
    assert!(found.notes.iter().any(|note| note.code() == "calibration-shifted"), "{:?}", found.notes);
}

/// Views of the target of a scene from several sides: lean to the right and up, roll, rad.
fn views(scene: &Scene, sides: &[[f64; 3]]) -> Vec<Vec<u8>> {
    let view = |(number, [right, up, roll]): (usize, &[f64; 3])| {
        let mut scene = scene.clone();
        scene.seed += number as u64;
        scene.camera.lean_rad = [*right, *up];
        scene.camera.roll_rad = *roll;
        encode(&scene, &render_target(&scene).unwrap()).unwrap()
    };
    sides.iter().enumerate().map(view).collect()
}

const SIDES: [[f64; 3]; 7] =
    [[0.45, 0.0, 0.0], [-0.5, 0.1, 0.1], [0.0, 0.45, -0.1], [0.1, -0.5, 0.0], [0.35, 0.35, 1.5], [-0.35, 0.3, -0.2], [0.0, 0.05, 0.05]];

fn target_pitch() -> Quantity {
    Quantity::normal(0.01, 1e-5)
}

fn lens_scene(seed: u64) -> Scene {
    let mut scene = small("embossed-film", 0.5);
    scene.seed = seed;
    scene.camera.lens.principal_px[0] += 12.0;
    scene.camera.lens.principal_px[1] -= 7.0;
    scene.camera.lens.radial = [-0.11, 0.06];
    scene.camera.lens.tangential = [6e-4, -8e-4];
    scene
}

/// Planted lenses come back: every |z| below 4.5, and their root mean square that of honest uncertainties (21 values that move together).
#[test]
fn planted_lenses_come_back_within_their_uncertainty() {
    let mut pulls = Vec::new();
    for seed in 500..503 {
        let scene = lens_scene(seed * 100);
        let photos = views(&scene, &SIDES);
        let names: Vec<String> = (0..photos.len()).map(|i| format!("view{i}.jpg")).collect();
        let files: Vec<PhotoFile<'_>> = names.iter().zip(&photos).map(|(name, bytes)| PhotoFile { name, bytes }).collect();
        let found = calibrate_camera(&files, Quantity { value: scene.print.pitch_m, ..target_pitch() }).unwrap();
        let lens = &scene.camera.lens;
        let planted = [
            lens.focal_px,
            lens.principal_px[0],
            lens.principal_px[1],
            lens.radial[0],
            lens.radial[1],
            lens.tangential[0],
            lens.tangential[1],
        ];
        for (known, planted) in found.calibration.posterior.values.iter().zip(planted) {
            let pull = (known.value - planted) / known.u;
            println!("seed {seed}: {} {:.6} ({:.6}), planted {planted}, z {pull:.2}", known.name, known.value, known.u);
            assert!(pull.abs() < 4.5, "seed {seed}: {known:?}, planted {planted}");
            pulls.push(pull);
        }
        assert!(found.calibration.made_from.rms_px < 0.1, "{}", found.calibration.made_from.rms_px);
    }
    let rms = (pulls.iter().map(|pull| pull * pull).sum::<f64>() / pulls.len() as f64).sqrt();
    println!("{} values, rms z {rms:.2}", pulls.len());
    assert!((0.5..1.6).contains(&rms), "rms z {rms:.2}");
}

#[test]
fn views_that_fix_no_lens_are_refused() {
    let scene = lens_scene(600);
    let refusal = |sides: &[[f64; 3]]| {
        let photos = views(&scene, sides);
        let files: Vec<PhotoFile<'_>> = photos.iter().map(|bytes| PhotoFile { name: "v.jpg", bytes }).collect();
        calibrate_camera(&files, target_pitch()).unwrap_err().to_string()
    };
    assert!(refusal(&SIDES[..2]).contains("2 views"), "{}", refusal(&SIDES[..2]));
    let parallel = refusal(&[[0.02, 0.0, 0.0], [0.0, 0.01, 0.4], [0.0, 0.02, 0.0], [0.01, 0.0, -0.3]]);
    assert!(parallel.contains("same direction"), "{parallel}");
    let oblique = refusal(&[[0.3, 0.0, 0.0], [0.305, 0.0, 0.0], [0.3, 0.005, 0.0]]);
    assert!(oblique.contains("same direction") || oblique.contains("focal length only"), "{oblique}");
    let once = views(&scene, &SIDES[..3]);
    let files = [&once[0], &once[1], &once[0]].map(|bytes| PhotoFile { name: "v.jpg", bytes });
    assert!(calibrate_camera(&files, target_pitch()).unwrap_err().to_string().contains("given twice"));
    let small_view = views(&small("embossed-film", 0.4), &SIDES[3..4]);
    let files = [&once[0], &once[1], &once[2], &small_view[0]].map(|bytes| PhotoFile { name: "v.jpg", bytes });
    assert!(calibrate_camera(&files, target_pitch()).unwrap_err().to_string().contains("another camera setting"));
}

/// A calibrated lens takes the place of the ordinary one; a bench that names it without the file is refused.
#[test]
fn a_calibrated_lens_serves_a_bench() {
    let mut scene = lens_scene(700).redrawn(700);
    scene.camera.lens = lens_scene(700).camera.lens;
    let photos = views(&scene, &SIDES);
    let files: Vec<PhotoFile<'_>> = photos.iter().map(|bytes| PhotoFile { name: "v.jpg", bytes }).collect();
    let camera = calibrate_camera(&files, Quantity { value: scene.print.pitch_m, ..target_pitch() }).unwrap();
    let text = calibration::text(&camera.calibration);
    let bench_text = format!("{}\n[camera]\ncalibration = \"camera.toml\"\n", scene.bench_text().replace("[camera]\n", ""));
    let (bench, _) = Bench::parse(&bench_text).unwrap_or_else(|error| panic!("{error}\n{bench_text}"));
    let drawn = drawn(&scene);
    let inputs = Inputs {
        patterns: vec![PhotoFile { name: "pattern.jpg", bytes: &drawn.pattern }],
        targets: drawn.target.iter().map(|bytes| PhotoFile { name: "target.jpg", bytes }).collect(),
    };
    assert!(measure(&inputs, &bench).unwrap_err().to_string().contains("no [calibration]"));
    let found = measure(&inputs, &bench.with_lens(&text).unwrap()).unwrap();
    let (pitches, _) = truth(&scene);
    for (pitch, true_m) in found.sample.pitch_m.iter().zip(pitches) {
        assert!((pitch.value - true_m).abs() < 4.5 * pitch.u, "{pitch:?} {true_m}");
    }
    let lens = found.parameters.iter().find(|parameter| parameter.name == "focal length").unwrap();
    let known = &camera.calibration.posterior.values[0];
    let (prior, u) = lens.prior.unwrap();
    close("focal length", prior, known.value, 1e-9 * known.value);
    close("its u", u, known.u, 1e-9 * known.u);
    assert!(lens.u <= u * (1.0 + 1e-9));
    assert!(!found.sample.budget.iter().any(|line| line.source == "lens" && line.share[0] > 1e-6), "{:?}", found.sample.budget);
}

/// OpenCV's `calibrateCamera` on the same points, u from their scatter on both sides: values agree to a thousandth of u, uncertainties to
/// 0.1 % (measured: 1e-5 and 2e-4; OpenCV forms its covariance from the normal equations).
///
/// Source: `tests/reference/opencv_calibrate.py` (OpenCV 5.0.0), kept output in `tests/data/opencv_calibrate.json`.
#[test]
fn opencv_finds_the_same_lens() {
    kept_and_live("opencv_calibrate", |reference| {
        assert!(list(reference, "cases").len() >= 3);
        for case in list(reference, "cases") {
            let pair = |(plane, pixel): (Vec<f64>, Vec<f64>)| PointPair {
                plane_m: [plane[0], plane[1]],
                at: PixelPoint { x_px: pixel[0], y_px: pixel[1] },
            };
            let views: Vec<Vec<PointPair>> = list(case, "views")
                .iter()
                .map(|view| rows(&view["plane_m"]).into_iter().zip(rows(&view["pixels_px"])).map(pair).collect())
                .collect();
            let size: Vec<f64> = row(&case["size_px"]);
            // A tenth of the scatter: the scatter itself then decides, as in OpenCV.
            let found = lens_from_points(&views, [size[0] as usize, size[1] as usize], 0.1 * number(case, "noise_px")).unwrap();
            for theirs in list(case, "parameters") {
                let name = theirs["name"].as_str().unwrap();
                let ours = found.named(name).unwrap();
                let (value, u) = (number(theirs, "value"), number(theirs, "u"));
                println!("{} {name}: apart by {:.5} u, u ratio {:.5}", case["name"], (ours.value - value) / u, ours.u / u);
                close(name, ours.value, value, 1e-3 * u);
                close(&format!("u of {name}"), ours.u, u, 1e-3 * u);
            }
        }
    });
}

fn spotrule(folder: &Path, arguments: &[&str]) -> (Option<i32>, String, String) {
    let done = std::process::Command::new(env!("CARGO_BIN_EXE_spotrule")).args(arguments).current_dir(folder).output().unwrap();
    let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
    (done.status.code(), text(&done.stdout), text(&done.stderr))
}

/// The commands as the documents write them.
#[test]
fn a_bench_is_calibrated_and_used_on_the_command_line() {
    let bench = one_bench(330);
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    for (name, bytes) in [("reference.jpg", &bench.reference), ("sample.jpg", &bench.sample), ("target.jpg", &bench.target)] {
        std::fs::write(at(name), bytes).unwrap();
    }
    std::fs::write(at("bench.toml"), bench.bench.clone() + &bench.photos(&["reference.jpg"])).unwrap();
    let calibrate = ["calibrate", "--bench", "bench.toml", "--out", "bench-calibrated.toml"];
    let (code, out, errors) = spotrule(folder.path(), &calibrate);
    assert_eq!(code, Some(0), "{errors}");
    assert!(out.contains("throw") && out.contains("not a calibration certificate"), "{out}");
    let (code, _, errors) = spotrule(folder.path(), &calibrate);
    assert!(code == Some(2) && errors.contains("--force"), "{errors}");
    std::fs::remove_file(at("target.jpg")).unwrap();
    let measure = ["measure", "sample.jpg", "--bench", "bench-calibrated.toml", "--json", "-"];
    let (code, out, errors) = spotrule(folder.path(), &measure);
    assert_eq!(code, Some(0), "{errors}");
    let result: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert!(list(&result, "budget").iter().any(|line| line["source"] == "calibration"), "{out}");
    let (code, _, errors) = spotrule(folder.path(), &[&measure[..4], &["--throw", "1.000(1) m"]].concat());
    assert!(code == Some(2) && errors.contains("[screen] is not what it was"), "{errors}");
    let (code, _, errors) = spotrule(folder.path(), &["measure", "reference.jpg", "--bench", "bench-calibrated.toml"]);
    assert!(code == Some(2) && errors.contains("count twice"), "{errors}");
    let text = std::fs::read_to_string(at("bench-calibrated.toml")).unwrap();
    assert!(text.contains(&sha256_hex(&bench.reference)) && text.contains("5.00000(50)") || text.contains("5.0000(5)"), "{text}");
    std::fs::write(at("bench-calibrated.toml"), text.replacen("u = 0.", "u = 0.0", 1)).unwrap();
    let (code, out, errors) = spotrule(folder.path(), &measure);
    assert!(code == Some(2) && errors.contains("was changed after it was written"), "{errors}");
    assert!(out.contains("calibration-edited"), "{out}");
}

#[test]
fn a_camera_is_calibrated_on_the_command_line() {
    let scene = lens_scene(900);
    let folder = tempfile::tempdir().unwrap();
    let names = ["a.jpg", "b.jpg", "c.jpg", "d.jpg"];
    for (name, bytes) in names.iter().zip(views(&scene, &SIDES[..4])) {
        std::fs::write(folder.path().join(name), bytes).unwrap();
    }
    let camera = |photos: &[&str], pitch: &str| {
        let options = ["--target-pitch", pitch, "--out", "camera.toml", "--json", "-"];
        spotrule(folder.path(), &[&["calibrate", "camera"], photos, &options].concat())
    };
    let (code, out, errors) = camera(&names[..2], "20.00(1) mm");
    assert!(code == Some(1) && errors.contains("2 views") && out.contains("calibration-views"), "{errors}");
    let (code, _, errors) = camera(&names, "20.00 mm");
    assert!(code == Some(2) && errors.contains("--target-pitch") && errors.contains("how sure?"), "{errors}");
    assert!(!folder.path().join("camera.toml").exists(), "a refusal leaves no file");
    let (code, out, errors) = camera(&names, "20.00(1) mm");
    assert_eq!(code, Some(0), "{errors}");
    let result: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!((result["schema"].as_str(), list(&result, "views").len()), (Some("spotrule.camera/1"), 4));
    let text = std::fs::read_to_string(folder.path().join("camera.toml")).unwrap();
    assert_eq!(calibration::read(&text).unwrap().unwrap().kind, Kind::Camera);
    assert!(Bench::parse(&text).is_err(), "a camera is no bench");
}
