//! Peak of separate multiplications and additions on binary64, the stuff of `float.elementary`'s polynomials.
//!
//! The pinned steps have 29 operations for exp, 25 for log, 38 for sine and cosine together: 23 a value.

use std::hint::black_box;

use kernels::Variant;
use kernels::lanes::bits::Bits;

use super::{Yardstick, available};

const KERNEL: &str = "float.elementary";
const CHAINS: usize = 12;
const ROUNDS: usize = 1150;
const A_VALUE: usize = 23;

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn peak<V: Bits>() {
    let [v, c, start] = black_box([0.999_9, 0.000_1, 1.0]);
    // SAFETY: no register here has more than 8 lanes; the caller has the instructions
    unsafe {
        let (v, c) = (V::all(v), V::all(c));
        // different values, or the chains would be one to the compiler
        let mut x: [V; CHAINS] = std::array::from_fn(|i| V::all(start + i as f64));
        for _ in 0..ROUNDS {
            for x in &mut x {
                *x = x.mul(v).add(c);
            }
        }
        for x in x {
            let mut end = [0.0; 8];
            x.store(end.as_mut_ptr());
            black_box(end);
        }
    }
}

/// The baseline's vectors of two, which the compiler makes of the kernel's scalars.
#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable() {
    use std::arch::x86_64::{_mm_add_pd, _mm_mul_pd, _mm_set1_pd};
    let [v, c, start] = black_box([0.999_9, 0.000_1, 1.0]);
    // SAFETY: SSE2 is in the baseline
    unsafe {
        let (v, c) = (_mm_set1_pd(v), _mm_set1_pd(c));
        let mut x: [_; CHAINS] = std::array::from_fn(|i| _mm_set1_pd(start + i as f64));
        for _ in 0..ROUNDS {
            for x in &mut x {
                *x = _mm_add_pd(_mm_mul_pd(*x, v), c);
            }
        }
        x.into_iter().for_each(|x| {
            black_box(x);
        });
    }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn portable() {
    // SAFETY: Advanced SIMD is in the architecture's baseline
    unsafe { peak::<std::arch::aarch64::float64x2_t>() }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2 is present
    unsafe { peak::<std::arch::x86_64::__m256d>() }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { peak::<std::arch::x86_64::__m512d>() }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon() {
    // SAFETY: Advanced SIMD is in the architecture's baseline
    unsafe { peak::<std::arch::aarch64::float64x2_t>() }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, usize, unsafe fn())] = &[
        (Variant::Portable, 2, portable),
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
            units: (2 * CHAINS * ROUNDS * width / A_VALUE) as u64,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
