//! SHA-256 by the x86 SHA extensions, two chains interleaved: one chain alone waits for the latency of its rounds.
//!
//! `sha256rnds2` takes the state as (a, b, e, f) and (c, d, g, h), highest lane first, and makes two rounds.

use std::arch::x86_64::*;

use super::sha256::{K, State};

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn load(from: &[u32; 4]) -> __m128i {
    // SAFETY: the array is 16 readable bytes
    unsafe { _mm_loadu_si128(from.as_ptr().cast()) }
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
fn split(state: &State) -> (__m128i, __m128i) {
    let [a, b, c, d, e, f, g, h] = state.map(|x| x as i32);
    (_mm_set_epi32(a, b, e, f), _mm_set_epi32(c, d, g, h))
}

#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn join(abef: __m128i, cdgh: __m128i) -> State {
    let (mut low, mut high) = ([0u32; 4], [0u32; 4]);
    // SAFETY: each array is 16 writable bytes
    unsafe {
        _mm_storeu_si128(low.as_mut_ptr().cast(), abef);
        _mm_storeu_si128(high.as_mut_ptr().cast(), cdgh);
    }
    [low[3], low[2], high[3], high[2], low[1], low[0], high[1], high[0]]
}

/// Four rounds on words that carry their constants already.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn four_rounds(abef: &mut __m128i, cdgh: &mut __m128i, words: __m128i) {
    *cdgh = _mm_sha256rnds2_epu32(*cdgh, *abef, words);
    *abef = _mm_sha256rnds2_epu32(*abef, *cdgh, _mm_shuffle_epi32::<0x0e>(words));
}

/// The four words that follow `w[0]`…`w[15]` in the schedule, `q` being the oldest group of the ring.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn next_words(w: &[__m128i; 4], q: usize) -> __m128i {
    let (w0, w4, w8, w12) = (w[q], w[(q + 1) % 4], w[(q + 2) % 4], w[(q + 3) % 4]);
    let sum = _mm_add_epi32(_mm_sha256msg1_epu32(w0, w4), _mm_alignr_epi8::<4>(w12, w8));
    _mm_sha256msg2_epu32(sum, w12)
}

/// Runs both states over both messages.
#[inline]
#[target_feature(enable = "sha,ssse3,sse4.1")]
pub fn compress_two(states: &mut [State; 2], messages: [&[u8]; 2]) {
    let groups = K.as_chunks::<4>().0.as_chunks::<4>().0;
    let [(mut abef0, mut cdgh0), (mut abef1, mut cdgh1)] = [split(&states[0]), split(&states[1])];
    for (block0, block1) in messages[0].as_chunks::<64>().0.iter().zip(messages[1].as_chunks::<64>().0) {
        let (quarters0, quarters1) = (block0.as_chunks::<16>().0, block1.as_chunks::<16>().0);
        let mut w0: [__m128i; 4] = [0, 1, 2, 3].map(|q| load_big_endian(&quarters0[q]));
        let mut w1: [__m128i; 4] = [0, 1, 2, 3].map(|q| load_big_endian(&quarters1[q]));
        let before = (abef0, cdgh0, abef1, cdgh1);

        for group in &groups[..3] {
            for q in 0..4 {
                let k = load(&group[q]);
                four_rounds(&mut abef0, &mut cdgh0, _mm_add_epi32(w0[q], k));
                four_rounds(&mut abef1, &mut cdgh1, _mm_add_epi32(w1[q], k));
                w0[q] = next_words(&w0, q);
                w1[q] = next_words(&w1, q);
            }
        }
        for q in 0..4 {
            let k = load(&groups[3][q]);
            four_rounds(&mut abef0, &mut cdgh0, _mm_add_epi32(w0[q], k));
            four_rounds(&mut abef1, &mut cdgh1, _mm_add_epi32(w1[q], k));
        }
        abef0 = _mm_add_epi32(abef0, before.0);
        cdgh0 = _mm_add_epi32(cdgh0, before.1);
        abef1 = _mm_add_epi32(abef1, before.2);
        cdgh1 = _mm_add_epi32(cdgh1, before.3);
    }
    *states = [join(abef0, cdgh0), join(abef1, cdgh1)];
}
