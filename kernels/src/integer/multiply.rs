//! `integer.multiply`: full-width 64 × 64 → 128 bit products, both halves consumed.
//!
//! Eight chains; step i multiplies every chain by the i-th multiplier m (odd): xⱼ ← low(xⱼ·m). That is a bijection, so a wrong
//! low half stays in its chain, and in everything the chain brings forth. The high halves hⱼ go into two sums for each chain:
//! aⱼ ← aⱼ + hⱼ, sⱼ ← sⱼ + aⱼ mod 2⁶⁴; before every fourth step, from the first on, the halves of aⱼ are exchanged. All these
//! are bijections too, so one wrong high half always shows. Two that are wrong by the same 2ᵏ, with either sign, may cancel in a
//! but leave s wrong by their distance times 2ᵏ. Without the exchange that is 0 mod 2⁶⁴ too often for the top bits: bit 63 at any
//! even distance, one pair in 85 over all bits. With it, within the same four steps only bit 63 of steps two apart can pass;
//! further apart it takes differences that wrap around in just the right places (a test counts less than one pair in 2,000).
//!
//! Any instruction of the integer ALUs, even one for each product, takes issue slots from the multiplier. So the loop has none:
//! high halves are stored, sixteen steps later the vector unit sums the row up, and the next one is written in its place.
//!
//! Operands, in stream order: 8 starts, then 1,024 multipliers, each with its lowest bit set. Output: the 8 chains, the 8 sums
//! a, the 8 sums s.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 8;
const STEPS: usize = 1024;
/// Steps whose high halves are in memory at one time.
const ROWS: usize = 16;
/// Steps from one exchange of the halves of a to the next.
const EXCHANGE: usize = 4;
const _: () = assert!(STEPS.is_multiple_of(ROWS) && ROWS.is_multiple_of(EXCHANGE));

/// See the file's head.
pub struct Multiply;

