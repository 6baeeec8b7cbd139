//! `float.chain64`: chains of double-precision multiply, square root, divide, subtract and add.
//!
//! 64 independent chains of the map in `common_chain.rs`, 8 rows of operands walked 16 times. Every register level
//! walks the same chains, a scalar one, 4, 8 or 2 at a time. Even seeds are bounded, odd seeds full range with
//! subnormals. Output: the 64 last states.

use super::common_chain::{Chains, DOUBLE, Operand, ROWS, walk, words_drawn};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 64;
const ROUNDS: usize = 16;

/// See the file's head.
pub struct Chain64;

type Rows = [Operand<f64, CHAINS>];
type States = [f64; CHAINS];

impl Kernel for Chain64 {
    fn id(&self) -> &'static str {
        "float.chain64"
    }

    fn summary(&self) -> &'static str {
        "double-precision multiplier, divider, square root and adder in dependent chains"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(21)]
    }

    fn output_words(&self, _size: Size) -> usize {
        CHAINS
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
                    marks: &["vmulpd", "vsqrtpd", "vdivpd", "vsubpd", "vaddpd"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vmulpd", "vsqrtpd", "vdivpd", "vsubpd", "vaddpd"],
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
        let chains = Chains::draw(DOUBLE, case.seed.0 & 1 == 1, &mut operands, f64::from_bits);
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
    chains: Chains<f64, CHAINS>,
    run: fn(&Rows, &mut States),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        let mut x = *self.chains.start;
        (self.run)(&self.chains.rows, &mut x);
        for (word, x) in out.iter_mut().zip(x) {
            *word = x.to_bits();
        }
    }
}

#[inline(never)]
fn portable(rows: &Rows, x: &mut States) {
    // SAFETY: a scalar needs no feature
    unsafe { walk::<f64, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(rows: &Rows, x: &mut States) {
    // SAFETY: avx2 is enabled on this function
    unsafe { walk::<std::arch::x86_64::__m256d, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(rows: &Rows, x: &mut States) {
    // SAFETY: avx512f is enabled on this function
    unsafe { walk::<std::arch::x86_64::__m512d, CHAINS>(rows, x, ROUNDS) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(rows: &Rows, x: &mut States) {
    // SAFETY: NEON is aarch64's baseline
    unsafe { walk::<std::arch::aarch64::float64x2_t, CHAINS>(rows, x, ROUNDS) }
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
