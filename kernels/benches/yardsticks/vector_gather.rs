//! The kernel's three kinds of gather in its proportions (doublewords 32, words by short and by long index 8 and 16),
//! always at the same indices within one page, none waiting for another. Portable: plain indexed loads, added up.

use super::Yardstick;
use kernels::Variant;

/// Every yardstick that this CPU can run.
pub fn yardsticks() -> Vec<Yardstick> {
    special((56 * LOOPS) as u64)
}

const LOOPS: usize = 512;

#[cfg(not(target_arch = "x86_64"))]
fn special(_loads: u64) -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
fn special(loads: u64) -> Vec<Yardstick> {
    use kernels::isa::Feature;

    let kernel = "vector.gather";
    let mut list = vec![Yardstick { kernel, variant: Variant::Portable, units: loads, run: Box::new(plain) }];
    if Feature::Avx2.present() {
        // SAFETY: avx2 is present
        list.push(Yardstick { kernel, variant: Variant::Avx2, units: loads, run: Box::new(|| unsafe { avx2() }) });
    }
    if Feature::Avx512f.present() {
        // SAFETY: avx512f is present
        list.push(Yardstick { kernel, variant: Variant::Avx512, units: loads, run: Box::new(|| unsafe { avx512() }) });
    }
    list
}

#[cfg(target_arch = "x86_64")]
fn plain() {
    let table = std::hint::black_box([0x0123_4567_89ab_cdef_u64; 512]);
    let last: u64;
    // SAFETY: baseline instructions; the index stays below 505 and is raised by at most 7, the table has 512 words
    unsafe {
        std::arch::asm!(
            "2:",
            "mov {r}, qword ptr [{table} + {i} * 8]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 8]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 16]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 24]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 32]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 40]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 48]",
            "mov {r}, qword ptr [{table} + {i} * 8 + 56]",
            "dec {n}",
            "jnz 2b",
            table = in(reg) &table, i = in(reg) 400_u64, n = inout(reg) 7 * LOOPS => _, r = out(reg) last,
            options(nostack, readonly),
        );
    }
    std::hint::black_box(last);
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn avx2() {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    let table = [0x0123_4567_89ab_cdef_u64; 512];
    let (halves, words) = (table.as_ptr().cast::<i32>(), table.as_ptr().cast::<i64>());
    for _ in 0..LOOPS {
        // opaque once a round, so that no gather can be left out or done once for all
        let i = black_box(_mm256_setr_epi32(7, 501, 33, 250, 128, 3, 99, 400));
        let (short, long) = (_mm256_castsi256_si128(i), _mm256_cvtepu32_epi64(_mm256_castsi256_si128(i)));
        let one = _mm256_set1_epi64x(1);
        // SAFETY: every index is below 512 and is at most raised by 3, in doublewords by 4 · 8; the table has 512 words
        unsafe {
            let a = _mm256_i32gather_epi32::<4>(halves, i);
            let b = _mm256_i32gather_epi32::<4>(halves.add(8), i);
            let c = _mm256_i32gather_epi32::<4>(halves.add(16), i);
            let d = _mm256_i32gather_epi32::<4>(halves.add(24), i);
            let e = _mm256_i32gather_epi64::<8>(words, short);
            let f = _mm256_i32gather_epi64::<8>(words.add(1), short);
            let g = _mm256_i64gather_epi64::<8>(words, long);
            let h = _mm256_i64gather_epi64::<8>(words, _mm256_add_epi64(long, one));
            let k = _mm256_i64gather_epi64::<8>(words.add(2), long);
            let l = _mm256_i64gather_epi64::<8>(words.add(3), long);
            let sum = [b, c, d, e, f, g, h, k, l].into_iter().fold(a, |x, y| _mm256_add_epi64(x, y));
            black_box(sum);
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx2")]
fn avx512() {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    let table = [0x0123_4567_89ab_cdef_u64; 512];
    for _ in 0..LOOPS {
        // opaque once a round, so that no gather can be left out or done once for all
        let i = black_box(_mm512_setr_epi32(7, 501, 33, 250, 128, 3, 99, 400, 17, 18, 19, 311, 312, 5, 77, 200));
        let short = _mm512_castsi512_si256(i);
        let long = _mm512_cvtepu32_epi64(short);
        // SAFETY: every index is below 512 and is raised by at most 3, in doublewords by 16; the table has 512 words
        unsafe {
            let a = _mm512_i32gather_epi32::<4>(i, table.as_ptr().cast());
            let b = _mm512_i32gather_epi32::<4>(i, table.as_ptr().add(8).cast());
            let c = _mm512_i32gather_epi64::<8>(short, table.as_ptr().cast());
            let d = _mm512_i64gather_epi64::<8>(long, table.as_ptr().add(1).cast());
            let e = _mm512_i64gather_epi64::<8>(long, table.as_ptr().add(2).cast());
            let sum = [b, c, d, e].into_iter().fold(a, |x, y| _mm512_add_epi64(x, y));
            black_box(sum);
        }
    }
}
