//! Comparators of `integer.sort`'s network: one pair of records at a time, or two in a vector.

use super::sort::Record;

/// A row of comparators that do not touch one another.
pub(super) trait Exchange {
    /// Puts the smaller of `low[i]` and `high[i]` into `low[i]`, for each i in order: h ← 3h + (1 if they change places).
    fn pairs(low: &mut [Record], high: &mut [Record], h: u64) -> u64;
}

/// One comparator after the other, without a branch.
pub(super) struct OneByOne;

impl Exchange for OneByOne {
    #[inline(always)]
    fn pairs(low: &mut [Record], high: &mut [Record], mut h: u64) -> u64 {
        for (low, high) in low.iter_mut().zip(high) {
            let (a, b) = (*low, *high);
            let change = b < a;
            *low = if change { b } else { a };
            *high = if change { a } else { b };
            h = h.wrapping_mul(3).wrapping_add(u64::from(change));
        }
        h
    }
}

/// Two comparators in 256 bits.
#[cfg(target_arch = "x86_64")]
pub(super) struct InPairs;

#[cfg(target_arch = "x86_64")]
impl Exchange for InPairs {
    #[inline(always)]
    fn pairs(low: &mut [Record], high: &mut [Record], mut h: u64) -> u64 {
        use std::arch::x86_64::*;
        let (low, low_rest) = low.as_chunks_mut::<2>();
        let (high, high_rest) = high.as_chunks_mut::<2>();
        for (low, high) in low.iter_mut().zip(high) {
            let changes;
            // SAFETY: implementor of a private trait used by `avx2` alone (and by a test that asks), for which avx2 was proven;
            // reads and writes the 32 bytes of each array
            unsafe {
                let sign = _mm256_set1_epi64x(i64::MIN);
                let (a, b) =
                    (_mm256_loadu_si256((&raw const *low).cast()), _mm256_loadu_si256((&raw const *high).cast()));
                // comparison is for signed numbers
                let more = _mm256_cmpgt_epi64(_mm256_xor_si256(a, sign), _mm256_xor_si256(b, sign));
                let same = _mm256_cmpeq_epi64(a, b);
                // the payloads' outcome, moved to the keys' lanes, counts where keys are equal
                let by_payload = _mm256_and_si256(same, _mm256_unpacklo_epi64(more, more));
                let at_key = _mm256_or_si256(more, by_payload);
                let change = _mm256_castsi256_pd(_mm256_unpackhi_epi64(at_key, at_key));
                let (a, b) = (_mm256_castsi256_pd(a), _mm256_castsi256_pd(b));
                _mm256_storeu_pd((&raw mut *low).cast(), _mm256_blendv_pd(a, b, change));
                _mm256_storeu_pd((&raw mut *high).cast(), _mm256_blendv_pd(b, a, change));
                changes = _mm256_movemask_pd(change) as u64;
            }
            h = h.wrapping_mul(9).wrapping_add(3 * (changes & 1) + (changes >> 2 & 1));
        }
        OneByOne::pairs(low_rest, high_rest, h)
    }
}
