//! Bare copies of every length from 0 to 256 bytes between two places, in the kernel's own proportion of lengths: `rep movsb` beside
//! the string instructions, vectors of 32 bytes with one that overlaps the last beside AVX2.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::asm;
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;
    use kernels::aligned::{self, Line};

    const LENGTHS: usize = 257;
    /// Forms done for each length.
    const TURNS: usize = 3;

    fn strings(from: &[u8], to: &mut [u8]) {
        // SAFETY: both regions are 320 bytes long
        unsafe {
            for len in 0..LENGTHS {
                asm!("rep movsb", inout("rcx") len => _, inout("rsi") from.as_ptr() => _, inout("rdi") to.as_mut_ptr() => _,
                     options(nostack, preserves_flags));
            }
        }
    }

    #[target_feature(enable = "avx2")]
    fn vectors(from: &[u8], to: &mut [u8]) {
        // SAFETY: both regions are 320 bytes long, and no vector begins beyond 256
        unsafe {
            for len in 0..LENGTHS {
                let last = black_box(len.saturating_sub(32));
                for at in (0..last).step_by(32) {
                    _mm256_storeu_si256(
                        to.as_mut_ptr().add(at).cast(),
                        _mm256_lddqu_si256(from.as_ptr().add(at).cast()),
                    );
                }
                _mm256_storeu_si256(
                    to.as_mut_ptr().add(last).cast(),
                    _mm256_lddqu_si256(from.as_ptr().add(last).cast()),
                );
            }
        }
    }

    fn regions(lines: &mut [Line]) -> (&[u8], &mut [u8]) {
        let (from, to) = aligned::bytes_mut(lines).split_at_mut(320);
        (black_box(from), black_box(&mut to[..320]))
    }

    let units = LENGTHS as u64;
    let mut lines = aligned::lines(1);
    let run = Box::new(move || {
        for _ in 0..TURNS {
            let (from, to) = regions(&mut lines);
            strings(from, to);
        }
    });
    let mut list = vec![Yardstick { kernel: "string.copy", variant: Variant::Portable, units, run }];
    if super::available("string.copy", Variant::Avx2) {
        let mut lines = aligned::lines(1);
        let run = Box::new(move || {
            for _ in 0..TURNS {
                let (from, to) = regions(&mut lines);
                // SAFETY: `available` says that avx2 is present
                unsafe { vectors(from, to) };
            }
        });
        list.push(Yardstick { kernel: "string.copy", variant: Variant::Avx2, units, run });
    }
    list
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
