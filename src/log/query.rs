//! Finding entries.

use super::{Entry, Log, LogError, Outcome, store};
use rusqlite::{OptionalExtension, Row, types::Value};

/// Which entries are wanted; the default is all.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Filter {
    /// Name of the sample; `*` and `?` stand for any letters and any one letter.
    pub sample: Option<String>,
    /// Operator, in the same way.
    pub operator: Option<String>,
    /// Beginning of the bench file's SHA-256.
    pub bench_sha256: Option<String>,
    /// Outcome.
    pub outcome: Option<Outcome>,
    /// Entered at this time or later, RFC 3339 in UTC.
    pub since: Option<String>,
    /// Entered before this time.
    pub before: Option<String>,
    /// Entries below this number, for the next page.
    pub below: Option<u64>,
}

/// An entry as a list shows it.
#[derive(Debug, Clone, PartialEq)]
pub struct Listed {
    /// The entry.
    pub entry: Entry,
    /// Its hash.
    pub sha256: String,
    /// The newest correction of it.
    pub corrected_by: Option<u64>,
}

/// An entry with everything that belongs to it.
#[derive(Debug, Clone, PartialEq)]
pub struct Shown {
    /// The entry.
    pub listed: Listed,
    /// Its canonical text, as hashed.
    pub body: String,
    /// The full result, compact JSON.
    pub result: Option<String>,
    /// The bench file.
    pub bench_text: Option<String>,
}

const COLUMNS: &str = "entry.sequence, entry.sha256, entry.body, \
     (SELECT max(later.sequence) FROM entry AS later WHERE later.corrects = entry.sequence)";

impl Log {
    /// Number of entries and hash of the last one.
    ///
    /// # Errors
    /// [`LogError`].
    pub fn head(&self) -> Result<(u64, String), LogError> {
        store::head(&self.connection).map_err(|error| self.failed(&error))
    }

    /// The newest entries that fit, newest first, at most `most`.
    ///
    /// # Errors
    /// [`LogError`].
    pub fn list(&self, filter: &Filter, most: usize) -> Result<Vec<Listed>, LogError> {
        let (conditions, mut values) = conditions(filter);
        values.push(Value::Integer(i64::try_from(most).unwrap_or(i64::MAX)));
        let sql = format!("SELECT {COLUMNS} FROM entry{conditions} ORDER BY entry.sequence DESC LIMIT ?");
        let read = || {
            let mut statement = self.connection.prepare(&sql)?;
            let rows = statement.query_map(rusqlite::params_from_iter(values), listed)?;
            rows.collect::<rusqlite::Result<Vec<_>>>()
        };
        read().map_err(|error: rusqlite::Error| self.failed(&error))
    }

    /// Every entry that fits, oldest first, one after the other to `each`, which may end the walk by an error of its own.
    ///
    /// # Errors
    /// The first error of `each`, or a [`LogError`].
    pub fn walk<E: From<LogError>>(&self, filter: &Filter, mut each: impl FnMut(&Shown) -> Result<(), E>) -> Result<(), E> {
        let (conditions, values) = conditions(filter);
        let sql = format!(
            "SELECT {COLUMNS}, result.json, document.text FROM entry LEFT JOIN result ON result.sequence = entry.sequence \
             LEFT JOIN document ON document.sha256 = entry.bench_sha256{conditions} ORDER BY entry.sequence"
        );
        let failed = |error: rusqlite::Error| E::from(self.failed(&error));
        let mut statement = self.connection.prepare(&sql).map_err(failed)?;
        let mut rows = statement.query(rusqlite::params_from_iter(values)).map_err(failed)?;
        while let Some(row) = rows.next().map_err(failed)? {
            each(&shown(row).map_err(failed)?)?;
        }
        Ok(())
    }

    /// One entry with everything that belongs to it.
    ///
    /// # Errors
    /// [`LogError::NoEntry`] where there is none.
    pub fn entry(&self, number: u64) -> Result<Shown, LogError> {
        let sql = format!(
            "SELECT {COLUMNS}, result.json, document.text FROM entry LEFT JOIN result ON result.sequence = entry.sequence \
             LEFT JOIN document ON document.sha256 = entry.bench_sha256 WHERE entry.sequence = ?1"
        );
        let found = self.connection.query_row(&sql, [number], shown).optional().map_err(|error| self.failed(&error))?;
        match found {
            Some(found) => Ok(found),
            None => Err(LogError::NoEntry { path: self.path.clone(), entry: number, count: self.head()?.0 }),
        }
    }
}

fn conditions(filter: &Filter) -> (String, Vec<Value>) {
    let pattern = |text: &String| Value::Text(text.clone());
    let parts = [
        ("entry.sample GLOB ?", filter.sample.as_ref().map(|text| Value::Text(letters_or_wildcards(text)))),
        ("entry.operator GLOB ?", filter.operator.as_ref().map(|text| Value::Text(letters_or_wildcards(text)))),
        ("entry.bench_sha256 GLOB ?", filter.bench_sha256.as_ref().map(|hash| Value::Text(format!("{}*", letters_or_wildcards(hash))))),
        ("entry.outcome = ?", filter.outcome.map(|outcome| Value::Text(outcome.name().to_owned()))),
        ("entry.time >= ?", filter.since.as_ref().map(pattern)),
        ("entry.time < ?", filter.before.as_ref().map(pattern)),
        ("entry.sequence < ?", filter.below.map(|number| Value::Integer(i64::try_from(number).unwrap_or(i64::MAX)))),
    ];
    let stated: Vec<(&str, Value)> = parts.into_iter().filter_map(|(condition, value)| Some((condition, value?))).collect();
    let (conditions, values): (Vec<&str>, Vec<Value>) = stated.into_iter().unzip();
    let joined = if conditions.is_empty() { String::new() } else { format!(" WHERE {}", conditions.join(" AND ")) };
    (joined, values)
}

/// A square bracket is a letter here, no set of letters.
fn letters_or_wildcards(text: &str) -> String {
    text.replace('[', "[[]")
}

fn listed(row: &Row<'_>) -> rusqlite::Result<Listed> {
    let body: String = row.get(2)?;
    Ok(Listed { entry: parsed(&body)?, sha256: row.get(1)?, corrected_by: row.get(3)? })
}

fn shown(row: &Row<'_>) -> rusqlite::Result<Shown> {
    Ok(Shown { listed: listed(row)?, body: row.get(2)?, result: row.get(4)?, bench_text: row.get(5)? })
}

fn parsed(body: &str) -> rusqlite::Result<Entry> {
    serde_json::from_str(body).map_err(|error| rusqlite::Error::FromSqlConversionFailure(2, rusqlite::types::Type::Text, Box::new(error)))
}
