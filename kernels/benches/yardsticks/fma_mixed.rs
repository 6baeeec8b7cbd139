//! Peak of `fma.mixed`'s step: one binary16 and one bfloat16 register from memory, widened, and a fused multiply-add.

use std::hint::black_box;

use kernels::Variant;
use kernels::lanes::mixed::MixedLanes;

use super::{Yardstick, available};

const KERNEL: &str = "fma.mixed";
const ACCUMULATORS: usize = 8;
const ROUNDS: usize = 512;

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn peak<V: MixedLanes>() {
    // one half in binary16 and in bfloat16: sums stay finite
    let half = black_box([0x3800u16; 16 * ACCUMULATORS]);
    let bfloat = black_box([0x3f00u16; 16 * ACCUMULATORS]);
    // SAFETY: no register here has more than 16 lanes; the caller has the instructions
    unsafe {
        let mut x = [V::no_bits(); ACCUMULATORS];
        for _ in 0..ROUNDS {
            // hidden, or the widening would be done once for all rounds
            let (half, bfloat) = (black_box(half.as_ptr()), black_box(bfloat.as_ptr()));
            for (r, x) in x.iter_mut().enumerate() {
                let h = V::widen_half(half.add(r * V::WIDTH));
                *x = h.mul_add(V::widen_bfloat(bfloat.add(r * V::WIDTH)), *x);
            }
        }
        for x in x {
            let mut end = [0.0f32; 16];
            x.store(end.as_mut_ptr());
            black_box(end);
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma,f16c")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2, FMA and F16C are present
    unsafe { peak::<std::arch::x86_64::__m256>() }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { peak::<std::arch::x86_64::__m512>() }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon() {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { peak::<std::arch::aarch64::float32x4_t>() }
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
            units: (2 * ACCUMULATORS * ROUNDS * width) as u64,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
