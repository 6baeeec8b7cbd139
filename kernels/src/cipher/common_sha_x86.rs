//! SHA-256 by the x86 SHA extensions, four chains in flight: one chain alone waits for the latency of its rounds.
//!
//! `sha256rnds2` takes the state as (a, b, e, f) and (c, d, g, h), highest lane first, and makes two rounds. The message
//! schedule of a block depends on nothing but the block, so it is made first, with the constants added, and the rounds then
//! read it from memory: four chains' states and schedules together would not fit in 16 registers.

use std::arch::x86_64::*;

use super::sha256::{CHAINS, K, State};

/// W_t + K_t of one block.
#[repr(align(16))]
struct Schedule([u32; 64]);

/// Four words of `from`.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn load(from: &[u32; 4]) -> __m128i {
    // SAFETY: the array is 16 readable bytes
    unsafe { _mm_loadu_si128(from.as_ptr().cast()) }
}

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn store(x: __m128i, to: &mut [u32; 4]) {
    // SAFETY: the array is 16 writable bytes
    unsafe { _mm_storeu_si128(to.as_mut_ptr().cast(), x) }
}

/// Four message words, each read big endian.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn load_big_endian(from: &[u8; 16]) -> __m128i {
    let order = _mm_set_epi64x(0x0c0d_0e0f_0809_0a0b, 0x0405_0607_0001_0203);
    // SAFETY: the array is 16 readable bytes
    let bytes = unsafe { _mm_loadu_si128(from.as_ptr().cast()) };
    _mm_shuffle_epi8(bytes, order)
}

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn make_schedule(block: &[u8; 64], schedule: &mut Schedule) {
    let quarters = block.as_chunks::<16>().0;
    let mut w = [
        load_big_endian(&quarters[0]),
        load_big_endian(&quarters[1]),
        load_big_endian(&quarters[2]),
        load_big_endian(&quarters[3]),
    ];
    let (to, k) = (schedule.0.as_chunks_mut::<4>().0, K.as_chunks::<4>().0);
    for group in 0..16 {
        store(_mm_add_epi32(w[0], load(&k[group])), &mut to[group]);
        let sum = _mm_add_epi32(_mm_sha256msg1_epu32(w[0], w[1]), _mm_alignr_epi8::<4>(w[3], w[2]));
        w = [w[1], w[2], w[3], _mm_sha256msg2_epu32(sum, w[3])];
    }
}

/// One state in the two registers of `sha256rnds2`.
#[derive(Clone, Copy)]
struct Pair {
    abef: __m128i,
    cdgh: __m128i,
}

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn split(state: &State) -> Pair {
    let [a, b, c, d, e, f, g, h] = state.map(|x| x as i32);
    Pair { abef: _mm_set_epi32(a, b, e, f), cdgh: _mm_set_epi32(c, d, g, h) }
}

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn join(pair: Pair) -> State {
    let (mut low, mut high) = ([0u32; 4], [0u32; 4]);
    store(pair.abef, &mut low);
    store(pair.cdgh, &mut high);
    [low[3], low[2], high[3], high[2], low[1], low[0], high[1], high[0]]
}

/// Runs every state over its message; all messages have the same whole number of blocks.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
pub fn compress_all(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    let blocks = messages.map(|m| m.as_chunks::<64>().0);
    let mut pairs = [split(&states[0]), split(&states[1]), split(&states[2]), split(&states[3])];
    let mut schedules = [const { Schedule([0; 64]) }; CHAINS];
    for i in 0..blocks[0].len() {
        for (chain, schedule) in schedules.iter_mut().enumerate() {
            make_schedule(&blocks[chain][i], schedule);
        }
        let before = pairs;
        for group in 0..16 {
            for (pair, schedule) in pairs.iter_mut().zip(&schedules) {
                let words = load(&schedule.0.as_chunks::<4>().0[group]);
                pair.cdgh = _mm_sha256rnds2_epu32(pair.cdgh, pair.abef, words);
                pair.abef = _mm_sha256rnds2_epu32(pair.abef, pair.cdgh, _mm_shuffle_epi32::<0x0e>(words));
            }
        }
        for (pair, old) in pairs.iter_mut().zip(before) {
            pair.abef = _mm_add_epi32(pair.abef, old.abef);
            pair.cdgh = _mm_add_epi32(pair.cdgh, old.cdgh);
        }
    }
    for (state, pair) in states.iter_mut().zip(pairs) {
        *state = join(pair);
    }
}
