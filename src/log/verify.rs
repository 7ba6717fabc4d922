//! Whether the log is still what was written.

use super::{Entry, Log, LogError, entry::NO_PREVIOUS, schema::TABLES, store};
use crate::digest::sha256_hex;
use rusqlite::Connection;
use std::{
    collections::{BTreeMap, BTreeSet},
    fmt,
};

/// What a check of the log found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Verification {
    /// Entries read.
    pub entries: u64,
    /// Hash of the last entry read.
    pub head: String,
    /// What is wrong; empty when nothing is.
    pub findings: Vec<Finding>,
    /// The entry that carries the expected hash, where one was asked for and found.
    pub expected_at: Option<u64>,
    /// Entries that are dated before the one before them: a clock that was set back, or a wrong date.
    pub dated_back: Vec<u64>,
}

/// One thing that is wrong, named by the entry.
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
pub enum Finding {
    /// Text and hash do not agree.
    Changed {
        /// Number of the entry.
        entry: u64,
    },
    /// The text of another entry stands here.
    Displaced {
        /// Its place.
        entry: u64,
        /// What it says of itself.
        says: u64,
    },
    /// It does not follow the entry before it: that one was exchanged whole, or this one was.
    Unchained {
        /// Number of the entry.
        entry: u64,
    },
    /// Entries that are not there.
    Missing {
        /// First one.
        from: u64,
        /// Last one.
        to: u64,
    },
    /// The text cannot be read as an entry.
    Unreadable {
        /// Number of the entry.
        entry: u64,
    },
    /// The full result is not the one that was entered.
    ResultChanged {
        /// Number of the entry.
        entry: u64,
    },
    /// The full result is gone.
    ResultMissing {
        /// Number of the entry.
        entry: u64,
    },
    /// The bench file's text is not the one that was entered.
    BenchChanged {
        /// First entry that names it.
        entry: u64,
    },
    /// The bench file's text is gone.
    BenchMissing {
        /// First entry that names it.
        entry: u64,
    },
    /// The head names another last entry.
    Head {
        /// Entries that the head counts.
        counted: u64,
        /// Entries that are there.
        found: u64,
    },
    /// No entry carries the hash that was expected.
    Expected {
        /// The hash.
        sha256: String,
    },
    /// Tables, indices or triggers are not those of a log.
    Guard {
        /// Their names.
        names: Vec<String>,
    },
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Changed { entry } => write!(f, "entry {entry} was changed: its text does not have its hash"),
            Self::Displaced { entry, says } => write!(f, "entry {entry} was reordered: the text says that it is entry {says}"),
            Self::Unchained { entry } => {
                write!(f, "entry {entry} does not follow entry {}: one of the two was exchanged for another", entry.saturating_sub(1))
            }
            Self::Missing { from, to } if from == to => write!(f, "entry {from} was removed"),
            Self::Missing { from, to } => write!(f, "entries {from} to {to} were removed"),
            Self::Unreadable { entry } => write!(f, "entry {entry} cannot be read: its text is no entry"),
            Self::ResultChanged { entry } => write!(f, "the result of entry {entry} was changed"),
            Self::ResultMissing { entry } => write!(f, "the result of entry {entry} was removed"),
            Self::BenchChanged { entry } => write!(f, "the bench file of entry {entry} was changed"),
            Self::BenchMissing { entry } => write!(f, "the bench file of entry {entry} was removed"),
            Self::Head { counted, found } if counted > found => {
                write!(f, "the last entries were removed: the log counts {counted}, {found} are there")
            }
            Self::Head { counted, found } => {
                write!(
                    f,
                    "the head of the log was changed: it counts {counted} entries and does not name the last of the {found} that are there"
                )
            }
            Self::Expected { sha256 } => {
                write!(
                    f,
                    "no entry has the expected hash {sha256}: entries were removed or changed since it was noted, or it is of another log"
                )
            }
            Self::Guard { names } => write!(f, "what keeps the log from being changed was itself changed: {}", names.join(", ")),
        }
    }
}

/// The walk along the chain.
struct Walk {
    report: Verification,
    /// Hash that the next entry must name.
    previous: String,
    last_number: u64,
    last_time: String,
    /// Hash of each bench file whose text is kept, and the first entry that names it.
    benches: BTreeMap<String, u64>,
}

impl Log {
    /// Reads every entry in order and checks: hash of each text, place, chain, results, bench files, head, triggers, and whether some entry has the
    /// hash `expected` (noted earlier, for example on a printed report).
    ///
    /// Entries are read one at a time. What is found wrong does not end the walk: it goes on from what stands there, so that each fault is named once.
    /// Who can write the file and knows this page can make a new chain of everything from some entry on: only a hash that was noted elsewhere tells.
    ///
    /// # Errors
    /// When the file cannot be read at all.
    pub fn verify(&self, expected: Option<&str>) -> Result<Verification, LogError> {
        self.verified(expected).map_err(|error| self.failed(&error))
    }

