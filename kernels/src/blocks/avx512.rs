//! Two blocks side by side in a 512-bit x86 register.

use std::arch::x86_64::*;

use super::{Block, Blocks, Elements};

/// Two blocks; exists only where avx512f and avx512bw do.
#[derive(Clone, Copy)]
pub struct Zmm(__m512i);

/// 64-bit words for `low_lanes`: of each block of the first source words 0 and 1, then those of the second (from 8).
const LOW_LANES: [i64; 8] = [0, 1, 8, 9, 4, 5, 12, 13];
const HIGH_LANES: [i64; 8] = [2, 3, 10, 11, 6, 7, 14, 15];

/// # Safety
/// The CPU must have avx.
#[inline(always)]
unsafe fn ymm(block: &Block) -> __m256i {
    // SAFETY: the caller promises avx; a `Block` is 32 bytes, aligned to 32
    unsafe { _mm256_load_si256((&raw const *block).cast()) }
}

macro_rules! pairs {
    ($($name:ident $intrinsic:ident;)*) => {$(
        #[inline(always)]
        fn $name(self, other: Self) -> Self {
            // SAFETY: a `Zmm` exists only where avx512f and avx512bw do
            Zmm(unsafe { $intrinsic(self.0, other.0) })
        }
    )*};
}

impl Blocks for Zmm {
    const WIDTH: usize = 2;

    #[inline(always)]
    unsafe fn load<const N: usize>(nets: &[[Block; N]], k: usize) -> Self {
        // SAFETY: the caller promises avx512f
        Zmm(unsafe { _mm512_inserti64x4::<1>(_mm512_castsi256_si512(ymm(&nets[0][k])), ymm(&nets[1][k])) })
    }

    #[inline(always)]
    fn store<const N: usize>(self, nets: &mut [[Block; N]], k: usize) {
        // SAFETY: a `Zmm` exists only where avx512f does; a `Block` is 32 bytes, aligned to 32
        unsafe {
            _mm256_store_si256((&raw mut nets[0][k]).cast(), _mm512_castsi512_si256(self.0));
            _mm256_store_si256((&raw mut nets[1][k]).cast(), _mm512_extracti64x4_epi64::<1>(self.0));
        }
    }

    #[inline(always)]
    unsafe fn splat(block: &Block) -> Self {
        // SAFETY: the caller promises avx512f
        Zmm(unsafe { _mm512_broadcast_i64x4(ymm(block)) })
    }

    #[inline(always)]
    fn permute_elements(self, from: &Elements) -> Self {
        // SAFETY: a `Zmm` exists only where avx512f does
        Zmm(unsafe {
            // the second block's elements are 8 to 15
            let second = _mm512_set_epi64(SECOND, SECOND, SECOND, SECOND, 0, 0, 0, 0);
            _mm512_permutexvar_epi32(_mm512_add_epi32(Self::splat(&from.elements).0, second), self.0)
        })
    }

    #[inline(always)]
    fn permute_words<const ORDER: i32>(self) -> Self {
        // SAFETY: a `Zmm` exists only where avx512f does
        Zmm(unsafe { _mm512_permutex_epi64::<ORDER>(self.0) })
    }

    #[inline(always)]
    fn align<const BYTES: i32>(self, low: Self) -> Self {
        // SAFETY: a `Zmm` exists only where avx512bw does
        Zmm(unsafe { _mm512_alignr_epi8::<BYTES>(self.0, low.0) })
    }

    #[inline(always)]
    fn blend(self, other: Self, mask: Self) -> Self {
        // SAFETY: a `Zmm` exists only where avx512bw does
        Zmm(unsafe { _mm512_mask_blend_epi8(_mm512_movepi8_mask(mask.0), self.0, other.0) })
    }

    #[inline(always)]
    fn low_lanes(self, other: Self) -> Self {
        // SAFETY: a `Zmm` exists only where avx512f does; the constant has the 64 bytes that are read
        Zmm(unsafe { _mm512_permutex2var_epi64(self.0, _mm512_loadu_si512(LOW_LANES.as_ptr().cast()), other.0) })
    }

    #[inline(always)]
    fn high_lanes(self, other: Self) -> Self {
        // SAFETY: a `Zmm` exists only where avx512f does; the constant has the 64 bytes that are read
        Zmm(unsafe { _mm512_permutex2var_epi64(self.0, _mm512_loadu_si512(HIGH_LANES.as_ptr().cast()), other.0) })
    }

    pairs! {
        shuffle_bytes _mm512_shuffle_epi8;
        zip8_low _mm512_unpacklo_epi8;
        zip8_high _mm512_unpackhi_epi8;
        zip16_low _mm512_unpacklo_epi16;
        zip16_high _mm512_unpackhi_epi16;
        zip32_low _mm512_unpacklo_epi32;
        zip32_high _mm512_unpackhi_epi32;
        zip64_low _mm512_unpacklo_epi64;
        zip64_high _mm512_unpackhi_epi64;
        pack _mm512_packus_epi16;
        add _mm512_add_epi64;
        and _mm512_and_si512;
    }
}

/// 8 in both 32-bit halves.
const SECOND: i64 = 0x0000_0008_0000_0008;
