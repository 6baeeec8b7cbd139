//! SHA-256 values as the ledger writes them: 64 lowercase hexadecimal digits.

use std::fmt;

use serde::{Serialize, Serializer};
use sha2::{Digest as _, Sha256};

/// A SHA-256 value.
#[derive(Clone, Copy, PartialEq, Eq, Hash)]
pub struct Digest([u8; 32]);

impl Digest {
    /// SHA-256 of `bytes`.
    pub fn of(bytes: &[u8]) -> Digest {
        Digest(Sha256::digest(bytes).into())
    }

    /// Reads exactly 64 lowercase hexadecimal digits. Upper case is refused, so that one value has one spelling.
    pub fn from_hex(hex: &[u8]) -> Option<Digest> {
        if hex.len() != 64 {
            return None;
        }
        let mut out = [0u8; 32];
        for (byte, pair) in out.iter_mut().zip(hex.chunks_exact(2)) {
            *byte = nibble(pair[0])? << 4 | nibble(pair[1])?;
        }
        Some(Digest(out))
    }

    /// The 64 digits.
    pub fn to_hex(self) -> [u8; 64] {
        const DIGITS: &[u8; 16] = b"0123456789abcdef";
        let mut out = [0u8; 64];
        for (pair, byte) in out.chunks_exact_mut(2).zip(self.0) {
            pair[0] = DIGITS[usize::from(byte >> 4)];
            pair[1] = DIGITS[usize::from(byte & 15)];
        }
        out
    }
}

fn nibble(digit: u8) -> Option<u8> {
    match digit {
        b'0'..=b'9' => Some(digit - b'0'),
        b'a'..=b'f' => Some(digit - b'a' + 10),
        _ => None,
    }
}

impl fmt::Display for Digest {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.iter().try_for_each(|byte| write!(f, "{byte:02x}"))
    }
}

impl fmt::Debug for Digest {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Display::fmt(self, f)
    }
}

impl Serialize for Digest {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.collect_str(self)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-4 example, "abc".
    const ABC: &str = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";

    #[test]
    fn agrees_with_the_standard() {
        assert_eq!(Digest::of(b"abc").to_string(), ABC);
        assert_eq!(Digest::of(b"abc").to_hex(), ABC.as_bytes());
    }

    #[test]
    fn one_spelling_only() {
        assert_eq!(Digest::from_hex(ABC.as_bytes()), Some(Digest::of(b"abc")));
        for wrong in [&ABC.to_uppercase(), &ABC[1..], "", &ABC.replace('a', "g"), &format!("{ABC}0")] {
            assert_eq!(Digest::from_hex(wrong.as_bytes()), None, "{wrong}");
        }
    }
}
