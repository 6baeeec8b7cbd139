//! `checksum.clmul`: the checksums by a shift register, bit by bit, over each message; the accumulators by polynomials in
//! natural order of bits, multiplied by shifting and adding.

use kernels::Case;

use crate::reference::chacha::Stream;

/// A polynomial of degree `bits` without its leading term.
struct Modulus {
    bits: u32,
    terms: u64,
}

const MODULI: [Modulus; 2] =
    [Modulus { bits: 32, terms: 0x04c1_1db7 }, Modulus { bits: 64, terms: 0x42f0_e1eb_a9ea_3693 }];

impl Modulus {
    /// The register, highest power of x in its highest bit, after one more bit has been taken in at the top.
    fn shift(&self, register: u64, bit: u64) -> u64 {
        let out = register >> (self.bits - 1) & 1 ^ bit;
        let shifted = register << 1 ^ if out == 1 { self.terms } else { 0 };
        shifted & self.ones()
    }

    fn ones(&self) -> u64 {
        u64::MAX >> (64 - self.bits)
    }

    fn take(&self, register: u64, message: &[u8]) -> u64 {
        let bits = message.iter().flat_map(|byte| (0..8).map(move |bit| u64::from(byte >> bit & 1)));
        bits.fold(register, |register, bit| self.shift(register, bit))
    }

    fn checksum(&self, register: u64) -> u64 {
        (register.reverse_bits() >> (64 - self.bits)) ^ self.ones()
    }

    /// xᵏ mod (P·x⁶⁴⁻ᵇⁱᵗˢ) for k of at least 64: x⁶⁴⁻ᵇⁱᵗˢ times the rest of the other powers of x by P.
    fn power(&self, k: u32) -> u64 {
        (0..k - (64 - self.bits)).fold(1, |register, _| self.shift(register, 0)) << (64 - self.bits)
    }
}

fn times(x: u64, y: u64) -> u128 {
    (0..64).filter(|bit| y >> bit & 1 == 1).fold(0, |sum, bit| sum ^ u128::from(x) << bit)
}

/// Sixteen bytes as a polynomial: the lowest bit of the first byte belongs to x¹²⁷.
fn polynomial(block: &[u8]) -> u128 {
    block.iter().fold(0, |sum, byte| sum << 8 | u128::from(byte.reverse_bits()))
}

/// For each modulus and message the checksum of all messages up to its end and the four accumulators.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let data: Vec<u8> = stream.words(1536).into_iter().flat_map(u64::to_le_bytes).collect();
    let mut messages: Vec<&[u8]> = Vec::new();
    for v in stream.words(4) {
        let blocks = 4 + (v % 512) as usize;
        for (blocks, field) in [(blocks, v >> 16), (519 - blocks, v >> 32)] {
            let at = (field % 65536 % 4049) as usize;
            messages.push(&data[at..at + 16 * blocks]);
        }
    }
    let mut out = Vec::new();
    for modulus in &MODULI {
        let (far, near) = (modulus.power(575), modulus.power(511));
        let mut register = modulus.ones();
        for message in &messages {
            let mut sums = [0u128; 4];
            for (number, four) in message.chunks_exact(64).enumerate() {
                for (sum, block) in sums.iter_mut().zip(four.chunks_exact(16)) {
                    // reflected factors make a product that is one place lower: times x
                    *sum = (times((*sum >> 64) as u64, far) ^ times(*sum as u64, near)) << 1 ^ polynomial(block);
                }
                if number == 0 {
                    sums[0] ^= u128::from(register) << (128 - modulus.bits);
                }
            }
            register = modulus.take(register, message);
            out.push(modulus.checksum(register));
            for sum in sums {
                out.extend([((sum >> 64) as u64).reverse_bits(), (sum as u64).reverse_bits()]);
            }
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The check values of the CRC catalogues, for "123456789".
    #[test]
    fn check_values() {
        for (modulus, check) in MODULI.iter().zip([0xcbf4_3926, 0x995d_c9bb_df19_39fa]) {
            assert_eq!(modulus.checksum(modulus.take(modulus.ones(), b"123456789")), check);
        }
    }
}
