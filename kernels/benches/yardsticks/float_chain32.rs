//! Peak of the mix of `float.chain32` on binary32.

use kernels::Variant;

use super::float_common::{flop, mix};
use super::{Yardstick, available};

const KERNEL: &str = "float.chain32";
const NEAR_ONE: f32 = 0.999_999_3;
const MIDDLE: f32 = 2.713_1;

#[inline(never)]
fn portable() {
    // SAFETY: a scalar needs no feature
    unsafe { mix::<f32, 8>(NEAR_ONE, MIDDLE) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2 is present
    unsafe { mix::<std::arch::x86_64::__m256, 2>(NEAR_ONE, MIDDLE) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { mix::<std::arch::x86_64::__m512, 4>(NEAR_ONE, MIDDLE) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon() {
    // SAFETY: Advanced SIMD is in the architecture's baseline
    unsafe { mix::<std::arch::aarch64::float32x4_t, 4>(NEAR_ONE, MIDDLE) }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, u64, unsafe fn())] = &[
        (Variant::Portable, flop(8, 1), portable),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, flop(2, 8), avx2),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx512, flop(4, 16), avx512),
        #[cfg(target_arch = "aarch64")]
        (Variant::Neon, flop(4, 4), neon),
    ];
    bare.iter()
        .filter(|(variant, ..)| available(KERNEL, *variant))
        .map(|&(variant, units, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
