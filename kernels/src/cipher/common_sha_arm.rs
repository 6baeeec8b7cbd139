//! SHA-256 by the aarch64 SHA2 extension. `sha256h` and `sha256h2` make four rounds on (a, b, c, d) and (e, f, g, h),
//! lowest lane first.

use std::arch::aarch64::*;

use super::sha256::{CHAINS, K, State};

#[inline]
#[target_feature(enable = "neon,sha2")]
fn load(from: &[u32]) -> uint32x4_t {
    let from = &from[..4];
    // SAFETY: the slice is 16 readable bytes
    unsafe { vld1q_u32(from.as_ptr()) }
}

/// Four message words, each read big endian.
#[inline]
#[target_feature(enable = "neon,sha2")]
fn load_big_endian(from: &[u8; 16]) -> uint32x4_t {
    // SAFETY: the array is 16 readable bytes
    let bytes = unsafe { vld1q_u8(from.as_ptr()) };
    vreinterpretq_u32_u8(vrev32q_u8(bytes))
}

#[inline]
#[target_feature(enable = "neon,sha2")]
fn compress(abcd: &mut uint32x4_t, efgh: &mut uint32x4_t, block: &[u8; 64]) {
    let quarters = block.as_chunks::<16>().0;
    let mut w: [uint32x4_t; 4] = [0, 1, 2, 3].map(|q| load_big_endian(&quarters[q]));
    let before = (*abcd, *efgh);
    for group in 0..16 {
        let q = group % 4;
        let words = vaddq_u32(w[q], load(&K[4 * group..]));
        let old = *abcd;
        *abcd = vsha256hq_u32(old, *efgh, words);
        *efgh = vsha256h2q_u32(*efgh, old, words);
        if group < 12 {
            let halfway = vsha256su0q_u32(w[q], w[(q + 1) % 4]);
            w[q] = vsha256su1q_u32(halfway, w[(q + 2) % 4], w[(q + 3) % 4]);
        }
    }
    *abcd = vaddq_u32(*abcd, before.0);
    *efgh = vaddq_u32(*efgh, before.1);
}

/// Runs every state over its message, block by block; all messages have the same whole number of blocks.
#[inline]
#[target_feature(enable = "neon,sha2")]
pub fn compress_all(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    let blocks = messages.map(|m| m.as_chunks::<64>().0);
    let mut halves = [0, 1, 2, 3].map(|i: usize| (load(&states[i]), load(&states[i][4..])));
    for i in 0..blocks[0].len() {
        for ((abcd, efgh), blocks) in halves.iter_mut().zip(blocks) {
            compress(abcd, efgh, &blocks[i]);
        }
    }
    for (state, (abcd, efgh)) in states.iter_mut().zip(halves) {
        // SAFETY: the state is 32 writable bytes
        unsafe {
            vst1q_u32(state.as_mut_ptr(), abcd);
            vst1q_u32(state.as_mut_ptr().add(4), efgh);
        }
    }
}
