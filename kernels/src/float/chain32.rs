//! `float.chain32`: chains of single-precision multiply, square root, divide, subtract and add.
//!
//! 128 independent chains of the map in `common_chain.rs`, 8 rows of operands walked 16 times. Every register level
//! walks the same chains, a scalar one, 8, 16 or 4 at a time. Even seeds are bounded, odd seeds full range with
//! subnormals. Output: the 128 last states, two a word, the even one in the low half.

use super::common_chain::{Chains, Operand, ROWS, SINGLE, walk, words_drawn};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 128;
const ROUNDS: usize = 16;

/// See the file's head.
pub struct Chain32;

type Rows = [Operand<f32, CHAINS>];
type States = [f32; CHAINS];

impl Kernel for Chain32 {
    fn id(&self) -> &'static str {
        "float.chain32"
    }

    fn summary(&self) -> &'static str {
        "single-precision multiplier, divider, square root and adder in dependent chains"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(21)]
    }

    fn output_words(&self, _size: Size) -> usize {
        CHAINS / 2
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (7 * CHAINS * ROWS * ROUNDS) as u64, unit: "flop" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["mul", "sqrt", "div", "sub", "add"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["vmulps", "vsqrtps", "vdivps", "vsubps", "vaddps"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vmulps", "vsqrtps", "vdivps", "vsubps", "vaddps"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            // fabd: the compiler joins the subtraction and the cleared sign
            const MARKS: &[&str] = &["fmul", "fsqrt", "fdiv", "fabd", "fadd"];
            &[
                Build { variant: Variant::Portable, needs: &[], marks: MARKS, proven: Proven::Emulator },
                Build { variant: Variant::Neon, needs: &[Feature::Neon], marks: MARKS, proven: Proven::Emulator },
            ]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["mul"], proven: Proven::Unexecuted }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let chains = Chains::draw(SINGLE, case.seed.0 & 1 == 1, &mut operands, |bits| f32::from_bits(bits as u32));
        operands.finish(words_drawn(CHAINS));
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            _ => portable,
        };
        Roles::One(Box::new(Prepared { chains, run }))
    }
}

struct Prepared {
    chains: Chains<f32, CHAINS>,
    run: fn(&Rows, &mut States),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        let mut x = *self.chains.start;
        (self.run)(&self.chains.rows, &mut x);
        for (word, pair) in out.iter_mut().zip(x.as_chunks::<2>().0) {
            *word = u64::from(pair[0].to_bits()) | u64::from(pair[1].to_bits()) << 32;
        }
    }
}

#[inline(never)]
fn portable(rows: &Rows, x: &mut States) {
    // SAFETY: a scalar needs no feature
    unsafe { walk::<f32, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(rows: &Rows, x: &mut States) {
    // SAFETY: avx2 is enabled on this function
    unsafe { walk::<std::arch::x86_64::__m256, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(rows: &Rows, x: &mut States) {
    // SAFETY: avx512f is enabled on this function
    unsafe { walk::<std::arch::x86_64::__m512, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(rows: &Rows, x: &mut States) {
    // SAFETY: NEON is aarch64's baseline
    unsafe { walk::<std::arch::aarch64::float32x4_t, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(rows: &Rows, x: &mut States) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 is present
    unsafe { avx2(rows, x) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx512(rows: &Rows, x: &mut States) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx512`, which `isa` makes only when avx512f is present
    unsafe { avx512(rows, x) }
}
