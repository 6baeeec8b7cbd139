//! Peak of the conversions of `float.convert`: each of the fifteen on one block that stays in the first cache, no sums.

use std::hint::black_box;

use kernels::Variant;
use kernels::lanes::Convert;
use kernels::lanes::convert::{BLOCK, Plain};

use super::{Yardstick, available};

const KERNEL: &str = "float.convert";
const ROUNDS: usize = 64;
const CONVERSIONS: usize = 15;

/// One conversion, `ROUNDS` times; the block is opaque to the compiler each time.
macro_rules! each {
    ($level:ident: $($name:ident $from:expr, $to:expr;)*) => {$(
        let (mut from, mut to) = ([$from; BLOCK], [$to; BLOCK]);
        for _ in 0..ROUNDS {
            // SAFETY: the caller has the level's features
            unsafe { $level::$name(black_box(&mut from), &mut to) };
            black_box(&mut to);
        }
    )*};
}

/// # Safety
/// The CPU has the features of `C`.
#[inline(always)]
unsafe fn bare<C: Convert>() {
    each! { C:
        f64_to_f32 1.7f64, 0f32;
        f32_to_f64 1.7f32, 0f64;
        f32_to_half 1.7f32, 0u16;
        half_to_f32 0x3c01u16, 0f32;
        f32_to_bfloat 1.7f32, 0u16;
        bfloat_to_f32 0x3f81u16, 0f32;
        f64_truncate_i32 1.7e8f64, 0i32;
        f64_nearest_i32 1.7e8f64, 0i32;
        i32_to_f64 123_456_789i32, 0f64;
        i32_to_f32 123_456_789i32, 0f32;
        u32_to_f32 3_123_456_789u32, 0f32;
        f64_truncate_i64 1.7e18f64, 0i64;
        i64_to_f64 1_234_567_890_123_456_789i64, 0f64;
        u64_to_f64 12_345_678_901_234_567_890u64, 0f64;
        f64_truncate_u32 3.1e9f64, 0u32;
    }
}

#[inline(never)]
fn portable() {
    // SAFETY: plain casts need no feature
    unsafe { bare::<Plain>() }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,f16c")]
fn avx2() {
    // SAFETY: this function is entered only where AVX2 and F16C are present
    unsafe { bare::<kernels::lanes::convert::Avx2>() }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f,avx512dq")]
fn avx512() {
    // SAFETY: this function is entered only where AVX-512 F and DQ are present
    unsafe { bare::<kernels::lanes::convert::Avx512>() }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon() {
    // SAFETY: Advanced SIMD is in the architecture's baseline
    unsafe { bare::<kernels::lanes::convert::Neon>() }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let bare: &[(Variant, unsafe fn())] = &[
        (Variant::Portable, portable),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx2, avx2),
        #[cfg(target_arch = "x86_64")]
        (Variant::Avx512, avx512),
        #[cfg(target_arch = "aarch64")]
        (Variant::Neon, neon),
    ];
    bare.iter()
        .filter(|(variant, _)| available(KERNEL, *variant))
        .map(|&(variant, run)| Yardstick {
            kernel: KERNEL,
            variant,
            units: (CONVERSIONS * BLOCK * ROUNDS) as u64,
            // SAFETY: listed only where every feature of the kernel's variant is present
            run: Box::new(move || unsafe { run() }),
        })
        .collect()
}
