//! Vectors of 32 bytes by AVX2, every load and store written out so that its instruction is the one named.
//!
//! Assembly on vectors of 32 bytes asks for the feature in the very function that it stands in, so these are no `inline(always)`;
//! they are inlined where the caller has the feature as well.

use std::arch::asm;
use std::arch::x86_64::*;

use super::common_wide::Wide;

/// Evidence that AVX2 is present.
#[derive(Clone, Copy)]
pub struct Avx2(());

impl Avx2 {
    /// # Safety
    /// The CPU must have `avx2`.
    #[inline(always)]
    pub unsafe fn new() -> Avx2 {
        Avx2(())
    }
}

/// One load by the instruction named.
macro_rules! load {
    ($name:literal, $class:ident, $from:ident) => {{
        let v;
        // SAFETY: the caller gives the bytes, and of `Avx2::new` proved avx2
        unsafe {
            asm!(concat!($name, " {v}, [{from}]"), v = out($class) v, from = in(reg) $from,
                 options(nostack, readonly, preserves_flags))
        };
        v
    }};
}

/// One store by the instruction named.
macro_rules! store {
    ($name:literal, $class:ident, $v:ident, $to:ident) => {
        // SAFETY: the caller gives the bytes, and of `Avx2::new` proved avx2
        unsafe {
            asm!(concat!($name, " [{to}], {v}"), v = in($class) $v, to = in(reg) $to, options(nostack, preserves_flags))
        }
    };
}

impl Wide for Avx2 {
    type V = __m256i;
    type H = __m128i;

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn load<const WIDTH: usize>(self, from: *const u8) -> __m256i {
        match WIDTH {
            1 => load!("vmovdqu", ymm_reg, from),
            2 => load!("vlddqu", ymm_reg, from),
            4 => load!("vmovups", ymm_reg, from),
            _ => load!("vmovupd", ymm_reg, from),
        }
    }

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn store<const WIDTH: usize>(self, v: __m256i, to: *mut u8) {
        match WIDTH {
            1 | 2 => store!("vmovdqu", ymm_reg, v, to),
            4 => store!("vmovups", ymm_reg, v, to),
            _ => store!("vmovupd", ymm_reg, v, to),
        }
    }

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn load_half(self, from: *const u8) -> __m128i {
        load!("vlddqu", xmm_reg, from)
    }

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn store_half(self, v: __m128i, to: *mut u8) {
        store!("vmovdqu", xmm_reg, v, to);
    }

    #[inline(always)]
    fn splat(self, width: usize, value: u64) -> __m256i {
        // SAFETY: the caller of `Avx2::new` proved avx2
        unsafe {
            match width {
                1 => _mm256_set1_epi8(value as i8),
                2 => _mm256_set1_epi16(value as i16),
                4 => _mm256_set1_epi32(value as i32),
                _ => _mm256_set1_epi64x(value as i64),
            }
        }
    }

    #[inline(always)]
    fn low(self, v: __m256i) -> __m128i {
        // SAFETY: the caller of `Avx2::new` proved avx2
        unsafe { _mm256_castsi256_si128(v) }
    }

    #[inline(always)]
    unsafe fn unequal(self, a: *const u8, b: *const u8) -> u32 {
        // SAFETY: the caller gives 32 bytes on both sides; the caller of `Avx2::new` proved avx2
        unsafe {
            let (a, b) = (_mm256_loadu_si256(a.cast()), _mm256_loadu_si256(b.cast()));
            !_mm256_movemask_epi8(_mm256_cmpeq_epi8(a, b)) as u32
        }
    }

    #[inline(always)]
    unsafe fn equal(self, a: *const u8, width: usize, v: __m256i) -> u32 {
        // SAFETY: the caller gives 32 bytes; the caller of `Avx2::new` proved avx2
        unsafe {
            let a = _mm256_loadu_si256(a.cast());
            let equal = match width {
                1 => _mm256_cmpeq_epi8(a, v),
                2 => _mm256_cmpeq_epi16(a, v),
                4 => _mm256_cmpeq_epi32(a, v),
                _ => _mm256_cmpeq_epi64(a, v),
            };
            _mm256_movemask_epi8(equal) as u32
        }
    }
}
