//! `checksum.clmul`: CRC-32 and CRC-64 of long messages by folding with carry-less multiplication (V. Gopal and others,
//! "Fast CRC Computation for Generic Polynomials Using PCLMULQDQ Instruction", 2009).
//!
//! CRC-32 is that of IEEE 802.3, CRC-64 has the polynomial of ECMA-182 with bits reflected and inverted as in the .xz file
//! format 1.1.0 §6. Both are done in one way by a modulus Q of degree 64: for CRC-32 Q = x³²·P, since
//! M·x⁶⁴ mod (P·x³²) = x³²·(M·x³² mod P).
//!
//! A block is 16 bytes, bits reflected: bit 0 of the first byte is the coefficient of x¹²⁷. Words are named by place, so "low"
//! has the high powers. The carry-less product of reflected words is the product of the polynomials times x, reflected. Hence:
//! 1. Four accumulators begin with the first four blocks, whose first word has the CRC's state added in. While four
//!    more blocks are there, aⱼ ← low(aⱼ)·(x⁵⁷⁵ mod Q) + high(aⱼ)·(x⁵¹¹ mod Q) + blockⱼ. These products are not reduced.
//! 2. A block is folded into the next by x¹⁹¹ and x¹²⁷ in the same way: a₀ into a₁, into a₂, into a₃, into each block left.
//! 3. The last one, A: T = low(A)·(x¹²⁷ mod Q) + (high(A) as low); state = T mod Q by the quotient q = low(T) + low(T)·μ /x⁶⁴,
//!    with μ = x¹²⁸ div Q without its leading term.
//!
//! The state is carried from message to message, and the accumulators after step 1 are put out as they are, since a reduced sum
//! would hide an error that Q divides.
//!
//! Operands, in stream order: 1,536 words, the buffer's 12,288 bytes; then a word v for each of four pairs of messages: the
//! first has n = 4 + (v mod 512) blocks, the second 519 − n; their offsets in bytes are the 16-bit fields of v at
//! bits 16 and 32, mod 4,049. Output: for each CRC, first CRC-32, for each message in order: the CRC of all up to its end,
//! then the four accumulators, low and high word.

use super::common_clmul_soft::Soft;
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const WORDS: usize = 1536;
const PAIRS: usize = 4;
/// Blocks of both messages of a pair.
const BLOCKS: usize = 519;
const OFFSETS: usize = 8 * WORDS - 16 * (BLOCKS - 4) + 1;
/// Output words a message.
const WIDTH: usize = 9;

/// Sixteen bytes as two little-endian words.
pub(super) type Block = [u64; 2];

/// See the file's head.
pub struct Clmul;

impl Kernel for Clmul {
    fn id(&self) -> &'static str {
        "checksum.clmul"
    }

    fn summary(&self) -> &'static str {
        "carry-less multiplier: CRC-32 and CRC-64 by folding, unreduced sums put out"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(13)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * 2 * PAIRS * WIDTH
    }

    fn work(&self, _size: Size) -> Work {
        // two for each fold of a block into another, three for each reduction
        Work { amount: (2 * PAIRS * (2 * (BLOCKS - 2) + 2 * 3)) as u64, unit: "product" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["xor", "shl"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx, Feature::Pclmulqdq],
                    marks: &["vpclmul"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx, Feature::Pclmulqdq, Feature::Avx512f, Feature::Vpclmulqdq],
                    marks: &["vpclmul", "vpternlog"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["eor"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon, Feature::ArmAes],
                    marks: &["pmull", "pmull2"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let data = operands.words(WORDS).into_iter().flat_map(u64::to_le_bytes).collect();
        let mut messages = Vec::with_capacity(2 * PAIRS);
        for _ in 0..PAIRS {
            let v = operands.word();
            let blocks = 4 + (v & 511) as usize;
            for (blocks, shift) in [(blocks, 16), (BLOCKS - blocks, 32)] {
                messages.push((usize::from((v >> shift) as u16) % OFFSETS, 16 * blocks));
            }
        }
        operands.finish(WORDS + PAIRS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => run_neon,
            _ => portable,
        };
        Roles::One(Box::new(Messages { data, messages, run }))
    }
}

/// Buffer, and offset and length in bytes of every message.
type Runner = fn(&[u8], &[(usize, usize)], &mut [u64]);

struct Messages {
    data: Vec<u8>,
    messages: Vec<(usize, usize)>,
    run: Runner,
}

impl Ready for Messages {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.data, &self.messages, out);
    }
}

