//! A line as four Advanced SIMD registers; the extension is part of the aarch64 baseline.

use std::arch::aarch64::*;

use super::common_lanes::Lanes;

/// Advanced SIMD.
#[derive(Clone, Copy)]
pub struct Neon;

impl Lanes for Neon {
    type V = [uint64x2_t; 4];

    #[inline(always)]
    fn of(self, words: [u64; 8]) -> [uint64x2_t; 4] {
        // SAFETY: the array is 64 readable bytes
        unsafe { self.load(words.as_ptr().cast()) }
    }

    #[inline(always)]
    fn words(self, v: [uint64x2_t; 4]) -> [u64; 8] {
        let mut words = [0; 8];
        // SAFETY: the array is 64 writable bytes
        unsafe { self.store(v, words.as_mut_ptr().cast()) };
        words
    }

    #[inline(always)]
    fn add(self, a: [uint64x2_t; 4], b: [uint64x2_t; 4]) -> [uint64x2_t; 4] {
        // SAFETY: Advanced SIMD is part of the aarch64 baseline
        [0, 1, 2, 3].map(|i: usize| unsafe { vaddq_u64(a[i], b[i]) })
    }

    #[inline(always)]
    fn fold(self, a: [uint64x2_t; 4]) -> [uint64x2_t; 4] {
        // SAFETY: Advanced SIMD is part of the aarch64 baseline
        a.map(|x| unsafe { veorq_u64(x, vshrq_n_u64::<32>(x)) })
    }

    #[inline(always)]
    unsafe fn load(self, from: *const u8) -> [uint64x2_t; 4] {
        // byte loads: no alignment is asked for
        // SAFETY: the caller gives 64 readable bytes
        [0, 16, 32, 48].map(|i| unsafe { vreinterpretq_u64_u8(vld1q_u8(from.add(i))) })
    }

    #[inline(always)]
    unsafe fn store(self, v: [uint64x2_t; 4], to: *mut u8) {
        for (i, x) in v.into_iter().enumerate() {
            // SAFETY: the caller gives 64 writable bytes
            unsafe { vst1q_u8(to.add(16 * i), vreinterpretq_u8_u64(x)) };
        }
    }
}
