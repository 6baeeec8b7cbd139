//! AES rounds by the aarch64 instructions. AESE adds the key *before* SubBytes; with a zero key and the round key added
//! after MixColumns the rounds take the order of FIPS 197.

use std::arch::aarch64::*;

use super::common_aes::{Block, Rounds};

/// Evidence that the AES extension is present.
#[derive(Clone, Copy)]
pub struct Arm(());

impl Arm {
    /// # Safety
    /// The CPU must have `aes`.
    #[inline(always)]
    pub unsafe fn new() -> Arm {
        Arm(())
    }
}

// The intrinsics are inlined only into functions that name their feature; these are, into the kernel's wrapper.

#[inline]
#[target_feature(enable = "neon,aes")]
fn forward(x: uint8x16_t) -> uint8x16_t {
    vaeseq_u8(x, vdupq_n_u8(0))
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn backward(x: uint8x16_t) -> uint8x16_t {
    vaesdq_u8(x, vdupq_n_u8(0))
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn encrypt(x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
    veorq_u8(vaesmcq_u8(forward(x)), k)
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn encrypt_last(x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
    veorq_u8(forward(x), k)
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn decrypt(x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
    veorq_u8(vaesimcq_u8(backward(x)), k)
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn decrypt_last(x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
    veorq_u8(backward(x), k)
}

#[inline]
#[target_feature(enable = "neon,aes")]
fn inverse_mix(k: uint8x16_t) -> uint8x16_t {
    vaesimcq_u8(k)
}

/// SubBytes of four equal columns, which ShiftRows leaves as they are.
#[inline]
#[target_feature(enable = "neon,aes")]
fn sub_word(w: u32) -> u32 {
    vgetq_lane_u32::<0>(vreinterpretq_u32_u8(forward(vreinterpretq_u8_u32(vdupq_n_u32(w)))))
}

impl Rounds for Arm {
    type Blocks = uint8x16_t;
    const WIDTH: usize = 1;

    #[inline(always)]
    fn load(self, from: &[Block]) -> uint8x16_t {
        // SAFETY: a block is 16 readable bytes
        unsafe { vld1q_u8((&raw const from[0]).cast()) }
    }

    #[inline(always)]
    fn store(self, x: uint8x16_t, to: &mut [Block]) {
        // SAFETY: a block is 16 writable bytes
        unsafe { vst1q_u8((&raw mut to[0]).cast(), x) }
    }

    #[inline(always)]
    fn spread(self, block: &Block) -> uint8x16_t {
        self.load(std::slice::from_ref(block))
    }

    #[inline(always)]
    fn xor(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: Advanced SIMD is part of the aarch64 baseline
        unsafe { veorq_u8(x, k) }
    }

    #[inline(always)]
    fn encrypt(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { encrypt(x, k) }
    }

    #[inline(always)]
    fn encrypt_last(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { encrypt_last(x, k) }
    }

    #[inline(always)]
    fn decrypt(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { decrypt(x, k) }
    }

    #[inline(always)]
    fn decrypt_last(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { decrypt_last(x, k) }
    }

    #[inline(always)]
    fn inverse_mix(self, k: &Block) -> Block {
        let mut out = [[0; 2]];
        // SAFETY: the caller of `Arm::new` proved aes
        let mixed = unsafe { inverse_mix(self.spread(k)) };
        self.store(mixed, &mut out);
        out[0]
    }

    #[inline(always)]
    fn sub_word(self, w: u32) -> u32 {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { sub_word(w) }
    }
}
