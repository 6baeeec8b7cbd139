//! Carry-less multiplication by the x86 instruction, one block in 128 bits or four in 512.

use std::arch::x86_64::*;

use super::clmul::{Block, Multiplier};

/// Evidence that AVX and PCLMULQDQ are present: every block in a register of its own.
#[derive(Clone, Copy)]
pub struct Narrow(());

impl Narrow {
    /// # Safety
    /// The CPU must have `avx` and `pclmulqdq`.
    #[inline(always)]
    pub unsafe fn new() -> Narrow {
        Narrow(())
    }
}

impl Multiplier for Narrow {
    type Pair = __m128i;
    type One = __m128i;
    type Four = [__m128i; 4];

    #[inline(always)]
    fn pair(self, constants: Block) -> __m128i {
        self.block(constants)
    }

    #[inline(always)]
    fn block(self, block: Block) -> __m128i {
        // SAFETY: sse2 is part of the x86-64 baseline
        unsafe { _mm_set_epi64x(block[1] as i64, block[0] as i64) }
    }

    #[inline(always)]
    fn words(self, block: __m128i) -> Block {
        let mut words = [0; 2];
        // SAFETY: a block is 16 writable bytes
        unsafe { _mm_storeu_si128((&raw mut words).cast(), block) };
        words
    }

    #[inline(always)]
    fn load(self, bytes: &[u8; 16]) -> __m128i {
        // SAFETY: the array is 16 readable bytes
        unsafe { _mm_loadu_si128(bytes.as_ptr().cast()) }
    }

    #[inline(always)]
    fn fold(self, x: __m128i, by: &__m128i, next: __m128i) -> __m128i {
        // SAFETY: whoever called `new` proved pclmulqdq
        unsafe {
            let low = _mm_clmulepi64_si128::<0x00>(x, *by);
            let high = _mm_clmulepi64_si128::<0x11>(x, *by);
            _mm_xor_si128(_mm_xor_si128(low, next), high)
        }
    }

    #[inline(always)]
    fn load_four(self, bytes: &[u8; 64]) -> [__m128i; 4] {
        let blocks = bytes.as_chunks::<16>().0;
        [self.load(&blocks[0]), self.load(&blocks[1]), self.load(&blocks[2]), self.load(&blocks[3])]
    }

    #[inline(always)]
    fn fold_four(self, x: [__m128i; 4], by: &__m128i, next: [__m128i; 4]) -> [__m128i; 4] {
        [
            self.fold(x[0], by, next[0]),
            self.fold(x[1], by, next[1]),
            self.fold(x[2], by, next[2]),
            self.fold(x[3], by, next[3]),
        ]
    }

    #[inline(always)]
    fn add_first(self, mut x: [__m128i; 4], word: u64) -> [__m128i; 4] {
        // SAFETY: sse2 is part of the x86-64 baseline
        x[0] = unsafe { _mm_xor_si128(x[0], _mm_cvtsi64_si128(word as i64)) };
        x
    }

    #[inline(always)]
    fn split(self, x: [__m128i; 4]) -> [__m128i; 4] {
        x
    }
}

/// Evidence that the 512-bit form is present as well: four blocks in one register.
#[derive(Clone, Copy)]
pub struct Wide(Narrow);

impl Wide {
    /// # Safety
    /// The CPU must have `avx`, `pclmulqdq`, `avx512f` and `vpclmulqdq`.
    #[inline(always)]
    pub unsafe fn new() -> Wide {
        Wide(Narrow(()))
    }
}

impl Multiplier for Wide {
    type Pair = (__m128i, __m512i);
    type One = __m128i;
    type Four = __m512i;

    #[inline(always)]
    fn pair(self, constants: Block) -> (__m128i, __m512i) {
        let one = self.0.pair(constants);
        // SAFETY: whoever called `new` proved avx512f
        (one, unsafe { _mm512_broadcast_i32x4(one) })
    }

    #[inline(always)]
    fn block(self, block: Block) -> __m128i {
        self.0.block(block)
    }

    #[inline(always)]
    fn words(self, block: __m128i) -> Block {
        self.0.words(block)
    }

    #[inline(always)]
    fn load(self, bytes: &[u8; 16]) -> __m128i {
        self.0.load(bytes)
    }

    #[inline(always)]
    fn fold(self, x: __m128i, by: &(__m128i, __m512i), next: __m128i) -> __m128i {
        self.0.fold(x, &by.0, next)
    }

    #[inline(always)]
    fn load_four(self, bytes: &[u8; 64]) -> __m512i {
        // SAFETY: the array is 64 readable bytes; whoever called `new` proved avx512f
        unsafe { _mm512_loadu_si512(bytes.as_ptr().cast()) }
    }

    #[inline(always)]
    fn fold_four(self, x: __m512i, by: &(__m128i, __m512i), next: __m512i) -> __m512i {
        // SAFETY: whoever called `new` proved avx512f and vpclmulqdq
        unsafe {
            let low = _mm512_clmulepi64_epi128::<0x00>(x, by.1);
            let high = _mm512_clmulepi64_epi128::<0x11>(x, by.1);
            _mm512_ternarylogic_epi64::<0x96>(low, high, next)
        }
    }

    #[inline(always)]
    fn add_first(self, x: __m512i, word: u64) -> __m512i {
        // SAFETY: whoever called `new` proved avx512f
        unsafe { _mm512_xor_si512(x, _mm512_set_epi64(0, 0, 0, 0, 0, 0, 0, word as i64)) }
    }

    #[inline(always)]
    fn split(self, x: __m512i) -> [__m128i; 4] {
        // SAFETY: whoever called `new` proved avx512f
        unsafe {
            [
                _mm512_extracti32x4_epi32::<0>(x),
                _mm512_extracti32x4_epi32::<1>(x),
                _mm512_extracti32x4_epi32::<2>(x),
                _mm512_extracti32x4_epi32::<3>(x),
            ]
        }
    }
}
