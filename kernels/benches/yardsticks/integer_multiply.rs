//! Peak of 64 × 64 → 128 bit multiplication: eight chains, the high half feeding the next multiplication. Unrolled, as
//! any other operation of the integer units takes issue slots from the multiplier.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "integer.multiply";
const CHAINS: usize = 8;
const UNROLL: usize = 4;
const ROUNDS: usize = 512;

#[inline(always)]
fn peak() {
    let mut x: [u64; CHAINS] = black_box(std::array::from_fn(|i| u64::MAX - i as u64));
    let m = black_box(u64::MAX);
    for _ in 0..ROUNDS {
        for _ in 0..UNROLL {
            for x in &mut x {
                *x = ((u128::from(*x) * u128::from(m)) >> 64) as u64;
            }
        }
    }
    black_box(x);
}

#[inline(never)]
fn portable() {
    peak();
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "bmi2")]
fn avx2() {
    peak();
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, unsafe fn())] = &[
        (Variant::Portable, portable),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, avx2),
    ];
    bare.iter()
        .copied()
        .filter(|(variant, _)| available(KERNEL, *variant))
        .map(|(variant, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units: (CHAINS * UNROLL * ROUNDS) as u64,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
