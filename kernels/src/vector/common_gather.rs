//! Sixteen 32-bit and eight 64-bit lanes with indexed loads, in the ways of each instruction set.

#[cfg(target_arch = "x86_64")]
use std::arch::x86_64::*;

/// Vectors of 16 × 32 and 8 × 64 bits. A value exists only where its instructions do: making the first one (`load` and
/// `splat`) is unsafe, everything but the indexed loads is safe from there on.
pub trait Lanes {
    /// 16 lanes of 32 bits.
    type Half: Copy;
    /// 8 lanes of 64 bits.
    type Full: Copy;

    /// # Safety
    /// The CPU must have the implementing type's features.
    unsafe fn load_half(from: &[u32; 16]) -> Self::Half;
    /// # Safety
    /// The CPU must have the implementing type's features.
    unsafe fn load_full(from: &[u64; 8]) -> Self::Full;
    fn store_half(x: Self::Half) -> [u32; 16];
    fn store_full(x: Self::Full) -> [u64; 8];

    fn and_half(x: Self::Half, y: Self::Half) -> Self::Half;
    fn xor_half(x: Self::Half, y: Self::Half) -> Self::Half;
    fn add_half(x: Self::Half, y: Self::Half) -> Self::Half;
    /// Rotates each lane left by 7.
    fn turn_half(x: Self::Half) -> Self::Half;
    fn and_full(x: Self::Full, y: Self::Full) -> Self::Full;
    fn add_full(x: Self::Full, y: Self::Full) -> Self::Full;
    /// Rotates each lane left by 13.
    fn turn_full(x: Self::Full) -> Self::Full;
    /// Lanes 8 to 15, zero-extended.
    fn widen_high(x: Self::Half) -> Self::Full;

    /// `vpgatherdd`: lane l gets the `index[l]`-th 32-bit element.
    ///
    /// # Safety
    /// Every index must be below twice the table's length.
    unsafe fn gather_half(table: &[u64], index: Self::Half) -> Self::Half;
    /// `vpgatherdq`: lane l gets the `index[l]`-th word, for the indices in lanes 0 to 7.
    ///
    /// # Safety
    /// Those indices must be below the table's length.
    unsafe fn gather_mixed(table: &[u64], index: Self::Half) -> Self::Full;
    /// `vpgatherqq`: lane l gets the `index[l]`-th word.
    ///
    /// # Safety
    /// Every index must be below the table's length.
    unsafe fn gather_full(table: &[u64], index: Self::Full) -> Self::Full;
}

/// One ordinary load an element.
pub struct OneByOne;

macro_rules! each {
    ($x:ident, $y:ident, $f:expr) => {
        std::array::from_fn(|l| $f($x[l], $y[l]))
    };
}

impl Lanes for OneByOne {
    type Half = [u32; 16];
    type Full = [u64; 8];

    #[inline(always)]
    unsafe fn load_half(from: &[u32; 16]) -> [u32; 16] {
        *from
    }
    #[inline(always)]
    unsafe fn load_full(from: &[u64; 8]) -> [u64; 8] {
        *from
    }
    #[inline(always)]
    fn store_half(x: [u32; 16]) -> [u32; 16] {
        x
    }
    #[inline(always)]
    fn store_full(x: [u64; 8]) -> [u64; 8] {
        x
    }
    #[inline(always)]
    fn and_half(x: [u32; 16], y: [u32; 16]) -> [u32; 16] {
        each!(x, y, |a, b| a & b)
    }
    #[inline(always)]
    fn xor_half(x: [u32; 16], y: [u32; 16]) -> [u32; 16] {
        each!(x, y, |a, b| a ^ b)
    }
    #[inline(always)]
    fn add_half(x: [u32; 16], y: [u32; 16]) -> [u32; 16] {
        each!(x, y, u32::wrapping_add)
    }
    #[inline(always)]
    fn turn_half(x: [u32; 16]) -> [u32; 16] {
        x.map(|v| v.rotate_left(7))
    }
    #[inline(always)]
    fn and_full(x: [u64; 8], y: [u64; 8]) -> [u64; 8] {
        each!(x, y, |a, b| a & b)
    }
    #[inline(always)]
    fn add_full(x: [u64; 8], y: [u64; 8]) -> [u64; 8] {
        each!(x, y, u64::wrapping_add)
    }
    #[inline(always)]
    fn turn_full(x: [u64; 8]) -> [u64; 8] {
        x.map(|v| v.rotate_left(13))
    }
    #[inline(always)]
    fn widen_high(x: [u32; 16]) -> [u64; 8] {
        std::array::from_fn(|l| u64::from(x[l + 8]))
    }
    #[inline(always)]
    unsafe fn gather_half(table: &[u64], index: [u32; 16]) -> [u32; 16] {
        index.map(|i| {
            // SAFETY: the caller promises an index below twice the length; a word holds two aligned 32-bit elements
            unsafe { table.as_ptr().cast::<u32>().add(i as usize).read() }
        })
    }
    #[inline(always)]
    unsafe fn gather_mixed(table: &[u64], index: [u32; 16]) -> [u64; 8] {
        std::array::from_fn(|l| {
            // SAFETY: the caller promises an index below the length
            unsafe { *table.get_unchecked(index[l] as usize) }
        })
    }
    #[inline(always)]
    unsafe fn gather_full(table: &[u64], index: [u64; 8]) -> [u64; 8] {
        index.map(|i| {
            // SAFETY: the caller promises an index below the length
            unsafe { *table.get_unchecked(i as usize) }
        })
    }
}

