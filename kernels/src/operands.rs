//! Seed to operands: the ChaCha20 key stream of RFC 8439, keyed by the case.
//!
//! Key bytes: seed (u64, little endian), size (u32, little endian), kernel id (ASCII, zero-padded to 20).
//! Nonce zero, block counter from zero; the stream is read as little-endian words. The references and the
//! witnesses each read the same stream through a ChaCha20 of their own.

use rand_chacha::ChaCha20Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

use crate::kernel::Case;

/// The key of a case's operand stream.
pub fn key(case: &Case) -> [u8; 32] {
    let mut key = [0u8; 32];
    key[..8].copy_from_slice(&case.seed.0.to_le_bytes());
    key[8..12].copy_from_slice(&case.size.0.to_le_bytes());
    let id = case.kernel.as_bytes();
    assert!(id.len() <= 20, "kernel ids have at most 20 bytes");
    key[12..12 + id.len()].copy_from_slice(id);
    key
}

/// The operand stream of one case, with its words counted.
pub struct Operands {
    stream: ChaCha20Rng,
    drawn: usize,
}

impl Operands {
    /// The stream of `case`, at its start.
    pub fn new(case: &Case) -> Operands {
        Operands { stream: ChaCha20Rng::from_seed(key(case)), drawn: 0 }
    }

    /// The next eight bytes of the stream.
    pub fn word(&mut self) -> u64 {
        self.drawn += 1;
        self.stream.next_u64()
    }

    /// The next `count` words.
    pub fn words(&mut self, count: usize) -> Vec<u64> {
        (0..count).map(|_| self.word()).collect()
    }

    /// Ends the stream; a kernel states how many words it meant to draw.
    ///
    /// # Panics
    /// When another number was drawn: kernel, reference and witness would no longer speak of the same operands.
    pub fn finish(self, expected: usize) {
        assert_eq!(self.drawn, expected, "operand count differs from the kernel's statement");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// RFC 8439 appendix A.1 test vector 1: key, nonce and counter zero.
    #[test]
    fn stream_is_rfc_8439() {
        let mut stream = ChaCha20Rng::from_seed([0; 32]);
        let first: Vec<u8> = (0..2).flat_map(|_| stream.next_u64().to_le_bytes()).collect();
        assert_eq!(
            first,
            [0x76, 0xb8, 0xe0, 0xad, 0xa0, 0xf1, 0x3d, 0x90, 0x40, 0x5d, 0x6a, 0xe5, 0x53, 0x86, 0xbd, 0x28]
        );
    }
}
