//! The bare traffic of the default size: lines written by turns around the caches and through them, from registers, then read back,
//! each read kept alive by one OR.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;
    use kernels::aligned::{self, Line};

    const KIB: u32 = 384;
    const PASSES: usize = 4;

    /// One pass over all pairs of lines, the first of each around the caches or the second.
    macro_rules! pass {
        ($lines:ident, $turn:ident, $vector:ty, $set:ident, $bypass:ident, $store:ident, $load:ident, $or:ident) => {{
            const COUNT: usize = 64 / size_of::<$vector>();
            let written = black_box($set(0x5555));
            for pair in black_box(&mut *$lines).as_chunks_mut::<2>().0 {
                let (around, through) = ($turn % 2, 1 - $turn % 2);
                let (a, b): (*mut $vector, *mut $vector) =
                    ((&raw mut pair[around]).cast(), (&raw mut pair[through]).cast());
                for i in 0..COUNT {
                    // SAFETY: COUNT vectors are a line
                    unsafe {
                        $bypass(a.add(i).cast(), written);
                        $store(b.add(i).cast(), written);
                    }
                }
            }
            _mm_sfence();
            let mut seen = [$set(0); COUNT];
            for line in black_box(&*$lines) {
                let at: *const $vector = (&raw const *line).cast();
                for (i, seen) in seen.iter_mut().enumerate() {
                    // SAFETY: COUNT vectors are a line
                    *seen = $or(*seen, unsafe { $load(at.add(i).cast()) });
                }
            }
            black_box(seen);
        }};
    }

    #[target_feature(enable = "sse2")]
    fn sse2(lines: &mut [Line], turn: usize) {
        pass!(lines, turn, __m128i, _mm_set1_epi64x, _mm_stream_si128, _mm_store_si128, _mm_load_si128, _mm_or_si128);
    }

    #[target_feature(enable = "avx2")]
    fn avx2(lines: &mut [Line], turn: usize) {
        pass!(
            lines,
            turn,
            __m256i,
            _mm256_set1_epi64x,
            _mm256_stream_si256,
            _mm256_store_si256,
            _mm256_load_si256,
            _mm256_or_si256
        );
    }

    let units = u64::from(KIB) * 1024 * 2 * PASSES as u64;
    let mut lines = aligned::lines(KIB);
    // SAFETY: SSE2 is part of the x86-64 baseline
    let run = Box::new(move || (0..PASSES).for_each(|turn| unsafe { sse2(&mut lines, turn) }));
    let mut list = vec![Yardstick { kernel: "memory.stream", variant: Variant::Portable, units, run }];
    if super::available("memory.stream", Variant::Avx2) {
        let mut lines = aligned::lines(KIB);
        // SAFETY: `available` says that avx2 is present
        let run = Box::new(move || (0..PASSES).for_each(|turn| unsafe { avx2(&mut lines, turn) }));
        list.push(Yardstick { kernel: "memory.stream", variant: Variant::Avx2, units, run });
    }
    list
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
