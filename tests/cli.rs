//! The program as a user and a script meet it: exit codes, what goes where, what is left behind.

use super::scenes::{drawn, small};
use std::{
    fs,
    path::Path,
    process::{Command, Output},
};

fn spotrule(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_spotrule")).args(arguments).current_dir(folder).output().unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

/// A folder with the photos and the bench file of a small scene.
fn bench_folder(name: &str) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    let scene = small(name, 0.5);
    let photos = drawn(&scene);
    fs::write(folder.path().join(scene.pattern_file()), &photos.pattern).unwrap();
    if let Some(target) = &photos.target {
        fs::write(folder.path().join(scene.target_file()), target).unwrap();
    }
    fs::write(folder.path().join("bench.toml"), scene.bench_text()).unwrap();
    folder
}

#[test]
fn a_photo_beside_its_bench_file_is_measured() {
    let folder = bench_folder("embossed-film");
    let done = spotrule(folder.path(), &["measure", "pattern.jpg", "--overlay", "seen.png", "--json", "result.json"]);
    assert_eq!(done.status.code(), Some(0), "{}", text(&done.stderr));
    assert!(text(&done.stdout).contains("pitch 1") && text(&done.stdout).contains("not a calibration certificate"));
    assert!(done.stderr.is_empty(), "{}", text(&done.stderr));
    let result: serde_json::Value = serde_json::from_slice(&fs::read(folder.path().join("result.json")).unwrap()).unwrap();
    assert_eq!((result["status"].as_str(), result["lattice_kind"].as_str()), (Some("measured"), Some("hexagonal")));
    let picture = image::open(folder.path().join("seen.png")).unwrap();
    assert!(picture.width() >= 1000);
}

#[test]
fn json_on_standard_output_stands_alone() {
    let folder = bench_folder("ruled-grating");
    let done = spotrule(folder.path(), &["measure", "--bench", "bench.toml", "pattern.jpg", "--json", "-"]);
    let result: serde_json::Value = serde_json::from_slice(&done.stdout).unwrap();
    assert_eq!(result["schema"].as_str(), Some("spotrule.measurement/1"));
    let shares: f64 = result["budget"].as_array().unwrap().iter().map(|line| line["share"][0].as_f64().unwrap()).sum();
    assert!((shares - 1.0).abs() < 1e-6, "{shares}");
}

/// The pitch of this scene is 12.05 µm with U = 0.02 µm; the verdict decides the exit code, text and JSON agree with it.
#[test]
fn limits_decide_the_exit_code() {
    let folder = bench_folder("embossed-film");
    let cases = [
        ("12.0 ± 0.4 um", "guarded", 0, "inside"),
        ("<= 11.9 um", "guarded", 3, "outside"),
        ("12.053 ± 0.010 um", "guarded", 4, "undecided"),
        ("12.053 ± 0.030 um", "shared", 4, "undecided"),
        ("pitch 1: 12.0 ± 0.4 um; pitch 2: >= 3 um; angle: 120 ± 5 deg", "simple", 0, "inside"),
    ];
    for (limits, rule, code, outcome) in cases {
        let done = spotrule(folder.path(), &["measure", "pattern.jpg", "--limits", limits, "--rule", rule, "--json", "result.json"]);
        assert_eq!(done.status.code(), Some(code), "{limits}: {}{}", text(&done.stdout), text(&done.stderr));
        assert!(text(&done.stdout).contains(&format!("{} ({rule} rule)", outcome.to_uppercase())), "{}", text(&done.stdout));
        let result: serde_json::Value = serde_json::from_slice(&fs::read(folder.path().join("result.json")).unwrap()).unwrap();
        assert_eq!((result["limits"]["outcome"].as_str(), result["limits"]["rule"].as_str()), (Some(outcome), Some(rule)));
        assert_eq!(result["limits"]["text"].as_str(), Some(limits));
    }
}

