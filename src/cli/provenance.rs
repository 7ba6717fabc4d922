//! What a measurement is made from, for reports and the log: files with their fingerprints, flags, operator, time.

use super::{arguments::RecordFlags, measure::Loaded};
use crate::{
    bench::Overrides,
    digest::sha256_hex,
    report::{BenchText, PhotoDigest, PhotoRole, Provenance},
};

pub(super) fn provenance(record: &RecordFlags, flags: &Overrides, loaded: &Loaded) -> Provenance {
    let digest = |role| {
        move |(file, bytes): &(String, Vec<u8>)| PhotoDigest { file: file.clone(), role, sha256: sha256_hex(bytes), bytes: bytes.len() }
    };
    let patterns = loaded.patterns.iter().map(digest(PhotoRole::Pattern));
    Provenance {
        time: now(),
        operator: record.operator.clone(),
        remark: record.remark.clone(),
        sample_name: record.sample_name.clone().or_else(|| loaded.sample_name()),
        bench: loaded.bench_file.as_ref().map(|file| BenchText {
            file: file.path.display().to_string(),
            text: file.text.clone(),
            sha256: sha256_hex(file.text.as_bytes()),
        }),
        flags: flags.stated().into_iter().map(|(flag, text)| format!("{flag} \"{text}\"")).collect(),
        photos: patterns.chain(loaded.targets.iter().map(digest(PhotoRole::Target))).collect(),
    }
}

/// The moment, RFC 3339 in UTC with milliseconds: of one width, so that texts compare as times do.
pub(super) fn now() -> String {
    jiff::Timestamp::now().strftime("%Y-%m-%dT%H:%M:%S%.3fZ").to_string()
}

#[cfg(test)]
mod tests {
    #[test]
    fn the_moment_is_of_one_width() {
        let now = super::now();
        assert!(now.len() == 24 && now.ends_with('Z') && now.as_bytes()[19] == b'.', "{now}");
        assert!(now.parse::<jiff::Timestamp>().is_ok());
    }
}
