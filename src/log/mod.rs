//! In: the JSON of results, with the texts of bench files. Out: an append-only log in one SQLite file, and whether it is still what was written.
//! Must never know: how a result was made, what time it is (it is told). Touches one file, through SQLite.
//! Start reading at [`Log`]; the chain is explained at [`Entry`], the tables in `schema.rs`.

mod draft;
mod entry;
mod error;
mod export;
mod query;
mod schema;
mod store;
#[cfg(test)]
mod tamper_test;
mod verify;

pub use draft::Draft;
pub use entry::{BenchReference, Entry, Kind, Outcome, PhotoReference, ProgramReference, Reading};
pub use error::LogError;
pub use export::{CSV_HEADER, csv_row, line, line_schema};
pub use query::{Filter, Listed, Shown};
pub use store::{Appended, Log};
pub use verify::{Finding, Verification};
