//! The house rules that a machine can check: who may use whom, who may touch the outer world, sources that exist,
//! test files that run. Code under `#[cfg(test)]` is free.

use std::{
    collections::{BTreeMap, BTreeSet},
    fs,
    path::{Path, PathBuf},
};

/// Room, and the rooms it may use. What they use in turn is allowed as well.
const MAY_USE: &[(&str, &[&str])] = &[
    ("quantity", &[]),
    ("math", &[]),
    ("lattice", &["math"]),
    ("optics", &["lattice", "math"]),
    ("photo", &["math"]),
    ("spots", &["photo", "math"]),
    ("target", &["lattice", "optics", "spots"]),
    ("calibration", &["quantity"]),
    ("bench", &["quantity", "calibration"]),
    ("fit", &["math", "lattice", "optics", "spots", "target", "bench"]),
    ("budget", &["fit"]),
    ("measure", &["budget"]),
    // a made-up scene speaks the language of the bench file that it writes beside its photo
    ("synth", &["lattice", "optics", "photo", "target", "bench"]),
    ("limits", &["measure"]),
    ("control", &[]),
    ("report", &["measure", "limits", "control"]),
    // knows results by their JSON alone
    ("log", &[]),
    ("cli", &["report", "log", "synth"]),
];

/// Rooms that everyone may use.
const OPEN: &[&str] = &["frames", "note", "error", "digest", "Error", "Note"];

/// These gather words from every room: the error enum, the notes with their numbers, the front door, the programs.
const GATHERERS: &[&str] = &["error", "note", "lib", "main", "bin"];

/// A path that the table does not allow but that stands for now, with its reason. An entry that is no longer needed
/// fails the test, so the list can only shrink.
const EXCEPTIONS: &[(&str, &str, &str)] = &[];

/// What only the command line may touch: disk, environment, other programs, network, clock, terminal.
const OUTER_WORLD: &[&str] = &[
    "std::fs",
    "std::env",
    "std::process",
    "std::net",
    "Instant::now",
    "SystemTime",
    "std::io::stdin",
    "std::io::stdout",
    "std::io::stderr",
    "indicatif::",
    "clap::",
];

/// Rooms that may serialise, through structs of their own: bench files, results, scenes and their truth.
const MAY_SERIALISE: &[&str] = &["bench", "calibration", "report", "log", "synth", "cli"];

