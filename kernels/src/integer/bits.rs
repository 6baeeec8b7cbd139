//! `integer.bits`: shifts, rotations, bit counts and scans, bit fields, bit tests, conditions, exchanges and small arithmetic,
//! each by the instruction of its name where the variant has it.
//!
//! A step computes 70 results from the state (x, y) and three words of memory m, n, c. They do not wait for one another;
//! result i goes into sum s_(i mod 4): s ← rotl(s + r, 29)·0x9e3779b97f4a7c15 mod 2⁶⁴, a bijection for each r, so that a wrong
//! result stays. Then x ← s₀ + s₁, y ← s₂ + s₃.
//!
//! a = x + m, b = y ⊕ n; from c, counted from bit 0: k and l in 6 bits each, then 8 bits called bit 12 … bit 19;
//! z = (a | 2⁶³) >> k, t = (b | 1) << l. "32", "16", "8" mean the low bits of the operands, counts modulo the width, and a
//! result without sign. Conditions are the sixteen of x86 in the order of their codes: o no b ae e ne be a s ns p np l ge le g.
//!
//! | results | are |
//! |---|---|
//! | 0–5 | a << k; b >> k; b >> l with copies of the sign; a << k, b >> k and a >> l with the sign, 32 |
//! | 6, 7 | high word of (a·2⁶⁴ + b) << k; low word of (b·2⁶⁴ + a) >> l |
//! | 8–13 | a to the left by k; b to the right by l; 32: a left k, b right l; 16: a left k; 8: b right l |
//! | 14, 15 | the 65 bits (bit 12, a) to the left by k, (bit 13, b) to the right by l, without the bit that becomes carry |
//! | 16–19 | one bits of a, of a in 32; zero bits above the highest one of z, and of z in 32 (all zero: 32) |
//! | 20–23 | place of z's highest one; of t's lowest one; zeros below the lowest one of t, of t in 32 (all zero: 32) |
//! | 24, 25 | a's low bits spread to the places of b's ones; b's bits at the places of a's ones gathered |
//! | 26–28 | l bits of a from k on; b mod 2ᵏ; t's lowest one alone |
//! | 29–32 | t without its lowest one; ones up to t's lowest one; ¬a ∧ b; a to the right by 27 |
//! | 33–37 | bytes of a in reverse, of b in 32, of b, of a in 32, of a in 16 |
//! | 38–40 | a with bit k set; b with bit k cleared; a with bit l inverted |
//! | 41 | h ← 9h + (a if the condition holds, else b), over the conditions of e − f, e and f being a and b with all but bits 63, 62, 0 cleared |
//! | 42, 43 | the conditions of e + f in 32 (bits 31, 30, 0 kept), one byte each, eight a word |
//! | 44 | h ← 9h + (0 if the condition holds, else its number from 1), over the conditions of e − f in 16, from a >> 16 and b >> 16 (bits 15, 14, 0 kept) |
//! | 45, 46 | c + b; a − c, by exchanges |
//! | 47, 48 | memory holding a if bit 14 else b, exchanged for c where it is a: memory, what it held |
//! | 49, 50 | memory holding b if bit 15 else c, exchanged for a where it is b: the same |
//! | 51, 52 | memory holding (a, b) if bit 16 else (a, c), exchanged for (c, a) where it is (a, b) |
//! | 53–56 | −a; ¬b; a + b + bit 17; b − a − bit 18 |
//! | 57 | a + 1, and 1 more unless a = 2⁶⁴ − 2 |
//! | 58, 59 | a·b in 8, full; a·b in 16 with signs, full |
//! | 60 | a/(b \| 1) in 8: quotient, remainder in the next 8 bits |
//! | 61 | a/d in 16 with signs, truncated, d = (b mod 2¹⁵) \| 1: quotient, remainder in the next 16 bits |
//! | 62, 63 | a + 8b + 0x1234567; a + 4b − 77 in 32 |
//! | 64–66 | sign extended: a in 8, plus 3 times b in 16, plus 9 times a in 32; a mod 2⁸ + b mod 2¹⁶; b in 8 |
//! | 67 | (2⁶⁴ − 1 if a is negative) + (2³² − 1 if b in 32 is) |
//! | 68 | a·3^(k mod 8), plus byte k mod 8 of c |
//! | 69 | carries, from bit 0: out of 14, out of 15, bit l of a, bit k of a (38), bit k of b, bit l of a (40), out of 55, out of 56, equality in 47, 49, 51; then from bit 16 on (c >> 12 mod 256) ∧ 0xd5 ∨ 2 |
//!
//! Operands, in stream order: x, y, four sums, then m, n, c for each of 48 steps. Output: the sums after every eighth step.

