//! Bare reads and writes of the default size's lines in the kernel's own order: the read is kept alive by one OR, the write is what was
//! read with a bit set. (Writes that do not wait for the read run so far ahead that their lines are evicted before they get there.)

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
        ($lines:ident, $stride:ident, $back:ident, $vector:ty, $set:ident, $store:ident, $load:ident, $or:ident) => {{
            const COUNT: usize = 64 / size_of::<$vector>();
            let written = black_box($set(0x5555));
            let (mut seen, mut line) = ([$set(0); COUNT], [$set(0); COUNT]);
            let pages = black_box(&mut *$lines).as_chunks_mut::<64>().0;
            for g in 0..GROUPS {
                let g = if $back { GROUPS - 1 - g } else { g };
                for w in 0..$stride {
                    let w = if $back { $stride - 1 - w } else { w };
                    for h in 0..PAGES / $stride {
                        let h = if $back { PAGES / $stride - 1 - h } else { h };
                        let at: *mut $vector = (&raw mut pages[h * $stride + w][9 * g % 64]).cast();
                        for i in 0..COUNT {
                            // SAFETY: COUNT vectors are a line
                            line[i] = unsafe { $load(at.add(i).cast()) };
                            seen[i] = $or(seen[i], line[i]);
                        }
                        for i in 0..COUNT {
                            // SAFETY: COUNT vectors are a line
                            unsafe { $store(at.add(i).cast(), $or(line[i], written)) };
                        }
                    }
                }
            }
            black_box(seen);
        }};
    }

    #[target_feature(enable = "sse2")]
    fn sse2(lines: &mut [Line], stride: usize, back: bool) {
        round!(lines, stride, back, __m128i, _mm_set1_epi64x, _mm_store_si128, _mm_load_si128, _mm_or_si128);
    }

    #[target_feature(enable = "avx2")]
    fn avx2(lines: &mut [Line], stride: usize, back: bool) {
        round!(
            lines,
            stride,
            back,
            __m256i,
            _mm256_set1_epi64x,
            _mm256_store_si256,
            _mm256_load_si256,
            _mm256_or_si256
        );
    }

    let stride = |round: usize| [1, 16, PAGES / 2][round % 3];
    let units = (PAGES * GROUPS * 2 * ROUNDS) as u64;
    let mut lines = aligned::lines(KIB);
    // SAFETY: SSE2 is part of the x86-64 baseline
    let run =
        Box::new(move || (0..ROUNDS).for_each(|round| unsafe { sse2(&mut lines, stride(round), round % 2 == 1) }));
    let mut list = vec![Yardstick { kernel: "cache.evict", variant: Variant::Portable, units, run }];
    if super::available("cache.evict", Variant::Avx2) {
        let mut lines = aligned::lines(KIB);
        // SAFETY: `available` says that avx2 is present
        let run =
            Box::new(move || (0..ROUNDS).for_each(|round| unsafe { avx2(&mut lines, stride(round), round % 2 == 1) }));
        list.push(Yardstick { kernel: "cache.evict", variant: Variant::Avx2, units, run });
    }
    list
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
