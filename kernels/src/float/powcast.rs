//! `float.powcast`: scalar powers x^y cut to integers, each after a vector prologue that leaves state behind.
//!
//! The published case (Dixit et al. 2021, arXiv 2102.11245 §5): a core whose `int(1.1^53)` was 0 while `int(1.1^52)` was
//! right. `pow` of the platform is not pinned, so this file has its own, for y a multiple of 1/16, |y| < 256, in
//! *double-double* arithmetic: a number is hi + lo, two doubles, |lo| at most half a last place of hi.
//! All steps are IEEE operations, rounded to nearest even:
//!
//! ```text
//! product error   e(a, b) = a·b − fl(a·b), exactly: by FMA, or by Dekker's split (1971) where there is none
//! fast sum        F(a, b): s = a + b; (s, b − (s − a))
//! a · b           p = a.hi·b.hi; F(p, e(a.hi, b.hi) + (a.hi·b.lo + a.lo·b.hi))
//! √a              q = √a.hi; p = q·q; F(q, (((a.hi − p) − e(q, q)) + a.lo) / (q + q))
//! 1/a             q = 1 / a.hi; p = q·a.hi; F(q, (((1 − p) − e(q, a.hi)) − q·a.lo) / a.hi)
//! x^y, N = |16y|  r = 1; b = x; for the bits of N/16 from the lowest: if set r = r·b; then b = b·b, unless it was the last;
//!                 b = x; for bits 3 … 0 of N: b = √b; if set r = r·b;      if y < 0: r = 1/r;      r.hi
//! ```
//!
//! Its relative error is below 2^−90, so r.hi is the correctly rounded power wherever no midpoint of two doubles is
//! nearer than that; the witness is MPFR's correctly rounded power, so every accepted case proves that it was.
//!
//! Before each power, one round of eight chains of `common_chain.rs` (bounded) runs in the variant's own registers. A run
//! takes 48 powers, the first 7 the published ones, in 8 rounds. Operands, in stream order: the 8 chains; then two words w, z for each of the
//! other 41 powers. Bits 60–61 of w choose: 0, 1: x in [1, 9/8), |16y| < 4096; 2: x in [1, 2), |16y| < 961; 3: x in
//! [1/2, 1), |16y| < 961; |16y| is w modulo that bound, the sign of y bit 63 of w, x's fraction
//! z's low bits.
//! Output: the bits of the last round's powers; their integer parts; for each power the fold of its bits and integer part
//! in every round, f ← (f rotated left by 7) + word mod 2^64; the 8 last states.

use super::common_chain::{Chains, DOUBLE, Operand, ROWS, walk, words_drawn};
use super::common_pair::{Fused, ProductError, Split, pow};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::lanes::Arithmetic;
use crate::operands::Operands;

const CHAINS: usize = 8;
const POWERS: usize = 48;
const ROUNDS: usize = 8;
const _: () = assert!(POWERS.is_multiple_of(ROWS), "every round starts at the first row");
/// 1.1, and 16y of the published powers.
const BASE: u64 = 0x3ff1_9999_9999_999a;
const PUBLISHED: [i32; 7] = [53 * 16, 68 * 16, 3 * 16, 107 * 16, -3 * 16, 52 * 16, 78 * 16];

/// See the file's head.
pub struct PowCast;

