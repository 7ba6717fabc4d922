//! SHA-256, the fingerprint of photos, bench files and log entries, as 64 hexadecimal digits.

use sha2::{Digest, Sha256};
use std::fmt::Write;

/// SHA-256 of `bytes` in lower-case hexadecimal digits (FIPS 180-4).
///
/// ```
/// // the example of the standard
/// assert_eq!(spotrule::digest::sha256_hex(b"abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
/// ```
#[must_use]
pub fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().fold(String::with_capacity(64), |mut text, byte| {
        // Writing to a string cannot fail.
        let _ = write!(text, "{byte:02x}");
        text
    })
}
