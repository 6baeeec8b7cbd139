//! AES rounds in plain integer code: SubBytes and MixColumns as one table look-up a byte (FIPS 197 §5.1), the tables
//! computed from GF(2⁸) when the program is compiled.

use super::common_aes::{Block, Rounds};

const fn double(x: u8) -> u8 {
    x << 1 ^ if x & 0x80 == 0 { 0 } else { 0x1b }
}

/// The S-box by walking GF(2⁸)* with the generator 3 forwards and its inverse 0xf6 backwards in step.
const SBOX: [u8; 256] = {
    let mut table = [0; 256];
    table[0] = 0x63;
    let (mut x, mut inverse) = (1u8, 1u8);
    loop {
        let s = inverse;
        table[x as usize] = s ^ s.rotate_left(1) ^ s.rotate_left(2) ^ s.rotate_left(3) ^ s.rotate_left(4) ^ 0x63;
        x ^= double(x);
        // division by 3: the inverse of x ⊕ 2x is the prefix sum of bits, reduced
        inverse ^= inverse << 1;
        inverse ^= inverse << 2;
        inverse ^= inverse << 4;
        if inverse & 0x80 != 0 {
            inverse ^= 0x09;
        }
        if x == 1 {
            break;
        }
    }
    table
};

const INVERSE_SBOX: [u8; 256] = {
    let mut table = [0; 256];
    let mut x = 0;
    while x < 256 {
        table[SBOX[x] as usize] = x as u8;
        x += 1;
    }
    table
};

/// Column that MixColumns makes of a byte in row 0, after SubBytes: rows (2, 1, 1, 3).
static FORWARD: [u32; 256] = {
    let mut table = [0; 256];
    let mut x = 0;
    while x < 256 {
        let s = SBOX[x];
        table[x] = u32::from_le_bytes([double(s), s, s, double(s) ^ s]);
        x += 1;
    }
    table
};

const fn inverse_column(s: u8) -> u32 {
    let (two, four) = (double(s), double(double(s)));
    let eight = double(four);
    u32::from_le_bytes([eight ^ four ^ two, eight ^ s, eight ^ four ^ s, eight ^ two ^ s])
}

/// Column that InvMixColumns makes of a byte in row 0, after InvSubBytes: rows (14, 9, 13, 11).
static BACKWARD: [u32; 256] = {
    let mut table = [0; 256];
    let mut x = 0;
    while x < 256 {
        table[x] = inverse_column(INVERSE_SBOX[x]);
        x += 1;
    }
    table
};

static BYTES: [u8; 256] = SBOX;
static INVERSE_BYTES: [u8; 256] = INVERSE_SBOX;

/// Tables on the baseline instruction set.
#[derive(Clone, Copy)]
pub struct Soft;

fn row(x: u32, r: u32) -> usize {
    (x >> (8 * r) & 0xff) as usize
}

/// One round's columns; `step` is 1 for ShiftRows, 3 for its inverse.
#[inline(always)]
fn round(x: [u32; 4], k: [u32; 4], step: usize, table: &[u32; 256]) -> [u32; 4] {
    std::array::from_fn(|c| {
        table[row(x[c], 0)]
            ^ table[row(x[(c + step) % 4], 1)].rotate_left(8)
            ^ table[row(x[(c + 2 * step) % 4], 2)].rotate_left(16)
            ^ table[row(x[(c + 3 * step) % 4], 3)].rotate_left(24)
            ^ k[c]
    })
}

#[inline(always)]
fn last(x: [u32; 4], k: [u32; 4], step: usize, table: &[u8; 256]) -> [u32; 4] {
    std::array::from_fn(|c| {
        u32::from_le_bytes(std::array::from_fn(|r| table[row(x[(c + r * step) % 4], r as u32)])) ^ k[c]
    })
}

impl Rounds for Soft {
    type Blocks = [u32; 4];
    const WIDTH: usize = 1;

    #[inline(always)]
    fn load(self, from: &[Block]) -> [u32; 4] {
        self.spread(&from[0])
    }

    #[inline(always)]
    fn store(self, x: [u32; 4], to: &mut [Block]) {
        to[0] = [u64::from(x[0]) | u64::from(x[1]) << 32, u64::from(x[2]) | u64::from(x[3]) << 32];
    }

    #[inline(always)]
    fn spread(self, b: &Block) -> [u32; 4] {
        [b[0] as u32, (b[0] >> 32) as u32, b[1] as u32, (b[1] >> 32) as u32]
    }

    #[inline(always)]
    fn xor(self, x: [u32; 4], k: [u32; 4]) -> [u32; 4] {
        std::array::from_fn(|c| x[c] ^ k[c])
    }

    #[inline(always)]
    fn encrypt(self, x: [u32; 4], k: [u32; 4]) -> [u32; 4] {
        round(x, k, 1, &FORWARD)
    }

    #[inline(always)]
    fn encrypt_last(self, x: [u32; 4], k: [u32; 4]) -> [u32; 4] {
        last(x, k, 1, &BYTES)
    }

    #[inline(always)]
    fn decrypt(self, x: [u32; 4], k: [u32; 4]) -> [u32; 4] {
        round(x, k, 3, &BACKWARD)
    }

    #[inline(always)]
    fn decrypt_last(self, x: [u32; 4], k: [u32; 4]) -> [u32; 4] {
        last(x, k, 3, &INVERSE_BYTES)
    }

    #[inline(always)]
    fn inverse_mix(self, k: &Block) -> Block {
        let mixed = self.spread(k).map(|w| {
            let b = w.to_le_bytes().map(inverse_column);
            b[0] ^ b[1].rotate_left(8) ^ b[2].rotate_left(16) ^ b[3].rotate_left(24)
        });
        let mut out = [[0; 2]];
        self.store(mixed, &mut out);
        out[0]
    }

    #[inline(always)]
    fn sub_word(self, w: u32) -> u32 {
        u32::from_le_bytes(w.to_le_bytes().map(|b| BYTES[b as usize]))
    }
}