#[test]
fn a_refusal_has_code_1_a_reason_and_json() {
    let folder = bench_folder("embossed-film");
    let dark = image::RgbImage::from_pixel(800, 600, image::Rgb([3, 3, 3]));
    dark.save(folder.path().join("dark.png")).unwrap();
    let done = spotrule(folder.path(), &["measure", "dark.png", "--bench", "bench.toml", "--json", "-"]);
    assert_eq!(done.status.code(), Some(1), "{}", text(&done.stderr));
    let result: serde_json::Value = serde_json::from_slice(&done.stdout).unwrap();
    assert_eq!(result["status"].as_str(), Some("refused"));
    assert!(result["reason"]["text"].as_str().unwrap().len() > 20);
}

#[test]
fn wrong_use_has_code_2_and_says_what_to_do() {
    let folder = bench_folder("embossed-film");
    let cases: [(&[&str], &str); 11] = [
        (&["measure", "pattern.jpg", "--limits", "20.00(5) um"], "without brackets"),
        (&["measure", "pattern.jpg", "--limits", "20 ± 1 um", "--rule", "strict"], "guarded, simple, shared"),
        (&["measure", "pattern.jpg", "--rule", "strict"], "no decision rule"),
        (&["measure", "missing.jpg"], "missing.jpg"),
        (&["measure", "bench.toml"], "bench.toml"),
        (&["measure", "."], "folder"),
        (&["measure"], "spotrule new"),
        (&["measure", "pattern.jpg", "--throw", "812"], "812"),
        (&["measure", "pattern.jpg", "--wavelength", "0.532 mm"], "0.532 mm"),
        (&["measure", "pattern.jpg", "--no-such-flag"], "no-such-flag"),
        (&["target", "--pitch", "-3", "--out", "t.svg"], "pitch"),
    ];
    for (arguments, expected) in cases {
        // A folder of its own without bench.toml for the case without any argument.
        let empty = tempfile::tempdir().unwrap();
        let place = if arguments == ["measure"] { empty.path() } else { folder.path() };
        let done = spotrule(place, arguments);
        assert_eq!(done.status.code(), Some(2), "{arguments:?}: {}", text(&done.stderr));
        assert!(text(&done.stderr).contains(expected), "{arguments:?}: {}", text(&done.stderr));
        assert!(!text(&done.stderr).contains("panicked"));
    }
}

#[test]
fn a_failed_command_leaves_no_file() {
    let folder = tempfile::tempdir().unwrap();
    for arguments in [["target", "--pitch", "10", "--out", "target.txt"], ["target", "--pitch", "900", "--out", "target.svg"]] {
        assert_ne!(spotrule(folder.path(), &arguments).status.code(), Some(0), "{arguments:?}");
    }
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 0);
}

#[test]
fn nothing_is_replaced_by_accident() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("bench.toml"), "mine").unwrap();
    let done = spotrule(folder.path(), &["new", "bench.toml"]);
    assert_eq!(done.status.code(), Some(2));
    assert!(text(&done.stderr).contains("--force"));
    assert_eq!(fs::read_to_string(folder.path().join("bench.toml")).unwrap(), "mine");
}

#[test]
fn a_new_bench_file_reads_as_it_is() {
    let folder = tempfile::tempdir().unwrap();
    assert_eq!(spotrule(folder.path(), &["new"]).status.code(), Some(0));
    let written = fs::read_to_string(folder.path().join("bench.toml")).unwrap();
    assert!(spotrule::bench::Bench::parse(&written).is_ok());
    assert!(written.contains("IEC 60825-1"));
}

#[test]
fn every_command_explains_itself_with_an_example() {
    let folder = tempfile::tempdir().unwrap();
    for command in ["measure", "calibrate", "new", "target", "render", "completions", "manual", "log"] {
        let done = spotrule(folder.path(), &[command, "--help"]);
        assert_eq!(done.status.code(), Some(0));
        assert!(text(&done.stdout).contains("Example"), "{command}");
    }
    assert!(text(&spotrule(folder.path(), &["--help"]).stdout).contains("IEC 60825-1"));
    assert!(text(&spotrule(folder.path(), &["completions", "bash"]).stdout).contains("spotrule"));
    assert!(text(&spotrule(folder.path(), &["manual"]).stdout).contains(".TH"));
}
