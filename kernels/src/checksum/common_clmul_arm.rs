//! Carry-less multiplication by the aarch64 instructions, low halves by PMULL and high halves by PMULL2.

use std::arch::aarch64::*;
use std::arch::asm;

use super::clmul::{Block, Multiplier};

/// Evidence that the AES extension, to which the 64-bit form of PMULL belongs, is present.
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

impl Multiplier for Arm {
    type Pair = uint64x2_t;
    type One = uint64x2_t;
    type Four = [uint64x2_t; 4];

    #[inline(always)]
    fn pair(self, constants: Block) -> uint64x2_t {
        self.block(constants)
    }

    #[inline(always)]
    fn block(self, block: Block) -> uint64x2_t {
        // SAFETY: a block is 16 readable bytes
        unsafe { vld1q_u64(block.as_ptr()) }
    }

    #[inline(always)]
    fn words(self, block: uint64x2_t) -> Block {
        let mut words = [0; 2];
        // SAFETY: a block is 16 writable bytes
        unsafe { vst1q_u64(words.as_mut_ptr(), block) };
        words
    }

    #[inline(always)]
    fn load(self, bytes: &[u8; 16]) -> uint64x2_t {
        // SAFETY: the array is 16 readable bytes
        unsafe { vreinterpretq_u64_u8(vld1q_u8(bytes.as_ptr())) }
    }

    #[inline(always)]
    fn fold(self, x: uint64x2_t, by: &uint64x2_t, next: uint64x2_t) -> uint64x2_t {
        let (low, high): (uint64x2_t, uint64x2_t);
        // SAFETY: whoever called `new` proved aes; the block touches nothing but its registers. Assembly, because the
        // intrinsics would stay calls in a body that does not name their feature
        unsafe {
            asm!(".arch_extension aes", "pmull {low:v}.1q, {x:v}.1d, {by:v}.1d", "pmull2 {high:v}.1q, {x:v}.2d, {by:v}.2d",
                x = in(vreg) x, by = in(vreg) *by, low = out(vreg) low, high = lateout(vreg) high,
                options(pure, nomem, nostack, preserves_flags));
            veorq_u64(veorq_u64(low, next), high)
        }
    }

    #[inline(always)]
    fn load_four(self, bytes: &[u8; 64]) -> [uint64x2_t; 4] {
        let blocks = bytes.as_chunks::<16>().0;
        [self.load(&blocks[0]), self.load(&blocks[1]), self.load(&blocks[2]), self.load(&blocks[3])]
    }

    #[inline(always)]
    fn fold_four(self, x: [uint64x2_t; 4], by: &uint64x2_t, next: [uint64x2_t; 4]) -> [uint64x2_t; 4] {
        [
            self.fold(x[0], by, next[0]),
            self.fold(x[1], by, next[1]),
            self.fold(x[2], by, next[2]),
            self.fold(x[3], by, next[3]),
        ]
    }

    #[inline(always)]
    fn add_first(self, mut x: [uint64x2_t; 4], word: u64) -> [uint64x2_t; 4] {
        // SAFETY: Advanced SIMD is part of the aarch64 baseline
        x[0] = unsafe { veorq_u64(x[0], self.block([word, 0])) };
        x
    }

    #[inline(always)]
    fn split(self, x: [uint64x2_t; 4]) -> [uint64x2_t; 4] {
        x
    }
}
