//! A line as two 256-bit or one 512-bit register.

use std::arch::x86_64::*;

use super::common_lanes::Lanes;

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

impl Lanes for Avx2 {
    type V = [__m256i; 2];

    #[inline(always)]
    fn of(self, words: [u64; 8]) -> [__m256i; 2] {
        // SAFETY: the array is 64 readable bytes
        unsafe { self.load(words.as_ptr().cast()) }
    }

    #[inline(always)]
    fn words(self, v: [__m256i; 2]) -> [u64; 8] {
        let mut words = [0; 8];
        // SAFETY: the array is 64 writable bytes
        unsafe { self.store(v, words.as_mut_ptr().cast()) };
        words
    }

    #[inline(always)]
    fn add(self, a: [__m256i; 2], b: [__m256i; 2]) -> [__m256i; 2] {
        // SAFETY: the caller of `Avx2::new` proved avx2
        unsafe { [_mm256_add_epi64(a[0], b[0]), _mm256_add_epi64(a[1], b[1])] }
    }

    #[inline(always)]
    fn fold(self, a: [__m256i; 2]) -> [__m256i; 2] {
        // SAFETY: the caller of `Avx2::new` proved avx2
        a.map(|x| unsafe { _mm256_xor_si256(x, _mm256_srli_epi64::<32>(x)) })
    }

    #[inline(always)]
    fn prefetch(self, from: *const u8) {
        // SAFETY: SSE is part of the x86-64 baseline; a prefetch of any address is without effect on the program
        unsafe { _mm_prefetch::<_MM_HINT_T0>(from.cast()) }
    }

    #[inline(always)]
    unsafe fn load(self, from: *const u8) -> [__m256i; 2] {
        // SAFETY: the caller gives 64 readable bytes; the caller of `Avx2::new` proved avx2
        unsafe { [_mm256_loadu_si256(from.cast()), _mm256_loadu_si256(from.add(32).cast())] }
    }

    #[inline(always)]
    unsafe fn store(self, v: [__m256i; 2], to: *mut u8) {
        // SAFETY: the caller gives 64 writable bytes; the caller of `Avx2::new` proved avx2
        unsafe {
            _mm256_storeu_si256(to.cast(), v[0]);
            _mm256_storeu_si256(to.add(32).cast(), v[1]);
        }
    }
}

/// Evidence that AVX-512F is present.
#[derive(Clone, Copy)]
pub struct Avx512(());

impl Avx512 {
    /// # Safety
    /// The CPU must have `avx512f`.
    #[inline(always)]
    pub unsafe fn new() -> Avx512 {
        Avx512(())
    }
}

impl Lanes for Avx512 {
    type V = __m512i;

    #[inline(always)]
    fn of(self, words: [u64; 8]) -> __m512i {
        // SAFETY: the array is 64 readable bytes
        unsafe { self.load(words.as_ptr().cast()) }
    }

    #[inline(always)]
    fn words(self, v: __m512i) -> [u64; 8] {
        let mut words = [0; 8];
        // SAFETY: the array is 64 writable bytes
        unsafe { self.store(v, words.as_mut_ptr().cast()) };
        words
    }

    #[inline(always)]
    fn add(self, a: __m512i, b: __m512i) -> __m512i {
        // SAFETY: the caller of `Avx512::new` proved avx512f
        unsafe { _mm512_add_epi64(a, b) }
    }

    #[inline(always)]
    fn fold(self, a: __m512i) -> __m512i {
        // SAFETY: the caller of `Avx512::new` proved avx512f
        unsafe { _mm512_xor_si512(a, _mm512_srli_epi64::<32>(a)) }
    }

    #[inline(always)]
    fn prefetch(self, from: *const u8) {
        // SAFETY: SSE is part of the x86-64 baseline; a prefetch of any address is without effect on the program
        unsafe { _mm_prefetch::<_MM_HINT_T0>(from.cast()) }
    }

    #[inline(always)]
    unsafe fn load(self, from: *const u8) -> __m512i {
        // SAFETY: the caller gives 64 readable bytes; the caller of `Avx512::new` proved avx512f
        unsafe { _mm512_loadu_si512(from.cast()) }
    }

    #[inline(always)]
    unsafe fn store(self, v: __m512i, to: *mut u8) {
        // SAFETY: the caller gives 64 writable bytes; the caller of `Avx512::new` proved avx512f
        unsafe { _mm512_storeu_si512(to.cast(), v) }
    }
}
