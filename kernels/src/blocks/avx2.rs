//! One block in a 256-bit x86 register.

use std::arch::x86_64::*;

use super::{Block, Blocks, Elements};

/// One block; exists only where avx2 does.
#[derive(Clone, Copy)]
pub struct Ymm(__m256i);

macro_rules! pairs {
    ($($name:ident $intrinsic:ident;)*) => {$(
        #[inline(always)]
        fn $name(self, other: Self) -> Self {
            // SAFETY: a `Ymm` exists only where avx2 does
            Ymm(unsafe { $intrinsic(self.0, other.0) })
        }
    )*};
}

impl Blocks for Ymm {
    const WIDTH: usize = 1;

    #[inline(always)]
    unsafe fn load<const N: usize>(nets: &[[Block; N]], k: usize) -> Self {
        // SAFETY: the caller's promise is the same
        unsafe { Self::splat(&nets[0][k]) }
    }

    #[inline(always)]
    fn store<const N: usize>(self, nets: &mut [[Block; N]], k: usize) {
        // SAFETY: a `Ymm` exists only where avx2 does; a `Block` is 32 bytes, aligned to 32
        unsafe { _mm256_store_si256((&raw mut nets[0][k]).cast(), self.0) }
    }

    #[inline(always)]
    unsafe fn splat(block: &Block) -> Self {
        // SAFETY: the caller promises avx2; a `Block` is 32 bytes, aligned to 32
        Ymm(unsafe { _mm256_load_si256((&raw const *block).cast()) })
    }

    #[inline(always)]
    fn permute_elements(self, from: &Elements) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_permutevar8x32_epi32(self.0, Self::splat(&from.elements).0) })
    }

    #[inline(always)]
    fn permute_words<const ORDER: i32>(self) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_permute4x64_epi64::<ORDER>(self.0) })
    }

    #[inline(always)]
    fn align<const BYTES: i32>(self, low: Self) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_alignr_epi8::<BYTES>(self.0, low.0) })
    }

    #[inline(always)]
    fn blend(self, other: Self, mask: Self) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_blendv_epi8(self.0, other.0, mask.0) })
    }

    #[inline(always)]
    fn low_lanes(self, other: Self) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_permute2x128_si256::<0x20>(self.0, other.0) })
    }

    #[inline(always)]
    fn high_lanes(self, other: Self) -> Self {
        // SAFETY: a `Ymm` exists only where avx2 does
        Ymm(unsafe { _mm256_permute2x128_si256::<0x31>(self.0, other.0) })
    }

    pairs! {
        shuffle_bytes _mm256_shuffle_epi8;
        zip8_low _mm256_unpacklo_epi8;
        zip8_high _mm256_unpackhi_epi8;
        zip16_low _mm256_unpacklo_epi16;
        zip16_high _mm256_unpackhi_epi16;
        zip32_low _mm256_unpacklo_epi32;
        zip32_high _mm256_unpackhi_epi32;
        zip64_low _mm256_unpacklo_epi64;
        zip64_high _mm256_unpackhi_epi64;
        pack _mm256_packus_epi16;
        add _mm256_add_epi64;
        and _mm256_and_si256;
    }
}
