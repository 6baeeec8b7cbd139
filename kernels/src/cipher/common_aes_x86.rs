//! AES rounds by the x86 instructions, one block in 128 bits or four in 512.

use std::arch::x86_64::*;

use super::common_aes::{Block, Rounds};

/// Evidence that AES-NI and AVX are present.
#[derive(Clone, Copy)]
pub struct Aesni(());

impl Aesni {
    /// # Safety
    /// The CPU must have `aes` and `avx`.
    #[inline(always)]
    pub unsafe fn new() -> Aesni {
        Aesni(())
    }

    #[inline(always)]
    fn one(k: &Block) -> __m128i {
        // SAFETY: sse2 is part of the x86-64 baseline
        unsafe { _mm_set_epi64x(k[1] as i64, k[0] as i64) }
    }
}

impl Rounds for Aesni {
    type Blocks = __m128i;
    const WIDTH: usize = 1;

    #[inline(always)]
    fn load(self, from: &[Block]) -> __m128i {
        // SAFETY: a block is 16 readable bytes
        unsafe { _mm_loadu_si128((&raw const from[0]).cast()) }
    }

    #[inline(always)]
    fn store(self, x: __m128i, to: &mut [Block]) {
        // SAFETY: a block is 16 writable bytes
        unsafe { _mm_storeu_si128((&raw mut to[0]).cast(), x) }
    }

    #[inline(always)]
    fn spread(self, block: &Block) -> __m128i {
        self.load(std::slice::from_ref(block))
    }

    #[inline(always)]
    fn xor(self, x: __m128i, k: __m128i) -> __m128i {
        // SAFETY: sse2 is part of the x86-64 baseline
        unsafe { _mm_xor_si128(x, k) }
    }

    #[inline(always)]
    fn encrypt(self, x: __m128i, k: __m128i) -> __m128i {
        // SAFETY: the caller of `Aesni::new` proved aes
        unsafe { _mm_aesenc_si128(x, k) }
    }

    #[inline(always)]
    fn encrypt_last(self, x: __m128i, k: __m128i) -> __m128i {
        // SAFETY: the caller of `Aesni::new` proved aes
        unsafe { _mm_aesenclast_si128(x, k) }
    }

    #[inline(always)]
    fn decrypt(self, x: __m128i, k: __m128i) -> __m128i {
        // SAFETY: the caller of `Aesni::new` proved aes
        unsafe { _mm_aesdec_si128(x, k) }
    }

    #[inline(always)]
    fn decrypt_last(self, x: __m128i, k: __m128i) -> __m128i {
        // SAFETY: the caller of `Aesni::new` proved aes
        unsafe { _mm_aesdeclast_si128(x, k) }
    }

    #[inline(always)]
    fn inverse_mix(self, k: &Block) -> Block {
        let mut out = [[0; 2]];
        // SAFETY: the caller of `Aesni::new` proved aes
        let mixed = unsafe { _mm_aesimc_si128(Self::one(k)) };
        self.store(mixed, &mut out);
        out[0]
    }

    #[inline(always)]
    fn sub_word(self, w: u32) -> u32 {
        // word 0 of the result is SubWord of word 1 of the argument
        // SAFETY: the caller of `Aesni::new` proved aes
        unsafe { _mm_cvtsi128_si32(_mm_aeskeygenassist_si128::<0>(_mm_set1_epi32(w as i32))) as u32 }
    }
}

/// Evidence that VAES, AES-NI and AVX-512F are present.
#[derive(Clone, Copy)]
pub struct Vaes(Aesni);

impl Vaes {
    /// # Safety
    /// The CPU must have `vaes`, `aes` and `avx512f`.
    #[inline(always)]
    pub unsafe fn new() -> Vaes {
        Vaes(Aesni(()))
    }
}

impl Rounds for Vaes {
    type Blocks = __m512i;
    const WIDTH: usize = 4;

    #[inline(always)]
    fn load(self, from: &[Block]) -> __m512i {
        let from = &from[..4];
        // SAFETY: four blocks are 64 readable bytes; the caller of `Vaes::new` proved avx512f
        unsafe { _mm512_loadu_si512(from.as_ptr().cast()) }
    }

    #[inline(always)]
    fn store(self, x: __m512i, to: &mut [Block]) {
        let to = &mut to[..4];
        // SAFETY: four blocks are 64 writable bytes; the caller of `Vaes::new` proved avx512f
        unsafe { _mm512_storeu_si512(to.as_mut_ptr().cast(), x) }
    }

    #[inline(always)]
    fn spread(self, block: &Block) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved avx512f
        unsafe { _mm512_broadcast_i32x4(Aesni::one(block)) }
    }

    #[inline(always)]
    fn xor(self, x: __m512i, k: __m512i) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved avx512f
        unsafe { _mm512_xor_si512(x, k) }
    }

    #[inline(always)]
    fn encrypt(self, x: __m512i, k: __m512i) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved vaes and avx512f
        unsafe { _mm512_aesenc_epi128(x, k) }
    }

    #[inline(always)]
    fn encrypt_last(self, x: __m512i, k: __m512i) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved vaes and avx512f
        unsafe { _mm512_aesenclast_epi128(x, k) }
    }

    #[inline(always)]
    fn decrypt(self, x: __m512i, k: __m512i) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved vaes and avx512f
        unsafe { _mm512_aesdec_epi128(x, k) }
    }

    #[inline(always)]
    fn decrypt_last(self, x: __m512i, k: __m512i) -> __m512i {
        // SAFETY: the caller of `Vaes::new` proved vaes and avx512f
        unsafe { _mm512_aesdeclast_epi128(x, k) }
    }

    #[inline(always)]
    fn inverse_mix(self, k: &Block) -> Block {
        self.0.inverse_mix(k)
    }

    #[inline(always)]
    fn sub_word(self, w: u32) -> u32 {
        self.0.sub_word(w)
    }
}