impl Kernel for Multiply {
    fn id(&self) -> &'static str {
        "integer.multiply"
    }

    fn summary(&self) -> &'static str {
        "integer multiplier: 64 x 64 -> 128 bit, both halves consumed"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(9)]
    }

    fn output_words(&self, _size: Size) -> usize {
        3 * CHAINS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (CHAINS * STEPS) as u64, unit: "multiply" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["mul", "paddq"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi2],
                    marks: &["mulx", "vpaddq"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["umulh"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let start = std::array::from_fn(|_| operands.word());
        let multipliers = operands.words(STEPS).into_iter().map(|m| m | 1).collect();
        operands.finish(CHAINS + STEPS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(Chains { start, multipliers, run }))
    }
}

struct Chains {
    start: [u64; CHAINS],
    multipliers: Vec<u64>,
    run: fn(&[u64], [u64; CHAINS]) -> Output,
}

impl Ready for Chains {
    fn run(&mut self, out: &mut [u64]) {
        out.copy_from_slice((self.run)(&self.multipliers, self.start).as_flattened());
    }
}

/// Chains, sums a, sums s.
type Output = [[u64; CHAINS]; 3];

/// Takes the high halves of one step into the sums.
#[inline(always)]
fn sum(step: usize, high: &[u64; CHAINS], a: &mut [u64; CHAINS], s: &mut [u64; CHAINS]) {
    for ((a, s), high) in a.iter_mut().zip(s).zip(high) {
        if step.is_multiple_of(EXCHANGE) {
            *a = a.rotate_left(32);
        }
        *a = a.wrapping_add(*high);
        *s = s.wrapping_add(*a);
    }
}

#[cfg(not(target_arch = "x86_64"))]
#[inline(never)]
fn portable(multipliers: &[u64], mut x: [u64; CHAINS]) -> Output {
    let (mut a, mut s) = ([0; CHAINS], [0; CHAINS]);
    for (step, &m) in multipliers.iter().enumerate() {
        let high = std::array::from_fn(|j| {
            let product = u128::from(x[j]) * u128::from(m);
            x[j] = product as u64;
            (product >> 64) as u64
        });
        sum(step, &high, &mut a, &mut s);
    }
    [x, a, s]
}

/// The high halves of [`ROWS`] steps.
#[cfg(target_arch = "x86_64")]
#[repr(C, align(64))]
struct High([[u64; CHAINS]; ROWS]);

/// The code around a block of [`ROWS`] steps: rows of zeros, which leave sums of zero as they are, stand in for the steps before
/// the first block, and what the last block has left in memory is summed up at the end.
#[cfg(target_arch = "x86_64")]
macro_rules! walk {
    ($multipliers:ident, $x:ident, $zero:expr, $words:expr, $block:ident) => {{
        let mut high = High([[0; CHAINS]; ROWS]);
        let (mut a, mut s) = ($zero, $zero);
        for m in $multipliers.as_chunks::<ROWS>().0 {
            $block!(m, high.0, $x, a, s);
        }
        let (mut a, mut s): ([u64; CHAINS], [u64; CHAINS]) = ($words(a), $words(s));
        for (step, row) in high.0.iter().enumerate() {
            sum(step, row, &mut a, &mut s);
        }
        [$x, a, s]
    }};
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable(multipliers: &[u64], mut x: [u64; CHAINS]) -> Output {
    use std::arch::x86_64::{__m128i, _mm_setzero_si128};
    // SAFETY: both are 64 bytes in which any bits are valid
    let words = |sums: [__m128i; 4]| unsafe { std::mem::transmute::<[__m128i; 4], [u64; CHAINS]>(sums) };
    // SAFETY: SSE2 is part of the x86-64 baseline
    walk!(multipliers, x, [unsafe { _mm_setzero_si128() }; 4], words, mul_block)
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi2")]
fn avx2(multipliers: &[u64], mut x: [u64; CHAINS]) -> Output {
    use std::arch::x86_64::{__m256i, _mm256_setzero_si256};
    // SAFETY: both are 64 bytes in which any bits are valid
    let words = |sums: [__m256i; 2]| unsafe { std::mem::transmute::<[__m256i; 2], [u64; CHAINS]>(sums) };
    walk!(multipliers, x, [_mm256_setzero_si256(); 2], words, mulx_block)
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(multipliers: &[u64], x: [u64; CHAINS]) -> Output {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 and bmi2 are present
    unsafe { avx2(multipliers, x) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sums(rows: &[[u64; CHAINS]]) -> [[u64; CHAINS]; 2] {
        let (mut a, mut s) = ([0; CHAINS], [0; CHAINS]);
        rows.iter().enumerate().for_each(|(step, row)| sum(step, row, &mut a, &mut s));
        [a, s]
    }

    /// All pairs of the same bit in two of 128 steps, in every chain.
    #[test]
    fn a_flip_shows_alone_and_so_does_almost_every_pair_of_the_same_flip() {
        const LONG: usize = 128;
        let rows: Vec<[u64; CHAINS]> = (1..=LONG as u64)
            .map(|i| std::array::from_fn(|j| i.wrapping_mul(0x9e37_79b9_7f4a_7c15).rotate_left(7 * j as u32)))
            .collect();
        let right = sums(&rows);
        let (mut pairs, mut passed) = (0, 0);
        for bit in 0..64 {
            for i in 0..LONG {
                let mut bad = rows.clone();
                bad[i].iter_mut().for_each(|h| *h ^= 1 << bit);
                let wrong = sums(&bad);
                assert!(
                    (0..CHAINS).all(|c| (wrong[0][c], wrong[1][c]) != (right[0][c], right[1][c])),
                    "bit {bit} of step {i}"
                );
                for j in i + 1..LONG {
                    bad[j].iter_mut().for_each(|h| *h ^= 1 << bit);
                    let wrong = sums(&bad);
                    bad[j] = rows[j];
                    let hidden =
                        (0..CHAINS).filter(|&c| (wrong[0][c], wrong[1][c]) == (right[0][c], right[1][c])).count();
                    if i / EXCHANGE == j / EXCHANGE {
                        let passes = bit == 63 && j == i + 2;
                        assert_eq!(hidden, if passes { CHAINS } else { 0 }, "bit {bit} of steps {i} and {j}");
                    }
                    pairs += CHAINS;
                    passed += hidden;
                }
            }
        }
        // sums of sums without the exchange let one in 85 pass
        assert!(passed * 2000 < pairs, "{passed} of {pairs} pairs pass");
    }
}
