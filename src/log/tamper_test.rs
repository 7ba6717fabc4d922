//! Whoever changes the file by hand is found out; whoever does it through SQL is stopped first.

use super::{Draft, Filter, Finding, Log, LogError, Outcome};
use rusqlite::Connection;
use std::path::{Path, PathBuf};

const BENCH: &str = "[laser]\nwavelength = \"632.82(1) nm\"\n";

fn result(sample: &str, pitch: f64, outcome: &str) -> String {
    let bench = crate::digest::sha256_hex(BENCH.as_bytes());
    format!(
        r#"{{
  "schema": "spotrule.measurement/1", "program": {{"version": "1.0.0", "commit": "abc"}}, "status": "measured", "sample": "{sample}",
  "time": "2030-05-01T10:00:00.000Z", "operator": "A", "pitch": [{{"value": {pitch}, "u": 0.001, "U": 0.002, "k": 2.0, "unit": "um"}}],
  "warnings": [{{"code": "few-spots", "text": "only 7 spots"}}], "limits": {{"outcome": "{outcome}"}},
  "inputs": {{"bench": {{"file": "bench.toml", "sha256": "{bench}"}}, "photos": [{{"file": "p.jpg", "role": "pattern", "sha256": "00ff", "bytes": 12}}]}}
}}"#
    )
}

fn time(number: usize) -> String {
    format!("2030-05-01T10:{:02}:{:02}.000Z", number / 60, number % 60)
}

/// A log with `count` measurements in a folder of its own.
fn log_of(count: usize) -> (tempfile::TempDir, PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("book.db");
    let mut log = Log::open(&path).unwrap();
    for number in 1..=count {
        let outcome = if number % 3 == 0 { "outside" } else { "inside" };
        let draft = Draft::of_result(
            &result(&format!("lot {number}"), 20.0 + 0.001 * f64::from(u32::try_from(number).unwrap()), outcome),
            Some(BENCH),
        );
        assert_eq!(log.append(&draft.unwrap(), &time(number)).unwrap().entry, u64::try_from(number).unwrap());
    }
    (folder, path)
}

/// Runs `sql` without the triggers, which are put back afterwards: the work of someone who knows the tables.
fn tamper(path: &Path, sql: &str) {
    let connection = Connection::open(path).unwrap();
    let triggers: Vec<(String, String)> = connection
        .prepare("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")
        .unwrap()
        .query_map([], |row| Ok((row.get(0)?, row.get(1)?)))
        .unwrap()
        .map(Result::unwrap)
        .collect();
    assert!(triggers.len() > 10);
    for (name, _) in &triggers {
        connection.execute_batch(&format!("DROP TRIGGER {name}")).unwrap();
    }
    connection.execute_batch(sql).unwrap();
    for (_, definition) in &triggers {
        connection.execute_batch(definition).unwrap();
    }
}

fn findings(path: &Path) -> Vec<Finding> {
    Log::read(path).unwrap().verify(None).unwrap().findings
}

#[test]
fn an_untouched_log_is_sound() {
    let (_folder, path) = log_of(20);
    let log = Log::read(&path).unwrap();
    let report = log.verify(None).unwrap();
    assert_eq!((report.entries, report.findings.as_slice(), report.dated_back.as_slice()), (20, &[][..], &[][..]));
    assert_eq!(log.head().unwrap(), (20, report.head));
}

#[test]
fn sql_is_stopped() {
    let (_folder, path) = log_of(3);
    let connection = Connection::open(&path).unwrap();
    for sql in [
        "UPDATE entry SET body = '{}' WHERE sequence = 2",
        "UPDATE entry SET sha256 = '' WHERE sequence = 2",
        "DELETE FROM entry WHERE sequence = 3",
        "INSERT OR REPLACE INTO entry (sequence, sha256, body) VALUES (2, '', '{}')",
        "INSERT INTO entry (sequence, sha256, body) VALUES (9, '', '{}')",
        "UPDATE result SET json = '{}'",
        "DELETE FROM result",
        "INSERT OR REPLACE INTO result VALUES (2, '{}')",
        "UPDATE document SET text = ''",
        "DELETE FROM document",
        "INSERT OR REPLACE INTO document SELECT sha256, 'x' FROM document",
        "UPDATE head SET count = 1",
        "DELETE FROM head",
        "INSERT OR REPLACE INTO head VALUES (1, 0, '')",
    ] {
        assert!(connection.execute_batch(sql).is_err(), "{sql}");
    }
    drop(connection);
    assert_eq!(findings(&path), []);
}

