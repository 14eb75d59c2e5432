//! SHA-256 digests (FIPS 180-4) and their text form.

use sha2::{Digest as _, Sha256};

/// A SHA-256 digest.
pub type Hash = [u8; 32];

/// The digest of some bytes.
pub fn sha256(bytes: &[u8]) -> Hash {
    Sha256::digest(bytes).into()
}

/// The digest of some bytes in lower-case hexadecimal, as `sha256sum` prints it.
pub fn sha256_hex(bytes: &[u8]) -> String {
    hex(&sha256(bytes))
}

/// Lower-case hexadecimal.
pub fn hex(bytes: &[u8]) -> String {
    const DIGITS: &[u8; 16] = b"0123456789abcdef";
    bytes
        .iter()
        .flat_map(|b| [DIGITS[usize::from(b >> 4)], DIGITS[usize::from(b & 15)]])
        .map(char::from)
        .collect()
}

/// Whether a text is a digest in lower-case hexadecimal.
pub fn is_hex_digest(text: &str) -> bool {
    text.len() == 64 && text.bytes().all(|b| matches!(b, b'0'..=b'9' | b'a'..=b'f'))
}