    fn verified(&self, expected: Option<&str>) -> rusqlite::Result<Verification> {
        // One state of the log, whatever others append meanwhile.
        let transaction = self.connection.unchecked_transaction()?;
        let report = Verification { entries: 0, head: NO_PREVIOUS.to_owned(), findings: vec![], expected_at: None, dated_back: vec![] };
        let mut walk =
            Walk { report, previous: NO_PREVIOUS.to_owned(), last_number: 0, last_time: String::new(), benches: BTreeMap::new() };
        walk.guards(&transaction)?;
        let mut statement = transaction.prepare(
            "SELECT entry.sequence, entry.sha256, entry.body, result.json FROM entry LEFT JOIN result ON result.sequence = entry.sequence ORDER BY entry.sequence",
        )?;
        let mut rows = statement.query([])?;
        while let Some(row) = rows.next()? {
            let text = |column: usize| row.get_ref(column).map(|value| value.as_bytes_or_null().ok().flatten().unwrap_or_default());
            walk.entry(row.get(0)?, text(1)?, text(2)?, row.get_ref(3)?.as_bytes_or_null().unwrap_or_default(), expected);
        }
        walk.documents(&transaction)?;
        walk.end(&store::head(&transaction).unwrap_or_default(), expected);
        Ok(walk.report)
    }
}

impl Walk {
    fn entry(&mut self, number: u64, sha256: &[u8], body: &[u8], result: Option<&[u8]>, expected: Option<&str>) {
        let sha256 = String::from_utf8_lossy(sha256).into_owned();
        if number > self.last_number + 1 {
            self.found(Finding::Missing { from: self.last_number + 1, to: number - 1 });
        }
        let is_intact = sha256_hex(body) == sha256;
        match serde_json::from_slice::<Entry>(body) {
            Err(_) if is_intact => self.found(Finding::Unreadable { entry: number }),
            Err(_) => self.found(Finding::Changed { entry: number }),
            Ok(entry) if entry.entry != number => self.found(Finding::Displaced { entry: number, says: entry.entry }),
            Ok(_) if !is_intact => self.found(Finding::Changed { entry: number }),
            Ok(entry) => self.follows(number, &entry, result),
        }
        if expected == Some(sha256.as_str()) {
            self.report.expected_at = Some(number);
        }
        self.report.entries += 1;
        self.last_number = number;
        self.report.head.clone_from(&sha256);
        self.previous = sha256;
    }

    /// An entry whose own text is sound: its place in the chain and what belongs to it.
    fn follows(&mut self, number: u64, entry: &Entry, result: Option<&[u8]>) {
        // After a gap the chain cannot close; that was said already.
        if entry.previous != self.previous && number == self.last_number + 1 {
            self.found(Finding::Unchained { entry: number });
        }
        match (&entry.result_sha256, result) {
            (Some(stated), Some(result)) if sha256_hex(result) != *stated => self.found(Finding::ResultChanged { entry: number }),
            (Some(_), None) => self.found(Finding::ResultMissing { entry: number }),
            (None, Some(_)) => self.found(Finding::ResultChanged { entry: number }),
            _ => {}
        }
        if let Some(bench) = entry.bench.as_ref().filter(|bench| bench.text_kept) {
            self.benches.entry(bench.sha256.clone()).or_insert(number);
        }
        if entry.time < self.last_time {
            self.report.dated_back.push(number);
        }
        self.last_time.clone_from(&entry.time);
    }

    fn documents(&mut self, connection: &Connection) -> rusqlite::Result<()> {
        let mut statement = connection.prepare("SELECT sha256, text FROM document")?;
        let mut rows = statement.query([])?;
        while let Some(row) = rows.next()? {
            let (stated, text): (String, String) = (row.get(0)?, row.get(1)?);
            let entry = self.benches.remove(&stated).unwrap_or(0);
            if sha256_hex(text.as_bytes()) != stated {
                self.found(Finding::BenchChanged { entry });
            }
        }
        let missing: Vec<Finding> = self.benches.values().map(|&entry| Finding::BenchMissing { entry }).collect();
        self.report.findings.extend(missing);
        Ok(())
    }

    /// Everything that the tables of a new log have, word for word.
    fn guards(&mut self, connection: &Connection) -> rusqlite::Result<()> {
        let sound = Connection::open_in_memory()?;
        sound.execute_batch(TABLES)?;
        let (wanted, there) = (definitions(&sound)?, definitions(connection)?);
        let names: BTreeSet<String> = wanted.symmetric_difference(&there).map(|(name, _)| name.clone()).collect();
        if !names.is_empty() {
            self.found(Finding::Guard { names: names.into_iter().collect() });
        }
        Ok(())
    }

    fn end(&mut self, (counted, head): &(u64, String), expected: Option<&str>) {
        if *counted != self.last_number || *head != self.report.head {
            self.found(Finding::Head { counted: *counted, found: self.last_number });
        }
        if let (Some(sha256), None) = (expected, self.report.expected_at) {
            self.found(Finding::Expected { sha256: sha256.to_owned() });
        }
    }

    fn found(&mut self, finding: Finding) {
        self.report.findings.push(finding);
    }
}

fn definitions(connection: &Connection) -> rusqlite::Result<BTreeSet<(String, String)>> {
    // What SQLite makes for itself (statistics, indices of primary keys) is no part of the definition.
    let mut statement = connection.prepare("SELECT name, sql FROM sqlite_schema WHERE name NOT LIKE 'sqlite\\_%' ESCAPE '\\'")?;
    let rows = statement.query_map([], |row| Ok((row.get(0)?, row.get::<_, Option<String>>(1)?.unwrap_or_default())))?;
    rows.collect()
}
