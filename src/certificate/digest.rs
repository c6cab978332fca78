//! SHA-256 (FIPS 180-4) of an input, written in hexadecimal.

use serde::{Deserialize, Serialize};
use sha2::{Digest as _, Sha256};

/// Which bytes are meant.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Digest {
    /// SHA-256 in hexadecimal, lower case.
    pub sha256: String,
    /// How many bytes.
    pub bytes: u64,
}

impl Digest {
    /// The digest of `bytes`.
    pub fn of(bytes: &[u8]) -> Digest {
        Digest {
            sha256: sha256(bytes),
            bytes: bytes.len() as u64,
        }
    }
}

/// SHA-256 of `bytes` in hexadecimal, lower case.
pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The example "abc" of FIPS 180-4 (NIST, "SHA-256 example", one-block message).
    #[test]
    fn the_example_of_the_standard() {
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(sha256(b"abc"), expected);
        assert_eq!(Digest::of(b"abc").bytes, 3);
    }
}
