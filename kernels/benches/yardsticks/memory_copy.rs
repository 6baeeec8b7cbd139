//! Bare copies of all payloads of the default size from side to side at the kernel's own byte offsets, by unaligned vector loads
//! and stores, each followed by a vector comparison of both sides while they are in the first cache. (The platform's memory copy is several times slower at odd offsets.)

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;
    use kernels::aligned;

    const BYTES: usize = 12_160;
    const SLOT: usize = 12_288;
    const SLOTS: usize = 16;

    #[target_feature(enable = "avx2")]
    fn copy(from: &[u8], to: &mut [u8]) {
        for (a, b) in from.as_chunks::<32>().0.iter().zip(to.as_chunks_mut::<32>().0) {
            // a plain load would let the compiler make the loop a call of the platform's copy
            // SAFETY: both chunks are 32 bytes
            unsafe { _mm256_storeu_si256(b.as_mut_ptr().cast(), _mm256_lddqu_si256(a.as_ptr().cast())) }
        }
    }

    #[target_feature(enable = "avx2")]
    fn equal(a: &[u8], b: &[u8]) -> bool {
        let mut differ = [_mm256_setzero_si256(); 2];
        for (a, b) in a.as_chunks::<64>().0.iter().zip(b.as_chunks::<64>().0) {
            for (i, differ) in differ.iter_mut().enumerate() {
                // SAFETY: both chunks are 64 readable bytes
                let (x, y) = unsafe {
                    (_mm256_loadu_si256(a[32 * i..].as_ptr().cast()), _mm256_loadu_si256(b[32 * i..].as_ptr().cast()))
                };
                *differ = _mm256_or_si256(*differ, _mm256_xor_si256(x, y));
            }
        }
        let differ = _mm256_or_si256(differ[0], differ[1]);
        _mm256_testz_si256(differ, differ) == 1
    }

    if !is_x86_feature_detected!("avx2") {
        return Vec::new();
    }
    let mut lines = aligned::lines(384);
    let mut turn = 0usize;
    let run = Box::new(move || {
        let (low, high) = aligned::bytes_mut(&mut lines).split_at_mut(SLOTS * SLOT);
        let ends = |slot: usize, turn: usize| {
            let (from, to) = (27 * (turn + slot) % 64, 27 * (turn + slot + 1) % 64);
            (slot * SLOT + from..slot * SLOT + from + BYTES, slot * SLOT + to..slot * SLOT + to + BYTES)
        };
        for slot in 0..SLOTS {
            let (from, to) = ends(slot, turn);
            // SAFETY: avx2 was detected above
            unsafe { copy(black_box(&low[from.clone()]), black_box(&mut high[to.clone()])) };
            // SAFETY: as above
            assert!(unsafe { equal(black_box(&low[from]), black_box(&high[to])) });
        }
        turn += 2;
    });
    // bytes read and written: once each by the copy, both sides by the comparison
    vec![Yardstick { kernel: "memory.copy", variant: Variant::Avx2, units: (SLOTS * 4 * BYTES) as u64, run }]
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
