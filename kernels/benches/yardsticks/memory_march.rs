//! Reads and writes of every line of a buffer, 32 bytes at a time, over the march's default footprint: the read is kept alive by
//! one OR, the write comes from a register.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;
    use kernels::aligned::{self, Line};

    const KIB: u32 = 1024;
    const PASSES: usize = 2;

    #[target_feature(enable = "avx2")]
    fn pass(lines: &mut [Line]) {
        let mut seen = [_mm256_setzero_si256(); 2];
        let written = black_box(_mm256_set1_epi64x(0x5555));
        for line in black_box(lines) {
            for (half, seen) in line.0.as_chunks_mut::<4>().0.iter_mut().zip(&mut seen) {
                let at = half.as_mut_ptr().cast();
                // SAFETY: half a line is 32 bytes
                unsafe {
                    *seen = _mm256_or_si256(*seen, _mm256_loadu_si256(at));
                    _mm256_storeu_si256(at, written);
                }
            }
        }
        black_box(seen);
    }

    if !is_x86_feature_detected!("avx2") {
        return Vec::new();
    }
    let mut lines = aligned::lines(KIB);
    let run = Box::new(move || {
        for _ in 0..PASSES {
            // SAFETY: avx2 was detected above
            unsafe { pass(&mut lines) };
        }
    });
    let units = u64::from(KIB) * 1024 * 2 * PASSES as u64;
    vec![Yardstick { kernel: "memory.march", variant: Variant::Avx2, units, run }]
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