/// The carry-less multiplier of one variant.
pub(super) trait Multiplier: Copy {
    /// Two constants, made ready.
    type Pair: Copy;
    type One: Copy;
    type Four: Copy;
    fn pair(self, constants: Block) -> Self::Pair;
    fn block(self, block: Block) -> Self::One;
    fn words(self, block: Self::One) -> Block;
    fn load(self, bytes: &[u8; 16]) -> Self::One;
    /// low(x)·low(by) + high(x)·high(by) + next.
    fn fold(self, x: Self::One, by: &Self::Pair, next: Self::One) -> Self::One;
    fn load_four(self, bytes: &[u8; 64]) -> Self::Four;
    fn fold_four(self, x: Self::Four, by: &Self::Pair, next: Self::Four) -> Self::Four;
    /// Adds to the first word of the first block.
    fn add_first(self, x: Self::Four, word: u64) -> Self::Four;
    fn split(self, x: Self::Four) -> [Self::One; 4];
}

/// What the modulus gives, all reflected.
struct Modulus {
    /// Q without its leading term.
    q: u64,
    /// x¹²⁸ div Q without its leading term.
    quotient: u64,
    /// Over four blocks: for the low word, for the high word.
    far: Block,
    /// Over one block.
    near: Block,
    /// Ones where a state has bits.
    ones: u64,
}

/// xᵏ mod Q for Q = x⁶⁴ + `q`.
const fn power(q: u64, k: u32) -> u64 {
    let mut x = 1u64;
    let mut i = 0;
    while i < k {
        x = x << 1 ^ (q & (x >> 63).wrapping_neg());
        i += 1;
    }
    x
}

/// x¹²⁸ div Q without its leading term, by long division: x¹²⁸ = x⁶⁴·Q + x⁶⁴·q, so it is x⁶⁴·q div Q.
const fn quotient(q: u64) -> u64 {
    let (mut rest, mut quotient) = (q, 0);
    let mut i = 0;
    while i < 64 {
        let top = rest >> 63;
        quotient = quotient << 1 | top;
        rest = rest << 1 ^ (q & top.wrapping_neg());
        i += 1;
    }
    quotient
}

impl Modulus {
    const fn new(q: u64, ones: u64) -> Modulus {
        Modulus {
            q: q.reverse_bits(),
            quotient: quotient(q).reverse_bits(),
            far: [power(q, 575).reverse_bits(), power(q, 511).reverse_bits()],
            near: [power(q, 191).reverse_bits(), power(q, 127).reverse_bits()],
            ones,
        }
    }
}

/// x³² + x²⁶ + x²³ + x²² + x¹⁶ + x¹² + x¹¹ + x¹⁰ + x⁸ + x⁷ + x⁵ + x⁴ + x² + x + 1 (IEEE 802.3 §3.2.9), times x³²; then the
/// polynomial of ECMA-182 annex B.
static MODULI: [Modulus; 2] =
    [Modulus::new(0x04c1_1db7 << 32, 0xffff_ffff), Modulus::new(0x42f0_e1eb_a9ea_3693, u64::MAX)];

