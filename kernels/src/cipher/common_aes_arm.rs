//! AES rounds by the aarch64 instructions. AESE adds the key *before* SubBytes; with a zero key and the round key added
//! after MixColumns the rounds take the order of FIPS 197.

use std::arch::aarch64::*;
use std::arch::asm;

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

/// Makes one function of a row of instructions on one block. Inline assembly, because the intrinsics would stay calls:
/// the compiler inlines them only into functions that name their feature, which a generic body cannot.
macro_rules! instructions {
    ($name:ident: $($line:literal),+) => {
        /// # Safety
        /// The CPU must have `aes`.
        #[inline(always)]
        unsafe fn $name(mut x: uint8x16_t) -> uint8x16_t {
            // SAFETY: the caller proved aes; the block touches nothing but its two registers
            unsafe {
                asm!(".arch_extension aes", $($line),+, x = inout(vreg) x, zero = in(vreg) vdupq_n_u8(0),
                    options(pure, nomem, nostack, preserves_flags));
            }
            x
        }
    };
}

instructions!(forward: "aese {x:v}.16b, {zero:v}.16b");
instructions!(backward: "aesd {x:v}.16b, {zero:v}.16b");
instructions!(forward_mix: "aese {x:v}.16b, {zero:v}.16b", "aesmc {x:v}.16b, {x:v}.16b");
instructions!(backward_mix: "aesd {x:v}.16b, {zero:v}.16b", "aesimc {x:v}.16b, {x:v}.16b");
instructions!(inverse_mix: "aesimc {x:v}.16b, {x:v}.16b", "/* {zero:v} */");

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
        unsafe { veorq_u8(forward_mix(x), k) }
    }

    #[inline(always)]
    fn encrypt_last(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { veorq_u8(forward(x), k) }
    }

    #[inline(always)]
    fn decrypt(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { veorq_u8(backward_mix(x), k) }
    }

    #[inline(always)]
    fn decrypt_last(self, x: uint8x16_t, k: uint8x16_t) -> uint8x16_t {
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { veorq_u8(backward(x), k) }
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
        // SubBytes of four equal columns, which ShiftRows leaves as they are
        // SAFETY: the caller of `Arm::new` proved aes
        unsafe { vgetq_lane_u32::<0>(vreinterpretq_u32_u8(forward(vreinterpretq_u8_u32(vdupq_n_u32(w))))) }
    }
}