#[test]
fn each_kind_of_tampering_is_named() {
    let swap = "UPDATE entry SET sequence = -1 WHERE sequence = 4; UPDATE entry SET sequence = 4 WHERE sequence = 7; UPDATE entry SET sequence = 7 WHERE sequence = -1;";
    let cases: Vec<(&str, Vec<Finding>)> = vec![
        ("UPDATE entry SET body = replace(body, 'lot 5', 'lot 6') WHERE sequence = 5", vec![Finding::Changed { entry: 5 }]),
        ("UPDATE entry SET body = '{}' WHERE sequence = 5", vec![Finding::Changed { entry: 5 }]),
        ("DELETE FROM entry WHERE sequence = 5", vec![Finding::Missing { from: 5, to: 5 }]),
        ("DELETE FROM entry WHERE sequence IN (3, 4, 5)", vec![Finding::Missing { from: 3, to: 5 }]),
        ("DELETE FROM entry WHERE sequence > 8", vec![Finding::Head { counted: 10, found: 8 }]),
        ("UPDATE head SET count = 9", vec![Finding::Head { counted: 9, found: 10 }]),
        (
            swap,
            vec![
                Finding::Displaced { entry: 4, says: 7 },
                Finding::Unchained { entry: 5 },
                Finding::Displaced { entry: 7, says: 4 },
                Finding::Unchained { entry: 8 },
            ],
        ),
        ("UPDATE result SET json = replace(json, '20.005', '20.000') WHERE sequence = 5", vec![Finding::ResultChanged { entry: 5 }]),
        ("DELETE FROM result WHERE sequence = 5", vec![Finding::ResultMissing { entry: 5 }]),
        ("UPDATE document SET text = text || ' '", vec![Finding::BenchChanged { entry: 1 }]),
        ("DELETE FROM document", vec![Finding::BenchMissing { entry: 1 }]),
    ];
    for (sql, wanted) in cases {
        let (_folder, path) = log_of(10);
        tamper(&path, sql);
        let found = findings(&path);
        // A head that counts entries that are gone also tells of the other removals at the end.
        assert_eq!(found, wanted, "{sql}");
    }
}

/// Who rewrites an entry with a fitting hash breaks the chain behind it.
#[test]
fn an_exchanged_entry_breaks_the_chain() {
    let (_folder, path) = log_of(6);
    let mut entry = Log::read(&path).unwrap().entry(3).unwrap().listed.entry;
    entry.pitch[0].value = 19.0;
    let (body, sha256) = entry.sealed();
    tamper(&path, &format!("UPDATE entry SET body = '{body}', sha256 = '{sha256}' WHERE sequence = 3"));
    assert_eq!(findings(&path), [Finding::Unchained { entry: 4 }]);
}

/// Only a hash noted elsewhere shows that the end was cut off and the head set back.
#[test]
fn a_witness_outside_shows_what_the_chain_cannot() {
    let (_folder, path) = log_of(6);
    let log = Log::read(&path).unwrap();
    let (fourth, sixth) = (log.entry(4).unwrap().listed.sha256, log.entry(6).unwrap().listed.sha256);
    drop(log);
    tamper(
        &path,
        &format!(
            "DELETE FROM entry WHERE sequence > 4; DELETE FROM result WHERE sequence > 4; UPDATE head SET count = 4, sha256 = '{fourth}'"
        ),
    );
    let log = Log::read(&path).unwrap();
    assert_eq!(log.verify(None).unwrap().findings, [], "this is what a chain alone cannot show");
    assert_eq!(log.verify(Some(&fourth)).unwrap().expected_at, Some(4));
    assert_eq!(log.verify(Some(&sixth)).unwrap().findings, [Finding::Expected { sha256: sixth.clone() }]);
}

#[test]
fn guards_that_are_gone_are_named() {
    let (_folder, path) = log_of(2);
    Connection::open(&path).unwrap().execute_batch("DROP TRIGGER entry_remains; CREATE TABLE other (x)").unwrap();
    assert_eq!(findings(&path), [Finding::Guard { names: vec!["entry_remains".to_owned(), "other".to_owned()] }]);
}

#[test]
fn a_correction_points_to_its_entry_and_leaves_it() {
    let (_folder, path) = log_of(3);
    let before = Log::read(&path).unwrap().entry(2).unwrap();
    let mut log = Log::open(&path).unwrap();
    let draft = Draft::correction(2, "sample 8 was in the holder", "lot 8".to_owned(), Some("B".to_owned())).unwrap();
    assert_eq!(log.append(&draft, &time(4)).unwrap().entry, 4);
    let after = log.entry(2).unwrap();
    assert_eq!((after.body, after.listed.corrected_by), (before.body, Some(4)));
    let missing = Draft::correction(9, "why", String::new(), None).unwrap();
    assert!(matches!(log.append(&missing, &time(5)), Err(LogError::NoEntry { entry: 9, count: 4, .. })));
    assert_eq!(findings(&path), []);
}