use super::common_bits::Bits;
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const STEPS: usize = 48;
const STRIDE: usize = 8;
const RESULTS: usize = 70;
const SUMS: usize = 4;
/// 2⁶⁴ divided by the golden ratio: odd, with its ones spread.
const SPREAD: u64 = 0x9e37_79b9_7f4a_7c15;

/// See the file's head.
pub struct BitOperations;

impl Kernel for BitOperations {
    fn id(&self) -> &'static str {
        "integer.bits"
    }

    fn summary(&self) -> &'static str {
        "shifter, bit manipulation and conditions: seventy operations by the instruction of their name"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(2)]
    }

    fn output_words(&self, _size: Size) -> usize {
        STEPS / STRIDE * SUMS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (STEPS * RESULTS) as u64, unit: "operation" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["rcl", "rcr", "shld", "shrd", "bsf", "bsr", "bt", "cmov", "set", "cmpxchg8b", "xadd"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[
                        Feature::Avx2,
                        Feature::Bmi1,
                        Feature::Bmi2,
                        Feature::Lzcnt,
                        Feature::Popcnt,
                        Feature::Movbe,
                        Feature::Cmpxchg16b,
                    ],
                    marks: &[
                        "pdep", "pext", "bextr", "bzhi", "bls", "andn", "rorx", "shlx", "lzcnt", "tzcnt", "popcnt",
                        "movbe",
                    ],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["clz", "rbit", "rev", "ror"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let start = [operands.word(), operands.word()];
        let sums = std::array::from_fn(|_| operands.word());
        let steps = (0..STEPS).map(|_| std::array::from_fn(|_| operands.word())).collect();
        operands.finish(2 + SUMS + 3 * STEPS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(State { start, sums, steps, run }))
    }
}

type Sums = [u64; SUMS];

/// Steps, start, sums at the start, output.
type Runner = fn(&[[u64; 3]], [u64; 2], Sums, &mut [u64]);

struct State {
    start: [u64; 2],
    sums: Sums,
    steps: Vec<[u64; 3]>,
    run: Runner,
}

impl Ready for State {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.steps, self.start, self.sums, out);
    }
}

