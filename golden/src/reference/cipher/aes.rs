//! `cipher.aes`: FIPS 197 byte by byte. The S-box is computed from its definition (inverse in GF(2⁸), affine map), the
//! decryption is the plain inverse cipher of §5.3, not the equivalent one.

use kernels::Case;

use crate::reference::chacha::Stream;

/// Product in GF(2⁸) mod x⁸ + x⁴ + x³ + x + 1 (§4.2).
fn times(mut a: u8, mut b: u8) -> u8 {
    let mut product = 0;
    while b != 0 {
        if b & 1 == 1 {
            product ^= a;
        }
        let carry = a >> 7;
        a = (a << 1) ^ (carry * 0x1b);
        b >>= 1;
    }
    product
}

/// Substitution, its inverse, and the products with every coefficient of the two mix steps.
struct Tables {
    s: [u8; 256],
    inverse_s: [u8; 256],
    /// `by[c][x]` is c · x for c up to 14.
    by: Vec<[u8; 256]>,
}

impl Tables {
    fn new() -> Tables {
        let mut tables = Tables { s: [0; 256], inverse_s: [0; 256], by: Vec::new() };
        for x in 0..=255u8 {
            // x²⁵⁴ is the inverse of x, and 0 for 0
            let inverse = (0..254).fold(1, |p, _| times(p, x));
            // bit i of the affine map (§5.1.1): b_i ⊕ b_(i+4) ⊕ b_(i+5) ⊕ b_(i+6) ⊕ b_(i+7) ⊕ c_i with c = 63
            let mut s = 0u8;
            for i in 0..8 {
                let sum: u8 = [0, 4, 5, 6, 7].iter().map(|j| inverse >> ((i + j) % 8) & 1).sum();
                s |= ((sum & 1) ^ (0x63 >> i & 1)) << i;
            }
            tables.s[x as usize] = s;
            tables.inverse_s[s as usize] = x;
        }
        tables.by = (0..15).map(|c| std::array::from_fn(|x| times(x as u8, c))).collect();
        tables
    }

    /// Every column times the circulant matrix whose first row is `row`.
    fn mix(&self, state: [u8; 16], row: [usize; 4]) -> [u8; 16] {
        std::array::from_fn(|i| {
            let (column, r) = (i / 4 * 4, i % 4);
            (0..4).fold(0, |sum, k| sum ^ self.by[row[(k + 4 - r) % 4]][state[column + k] as usize])
        })
    }
}

/// Byte r + 4c of the result comes from column c + r (§5.1.2), or from c − r for the inverse.
fn shift(state: [u8; 16], inverse: bool) -> [u8; 16] {
    std::array::from_fn(|i| {
        let (c, r) = (i / 4, i % 4);
        state[(c + if inverse { 4 - r } else { r }) % 4 * 4 + r]
    })
}

fn add(state: [u8; 16], key: &[u8; 16]) -> [u8; 16] {
    std::array::from_fn(|i| state[i] ^ key[i])
}

/// Round keys (§5.2).
fn expand(t: &Tables, key: &[u8]) -> Vec<[u8; 16]> {
    let nk = key.len() / 4;
    let mut w: Vec<[u8; 4]> = key.chunks_exact(4).map(|c| [c[0], c[1], c[2], c[3]]).collect();
    let mut constant = 1;
    for i in nk..4 * (nk + 7) {
        let mut x = w[i - 1];
        if i % nk == 0 {
            x.rotate_left(1);
            x = x.map(|b| t.s[b as usize]);
            x[0] ^= constant;
            constant = times(constant, 2);
        } else if nk > 6 && i % nk == 4 {
            x = x.map(|b| t.s[b as usize]);
        }
        let old = w[i - nk];
        w.push(std::array::from_fn(|j| old[j] ^ x[j]));
    }
    w.chunks_exact(4).map(|c| std::array::from_fn(|i| c[i / 4][i % 4])).collect()
}

fn encrypt(t: &Tables, keys: &[[u8; 16]], block: [u8; 16]) -> [u8; 16] {
    let last = keys.len() - 1;
    let mut x = add(block, &keys[0]);
    for key in &keys[1..last] {
        x = add(t.mix(shift(x.map(|b| t.s[b as usize]), false), [2, 3, 1, 1]), key);
    }
    add(shift(x.map(|b| t.s[b as usize]), false), &keys[last])
}

fn decrypt(t: &Tables, keys: &[[u8; 16]], block: [u8; 16]) -> [u8; 16] {
    let last = keys.len() - 1;
    let mut x = add(block, &keys[last]);
    for key in keys[1..last].iter().rev() {
        x = t.mix(add(shift(x, true).map(|b| t.inverse_s[b as usize]), key), [14, 11, 13, 9]);
    }
    add(shift(x, true).map(|b| t.inverse_s[b as usize]), &keys[0])
}

fn block(stream: &mut Stream) -> [u8; 16] {
    let words = [stream.word(), stream.word()];
    std::array::from_fn(|i| (words[i / 8] >> (8 * (i % 8))) as u8)
}

/// The last block of each of 24 chains in four sections.
pub fn words(case: &Case) -> Vec<u64> {
    let t = Tables::new();
    let mut stream = Stream::new(case);
    let mut out = Vec::new();
    for (key_blocks, inverse) in [(1, false), (1, true), (2, false), (2, true)] {
        let key: Vec<u8> = (0..key_blocks).flat_map(|_| block(&mut stream)).collect();
        let keys = expand(&t, &key);
        let starts: Vec<_> = (0..24).map(|_| block(&mut stream)).collect();
        let plain: Vec<_> = (0..64).map(|_| block(&mut stream)).collect();
        for start in starts {
            let x = plain.iter().fold(start, |x, p| {
                let x = add(x, p);
                if inverse { decrypt(&t, &keys, x) } else { encrypt(&t, &keys, x) }
            });
            for half in x.chunks_exact(8) {
                out.push(half.iter().rev().fold(0, |w, &b| w << 8 | u64::from(b)));
            }
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 197 appendix C.1, both ways.
    #[test]
    fn example_vector_c1() {
        let t = Tables::new();
        let key: Vec<u8> = (0..16).collect();
        let keys = expand(&t, &key);
        let plain: [u8; 16] = std::array::from_fn(|i| (i * 0x11) as u8);
        let cipher = 0x69c4_e0d8_6a7b_0430_d8cd_b780_70b4_c55au128.to_be_bytes();
        assert_eq!(encrypt(&t, &keys, plain), cipher);
        assert_eq!(decrypt(&t, &keys, cipher), plain);
    }
}
