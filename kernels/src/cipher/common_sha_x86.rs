//! SHA-256 by the x86 SHA extensions, four chains in flight: one chain alone waits for the latency of its rounds.
//!
//! `sha256rnds2` takes the state as (a, b, e, f) and (c, d, g, h), highest lane first, and makes two rounds. Four states and
//! message rings exceed the 16 registers; the rings' loads and stores cost less than the waiting.

use std::arch::x86_64::*;

use super::sha256::{CHAINS, K, State};

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

/// Four rounds on words that carry their constants already.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn four_rounds(pair: &mut Pair, words: __m128i) {
    pair.cdgh = _mm_sha256rnds2_epu32(pair.cdgh, pair.abef, words);
    pair.abef = _mm_sha256rnds2_epu32(pair.abef, pair.cdgh, _mm_shuffle_epi32::<0x0e>(words));
}

/// Replaces the oldest four words of the ring, group `q`, by the four that follow in the schedule.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn next_words(w: &mut [__m128i; 4], q: usize) {
    let (w4, w8, w12) = (w[(q + 1) % 4], w[(q + 2) % 4], w[(q + 3) % 4]);
    let sum = _mm_add_epi32(_mm_sha256msg1_epu32(w[q], w4), _mm_alignr_epi8::<4>(w12, w8));
    w[q] = _mm_sha256msg2_epu32(sum, w12);
}

/// Runs every state over its message; all messages have the same whole number of blocks.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
pub fn compress_all(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    let k = K.as_chunks::<4>().0;
    let blocks = messages.map(|m| m.as_chunks::<64>().0);
    let mut pairs = [split(&states[0]), split(&states[1]), split(&states[2]), split(&states[3])];
    for i in 0..blocks[0].len() {
        let before = pairs;
        let mut w = [[_mm_setzero_si128(); 4]; CHAINS];
        for (w, blocks) in w.iter_mut().zip(blocks) {
            for (w, quarter) in w.iter_mut().zip(blocks[i].as_chunks::<16>().0) {
                *w = load_big_endian(quarter);
            }
        }
        for k in &k.as_chunks::<4>().0[..3] {
            for q in 0..4 {
                let constants = load(&k[q]);
                for (pair, w) in pairs.iter_mut().zip(&mut w) {
                    four_rounds(pair, _mm_add_epi32(w[q], constants));
                    next_words(w, q);
                }
            }
        }
        for (q, k) in k[12..].iter().enumerate() {
            let constants = load(k);
            for (pair, w) in pairs.iter_mut().zip(&w) {
                four_rounds(pair, _mm_add_epi32(w[q], constants));
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
