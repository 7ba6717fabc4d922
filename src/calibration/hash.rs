//! SHA-256 (FIPS 180-4) as text.

use sha2::{Digest, Sha256};

/// SHA-256 of some bytes, 64 lower-case hexadecimal digits.
#[must_use]
pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The one-block example of FIPS 180-4 ("abc").
    #[test]
    fn the_published_example() {
        assert_eq!(sha256(b"abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    }
}