#[test]
fn entries_are_found_by_what_they_say() {
    let (_folder, path) = log_of(12);
    let log = Log::read(&path).unwrap();
    let numbers = |filter: Filter| log.list(&filter, 50).unwrap().iter().map(|listed| listed.entry.entry).collect::<Vec<_>>();
    let named = |text: &str| Filter { sample: Some(text.to_owned()), ..Filter::default() };
    assert_eq!(numbers(named("lot 1*")), [12, 11, 10, 1]);
    assert_eq!(numbers(named("lot ?")).len(), 9);
    assert!(numbers(named("[l]ot 1")).is_empty(), "brackets are letters");
    assert_eq!(numbers(Filter { outcome: Some(Outcome::Outside), ..Filter::default() }), [12, 9, 6, 3]);
    assert_eq!(numbers(Filter { since: Some(time(4)), before: Some(time(6)), ..Filter::default() }), [5, 4]);
    assert!(numbers(Filter { bench_sha256: Some("ffff".to_owned()), ..Filter::default() }).is_empty());
    assert_eq!(numbers(Filter { below: Some(3), operator: Some("A".to_owned()), ..Filter::default() }), [2, 1]);
    assert_eq!(log.list(&Filter::default(), 5).unwrap().len(), 5);
    let shown = log.entry(7).unwrap();
    assert_eq!(shown.bench_text.as_deref(), Some(BENCH));
    let line: serde_json::Value = serde_json::from_str(&super::line(&shown)).unwrap();
    assert_eq!((line["entry"]["entry"].as_u64(), line["result"]["sample"].as_str()), (Some(7), Some("lot 7")));
    assert!(super::line(&shown).contains(&shown.body), "the exported entry is hashed byte for byte");
    assert_eq!(super::csv_row(&shown).len(), super::CSV_HEADER.len());
}

#[test]
fn a_spreadsheet_is_handed_no_formula() {
    let folder = tempfile::tempdir().unwrap();
    let mut log = Log::open(&folder.path().join("book.db")).unwrap();
    log.append(&Draft::of_result(&result("=1+1", 20.0, "inside"), None).unwrap(), &time(1)).unwrap();
    assert_eq!(super::csv_row(&log.entry(1).unwrap())[4], "'=1+1");
}

#[test]
fn a_full_disk_enters_nothing_and_says_so() {
    let (_folder, path) = log_of(2);
    let mut log = Log::open(&path).unwrap();
    log.connection.pragma_update(None, "max_page_count", 1).unwrap();
    let long = result(&"long ".repeat(20_000), 20.0, "inside");
    let error = log.append(&Draft::of_result(&long, None).unwrap(), &time(3)).unwrap_err();
    assert!(matches!(error, LogError::DiskFull { .. }), "{error}");
    assert_eq!(log.head().unwrap().0, 2);
    assert_eq!(findings(&path), []);
}

#[test]
fn other_files_are_left_as_they_are() {
    let folder = tempfile::tempdir().unwrap();
    let text = folder.path().join("bench.toml");
    std::fs::write(&text, BENCH.repeat(100)).unwrap();
    let other = folder.path().join("other.db");
    Connection::open(&other).unwrap().execute_batch("CREATE TABLE mine (x)").unwrap();
    for path in [&text, &other] {
        let before = std::fs::read(path).unwrap();
        assert!(matches!(Log::open(path), Err(LogError::NotALog { .. })), "{}", path.display());
        assert!(matches!(Log::read(path), Err(LogError::NotALog { .. })), "{}", path.display());
        assert_eq!(std::fs::read(path).unwrap(), before);
    }
    assert!(matches!(Log::read(&folder.path().join("none.db")), Err(LogError::Missing { .. })));
    assert!(matches!(Log::open(&folder.path().join("no/such/folder.db")), Err(LogError::CannotOpen { .. })));
    let newer = folder.path().join("newer.db");
    drop(Log::open(&newer).unwrap());
    Connection::open(&newer).unwrap().pragma_update(None, "user_version", 7).unwrap();
    assert!(matches!(Log::open(&newer), Err(LogError::Newer { found: 7, known: 1, .. })));
}

#[test]
fn an_entry_dated_before_its_predecessor_is_remarked() {
    let (_folder, path) = log_of(2);
    let mut log = Log::open(&path).unwrap();
    log.append(&Draft::of_result(&result("x", 20.0, "inside"), Some(BENCH)).unwrap(), "2029-01-01T00:00:00.000Z").unwrap();
    let report = log.verify(None).unwrap();
    assert_eq!((report.dated_back, report.findings), (vec![3], vec![]));
    let other_bench = Draft::of_result(&result("x", 20.0, "inside"), Some("other"));
    assert!(matches!(other_bench, Err(LogError::OtherBench { .. })));
}