impl Kernel for PowCast {
    fn id(&self) -> &'static str {
        "float.powcast"
    }

    fn summary(&self) -> &'static str {
        "scalar double-double powers cut to integers, after a vector prologue"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(4)]
    }

    fn output_words(&self, _size: Size) -> usize {
        3 * POWERS + CHAINS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (POWERS * ROUNDS) as u64, unit: "power" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["mulsd", "addsd", "subsd", "divsd", "sqrtsd", "cvttsd2si"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Fma],
                    marks: &["vfmsub", "vmulsd", "vaddsd", "vdivsd", "vsqrtsd", "vcvttsd2si", "vsqrtpd", "vdivpd"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f, Feature::Fma],
                    marks: &["vfmsub", "vmulsd", "vaddsd", "vdivsd", "vsqrtsd", "vcvttsd2si", "vsqrtpd", "vdivpd"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["fmul", "fadd", "fsub", "fdiv", "fsqrt", "fcvtzs"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["fnmsub", "fmul", "fadd", "fdiv", "fsqrt", "fcvtzs"],
                    proven: Proven::Emulator,
                },
            ]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["mul"], proven: Proven::Unexecuted }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let chains = Chains::draw(DOUBLE, false, &mut operands, f64::from_bits);
        let mut powers = PUBLISHED.map(|y| (f64::from_bits(BASE), y)).to_vec();
        while powers.len() < POWERS {
            let w = operands.word();
            powers.push(power(w, operands.word()));
        }
        operands.finish(words_drawn(CHAINS) + 2 * (POWERS - PUBLISHED.len()));
        let run: Run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            _ => portable,
        };
        Roles::One(Box::new(Prepared { chains, powers, run }))
    }
}

/// x and 16y from two words.
fn power(w: u64, z: u64) -> Power {
    let fraction = z & ((1 << 52) - 1);
    let (bits, bound) = match w >> 60 & 3 {
        0 | 1 => (0x3ff << 52 | fraction >> 3, 4096),
        2 => (0x3ff << 52 | fraction, 961),
        _ => (0x3fe << 52 | fraction, 961),
    };
    let sixteenths = (w % bound) as i32;
    (f64::from_bits(bits), if w >> 63 == 1 { -sixteenths } else { sixteenths })
}

type Rows = [Operand<f64, CHAINS>];
type States = [f64; CHAINS];
/// x and 16y.
type Power = (f64, i32);

type Run = fn(&Rows, &mut States, &[Power], &mut [u64]);

struct Prepared {
    chains: Chains<f64, CHAINS>,
    powers: Vec<Power>,
    run: Run,
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        let mut x = *self.chains.start;
        (self.run)(&self.chains.rows, &mut x, &self.powers, out);
        for (word, x) in out[3 * POWERS..].iter_mut().zip(x) {
            *word = x.to_bits();
        }
    }
}

/// All powers, a row of the chains before each.
///
/// # Safety
/// The CPU has the features of `A`'s level.
#[inline(always)]
unsafe fn body<A: Arithmetic<Scalar = f64>, E: ProductError>(
    rows: &Rows,
    x: &mut States,
    powers: &[Power],
    out: &mut [u64],
) {
    let (results, folds) = out.split_at_mut(2 * POWERS);
    let (bits, integers) = results.split_at_mut(POWERS);
    folds.fill(0);
    for _ in 0..ROUNDS {
        for (i, (base, sixteenths)) in powers.iter().enumerate() {
            let row = i % ROWS;
            // SAFETY: features by this function's contract
            unsafe { walk::<A, CHAINS>(&rows[row..=row], x, 1) };
            let result = pow::<E>(*base, *sixteenths);
            bits[i] = result.to_bits();
            integers[i] = result as i64 as u64;
            for word in [bits[i], integers[i]] {
                folds[i] = folds[i].rotate_left(7).wrapping_add(word);
            }
        }
    }
}

#[inline(never)]
fn portable(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: a scalar needs no feature
    unsafe { body::<f64, Split>(rows, x, powers, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: avx2 is enabled on this function
    unsafe { body::<std::arch::x86_64::__m256d, Fused>(rows, x, powers, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f,fma")]
fn avx512(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: avx512f is enabled on this function
    unsafe { body::<std::arch::x86_64::__m512d, Fused>(rows, x, powers, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: NEON is aarch64's baseline
    unsafe { body::<std::arch::aarch64::float64x2_t, Fused>(rows, x, powers, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 and fma are present
    unsafe { avx2(rows, x, powers, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx512(rows: &Rows, x: &mut States, powers: &[Power], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx512`, which `isa` makes only when its features are present
    unsafe { avx512(rows, x, powers, out) }
}
