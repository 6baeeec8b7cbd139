//! Peak of fused multiply-add on binary32: what no matrix product can exceed. `scripts/ratio-blas` has another one's speed.

use kernels::Variant;

use super::fma_common::{flop, peak};
use super::{Yardstick, available};

const KERNEL: &str = "fma.matmul32";

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2 and FMA are present
    unsafe { peak::<std::arch::x86_64::__m256>(0.5) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { peak::<std::arch::x86_64::__m512>(0.5) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon() {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { peak::<std::arch::aarch64::float32x4_t>(0.5) }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, usize, unsafe fn())] = &[
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, 8, avx2),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx512, 16, avx512),
        #[cfg(target_arch = "aarch64")]
        (Variant::Neon, 4, neon),
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