fn root(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

fn rust_files(folder: &Path, found: &mut Vec<PathBuf>) {
    let Ok(entries) = fs::read_dir(folder) else { return };
    let mut entries: Vec<PathBuf> = entries.map(|entry| entry.unwrap().path()).collect();
    entries.sort();
    for path in entries {
        if path.is_dir() {
            rust_files(&path, found);
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            found.push(path);
        }
    }
}

/// One source file of the library, without comments, literals and test code.
struct Source {
    path: PathBuf,
    /// First word of the path below src.
    room: String,
    /// How many `super::` lead from this file to the crate.
    depth: usize,
    code: String,
}

/// Every file of src that is part of the shipped program.
fn shipped() -> Vec<Source> {
    let src = root("src");
    let mut files = Vec::new();
    rust_files(&src, &mut files);
    let mut sources = Vec::new();
    let mut test_files = BTreeSet::new();
    for path in files {
        let code = bare(&fs::read_to_string(&path).unwrap());
        let (code, tests) = without_test_code(&code);
        let folder = if path.ends_with("mod.rs") { path.parent().unwrap().to_path_buf() } else { path.with_extension("") };
        let folder = if path.parent() == Some(&src) && path.ends_with("lib.rs") { src.clone() } else { folder };
        for name in tests {
            test_files.extend([path.parent().unwrap().join(format!("{name}.rs")), folder.join(format!("{name}.rs"))]);
        }
        let below: Vec<String> =
            path.strip_prefix(&src).unwrap().with_extension("").iter().map(|part| part.to_str().unwrap().to_owned()).collect();
        let depth = below.iter().filter(|part| *part != "mod").count();
        sources.push(Source { room: below[0].clone(), depth, code, path });
    }
    sources.retain(|source| !test_files.contains(&source.path));
    assert!(sources.len() > 20, "only {} files found below {}", sources.len(), src.display());
    sources
}

/// Replaces comments, strings and characters by blanks, so that only code is read.
fn bare(text: &str) -> String {
    let bytes = text.as_bytes();
    let mut out = String::with_capacity(text.len());
    let mut i = 0;
    while i < bytes.len() {
        let rest = &text[i..];
        let skipped = if rest.starts_with("//") {
            rest.find('\n').unwrap_or(rest.len())
        } else if rest.starts_with("/*") {
            rest.find("*/").map_or(rest.len(), |end| end + 2)
        } else if rest.starts_with("r\"") || rest.starts_with("r#") {
            raw_string(rest)
        } else if rest.starts_with('"') {
            string(rest)
        } else if rest.starts_with('\'') {
            character(rest)
        } else {
            0
        };
        if skipped > 0 {
            out.push(' ');
            i += skipped;
        } else {
            let letter = rest.chars().next().unwrap();
            out.push(letter);
            i += letter.len_utf8();
        }
    }
    out
}

fn string(rest: &str) -> usize {
    let mut escaped = false;
    for (at, letter) in rest.char_indices().skip(1) {
        match letter {
            _ if escaped => escaped = false,
            '\\' => escaped = true,
            '"' => return at + 1,
            _ => {}
        }
    }
    rest.len()
}

/// Length of a raw string; zero for a raw identifier or anything else.
fn raw_string(rest: &str) -> usize {
    let fence = rest[1..].bytes().take_while(|b| *b == b'#').count();
    if rest.as_bytes().get(1 + fence) != Some(&b'"') {
        return 0;
    }
    let close = format!("\"{}", "#".repeat(fence));
    rest[2 + fence..].find(&close).map_or(rest.len(), |end| 2 + fence + end + close.len())
}

/// Length of a character literal; zero for a lifetime.
fn character(rest: &str) -> usize {
    let letters: Vec<(usize, char)> = rest.char_indices().take(12).collect();
    match letters.get(1) {
        Some((_, '\\')) => letters.iter().skip(3).find(|(_, letter)| *letter == '\'').map_or(0, |(at, _)| at + 1),
        Some(_) => letters.get(2).filter(|(_, letter)| *letter == '\'').map_or(0, |(at, _)| at + 1),
        None => 0,
    }
}

/// Cuts out every item under `#[cfg(test)]`; gives the names of modules that were declared there.
fn without_test_code(code: &str) -> (String, Vec<String>) {
    let (mut kept, mut modules, mut rest) = (String::new(), Vec::new(), code);
    while let Some(at) = rest.find("#[cfg(test)]") {
        kept.push_str(&rest[..at]);
        let item = &rest[at + "#[cfg(test)]".len()..];
        let end = item.find([';', '{']).unwrap_or(item.len());
        if item[end..].starts_with('{') {
            rest = &item[end + matching_brace(&item[end..])..];
            continue;
        }
        modules.extend(item[..end].split_whitespace().skip_while(|word| *word != "mod").nth(1).map(str::to_owned));
        rest = item.get(end + 1..).unwrap_or("");
    }
    kept.push_str(rest);
    (kept, modules)
}

/// Length of the text up to the brace that closes the first one.
fn matching_brace(text: &str) -> usize {
    let mut depth = 0_usize;
    for (at, letter) in text.char_indices() {
        match letter {
            '{' => depth += 1,
            '}' => depth = depth.saturating_sub(1),
            _ => {}
        }
        if depth == 0 {
            return at + 1;
        }
    }
    text.len()
}

/// First words of every path that starts with `prefix`, use trees included: `crate::{a::b, c}` gives a and c.
fn first_words(code: &str, prefix: &str) -> Vec<String> {
    let mut words = Vec::new();
    for (at, _) in code.match_indices(prefix) {
        let before = code[..at].chars().next_back();
        if before.is_some_and(|letter| letter.is_alphanumeric() || letter == '_' || letter == ':') {
            continue;
        }
        let tail = code[at + prefix.len()..].trim_start();
        if tail.starts_with('{') {
            words.extend(branches(&tail[1..matching_brace(tail)]));
        } else {
            words.extend(identifier(tail));
        }
    }
    words
}

fn branches(tree: &str) -> Vec<String> {
    let (mut words, mut depth, mut start) = (Vec::new(), 0_usize, 0);
    for (at, letter) in tree.char_indices() {
        match letter {
            '{' => depth += 1,
            '}' => depth = depth.saturating_sub(1),
            ',' if depth == 0 => {
                words.extend(identifier(tree[start..at].trim_start()));
                start = at + 1;
            }
            _ => {}
        }
    }
    words.extend(identifier(tree[start..].trim_start()));
    words
}

fn identifier(text: &str) -> Option<String> {
    let word: String = text.chars().take_while(|letter| letter.is_alphanumeric() || *letter == '_').collect();
    (!word.is_empty()).then_some(word)
}

/// The table with everything that follows from it.
fn closure() -> BTreeMap<&'static str, BTreeSet<&'static str>> {
    let mut all: BTreeMap<&str, BTreeSet<&str>> = MAY_USE.iter().map(|(room, uses)| (*room, uses.iter().copied().collect())).collect();
    loop {
        let before: usize = all.values().map(BTreeSet::len).sum();
        let snapshot = all.clone();
        for uses in all.values_mut() {
            let further: Vec<&str> = uses.iter().flat_map(|used| snapshot[used].iter().copied()).collect();
            uses.extend(further);
        }
        if all.values().map(BTreeSet::len).sum::<usize>() == before {
            return all;
        }
    }
}

/// Rooms that a file names, by `crate::` or by enough `super::`.
fn rooms_named(source: &Source) -> BTreeSet<String> {
    let up = "super::".repeat(source.depth);
    first_words(&source.code, "crate::").into_iter().chain(first_words(&source.code, &up)).collect()
}

#[test]
fn rooms_use_only_what_the_table_allows() {
    let allowed = closure();
    let mut wrong = Vec::new();
    let mut excused = BTreeSet::new();
    for source in shipped().iter().filter(|source| !GATHERERS.contains(&source.room.as_str())) {
        let Some(uses) = allowed.get(source.room.as_str()) else {
            assert!(OPEN.contains(&source.room.as_str()), "room {} is not in the table of this test", source.room);
            continue;
        };
        for named in rooms_named(source) {
            // a word that is no room is a macro or an item of the crate's root
            let is_room = MAY_USE.iter().any(|(room, _)| *room == named);
            if !is_room || named == source.room || uses.contains(named.as_str()) || OPEN.contains(&named.as_str()) {
                continue;
            }
            match EXCEPTIONS.iter().find(|(from, to, _)| *from == source.room && *to == named) {
                Some(exception) => {
                    excused.insert(exception);
                }
                None => wrong.push(format!("{}: {} may not use {named}", source.path.display(), source.room)),
            }
        }
    }
    assert!(wrong.is_empty(), "paths against the table:\n{}", wrong.join("\n"));
    for exception in EXCEPTIONS {
        assert!(excused.contains(exception), "the exception {} -> {} is no longer needed; take it out", exception.0, exception.1);
    }
}

/// `math` names no other room at all, not even the open ones except errors of its own.
#[test]
fn math_stands_alone() {
    for source in shipped().iter().filter(|source| source.room == "math") {
        let foreign: Vec<String> = rooms_named(source).into_iter().filter(|named| named != "math").collect();
        assert!(foreign.is_empty(), "{} names {foreign:?}", source.path.display());
    }
}

#[test]
fn only_the_command_line_touches_the_outer_world() {
    let mut wrong = Vec::new();
    for source in shipped().iter().filter(|source| !["cli", "main", "bin"].contains(&source.room.as_str())) {
        let grouped = first_words(&source.code, "std::").into_iter().map(|word| format!("std::{word}"));
        let grouped: BTreeSet<String> = grouped.collect();
        for outer in OUTER_WORLD {
            if source.code.contains(outer) || grouped.contains(*outer) {
                wrong.push(format!("{}: {outer}", source.path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "only cli may touch disk, environment, clock and terminal:\n{}", wrong.join("\n"));
}

#[test]
fn inner_types_are_not_serialised() {
    let mut wrong = Vec::new();
    for source in shipped().iter().filter(|source| !MAY_SERIALISE.contains(&source.room.as_str())) {
        if ["serde::", "serde_json::", "Serialize", "Deserialize", "toml::"].iter().any(|word| source.code.contains(word)) {
            wrong.push(source.path.display().to_string());
        }
    }
    assert!(wrong.is_empty(), "only {MAY_SERIALISE:?} read or write formats:\n{}", wrong.join("\n"));
}

/// Tags such as `[JCGM100]`, in backticks, that comments of src and tests refer to.
fn tags(text: &str) -> Vec<String> {
    let tag = |piece: &str| {
        let word = piece.strip_prefix('[')?.strip_suffix(']')?;
        let named = word.len() >= 4 && word.starts_with(|c: char| c.is_ascii_uppercase());
        (named && word.chars().all(|c| c.is_ascii_alphanumeric() || c == '-')).then(|| word.to_owned())
    };
    let comments = text.lines().filter_map(|line| line.split_once("//").map(|(_, comment)| comment));
    comments.flat_map(|comment| comment.split('`').skip(1).step_by(2).filter_map(tag).collect::<Vec<_>>()).collect()
}

#[test]
fn every_source_named_is_listed() {
    let listed = fs::read_to_string(root("docs/sources.md")).unwrap();
    let mut files = Vec::new();
    rust_files(&root("src"), &mut files);
    rust_files(&root("tests"), &mut files);
    let mut count = 0;
    let mut missing = BTreeSet::new();
    for path in files {
        for tag in tags(&fs::read_to_string(&path).unwrap()) {
            count += 1;
            if !listed.contains(&format!("`[{tag}]`")) {
                missing.insert(format!("{}: [{tag}]", path.display()));
            }
        }
    }
    assert!(count > 10, "only {count} tags found; has their form changed?");
    assert!(missing.is_empty(), "not in docs/sources.md:\n{}", missing.into_iter().collect::<Vec<_>>().join("\n"));
}

/// A file in tests that main.rs does not name would never run; a reference script whose output is not kept checks nothing.
#[test]
fn every_test_file_runs() {
    let main = bare(&fs::read_to_string(root("tests/main.rs")).unwrap());
    for entry in fs::read_dir(root("tests")).unwrap() {
        let path = entry.unwrap().path();
        let name = path.file_stem().unwrap().to_str().unwrap().to_owned();
        if path.extension().is_some_and(|extension| extension == "rs") && name != "main" {
            assert!(main.contains(&format!("mod {name};")), "tests/{name}.rs is not named in tests/main.rs");
        }
    }
}

/// The reader above, on code small enough to see what it must find.
#[test]
fn the_reader_itself() {
    let code = "use crate::{bench::{Side, x}, math::rotation}; // crate::cli\nlet s = \"crate::report\"; let c = '\"'; crate::fit::go::<'a>();\n\
                #[cfg(test)]\nmod tests { use crate::synth; }\n#[cfg(test)]\nmod extra;\nsuper::super::photo::x(); mycrate::optics::y();";
    let (kept, modules) = without_test_code(&bare(code));
    assert_eq!(first_words(&kept, "crate::"), ["bench", "math", "fit"]);
    assert_eq!(first_words(&kept, &"super::".repeat(2)), ["photo"]);
    assert_eq!(modules, ["extra"]);
    assert_eq!(tags("/// Source: `[JCGM100]` and `[x]`, not `[air]` or `[[1, 2]]`."), ["JCGM100"]);
    assert_eq!(first_words("use std::{fs, path::Path}; std::env::var(x)", "std::"), ["fs", "path", "env"]);
}