/// Two 256-bit registers a vector.
#[cfg(target_arch = "x86_64")]
pub struct TwoYmm;

/// Both registers, low lanes first; exists only where avx2 does.
#[cfg(target_arch = "x86_64")]
#[derive(Clone, Copy)]
pub struct Ymms(__m256i, __m256i);

#[cfg(target_arch = "x86_64")]
macro_rules! both {
    ($($name:ident $intrinsic:ident;)*) => {$(
        #[inline(always)]
        fn $name(x: Ymms, y: Ymms) -> Ymms {
            // SAFETY: `Ymms` exist only where avx2 does
            unsafe { Ymms($intrinsic(x.0, y.0), $intrinsic(x.1, y.1)) }
        }
    )*};
}

#[cfg(target_arch = "x86_64")]
impl Lanes for TwoYmm {
    type Half = Ymms;
    type Full = Ymms;

    #[inline(always)]
    unsafe fn load_half(from: &[u32; 16]) -> Ymms {
        let from = from.as_ptr().cast::<__m256i>();
        // SAFETY: the caller promises avx2; the array has 64 bytes
        unsafe { Ymms(_mm256_loadu_si256(from), _mm256_loadu_si256(from.add(1))) }
    }
    #[inline(always)]
    unsafe fn load_full(from: &[u64; 8]) -> Ymms {
        let from = from.as_ptr().cast::<__m256i>();
        // SAFETY: the caller promises avx2; the array has 64 bytes
        unsafe { Ymms(_mm256_loadu_si256(from), _mm256_loadu_si256(from.add(1))) }
    }
    #[inline(always)]
    fn store_half(x: Ymms) -> [u32; 16] {
        let mut out = [0; 16];
        let to = out.as_mut_ptr().cast::<__m256i>();
        // SAFETY: `Ymms` exist only where avx2 does; the array has 64 bytes
        unsafe {
            _mm256_storeu_si256(to, x.0);
            _mm256_storeu_si256(to.add(1), x.1);
        }
        out
    }
    #[inline(always)]
    fn store_full(x: Ymms) -> [u64; 8] {
        let mut out = [0; 8];
        let to = out.as_mut_ptr().cast::<__m256i>();
        // SAFETY: `Ymms` exist only where avx2 does; the array has 64 bytes
        unsafe {
            _mm256_storeu_si256(to, x.0);
            _mm256_storeu_si256(to.add(1), x.1);
        }
        out
    }
    #[inline(always)]
    fn turn_half(x: Ymms) -> Ymms {
        // SAFETY: `Ymms` exist only where avx2 does
        let turn = |v| unsafe { _mm256_or_si256(_mm256_slli_epi32::<7>(v), _mm256_srli_epi32::<25>(v)) };
        Ymms(turn(x.0), turn(x.1))
    }
    #[inline(always)]
    fn turn_full(x: Ymms) -> Ymms {
        // SAFETY: `Ymms` exist only where avx2 does
        let turn = |v| unsafe { _mm256_or_si256(_mm256_slli_epi64::<13>(v), _mm256_srli_epi64::<51>(v)) };
        Ymms(turn(x.0), turn(x.1))
    }
    #[inline(always)]
    fn widen_high(x: Ymms) -> Ymms {
        // SAFETY: `Ymms` exist only where avx2 does
        unsafe {
            Ymms(
                _mm256_cvtepu32_epi64(_mm256_castsi256_si128(x.1)),
                _mm256_cvtepu32_epi64(_mm256_extracti128_si256::<1>(x.1)),
            )
        }
    }
    #[inline(always)]
    unsafe fn gather_half(table: &[u64], index: Ymms) -> Ymms {
        let table = table.as_ptr().cast::<i32>();
        // SAFETY: `Ymms` exist only where avx2 does; the caller promises indices inside the table
        unsafe { Ymms(_mm256_i32gather_epi32::<4>(table, index.0), _mm256_i32gather_epi32::<4>(table, index.1)) }
    }
    #[inline(always)]
    unsafe fn gather_mixed(table: &[u64], index: Ymms) -> Ymms {
        let table = table.as_ptr().cast::<i64>();
        // SAFETY: `Ymms` exist only where avx2 does; the caller promises indices inside the table
        unsafe {
            Ymms(
                _mm256_i32gather_epi64::<8>(table, _mm256_castsi256_si128(index.0)),
                _mm256_i32gather_epi64::<8>(table, _mm256_extracti128_si256::<1>(index.0)),
            )
        }
    }
    #[inline(always)]
    unsafe fn gather_full(table: &[u64], index: Ymms) -> Ymms {
        let table = table.as_ptr().cast::<i64>();
        // SAFETY: `Ymms` exist only where avx2 does; the caller promises indices inside the table
        unsafe { Ymms(_mm256_i64gather_epi64::<8>(table, index.0), _mm256_i64gather_epi64::<8>(table, index.1)) }
    }
    both! {
        and_half _mm256_and_si256;
        xor_half _mm256_xor_si256;
        add_half _mm256_add_epi32;
        and_full _mm256_and_si256;
        add_full _mm256_add_epi64;
    }
}

