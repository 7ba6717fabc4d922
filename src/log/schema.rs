//! The tables of the log and what guards them.

/// Says in the file's header whose it is: "SPRL".
pub(super) const APPLICATION_ID: i64 = 0x5350_524C;

/// Format of the tables.
pub(super) const VERSION: i64 = 1;

/// - `entry`: the canonical text of each entry and its hash. All that is searched for is generated from that text, so that it cannot say anything else.
/// - `result`: the full result of an entry; its hash stands in the entry. Apart, so that lists need not read past it.
/// - `document`: texts of bench files, each once, by hash.
/// - `head`: one row with the number of entries and the hash of the last one, so that entries missing at the end are noticed.
///
/// The triggers stop every change by honest programs, and by the `OR REPLACE` that would slip past a ban on deletion. Who takes the triggers away
/// is found out by the chain.
pub(super) const TABLES: &str = "
CREATE TABLE entry (
    sequence INTEGER PRIMARY KEY,
    sha256 TEXT NOT NULL,
    body TEXT NOT NULL,
    time TEXT GENERATED ALWAYS AS (body ->> '$.time') VIRTUAL,
    sample TEXT GENERATED ALWAYS AS (body ->> '$.sample') VIRTUAL,
    operator TEXT GENERATED ALWAYS AS (body ->> '$.operator') VIRTUAL,
    outcome TEXT GENERATED ALWAYS AS (body ->> '$.outcome') VIRTUAL,
    bench_sha256 TEXT GENERATED ALWAYS AS (body ->> '$.bench.sha256') VIRTUAL,
    photo_sha256 TEXT GENERATED ALWAYS AS (body ->> '$.photos[0].sha256') VIRTUAL,
    corrects INTEGER GENERATED ALWAYS AS (body ->> '$.corrects') VIRTUAL
) STRICT;
CREATE INDEX entry_time ON entry (time);
CREATE INDEX entry_sample ON entry (sample);
CREATE INDEX entry_operator ON entry (operator);
CREATE INDEX entry_outcome ON entry (outcome);
CREATE INDEX entry_bench ON entry (bench_sha256);
CREATE INDEX entry_photo ON entry (photo_sha256);
CREATE INDEX entry_corrects ON entry (corrects) WHERE corrects IS NOT NULL;
CREATE TABLE result (sequence INTEGER PRIMARY KEY, json TEXT NOT NULL) STRICT;
CREATE TABLE document (sha256 TEXT PRIMARY KEY, text TEXT NOT NULL) STRICT;
CREATE TABLE head (only_row INTEGER PRIMARY KEY CHECK (only_row = 1), count INTEGER NOT NULL, sha256 TEXT NOT NULL) STRICT;
INSERT INTO head VALUES (1, 0, '0000000000000000000000000000000000000000000000000000000000000000');
CREATE TRIGGER entry_follows BEFORE INSERT ON entry WHEN NEW.sequence IS NOT (SELECT count + 1 FROM head)
    BEGIN SELECT RAISE(ABORT, 'an entry follows the last one'); END;
CREATE TRIGGER entry_stays BEFORE UPDATE ON entry BEGIN SELECT RAISE(ABORT, 'the log is append-only: enter a correction'); END;
CREATE TRIGGER entry_remains BEFORE DELETE ON entry BEGIN SELECT RAISE(ABORT, 'the log is append-only: enter a correction'); END;
CREATE TRIGGER result_once BEFORE INSERT ON result WHEN EXISTS (SELECT 1 FROM result WHERE sequence = NEW.sequence)
    BEGIN SELECT RAISE(ABORT, 'the log is append-only: the entry has its result'); END;
CREATE TRIGGER result_stays BEFORE UPDATE ON result BEGIN SELECT RAISE(ABORT, 'the log is append-only: enter a correction'); END;
CREATE TRIGGER result_remains BEFORE DELETE ON result BEGIN SELECT RAISE(ABORT, 'the log is append-only: enter a correction'); END;
CREATE TRIGGER document_once BEFORE INSERT ON document WHEN EXISTS (SELECT 1 FROM document WHERE sha256 = NEW.sha256)
    BEGIN SELECT RAISE(ABORT, 'the log is append-only: the text is there'); END;
CREATE TRIGGER document_stays BEFORE UPDATE ON document BEGIN SELECT RAISE(ABORT, 'the log is append-only'); END;
CREATE TRIGGER document_remains BEFORE DELETE ON document BEGIN SELECT RAISE(ABORT, 'the log is append-only'); END;
CREATE TRIGGER head_once BEFORE INSERT ON head BEGIN SELECT RAISE(ABORT, 'the log has one head'); END;
CREATE TRIGGER head_grows BEFORE UPDATE ON head WHEN NEW.count IS NOT OLD.count + 1
    BEGIN SELECT RAISE(ABORT, 'the log grows by one entry at a time'); END;
CREATE TRIGGER head_remains BEFORE DELETE ON head BEGIN SELECT RAISE(ABORT, 'the log has one head'); END;
";
