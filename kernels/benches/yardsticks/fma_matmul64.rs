//! Peak of fused multiply-add on binary64: what no matrix product can exceed. `scripts/ratio-blas` has another one's speed.

use kernels::Variant;

use super::fma_common::{flop, peak};
use super::{Yardstick, available};

const KERNEL: &str = "fma.matmul64";

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2 and FMA are present
    unsafe { peak::<std::arch::x86_64::__m256d>(0.5) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { peak::<std::arch::x86_64::__m512d>(0.5) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon() {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { peak::<std::arch::aarch64::float64x2_t>(0.5) }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, usize, unsafe fn())] = &[
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, 4, avx2),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx512, 8, avx512),
        #[cfg(target_arch = "aarch64")]
        (Variant::Neon, 2, neon),
    ];
    bare.iter()
        .filter(|(variant, ..)| available(KERNEL, *variant))
        .map(|&(variant, width, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units: flop(width),
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
