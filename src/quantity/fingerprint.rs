//! Content fingerprints: SHA-256 in lower-case hex, so that a file, a model or
//! a site file can be named by what it holds.

use std::fmt::Write;

use sha2::{Digest, Sha256};

/// SHA-256 of some bytes, hex.
#[must_use]
pub fn sha256_hex(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

/// Bytes as lower-case hex.
#[must_use]
pub fn hex(bytes: &[u8]) -> String {
    bytes.iter().fold(String::new(), |mut text, byte| {
        // Writing to a String cannot fail.
        let _ = write!(text, "{byte:02x}");
        text
    })
}

#[cfg(test)]
mod tests {
    /// FIPS 180-4 example for the message "abc".
    #[test]
    fn verify_sha256_of_abc() {
        assert_eq!(
            super::sha256_hex(b"abc"),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
    }
}
