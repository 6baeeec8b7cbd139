//! The reference's own ChaCha20 (RFC 8439 §2.3), word by word, and the operand stream keyed by a case.

use kernels::Case;

fn quarter(s: &mut [u32; 16], a: usize, b: usize, c: usize, d: usize) {
    s[a] = s[a].wrapping_add(s[b]);
    s[d] = (s[d] ^ s[a]).rotate_left(16);
    s[c] = s[c].wrapping_add(s[d]);
    s[b] = (s[b] ^ s[c]).rotate_left(12);
    s[a] = s[a].wrapping_add(s[b]);
    s[d] = (s[d] ^ s[a]).rotate_left(8);
    s[c] = s[c].wrapping_add(s[d]);
    s[b] = (s[b] ^ s[c]).rotate_left(7);
}

fn block(initial: &[u32; 16]) -> [u32; 16] {
    let mut s = *initial;
    for _ in 0..10 {
        quarter(&mut s, 0, 4, 8, 12);
        quarter(&mut s, 1, 5, 9, 13);
        quarter(&mut s, 2, 6, 10, 14);
        quarter(&mut s, 3, 7, 11, 15);
        quarter(&mut s, 0, 5, 10, 15);
        quarter(&mut s, 1, 6, 11, 12);
        quarter(&mut s, 2, 7, 8, 13);
        quarter(&mut s, 3, 4, 9, 14);
    }
    for (word, start) in s.iter_mut().zip(initial) {
        *word = word.wrapping_add(*start);
    }
    s
}

/// The operand stream of a case: seed (u64), size (u32), kernel id (20 bytes) as the key, nonce and counter zero.
pub struct Stream {
    state: [u32; 16],
    buffer: [u32; 16],
    used: usize,
}

impl Stream {
    /// The stream of `case`, at its start.
    pub fn new(case: &Case) -> Stream {
        let mut key = Vec::with_capacity(32);
        key.extend_from_slice(&case.seed.0.to_le_bytes());
        key.extend_from_slice(&case.size.0.to_le_bytes());
        key.extend_from_slice(case.kernel.as_bytes());
        key.resize(32, 0);
        let mut state = [0u32; 16];
        state[..4].copy_from_slice(&[0x6170_7865, 0x3320_646e, 0x7962_2d32, 0x6b20_6574]);
        for (word, bytes) in state[4..12].iter_mut().zip(key.chunks_exact(4)) {
            *word = u32::from_le_bytes([bytes[0], bytes[1], bytes[2], bytes[3]]);
        }
        Stream { state, buffer: [0; 16], used: 16 }
    }

    fn half(&mut self) -> u32 {
        if self.used == 16 {
            self.buffer = block(&self.state);
            self.state[12] = self.state[12].wrapping_add(1);
            self.used = 0;
        }
        self.used += 1;
        self.buffer[self.used - 1]
    }

    /// The next eight bytes, little endian.
    pub fn word(&mut self) -> u64 {
        let low = u64::from(self.half());
        low | u64::from(self.half()) << 32
    }

    /// The next `count` words.
    pub fn words(&mut self, count: usize) -> Vec<u64> {
        (0..count).map(|_| self.word()).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// RFC 8439 §2.3.2: the block function's worked example.
    #[test]
    fn block_function_example() {
        let initial = [
            0x6170_7865,
            0x3320_646e,
            0x7962_2d32,
            0x6b20_6574,
            0x0302_0100,
            0x0706_0504,
            0x0b0a_0908,
            0x0f0e_0d0c,
            0x1312_1110,
            0x1716_1514,
            0x1b1a_1918,
            0x1f1e_1d1c,
            0x0000_0001,
            0x0900_0000,
            0x4a00_0000,
            0x0000_0000,
        ];
        let expected = [
            0xe4e7_f110,
            0x1559_3bd1,
            0x1fdd_0f50,
            0xc471_20a3,
            0xc7f4_d1c7,
            0x0368_c033,
            0x9aaa_2204,
            0x4e6c_d4c3,
            0x4664_82d2,
            0x09aa_9f07,
            0x05d7_c214,
            0xa202_8bd9,
            0xd19c_12b5,
            0xb94e_16de,
            0xe883_d0cb,
            0x4e3c_50a2,
        ];
        assert_eq!(block(&initial), expected);
    }
}