/// One 512-bit register a vector.
#[cfg(target_arch = "x86_64")]
pub struct OneZmm;

/// Exists only where avx512f does.
#[cfg(target_arch = "x86_64")]
#[derive(Clone, Copy)]
pub struct Zmm(__m512i);

#[cfg(target_arch = "x86_64")]
macro_rules! wide {
    ($($name:ident $intrinsic:ident;)*) => {$(
        #[inline(always)]
        fn $name(x: Zmm, y: Zmm) -> Zmm {
            // SAFETY: a `Zmm` exists only where avx512f does
            unsafe { Zmm($intrinsic(x.0, y.0)) }
        }
    )*};
}

#[cfg(target_arch = "x86_64")]
impl Lanes for OneZmm {
    type Half = Zmm;
    type Full = Zmm;

    #[inline(always)]
    unsafe fn load_half(from: &[u32; 16]) -> Zmm {
        // SAFETY: the caller promises avx512f; the array has 64 bytes
        unsafe { Zmm(_mm512_loadu_si512(from.as_ptr().cast())) }
    }
    #[inline(always)]
    unsafe fn load_full(from: &[u64; 8]) -> Zmm {
        // SAFETY: the caller promises avx512f; the array has 64 bytes
        unsafe { Zmm(_mm512_loadu_si512(from.as_ptr().cast())) }
    }
    #[inline(always)]
    fn store_half(x: Zmm) -> [u32; 16] {
        let mut out = [0; 16];
        // SAFETY: a `Zmm` exists only where avx512f does; the array has 64 bytes
        unsafe { _mm512_storeu_si512(out.as_mut_ptr().cast(), x.0) };
        out
    }
    #[inline(always)]
    fn store_full(x: Zmm) -> [u64; 8] {
        let mut out = [0; 8];
        // SAFETY: a `Zmm` exists only where avx512f does; the array has 64 bytes
        unsafe { _mm512_storeu_si512(out.as_mut_ptr().cast(), x.0) };
        out
    }
    #[inline(always)]
    fn turn_half(x: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does
        unsafe { Zmm(_mm512_rol_epi32::<7>(x.0)) }
    }
    #[inline(always)]
    fn turn_full(x: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does
        unsafe { Zmm(_mm512_rol_epi64::<13>(x.0)) }
    }
    #[inline(always)]
    fn widen_high(x: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does
        unsafe { Zmm(_mm512_cvtepu32_epi64(_mm512_extracti64x4_epi64::<1>(x.0))) }
    }
    #[inline(always)]
    unsafe fn gather_half(table: &[u64], index: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does; the caller promises indices inside the table
        unsafe { Zmm(_mm512_i32gather_epi32::<4>(index.0, table.as_ptr().cast())) }
    }
    #[inline(always)]
    unsafe fn gather_mixed(table: &[u64], index: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does; the caller promises indices inside the table
        unsafe { Zmm(_mm512_i32gather_epi64::<8>(_mm512_castsi512_si256(index.0), table.as_ptr().cast())) }
    }
    #[inline(always)]
    unsafe fn gather_full(table: &[u64], index: Zmm) -> Zmm {
        // SAFETY: a `Zmm` exists only where avx512f does; the caller promises indices inside the table
        unsafe { Zmm(_mm512_i64gather_epi64::<8>(index.0, table.as_ptr().cast())) }
    }
    wide! {
        and_half _mm512_and_si512;
        xor_half _mm512_xor_si512;
        add_half _mm512_add_epi32;
        and_full _mm512_and_si512;
        add_full _mm512_add_epi64;
    }
}
