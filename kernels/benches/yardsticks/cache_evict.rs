//! Bare reads and writes of the default size's lines in the kernel's own order: the read is kept alive by one OR, the write comes from
//! a register.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;
    use kernels::aligned::{self, Line};

    const KIB: u32 = 512;
    const PAGES: usize = KIB as usize / 4;
    const GROUPS: usize = 8;
    const ROUNDS: usize = 8;

    /// One round over vectors of this type.
    macro_rules! round {
        ($lines:ident, $stride:ident, $vector:ty, $set:ident, $store:ident, $load:ident, $or:ident) => {{
            const COUNT: usize = 64 / size_of::<$vector>();
            let written = black_box($set(0x5555));
            let mut seen = [$set(0); COUNT];
            let pages = black_box(&mut *$lines).as_chunks_mut::<64>().0;
            for g in 0..GROUPS {
                for w in 0..$stride {
                    for page in pages[w..].iter_mut().step_by($stride) {
                        let at: *mut $vector = (&raw mut page[9 * g % 64]).cast();
                        for (i, seen) in seen.iter_mut().enumerate() {
                            // SAFETY: COUNT vectors are a line
                            unsafe {
                                *seen = $or(*seen, $load(at.add(i).cast()));
                                $store(at.add(i).cast(), written);
                            }
                        }
                    }
                }
            }
            black_box(seen);
        }};
    }

    fn sse2(lines: &mut [Line], stride: usize) {
        // SAFETY: SSE2 is part of the x86-64 baseline
        unsafe { round!(lines, stride, __m128i, _mm_set1_epi64x, _mm_store_si128, _mm_load_si128, _mm_or_si128) }
    }

    #[target_feature(enable = "avx2")]
    fn avx2(lines: &mut [Line], stride: usize) {
        round!(lines, stride, __m256i, _mm256_set1_epi64x, _mm256_store_si256, _mm256_load_si256, _mm256_or_si256);
    }

    let stride = |round: usize| [1, 16, PAGES / 2][round % 3];
    let units = (PAGES * GROUPS * 2 * ROUNDS) as u64;
    let mut lines = aligned::lines(KIB);
    let run = Box::new(move || (0..ROUNDS).for_each(|round| sse2(&mut lines, stride(round))));
    let mut list = vec![Yardstick { kernel: "cache.evict", variant: Variant::Portable, units, run }];
    if super::available("cache.evict", Variant::Avx2) {
        let mut lines = aligned::lines(KIB);
        // SAFETY: `available` says that avx2 is present
        let run = Box::new(move || (0..ROUNDS).for_each(|round| unsafe { avx2(&mut lines, stride(round)) }));
        list.push(Yardstick { kernel: "cache.evict", variant: Variant::Avx2, units, run });
    }
    list
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
