//! The log under what happens to logs: writers that are killed, writers at once, full disks, folders that may only be read.

use super::scenes::{drawn, small};
use spotrule::log::{Filter, Log, LogError};
use std::{
    collections::BTreeMap,
    fs,
    io::{BufRead, BufReader, Write},
    path::Path,
    process::{Child, Command, Output, Stdio},
};

fn spotrule(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_spotrule")).args(arguments).current_dir(folder).output().unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

/// A result as `measure --json` writes it, on one line.
fn result(sample: &str) -> String {
    format!(
        r#"{{"schema":"spotrule.measurement/1","program":{{"version":"1.0.0","commit":"abc"}},"status":"measured","sample":"{sample}","pitch":[{{"value":20.0,"u":0.001,"U":0.002,"k":2.0,"unit":"um"}}],"warnings":[],"filling":"{}"}}"#,
        "x".repeat(1000)
    )
}

/// A writer that is fed `lines`; what it acknowledges comes back as (entry, hash). Killed after `kill_after` acknowledgements.
fn write_and_die(folder: &Path, lines: &[String], kill_after: Option<usize>) -> Vec<(u64, String)> {
    let mut child = writer(folder);
    let mut input = child.stdin.take().unwrap();
    let lines = lines.to_vec();
    // A pipe holds less than all lines; who writes them must not be who reads the answers. A killed reader ends the writing.
    let feeding = std::thread::spawn(move || lines.iter().all(|line| writeln!(input, "{line}").is_ok()));
    let mut acknowledged = Vec::new();
    for answer in BufReader::new(child.stdout.take().unwrap()).lines() {
        let answer = answer.unwrap();
        // A line cut off by the kill acknowledges nothing.
        let words: Vec<&str> = answer.split_whitespace().collect();
        if let ["entry", number, hash] = words[..]
            && hash.len() == 64
        {
            acknowledged.push((number.parse().unwrap(), hash.to_owned()));
        }
        if kill_after.is_some_and(|count| acknowledged.len() == count) {
            child.kill().unwrap();
        }
    }
    child.wait().unwrap();
    feeding.join().unwrap();
    acknowledged
}

fn writer(folder: &Path) -> Child {
    Command::new(env!("CARGO_BIN_EXE_spotrule"))
        .args(["log", "add", "book.db", "-"])
        .current_dir(folder)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap()
}

/// Four writers of 200 entries each, each killed (SIGKILL) five times and started again with what was not acknowledged.
#[test]
fn killed_writers_lose_nothing_that_they_acknowledged() {
    let folder = tempfile::tempdir().unwrap();
    let writers: Vec<_> = (0..4_u64)
        .map(|number| {
            let place = folder.path().to_owned();
            std::thread::spawn(move || {
                let mut lines: Vec<String> = (0..200).map(|line| result(&format!("writer {number} line {line}"))).collect();
                let mut acknowledged = BTreeMap::new();
                let mut seed = 0x9E37_79B9_7F4A_7C15_u64.wrapping_mul(number + 1);
                let mut kills = 0;
                while !lines.is_empty() {
                    seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                    let after = 3 + usize::try_from(seed >> 33).unwrap() % 40;
                    kills += usize::from(kills < 5);
                    let answers = write_and_die(&place, &lines, (kills < 5).then_some(after));
                    let done: Vec<String> = lines.drain(..answers.len()).collect();
                    acknowledged.extend(answers.into_iter().zip(done).map(|((entry, hash), line)| (entry, (hash, line))));
                }
                acknowledged
            })
        })
        .collect();
    let acknowledged: BTreeMap<u64, (String, String)> = writers.into_iter().flat_map(|writer| writer.join().unwrap()).collect();
    assert_eq!(acknowledged.len(), 800, "every line was acknowledged once, each by an entry of its own");
    let log = Log::read(&folder.path().join("book.db")).unwrap();
    let report = log.verify(None).unwrap();
    assert_eq!(report.findings, []);
    // An entry may be on the disk although the kill came before its acknowledgement; never the other way round.
    assert!(report.entries >= 800, "{}", report.entries);
    println!("800 acknowledged, {} entries in the log after 16 kills", report.entries);
    for (entry, (hash, line)) in &acknowledged {
        let shown = log.entry(*entry).unwrap();
        assert_eq!((&shown.listed.sha256, shown.result.as_ref()), (hash, Some(line)), "entry {entry}");
    }
}

/// The disk has no room for the next entry: here a limit on the size of files stands for it.
#[cfg(unix)]
#[test]
fn a_disk_without_room_keeps_what_was_acknowledged() {
    let folder = tempfile::tempdir().unwrap();
    // The first entry is made without limit: it makes the tables.
    fs::write(folder.path().join("one.json"), result("first")).unwrap();
    assert_eq!(spotrule(folder.path(), &["log", "add", "book.db", "one.json"]).status.code(), Some(0));
    fs::write(folder.path().join("lines"), (0..400).map(|line| result(&format!("line {line}")) + "\n").collect::<String>()).unwrap();
    let script = format!("trap '' XFSZ; ulimit -f 1200; exec '{}' log add book.db - < lines", env!("CARGO_BIN_EXE_spotrule"));
    let done = Command::new("sh").args(["-c", &script]).current_dir(folder.path()).output().unwrap();
    assert_eq!(done.status.code(), Some(2), "{}", text(&done.stderr));
    assert!(text(&done.stderr).contains("full disk") || text(&done.stderr).contains("disk is full"), "{}", text(&done.stderr));
    let acknowledged = text(&done.stdout).lines().count();
    assert!(acknowledged > 5 && acknowledged < 400, "{acknowledged}");
    let log = Log::read(&folder.path().join("book.db")).unwrap();
    let report = log.verify(None).unwrap();
    assert_eq!((report.entries, report.findings), (u64::try_from(acknowledged).unwrap() + 1, vec![]));
}

/// As another user where the tests run as root, for whom no folder is closed.
#[cfg(unix)]
#[test]
fn a_folder_that_may_only_be_read_is_told_and_can_still_be_read() {
    use std::os::unix::{fs::PermissionsExt, process::CommandExt};
    let folder = tempfile::tempdir().unwrap();
    let mode = |path: &Path, mode| fs::set_permissions(path, fs::Permissions::from_mode(mode)).unwrap();
    fs::write(folder.path().join("one.json"), result("first")).unwrap();
    assert_eq!(spotrule(folder.path(), &["log", "add", "book.db", "one.json"]).status.code(), Some(0));
    let program = folder.path().join("spotrule");
    fs::copy(env!("CARGO_BIN_EXE_spotrule"), &program).unwrap();
    mode(&folder.path().join("book.db"), 0o444);
    mode(folder.path(), 0o555);
    let root = fs::metadata("/proc/self").map(|own| std::os::unix::fs::MetadataExt::uid(&own) == 0).unwrap_or(false);
    let run = |arguments: &[&str]| {
        let mut command = Command::new(&program);
        command.args(arguments).current_dir(folder.path());
        if root {
            command.uid(65_534).gid(65_534);
        }
        command.output().unwrap()
    };
    let refused = run(&["log", "add", "book.db", "one.json"]);
    let new = run(&["log", "add", "new.db", "one.json"]);
    let listed = run(&["log", "list", "book.db"]);
    let verified = run(&["log", "verify", "book.db"]);
    mode(folder.path(), 0o755);
    assert_eq!(refused.status.code(), Some(2));
    assert!(text(&refused.stderr).contains("must be writable"), "{}", text(&refused.stderr));
    assert!(text(&new.stderr).contains("its folder must exist and you must be allowed to write"), "{}", text(&new.stderr));
    assert!(text(&listed.stdout).contains("first"), "{}", text(&listed.stderr));
    assert_eq!((verified.status.code(), text(&verified.stdout).contains("sound")), (Some(0), true), "{}", text(&verified.stderr));
}

/// Measured, measured beside the limits, refused, used wrongly: what the log holds afterwards, seen through the commands of the documentation.
#[test]
fn measurements_are_entered_shown_exported_and_corrected() {
    let folder = tempfile::tempdir().unwrap();
    let scene = small("ruled-grating", 0.5);
    let photos = drawn(&scene);
    fs::write(folder.path().join("pattern.jpg"), &photos.pattern).unwrap();
    fs::write(folder.path().join("target.jpg"), photos.target.as_ref().unwrap()).unwrap();
    fs::write(folder.path().join("bench.toml"), scene.bench_text()).unwrap();
    image::RgbImage::from_pixel(800, 600, image::Rgb([3, 3, 3])).save(folder.path().join("dark.png")).unwrap();
    let measure = |photo: &str, more: &[&str]| {
        let common = ["measure", photo, "--log", "book.db", "--keep-photos", "kept", "--operator", "A", "--sample-name", "lot 7"];
        spotrule(folder.path(), &[&common[..], more].concat())
    };
    let first = measure("pattern.jpg", &["--remark", "after cleaning"]);
    assert_eq!(first.status.code(), Some(0), "{}", text(&first.stderr));
    assert_eq!(measure("pattern.jpg", &["--limits", "<= 0.1 um"]).status.code(), Some(3));
    assert_eq!(measure("dark.png", &[]).status.code(), Some(1));
    assert_eq!(measure("missing.png", &[]).status.code(), Some(2), "wrong use is not entered");
    let said = text(&first.stdout);
    let hash = said.split("SHA-256").nth(1).unwrap().split_whitespace().next().unwrap().to_owned();
    assert!(said.contains("Logged: entry 1 of book.db"), "{said}");

    let verify = spotrule(folder.path(), &["log", "verify", "book.db", "--expect-head", &hash, "--photos", "kept"]);
    assert_eq!(verify.status.code(), Some(0), "{}", text(&verify.stdout));
    assert!(text(&verify.stdout).contains("that of entry 1"), "{}", text(&verify.stdout));
    let outcomes = |filter: &Filter| {
        Log::read(&folder.path().join("book.db"))
            .unwrap()
            .list(filter, 9)
            .unwrap()
            .iter()
            .map(|listed| listed.entry.outcome.name())
            .collect::<Vec<_>>()
    };
    assert_eq!(outcomes(&Filter::default()), ["refused", "outside", "measured"]);

    let show = text(&spotrule(folder.path(), &["log", "show", "book.db", "1"]).stdout);
    for wanted in ["after cleaning", "lot 7", "pattern.jpg", "target.jpg", "wavelength"] {
        assert!(show.contains(wanted), "{wanted}:\n{show}");
    }
    let corrected = spotrule(folder.path(), &["log", "correct", "book.db", "1", "--why", "it was lot 8", "--sample-name", "lot 8"]);
    assert_eq!(corrected.status.code(), Some(0), "{}", text(&corrected.stderr));
    let list = text(&spotrule(folder.path(), &["log", "list", "book.db", "--sample", "lot*"]).stdout);
    assert!(list.contains("[corrected by 4]") && list.contains("corrects 1: it was lot 8"), "{list}");
    let table = text(&spotrule(folder.path(), &["log", "export", "book.db"]).stdout);
    assert_eq!(table.lines().count(), 5, "{table}");
    assert_eq!(spotrule(folder.path(), &["log", "export", "book.db", "--format", "jsonl", "--out", "book.jsonl"]).status.code(), Some(0));
    for line in fs::read_to_string(folder.path().join("book.jsonl")).unwrap().lines() {
        let value: serde_json::Value = serde_json::from_str(line).unwrap();
        let entry = line
            .split("\"entry\":")
            .nth(1)
            .map(|_| &line[line.find("\"entry\":").unwrap() + 8..line.rfind(",\"result\":").unwrap()])
            .unwrap();
        assert_eq!(value["sha256"].as_str().unwrap(), spotrule::digest::sha256_hex(entry.as_bytes()), "{entry}");
    }
    // A kept photo that changes is found by its hash.
    let kept = fs::read_dir(folder.path().join("kept")).unwrap().next().unwrap().unwrap().path();
    fs::write(&kept, b"another").unwrap();
    let spoilt = spotrule(folder.path(), &["log", "verify", "book.db", "--photos", "kept"]);
    assert_eq!(spoilt.status.code(), Some(1));
    assert!(text(&spoilt.stdout).contains("was changed"), "{}", text(&spoilt.stdout));
}

/// Readings that jump once: the chart names the entry, and leaves out the one that was corrected.
#[test]
fn a_chart_names_the_entry_that_jumps() {
    let folder = tempfile::tempdir().unwrap();
    let lines: String = (0..24)
        .map(|i| result("reference").replace("20.0,", &format!("{},", if i == 17 { 21.0 } else { 20.0 + 0.01 * f64::from(i % 4) })) + "\n")
        .collect();
    for line in lines.lines() {
        fs::write(folder.path().join("one.json"), line).unwrap();
        assert_eq!(spotrule(folder.path(), &["log", "add", "book.db", "one.json"]).status.code(), Some(0));
    }
    let chart = || spotrule(folder.path(), &["log", "chart", "book.db", "--sample", "reference", "--out", "chart.svg"]);
    let drawn = text(&chart().stdout);
    assert!(drawn.contains("24 readings") && drawn.contains("entry 18: one reading beyond 3 sigma"), "{drawn}");
    assert!(fs::read_to_string(folder.path().join("chart.svg")).unwrap().contains("24 readings of pitch 1, µm"));
    assert_eq!(spotrule(folder.path(), &["log", "correct", "book.db", "18", "--why", "dust on the film"]).status.code(), Some(0));
    let corrected = text(&chart().stdout);
    assert!(corrected.contains("23 readings") && !corrected.contains("beyond 3 sigma"), "{corrected}");
    assert_eq!(spotrule(folder.path(), &["log", "chart", "book.db", "--sample", "none", "--out", "no.svg"]).status.code(), Some(1));
    assert!(!folder.path().join("no.svg").exists());
}

#[test]
fn a_log_that_is_not_there_is_not_made_by_looking() {
    let folder = tempfile::tempdir().unwrap();
    for arguments in [
        &["log", "list", "b.db"][..],
        &["log", "verify", "b.db"],
        &["log", "show", "b.db", "1"],
        &["log", "correct", "b.db", "1", "--why", "x"],
    ] {
        let done = spotrule(folder.path(), arguments);
        assert_eq!(done.status.code(), Some(2));
        assert!(text(&done.stderr).contains("no such log"), "{}", text(&done.stderr));
    }
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 0);
    assert!(matches!(Log::read(Path::new("b.db")), Err(LogError::Missing { .. })));
}
