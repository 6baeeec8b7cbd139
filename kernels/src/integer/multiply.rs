//! `integer.multiply`: full-width 64 × 64 → 128 bit products, both halves consumed.
//!
//! Eight chains; step i multiplies every chain by the i-th multiplier m (odd) and adds each product's low half to the
//! high half of the chain before it: xⱼ ← low(xⱼ·m) + high(xⱼ₋₁·m) mod 2⁶⁴, with x₋₁ for x₇. The halves of one product
//! go to two chains, so no pair of errors within a product cancels, as it could if they were folded into one word. A
//! wrong half always changes its chain, and a single wrong chain stays wrong: x ↦ low(x·m) is a bijection.
//!
//! Operands, in stream order: 8 starts, then 1,024 multipliers, each with its lowest bit set. Output: the 8 chains.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 8;
const STEPS: usize = 1024;

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
        CHAINS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (CHAINS * STEPS) as u64, unit: "multiply" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["mul"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi2],
                    marks: &["mulx"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["umulh"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Box<dyn Ready> {
        let mut operands = Operands::new(case);
        let start = std::array::from_fn(|_| operands.word());
        let multipliers = operands.words(STEPS).into_iter().map(|m| m | 1).collect();
        operands.finish(CHAINS + STEPS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Box::new(Chains { start, multipliers, run })
    }
}

struct Chains {
    start: [u64; CHAINS],
    multipliers: Vec<u64>,
    run: fn(&[u64], [u64; CHAINS]) -> [u64; CHAINS],
}

impl Ready for Chains {
    fn run(&mut self, out: &mut [u64]) {
        out.copy_from_slice(&(self.run)(&self.multipliers, self.start));
    }
}

#[inline(always)]
fn body(multipliers: &[u64], mut x: [u64; CHAINS]) -> [u64; CHAINS] {
    for &m in multipliers {
        let mut carried = 0;
        for lane in &mut x {
            let product = u128::from(*lane) * u128::from(m);
            *lane = (product as u64).wrapping_add(carried);
            carried = (product >> 64) as u64;
        }
        x[0] = x[0].wrapping_add(carried);
    }
    x
}

#[inline(never)]
fn portable(multipliers: &[u64], x: [u64; CHAINS]) -> [u64; CHAINS] {
    body(multipliers, x)
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "bmi2")]
fn avx2(multipliers: &[u64], x: [u64; CHAINS]) -> [u64; CHAINS] {
    body(multipliers, x)
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(multipliers: &[u64], x: [u64; CHAINS]) -> [u64; CHAINS] {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when bmi2 is present
    unsafe { avx2(multipliers, x) }
}