/// The state after `message`, whose length is a multiple of 16 and at least 64; the accumulators go to `sums`.
#[inline(always)]
fn crc<M: Multiplier>(m: M, modulus: &Modulus, state: u64, message: &[u8], sums: &mut [u64; 8]) -> u64 {
    let (far, near) = (m.pair(modulus.far), m.pair(modulus.near));
    let (fours, rest) = message.as_chunks::<64>();
    let Some((first, fours)) = fours.split_first() else { return state };
    let mut four = m.add_first(m.load_four(first), state);
    for bytes in fours {
        four = m.fold_four(four, &far, m.load_four(bytes));
    }
    let [mut last, others @ ..] = m.split(four);
    sums[..2].copy_from_slice(&m.words(last));
    for (sum, other) in sums[2..].as_chunks_mut::<2>().0.iter_mut().zip(others) {
        *sum = m.words(other);
        last = m.fold(last, &near, other);
    }
    for bytes in rest.as_chunks::<16>().0 {
        last = m.fold(last, &near, m.load(bytes));
    }
    let [low, high] = m.words(last);
    // the product of one word: the other one is zero
    let product = |x: u64, by: u64, plus: Block| m.words(m.fold(m.block([x, 0]), &m.pair([by, 0]), m.block(plus)));
    let [low, high] = product(low, modulus.near[1], [high, 0]);
    let [by_quotient, _] = product(low, modulus.quotient, [0, 0]);
    let [below, above] = product(low ^ by_quotient << 1, modulus.q, [0, 0]);
    high ^ (below >> 63 | above << 1)
}

#[inline(always)]
fn body<M: Multiplier>(m: M, data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    let mut rows = out.as_chunks_mut::<WIDTH>().0.iter_mut();
    for modulus in &MODULI {
        let mut state = modulus.ones;
        for (&(at, length), row) in messages.iter().zip(&mut rows) {
            let [checksum, sums @ ..] = row;
            state = crc(m, modulus, state, &data[at..at + length], sums);
            *checksum = state ^ modulus.ones;
        }
    }
}

#[inline(never)]
fn portable(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    body(Soft, data, messages, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx,pclmulqdq")]
fn avx2(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: a function of avx and pclmulqdq
    body(unsafe { super::common_clmul_x86::Narrow::new() }, data, messages, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when both features are present
    unsafe { avx2(data, messages, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx,pclmulqdq,avx512f,vpclmulqdq")]
fn avx512(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: a function of these features
    body(unsafe { super::common_clmul_x86::Wide::new() }, data, messages, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx512(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx512`, which `isa` makes only when its features are present
    unsafe { avx512(data, messages, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon,aes")]
fn neon(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: a function of neon and aes
    body(unsafe { super::common_clmul_arm::Arm::new() }, data, messages, out);
}

#[cfg(target_arch = "aarch64")]
fn run_neon(data: &[u8], messages: &[(usize, usize)], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Neon`, which `isa` makes only when both features are present
    unsafe { neon(data, messages, out) }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The check values of the CRC catalogues: "123456789" gives cbf43926 and 995dc9bbdf1939fa. The nine bytes stand at the
    /// end of 64, and the state is such that what comes before them leaves all ones.
    #[test]
    fn published_check_values() {
        let mut message = [0u8; 64];
        message[55..].copy_from_slice(b"123456789");
        for (modulus, q, check) in
            [(&MODULI[0], 0x04c1_1db7 << 32, 0xcbf4_3926), (&MODULI[1], 0x42f0_e1eb_a9ea_3693, 0x995d_c9bb_df19_39fa)]
        {
            // 55 zero bytes backwards: division by x, bit by bit (Q's lowest term is x³² or 1)
            let lowest = if q as u32 == 0 { 32 } else { 0 };
            let mut state = modulus.ones.reverse_bits();
            for _ in 0..8 * 55 {
                let odd = state >> lowest & 1;
                state = (state ^ (q & odd.wrapping_neg())) >> 1 | odd << 63;
            }
            let end = crc(Soft, modulus, state.reverse_bits(), &message, &mut [0; 8]);
            assert_eq!(end ^ modulus.ones, check);
        }
    }
}