/// The results of one step, as the head lists them.
#[inline(always)]
fn results<B: Bits>(a: u64, b: u64, c: u64) -> [u64; RESULTS] {
    let (k, l) = (c as u32 & 63, (c >> 6) as u32 & 63);
    let bit = |i: u32| c >> i & 1 == 1;
    let (z, t) = ((a | 1 << 63) >> k, (b | 1) << l);
    let (rcl, rcl_carry) = B::rcl(a, k, bit(12));
    let (rcr, rcr_carry) = B::rcr(b, l, bit(13));
    let (bts, bts_bit) = B::bts(a, k);
    let (btr, btr_bit) = B::btr(b, k);
    let (btc, btc_bit) = B::btc(a, l);
    let [sets_low, sets_high] = B::sets(a as u32 & 0xc000_0001, b as u32 & 0xc000_0001);
    let [exchanged, difference] = B::exchange_add(a, b, c);
    let (one, one_held, one_equal) = B::cmpxchg(if bit(14) { a } else { b }, a, c);
    let (halves, halves_held, halves_equal) = B::cmpxchg8b(if bit(15) { b } else { c }, b, a);
    let (pair, pair_equal) = B::cmpxchg16b([a, if bit(16) { b } else { c }], [a, b], [c, a]);
    let (adc, adc_carry) = B::adc(a, b, bit(17));
    let (sbb, sbb_borrow) = B::sbb(b, a, bit(18));
    let carries = [
        rcl_carry,
        rcr_carry,
        B::bt(a, l),
        bts_bit,
        btr_bit,
        btc_bit,
        adc_carry,
        sbb_borrow,
        one_equal,
        halves_equal,
        pair_equal,
    ];
    let carries = carries.iter().rev().fold(0, |word, carry| word << 1 | u64::from(*carry));
    let extended = B::movsx16(b).wrapping_mul(3).wrapping_add(B::movsxd(a).wrapping_mul(9));
    [
        B::shl(a, k),
        B::shr(b, k),
        B::sar(b, l),
        B::shl32(a, k),
        B::shr32(b, k),
        B::sar32(a, l),
        B::shld(a, b, k),
        B::shrd(a, b, l),
        B::rol(a, k),
        B::ror(b, l),
        B::rol32(a, k),
        B::ror32(b, l),
        B::rol16(a, k),
        B::ror8(b, l),
        rcl,
        rcr,
        B::popcnt(a),
        B::popcnt32(a),
        B::lzcnt(z),
        B::lzcnt32(z),
        B::bsr(z),
        B::bsf(t),
        B::tzcnt(t),
        B::tzcnt32(t),
        B::pdep(a, b),
        B::pext(b, a),
        B::bextr(a, k, l),
        B::bzhi(b, k),
        B::blsi(t),
        B::blsr(t),
        B::blsmsk(t),
        B::andn(a, b),
        B::rorx27(a),
        B::bswap(a),
        B::bswap32(b),
        B::movbe(b),
        B::movbe32(a),
        B::movbe16(a),
        bts,
        btr,
        btc,
        B::moves(a & 0xc000_0000_0000_0001, b & 0xc000_0000_0000_0001, a, b),
        sets_low,
        sets_high,
        B::jumps((a >> 16) as u16 & 0xc001, (b >> 16) as u16 & 0xc001),
        exchanged,
        difference,
        one,
        one_held,
        halves,
        halves_held,
        pair[0],
        pair[1],
        B::neg(a),
        B::not(b),
        adc,
        sbb,
        B::carry_play(a),
        B::mul8(a as u8, b as u8),
        B::imul16(a as u16, b as u16),
        B::div8(a as u8, b as u8 | 1),
        B::idiv16(a as u16, b as u16 & 0x7fff | 1),
        B::lea(a, b),
        B::lea32(a, b),
        B::movsx8(a).wrapping_add(extended),
        B::movzx(a, b),
        B::widen(b),
        B::signs(a, b),
        B::threefold(a, u64::from(k & 7)).wrapping_add(B::byte_of(&c, k as u8 & 7)),
        carries | B::flags_byte((c >> 12) as u8) << 16,
    ]
}

/// Result j of the row into sum j.
#[inline(always)]
fn absorb(s: &mut Sums, row: &[u64]) {
    for (s, r) in s.iter_mut().zip(row) {
        *s = s.wrapping_add(*r).rotate_left(29).wrapping_mul(SPREAD);
    }
}

#[inline(always)]
fn body<B: Bits>(steps: &[[u64; 3]], start: [u64; 2], mut s: Sums, out: &mut [u64]) {
    let [mut x, mut y] = start;
    for (steps, out) in steps.chunks_exact(STRIDE).zip(out.as_chunks_mut::<SUMS>().0) {
        for &[m, n, c] in steps {
            let results = results::<B>(x.wrapping_add(m), y ^ n, c);
            let (rows, rest) = results.as_chunks::<SUMS>();
            for row in rows {
                absorb(&mut s, row);
            }
            absorb(&mut s, rest);
            x = s[0].wrapping_add(s[1]);
            y = s[2].wrapping_add(s[3]);
        }
        *out = s;
    }
}

#[inline(never)]
fn portable(steps: &[[u64; 3]], start: [u64; 2], sums: Sums, out: &mut [u64]) {
    #[cfg(not(target_arch = "x86_64"))]
    use super::common_bits::Plain as Operations;
    #[cfg(target_arch = "x86_64")]
    use super::common_bits_x86::Baseline as Operations;
    body::<Operations>(steps, start, sums, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi1,bmi2,lzcnt,popcnt,movbe,cmpxchg16b")]
fn avx2(steps: &[[u64; 3]], start: [u64; 2], sums: Sums, out: &mut [u64]) {
    body::<super::common_bits_x86_bmi::Extended>(steps, start, sums, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(steps: &[[u64; 3]], start: [u64; 2], sums: Sums, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when all its features are present
    unsafe { avx2(steps, start, sums, out) }
}
