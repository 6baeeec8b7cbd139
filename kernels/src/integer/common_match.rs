//! How far two places of a text agree, for `integer.compress`.

/// Bytes that have to follow the text, so that comparisons may look beyond its end.
pub(super) const MARGIN: usize = 64;

/// Comparison of two places.
pub(super) trait Compare {
    /// Number of equal bytes from `a` and from `b` on, at most `limit`.
    fn common(text: &[u8], a: usize, b: usize, limit: usize) -> usize;
}

/// Eight bytes at a time: the lowest differing bit of their difference tells the byte.
pub(super) struct ByWords;

impl Compare for ByWords {
    #[inline(always)]
    fn common(text: &[u8], a: usize, b: usize, limit: usize) -> usize {
        let (a, b) = (&text[a..], &text[b..]);
        for (i, (x, y)) in a.as_chunks().0.iter().zip(b.as_chunks().0).enumerate() {
            let difference = u64::from_le_bytes(*x) ^ u64::from_le_bytes(*y);
            if difference != 0 {
                return limit.min(8 * i + difference.trailing_zeros() as usize / 8);
            }
            if 8 * i + 8 >= limit {
                break;
            }
        }
        limit
    }
}

/// Thirty-two bytes at a time.
#[cfg(target_arch = "x86_64")]
pub(super) struct ByVectors;

#[cfg(target_arch = "x86_64")]
impl Compare for ByVectors {
    #[inline(always)]
    fn common(text: &[u8], a: usize, b: usize, limit: usize) -> usize {
        use std::arch::x86_64::*;
        let (a, b) = (&text[a..], &text[b..]);
        for (i, (x, y)) in a.as_chunks::<32>().0.iter().zip(b.as_chunks::<32>().0).enumerate() {
            // SAFETY: implementor of a private trait used by `avx2` alone (and by a test that asks), for which avx2 was proven;
            // both arrays are 32 readable bytes
            let equal = unsafe {
                let (x, y) = (_mm256_loadu_si256((&raw const *x).cast()), _mm256_loadu_si256((&raw const *y).cast()));
                _mm256_movemask_epi8(_mm256_cmpeq_epi8(x, y))
            };
            if equal != -1 {
                return limit.min(32 * i + (!equal).trailing_zeros() as usize);
            }
            if 32 * i + 32 >= limit {
                break;
            }
        }
        limit
    }
}
