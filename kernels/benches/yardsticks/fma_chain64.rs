//! Peak of fused multiply-add on binary64.

use kernels::Variant;

use super::fma_common::{flop, peak};
use super::{Yardstick, available};

const KERNEL: &str = "fma.chain64";

#[cfg(target_arch = "x86_64")]
mod bare {
    use super::peak;

    #[inline(never)]
    #[target_feature(enable = "avx2,fma")]
    pub fn avx2() {
        // SAFETY: this function is entered only where AVX2 and FMA are present
        unsafe { peak::<std::arch::x86_64::__m256d>(0.5) }
    }

    #[inline(never)]
    #[target_feature(enable = "avx512f")]
    pub fn avx512() {
        // SAFETY: this function is entered only where AVX-512F is present
        unsafe { peak::<std::arch::x86_64::__m512d>(0.5) }
    }
}

#[cfg(target_arch = "aarch64")]
mod bare {
    use super::peak;

    #[inline(never)]
    pub fn portable() {
        // SAFETY: fused multiply-add of scalars is in the architecture's baseline
        unsafe { peak::<f64>(0.5) }
    }

    #[inline(never)]
    #[target_feature(enable = "neon")]
    pub fn neon() {
        // SAFETY: this function is entered only where Advanced SIMD is present
        unsafe { peak::<std::arch::aarch64::float64x2_t>(0.5) }
    }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    #[cfg(target_arch = "x86_64")]
    let bare: [(Variant, usize, unsafe fn()); 2] = [(Variant::Avx2, 4, bare::avx2), (Variant::Avx512, 8, bare::avx512)];
    #[cfg(target_arch = "aarch64")]
    let bare: [(Variant, usize, unsafe fn()); 2] =
        [(Variant::Portable, 1, bare::portable), (Variant::Neon, 2, bare::neon)];
    bare.into_iter()
        .filter(|(variant, ..)| available(KERNEL, *variant))
        .map(|(variant, width, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units: flop(width),
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
