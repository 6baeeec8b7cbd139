//! The full-width product alone: a limb in a register times limbs in memory, nothing added up and nothing to wait for. What a
//! multiplication of whole numbers can reach beside it, `scripts/ratio-bignum` measures with a library.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "integer.bignum";
const LIMBS: usize = 32;
const ROUNDS: usize = 64;

#[inline(always)]
fn peak(limbs: &[u64; LIMBS]) {
    let mut sums = [0u64; 4];
    for round in 0..ROUNDS as u64 {
        let m = black_box(u64::MAX - round);
        for four in limbs.as_chunks::<4>().0 {
            for (sum, limb) in sums.iter_mut().zip(four) {
                let product = u128::from(*limb) * u128::from(m);
                *sum ^= product as u64 ^ (product >> 64) as u64;
            }
        }
    }
    black_box(sums);
}

#[inline(never)]
fn portable(limbs: &[u64; LIMBS]) {
    peak(limbs);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "bmi2")]
fn avx2(limbs: &[u64; LIMBS]) {
    peak(limbs);
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, unsafe fn(&[u64; LIMBS]))] = &[
        (Variant::Portable, portable),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, avx2),
    ];
    let limbs: [u64; LIMBS] = black_box(std::array::from_fn(|i| u64::MAX / (i as u64 + 1)));
    bare.iter()
        .copied()
        .filter(|(variant, _)| available(KERNEL, *variant))
        .map(|(variant, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units: (LIMBS * ROUNDS) as u64,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run(black_box(&limbs)) }),
        })
        .collect()
}
