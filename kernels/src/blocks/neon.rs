//! One block in two 128-bit aarch64 registers, one a lane.

use std::arch::aarch64::*;

use super::{Block, Blocks, Elements};

/// One block; Advanced SIMD is part of the aarch64 baseline that this target is built for.
#[derive(Clone, Copy)]
pub struct Lanes(uint8x16_t, uint8x16_t);

/// Source bytes of `permute_words`.
const fn word_order(order: i32) -> Block {
    let mut bytes = [0; 32];
    let mut i = 0;
    while i < 32 {
        bytes[i] = 8 * ((order >> (2 * (i / 8))) & 3) as u8 + (i % 8) as u8;
        i += 1;
    }
    Block(bytes)
}

#[inline(always)]
fn across(x: Lanes, from: &Block) -> Lanes {
    let table = uint8x16x2_t(x.0, x.1);
    // SAFETY: Advanced SIMD is part of the target's baseline
    unsafe {
        let Lanes(first, second) = Lanes::splat(from);
        Lanes(vqtbl2q_u8(table, first), vqtbl2q_u8(table, second))
    }
}

macro_rules! pairs {
    ($($name:ident |$a:ident, $b:ident| $lane:expr;)*) => {$(
        #[inline(always)]
        fn $name(self, other: Self) -> Self {
            let lane = |$a: uint8x16_t, $b: uint8x16_t| {
                // SAFETY: Advanced SIMD is part of the target's baseline
                unsafe { $lane }
            };
            Lanes(lane(self.0, other.0), lane(self.1, other.1))
        }
    )*};
}

impl Blocks for Lanes {
    const WIDTH: usize = 1;

    #[inline(always)]
    unsafe fn load<const N: usize>(nets: &[[Block; N]], k: usize) -> Self {
        // SAFETY: Advanced SIMD is part of the target's baseline
        unsafe { Self::splat(&nets[0][k]) }
    }

    #[inline(always)]
    fn store<const N: usize>(self, nets: &mut [[Block; N]], k: usize) {
        let (first, second) = nets[0][k].0.split_at_mut(16);
        // SAFETY: Advanced SIMD is part of the target's baseline; each half of a block has 16 bytes
        unsafe {
            vst1q_u8(first.as_mut_ptr(), self.0);
            vst1q_u8(second.as_mut_ptr(), self.1);
        }
    }

    #[inline(always)]
    unsafe fn splat(block: &Block) -> Self {
        let (first, second) = block.0.split_at(16);
        // SAFETY: Advanced SIMD is part of the target's baseline; each half of a block has 16 bytes
        unsafe { Lanes(vld1q_u8(first.as_ptr()), vld1q_u8(second.as_ptr())) }
    }

    #[inline(always)]
    fn permute_elements(self, from: &Elements) -> Self {
        across(self, &from.bytes)
    }

    #[inline(always)]
    fn permute_words<const ORDER: i32>(self) -> Self {
        across(self, const { &word_order(ORDER) })
    }

    #[inline(always)]
    fn align<const BYTES: i32>(self, low: Self) -> Self {
        // SAFETY: Advanced SIMD is part of the target's baseline
        unsafe { Lanes(vextq_u8::<BYTES>(low.0, self.0), vextq_u8::<BYTES>(low.1, self.1)) }
    }

    #[inline(always)]
    fn blend(self, other: Self, mask: Self) -> Self {
        // SAFETY: Advanced SIMD is part of the target's baseline
        let lane = |s, o, m| unsafe {
            let whole = vreinterpretq_u8_s8(vshrq_n_s8::<7>(vreinterpretq_s8_u8(m)));
            vbslq_u8(whole, o, s)
        };
        Lanes(lane(self.0, other.0, mask.0), lane(self.1, other.1, mask.1))
    }

    #[inline(always)]
    fn low_lanes(self, other: Self) -> Self {
        Lanes(self.0, other.0)
    }

    #[inline(always)]
    fn high_lanes(self, other: Self) -> Self {
        Lanes(self.1, other.1)
    }

    pairs! {
        // an index above 15 gives 0, and controls with bit 7 are above 15
        shuffle_bytes |a, c| vqtbl1q_u8(a, c);
        zip8_low |a, b| vzip1q_u8(a, b);
        zip8_high |a, b| vzip2q_u8(a, b);
        zip16_low |a, b| vreinterpretq_u8_u16(vzip1q_u16(vreinterpretq_u16_u8(a), vreinterpretq_u16_u8(b)));
        zip16_high |a, b| vreinterpretq_u8_u16(vzip2q_u16(vreinterpretq_u16_u8(a), vreinterpretq_u16_u8(b)));
        zip32_low |a, b| vreinterpretq_u8_u32(vzip1q_u32(vreinterpretq_u32_u8(a), vreinterpretq_u32_u8(b)));
        zip32_high |a, b| vreinterpretq_u8_u32(vzip2q_u32(vreinterpretq_u32_u8(a), vreinterpretq_u32_u8(b)));
        zip64_low |a, b| vreinterpretq_u8_u64(vzip1q_u64(vreinterpretq_u64_u8(a), vreinterpretq_u64_u8(b)));
        zip64_high |a, b| vreinterpretq_u8_u64(vzip2q_u64(vreinterpretq_u64_u8(a), vreinterpretq_u64_u8(b)));
        pack |a, b| vcombine_u8(vqmovun_s16(vreinterpretq_s16_u8(a)), vqmovun_s16(vreinterpretq_s16_u8(b)));
        add |a, b| vreinterpretq_u8_u64(vaddq_u64(vreinterpretq_u64_u8(a), vreinterpretq_u64_u8(b)));
        and |a, b| vandq_u8(a, b);
    }
}
