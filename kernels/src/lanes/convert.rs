//! Conversions between number formats, a block of [`BLOCK`] numbers at a time.
//!
//! Rounding is to nearest, ties to even; to integers toward zero where the name says `truncate`. No NaN goes in and
//! integers are in range, so that every level's rule for those is out of play. The default methods are plain casts
//! and, for the 16-bit formats and rounding to an integer, integer code; a level overrides what it has instructions for.

/// Numbers per call.
pub const BLOCK: usize = 32;

macro_rules! casts {
    ($($(#[$doc:meta])* $name:ident $from:ident $to:ident;)*) => {$(
        $(#[$doc])*
        #[inline(always)]
        unsafe fn $name(from: &[$from; BLOCK], to: &mut [$to; BLOCK]) {
            for (to, from) in to.iter_mut().zip(from) {
                *to = *from as $to;
            }
        }
    )*};
}

/// One level's conversions.
///
/// # Safety
/// The caller proves that the CPU has the level's features.
#[expect(clippy::missing_safety_doc, reason = "one contract for all methods, stated on the trait")]
pub trait Convert {
    casts! {
        /// binary64 to binary32.
        f64_to_f32 f64 f32;
        /// binary32 to binary64, exact.
        f32_to_f64 f32 f64;
        /// Toward zero.
        f64_truncate_i32 f64 i32;
        /// Toward zero.
        f64_truncate_u32 f64 u32;
        /// Toward zero.
        f64_truncate_i64 f64 i64;
        /// Exact.
        i32_to_f64 i32 f64;
        /// To nearest.
        i32_to_f32 i32 f32;
        /// To nearest.
        u32_to_f32 u32 f32;
        /// To nearest.
        i64_to_f64 i64 f64;
        /// To nearest.
        u64_to_f64 u64 f64;
    }

    /// To nearest, ties to even; |from| < 2^31.
    #[inline(always)]
    unsafe fn f64_nearest_i32(from: &[f64; BLOCK], to: &mut [i32; BLOCK]) {
        // 1.5 · 2^52: the sum's last place is 1, so that its low bits are the rounded integer
        const MAGIC: f64 = 6_755_399_441_055_744.0;
        for (to, from) in to.iter_mut().zip(from) {
            *to = (from + MAGIC).to_bits() as i32;
        }
    }

    /// binary32 to binary16.
    #[inline(always)]
    unsafe fn f32_to_half(from: &[f32; BLOCK], to: &mut [u16; BLOCK]) {
        for (to, from) in to.iter_mut().zip(from) {
            *to = half(from.to_bits());
        }
    }

    /// binary16 to binary32, exact.
    #[inline(always)]
    unsafe fn half_to_f32(from: &[u16; BLOCK], to: &mut [f32; BLOCK]) {
        for (to, from) in to.iter_mut().zip(from) {
            *to = f32::from_bits(from_half(*from));
        }
    }

    /// binary32 to bfloat16.
    #[inline(always)]
    unsafe fn f32_to_bfloat(from: &[f32; BLOCK], to: &mut [u16; BLOCK]) {
        for (to, from) in to.iter_mut().zip(from) {
            let bits = from.to_bits();
            // half of the last place kept, less one where that place is even; a carry into the exponent is right
            *to = ((bits + 0x7fff + (bits >> 16 & 1)) >> 16) as u16;
        }
    }

    /// bfloat16 to binary32, exact.
    #[inline(always)]
    unsafe fn bfloat_to_f32(from: &[u16; BLOCK], to: &mut [f32; BLOCK]) {
        for (to, from) in to.iter_mut().zip(from) {
            *to = f32::from_bits(u32::from(*from) << 16);
        }
    }
}

#[inline(always)]
fn half(bits: u32) -> u16 {
    let sign = (bits >> 16 & 0x8000) as u16;
    let magnitude = bits & 0x7fff_ffff;
    let exponent = magnitude >> 23;
    let rounded = if exponent > 127 + 15 {
        0x7c00
    } else if exponent >= 127 - 14 {
        // rebias, then round at bit 13; the largest ones carry into the encoding of infinity
        (magnitude - (112 << 23) + 0xfff + (magnitude >> 13 & 1)) >> 13
    } else if exponent >= 102 {
        // subnormal: units of 2^-24
        let significand = magnitude & 0x7f_ffff | 0x80_0000;
        let drop = 126 - exponent;
        (significand + (1 << (drop - 1)) - 1 + (significand >> drop & 1)) >> drop
    } else {
        0
    };
    sign | rounded as u16
}

#[inline(always)]
fn from_half(bits: u16) -> u32 {
    let sign = u32::from(bits & 0x8000) << 16;
    let (exponent, fraction) = (u32::from(bits >> 10 & 31), u32::from(bits & 0x3ff));
    sign | match exponent {
        31 => 0x7f80_0000 | fraction << 13,
        0 if fraction == 0 => 0,
        0 => {
            let up = fraction.leading_zeros() - 21;
            (113 - up) << 23 | (fraction << up & 0x3ff) << 13
        }
        _ => (exponent + 112) << 23 | fraction << 13,
    }
}

/// The defaults throughout.
pub struct Plain;
impl Convert for Plain {}

/// Overrides methods by an intrinsic from `$read` to `$write`, `$step` numbers at a time.
#[cfg(any(target_arch = "x86_64", target_arch = "aarch64"))]
macro_rules! by {
    ($($name:ident $from:ident $to:ident $step:literal |$in:ident, $out:ident| $body:expr;)*) => {$(
        #[inline(always)]
        unsafe fn $name(from: &[$from; BLOCK], to: &mut [$to; BLOCK]) {
            const { assert!(BLOCK.is_multiple_of($step)) };
            for at in (0..BLOCK).step_by($step) {
                // SAFETY: at + step <= BLOCK in both arrays; features by the trait's contract
                unsafe {
                    let $in = from.as_ptr().add(at);
                    let $out = to.as_mut_ptr().add(at);
                    $body;
                }
            }
        }
    )*};
}

/// AVX2 with F16C.
#[cfg(target_arch = "x86_64")]
pub struct Avx2;

#[cfg(target_arch = "x86_64")]
mod avx2 {
    use super::{Avx2, BLOCK, Convert};
    use std::arch::x86_64::*;

    impl Convert for Avx2 {
        by! {
            f64_to_f32 f64 f32 4 |x, y| _mm_storeu_ps(y, _mm256_cvtpd_ps(_mm256_loadu_pd(x)));
            f32_to_f64 f32 f64 4 |x, y| _mm256_storeu_pd(y, _mm256_cvtps_pd(_mm_loadu_ps(x)));
            f32_to_half f32 u16 8 |x, y|
                _mm_storeu_si128(y.cast(), _mm256_cvtps_ph::<_MM_FROUND_TO_NEAREST_INT>(_mm256_loadu_ps(x)));
            half_to_f32 u16 f32 8 |x, y| _mm256_storeu_ps(y, _mm256_cvtph_ps(_mm_loadu_si128(x.cast())));
            f64_truncate_i32 f64 i32 4 |x, y| _mm_storeu_si128(y.cast(), _mm256_cvttpd_epi32(_mm256_loadu_pd(x)));
            f64_nearest_i32 f64 i32 4 |x, y| _mm_storeu_si128(y.cast(), _mm256_cvtpd_epi32(_mm256_loadu_pd(x)));
            i32_to_f64 i32 f64 4 |x, y| _mm256_storeu_pd(y, _mm256_cvtepi32_pd(_mm_loadu_si128(x.cast())));
            i32_to_f32 i32 f32 8 |x, y| _mm256_storeu_ps(y, _mm256_cvtepi32_ps(_mm256_loadu_si256(x.cast())));
        }
    }
}

/// AVX-512 F and DQ.
#[cfg(target_arch = "x86_64")]
pub struct Avx512;

#[cfg(target_arch = "x86_64")]
mod avx512 {
    use super::{Avx512, BLOCK, Convert};
    use std::arch::x86_64::*;

    impl Convert for Avx512 {
        by! {
            f64_to_f32 f64 f32 8 |x, y| _mm256_storeu_ps(y, _mm512_cvtpd_ps(_mm512_loadu_pd(x)));
            f32_to_f64 f32 f64 8 |x, y| _mm512_storeu_pd(y, _mm512_cvtps_pd(_mm256_loadu_ps(x)));
            f32_to_half f32 u16 16 |x, y|
                _mm256_storeu_si256(y.cast(), _mm512_cvtps_ph::<_MM_FROUND_TO_NEAREST_INT>(_mm512_loadu_ps(x)));
            half_to_f32 u16 f32 16 |x, y| _mm512_storeu_ps(y, _mm512_cvtph_ps(_mm256_loadu_si256(x.cast())));
            f64_truncate_i32 f64 i32 8 |x, y| _mm256_storeu_si256(y.cast(), _mm512_cvttpd_epi32(_mm512_loadu_pd(x)));
            f64_nearest_i32 f64 i32 8 |x, y| _mm256_storeu_si256(y.cast(), _mm512_cvtpd_epi32(_mm512_loadu_pd(x)));
            f64_truncate_u32 f64 u32 8 |x, y| _mm256_storeu_si256(y.cast(), _mm512_cvttpd_epu32(_mm512_loadu_pd(x)));
            f64_truncate_i64 f64 i64 8 |x, y| _mm512_storeu_si512(y.cast(), _mm512_cvttpd_epi64(_mm512_loadu_pd(x)));
            i32_to_f64 i32 f64 8 |x, y| _mm512_storeu_pd(y, _mm512_cvtepi32_pd(_mm256_loadu_si256(x.cast())));
            i32_to_f32 i32 f32 16 |x, y| _mm512_storeu_ps(y, _mm512_cvtepi32_ps(_mm512_loadu_si512(x.cast())));
            u32_to_f32 u32 f32 16 |x, y| _mm512_storeu_ps(y, _mm512_cvtepu32_ps(_mm512_loadu_si512(x.cast())));
            i64_to_f64 i64 f64 8 |x, y| _mm512_storeu_pd(y, _mm512_cvtepi64_pd(_mm512_loadu_si512(x.cast())));
            u64_to_f64 u64 f64 8 |x, y| _mm512_storeu_pd(y, _mm512_cvtepu64_pd(_mm512_loadu_si512(x.cast())));
        }
    }
}

/// NEON.
#[cfg(target_arch = "aarch64")]
pub struct Neon;

#[cfg(target_arch = "aarch64")]
mod neon {
    use super::{BLOCK, Convert, Neon};
    use std::arch::aarch64::*;

    impl Convert for Neon {
        by! {
            f64_to_f32 f64 f32 2 |x, y| vst1_f32(y, vcvt_f32_f64(vld1q_f64(x)));
            f32_to_f64 f32 f64 2 |x, y| vst1q_f64(y, vcvt_f64_f32(vld1_f32(x)));
            f32_to_half f32 u16 4 |x, y| vst1_u16(y, vreinterpret_u16_f16(vcvt_f16_f32(vld1q_f32(x))));
            half_to_f32 u16 f32 4 |x, y| vst1q_f32(y, vcvt_f32_f16(vreinterpret_f16_u16(vld1_u16(x))));
            f64_truncate_i32 f64 i32 2 |x, y| vst1_s32(y, vmovn_s64(vcvtq_s64_f64(vld1q_f64(x))));
            f64_nearest_i32 f64 i32 2 |x, y| vst1_s32(y, vmovn_s64(vcvtnq_s64_f64(vld1q_f64(x))));
            f64_truncate_i64 f64 i64 2 |x, y| vst1q_s64(y, vcvtq_s64_f64(vld1q_f64(x)));
            i32_to_f32 i32 f32 4 |x, y| vst1q_f32(y, vcvtq_f32_s32(vld1q_s32(x)));
            u32_to_f32 u32 f32 4 |x, y| vst1q_f32(y, vcvtq_f32_u32(vld1q_u32(x)));
            i64_to_f64 i64 f64 2 |x, y| vst1q_f64(y, vcvtq_f64_s64(vld1q_s64(x)));
            u64_to_f64 u64 f64 2 |x, y| vst1q_f64(y, vcvtq_f64_u64(vld1q_u64(x)));
        }
    }
}
