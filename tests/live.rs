//! Runs a reference library beside our own code.
//!
//! Each script in `tests/reference` prints JSON; a copy of that output is kept in `tests/data` under the same name.
//! A check is always held against the kept copy, and once more against a fresh run when the environment variable
//! `SPOTRULE_PYTHON` names an interpreter that has the libraries. Without it the fresh run is skipped and says so;
//! with it, a script that cannot run fails the test.

use serde_json::Value;
use std::{path::PathBuf, process::Command};

fn in_tests(path: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests").join(path)
}

/// Holds `check` against the kept output of a script, then against a fresh one.
pub(crate) fn kept_and_live(name: &str, check: impl Fn(&Value)) {
    let path = in_tests(&format!("data/{name}.json"));
    let kept = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    check(&parsed(name, &kept));
    let Some(fresh) = run(name) else { return };
    check(&parsed(name, &fresh));
}

fn parsed(name: &str, text: &str) -> Value {
    serde_json::from_str(text).unwrap_or_else(|e| panic!("output of {name}: {e}"))
}

/// Standard output of `tests/reference/<name>.py`, or `None` when no interpreter is named.
fn run(name: &str) -> Option<String> {
    let Some(python) = std::env::var_os("SPOTRULE_PYTHON") else {
        println!("skipped: live run of tests/reference/{name}.py (SPOTRULE_PYTHON names no interpreter); the kept values were checked");
        return None;
    };
    let script = in_tests(&format!("reference/{name}.py"));
    let output = Command::new(&python).arg(&script).output().unwrap_or_else(|e| panic!("{}: {e}", python.display()));
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{} failed: {errors}", script.display());
    println!("live: tests/reference/{name}.py");
    Some(String::from_utf8(output.stdout).unwrap())
}

/// A number of a JSON object.
pub(crate) fn number(value: &Value, key: &str) -> f64 {
    value[key].as_f64().unwrap_or_else(|| panic!("{key} is no number in {value}"))
}

/// A row of numbers.
pub(crate) fn row(value: &Value) -> Vec<f64> {
    let items = value.as_array().unwrap_or_else(|| panic!("no list: {value}"));
    items.iter().map(|item| item.as_f64().unwrap_or_else(|| panic!("no number: {item}"))).collect()
}

/// Rows of numbers.
pub(crate) fn rows(value: &Value) -> Vec<Vec<f64>> {
    value.as_array().unwrap_or_else(|| panic!("no list: {value}")).iter().map(row).collect()
}

/// The entries of a list.
pub(crate) fn list<'a>(value: &'a Value, key: &str) -> &'a [Value] {
    value[key].as_array().unwrap_or_else(|| panic!("{key} is no list"))
}

/// Two-sided comparison that prints both values and their difference.
#[track_caller]
pub(crate) fn close(what: &str, got: f64, want: f64, tolerance: f64) {
    let difference = got - want;
    assert!(difference.abs() <= tolerance, "{what}: got {got}, want {want}, difference {difference:e}, allowed {tolerance:e}");
}
