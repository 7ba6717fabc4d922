//! The published schemas are those of the types, and what the program writes is valid by them.

use super::scenes::{drawn, small};
use serde_json::Value;
use std::{fs, path::Path, process::Command};

const RESULT: &str = "docs/measurement.schema.json";
const LINE: &str = "docs/log-line.schema.json";

fn root(path: &str) -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

fn schema(path: &str) -> jsonschema::Validator {
    let text = fs::read_to_string(root(path)).unwrap();
    jsonschema::validator_for(&serde_json::from_str(&text).unwrap()).unwrap()
}

#[track_caller]
fn assert_valid(schema: &jsonschema::Validator, value: &Value) {
    let wrong: Vec<String> = schema.iter_errors(value).map(|error| format!("{}: {error}", error.instance_path())).collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// `UPDATE=1 cargo test --release schema` rewrites them.
#[test]
fn published_schemas_are_those_of_the_types() {
    for (path, generated) in [(RESULT, spotrule::report::result_schema()), (LINE, spotrule::log::line_schema())] {
        if std::env::var_os("UPDATE").is_some() {
            fs::write(root(path), &generated).unwrap();
        }
        assert!(fs::read_to_string(root(path)).unwrap_or_default() == generated, "{path} is not what the types give; UPDATE=1 rewrites it");
    }
}

#[test]
fn golden_results_are_valid() {
    let schema = schema(RESULT);
    for name in ["plane.json", "line.json", "refused.json"] {
        assert_valid(&schema, &serde_json::from_str(&fs::read_to_string(root("tests/data/golden").join(name)).unwrap()).unwrap());
    }
}

/// Results with everything around them, and the lines of a log with each kind of entry.
#[test]
fn what_the_program_writes_is_valid() {
    let folder = tempfile::tempdir().unwrap();
    let scene = small("embossed-film", 0.5);
    let photos = drawn(&scene);
    fs::write(folder.path().join("pattern.jpg"), &photos.pattern).unwrap();
    fs::write(folder.path().join("target.jpg"), photos.target.as_ref().unwrap()).unwrap();
    fs::write(folder.path().join("bench.toml"), scene.bench_text()).unwrap();
    image::RgbImage::from_pixel(800, 600, image::Rgb([3, 3, 3])).save(folder.path().join("dark.png")).unwrap();
    let run =
        |arguments: &[&str]| Command::new(env!("CARGO_BIN_EXE_spotrule")).args(arguments).current_dir(folder.path()).output().unwrap();
    let result = schema(RESULT);
    let limits = "12.0 ± 0.4 um; angle: >= 100 deg";
    for photo in ["pattern.jpg", "dark.png"] {
        let done = run(&[
            "measure",
            photo,
            "--json",
            "-",
            "--log",
            "book.db",
            "--limits",
            limits,
            "--operator",
            "A",
            "--remark",
            "B",
            "--mode",
            "transmission",
        ]);
        assert_valid(&result, &serde_json::from_slice(&done.stdout).unwrap());
    }
    assert!(run(&["log", "correct", "book.db", "1", "--why", "no reason"]).status.success());
    let line = schema(LINE);
    let lines = String::from_utf8(run(&["log", "export", "book.db", "--format", "jsonl"]).stdout).unwrap();
    assert_eq!(lines.lines().count(), 3);
    for text in lines.lines() {
        let value: Value = serde_json::from_str(text).unwrap();
        assert_valid(&line, &value);
        if !value["result"].is_null() {
            assert_valid(&result, &value["result"]);
        }
    }
}

/// A schema that lets everything pass checks nothing.
#[test]
fn what_is_wrong_is_not_valid() {
    let schema = schema(RESULT);
    let sound: Value = serde_json::from_str(&fs::read_to_string(root("tests/data/golden/plane.json")).unwrap()).unwrap();
    for (key, wrong) in [("schema", "x"), ("status", "guessed"), ("pitch", "4 um"), ("mode", "sideways")] {
        let mut spoilt = sound.clone();
        spoilt[key] = Value::from(wrong);
        assert!(!schema.is_valid(&spoilt), "{key}");
        spoilt.as_object_mut().unwrap().remove(key);
        assert!(!schema.is_valid(&spoilt), "{key} is missing");
    }
}
