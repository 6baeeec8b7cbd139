//! Streams by SSE2, AVX2 and AVX-512: every store, load, prefetch and fence written out, so that its instruction is the one named.

use std::arch::asm;
use std::arch::x86_64::*;

use super::common_lanes::Lanes;
use super::common_lanes_x86::{Avx2, Avx512};
use super::common_stream::Streams;

/// A line as four 128-bit registers; SSE2 is part of the x86-64 baseline.
#[derive(Clone, Copy)]
pub struct Sse2;

impl Lanes for Sse2 {
    type V = [__m128i; 4];

    #[inline(always)]
    fn of(self, words: [u64; 8]) -> [__m128i; 4] {
        // SAFETY: the array is 64 readable bytes
        unsafe { self.load(words.as_ptr().cast()) }
    }

    #[inline(always)]
    fn words(self, v: [__m128i; 4]) -> [u64; 8] {
        let mut words = [0; 8];
        // SAFETY: the array is 64 writable bytes
        unsafe { self.store(v, words.as_mut_ptr().cast()) };
        words
    }

    #[inline(always)]
    fn add(self, a: [__m128i; 4], b: [__m128i; 4]) -> [__m128i; 4] {
        // SAFETY: SSE2 is part of the x86-64 baseline
        [0, 1, 2, 3].map(|i: usize| unsafe { _mm_add_epi64(a[i], b[i]) })
    }

    #[inline(always)]
    fn fold(self, a: [__m128i; 4]) -> [__m128i; 4] {
        // SAFETY: SSE2 is part of the x86-64 baseline
        a.map(|x| unsafe { _mm_xor_si128(x, _mm_srli_epi64::<32>(x)) })
    }

    #[inline(always)]
    unsafe fn load(self, from: *const u8) -> [__m128i; 4] {
        // SAFETY: the caller gives 64 readable bytes
        [0, 16, 32, 48].map(|i| unsafe { _mm_loadu_si128(from.add(i).cast()) })
    }

    #[inline(always)]
    unsafe fn store(self, v: [__m128i; 4], to: *mut u8) {
        for (i, x) in v.into_iter().enumerate() {
            // SAFETY: the caller gives 64 writable bytes
            unsafe { _mm_storeu_si128(to.add(16 * i).cast(), x) };
        }
    }
}

/// Four stores by the instruction named.
macro_rules! put4 {
    ($name:literal, $v:ident, $to:ident) => {
        // SAFETY: the caller gives 64 writable bytes on a line
        unsafe {
            asm!(concat!($name, " [{to}], {a}"), concat!($name, " [{to} + 16], {b}"), concat!($name, " [{to} + 32], {c}"),
                 concat!($name, " [{to} + 48], {d}"), to = in(reg) $to, a = in(xmm_reg) $v[0], b = in(xmm_reg) $v[1],
                 c = in(xmm_reg) $v[2], d = in(xmm_reg) $v[3], options(nostack, preserves_flags))
        }
    };
}

/// Eight stores of words, or sixteen of half words, from general registers, without a way through the caches.
#[inline(always)]
unsafe fn put_words(words: [u64; 8], to: *mut u8) {
    for (i, word) in words.into_iter().enumerate() {
        // SAFETY: the caller gives 64 writable bytes on a line
        unsafe {
            if i % 4 < 3 {
                asm!("movnti [{to}], {word}", to = in(reg) to.add(8 * i), word = in(reg) word,
                     options(nostack, preserves_flags));
            } else {
                asm!("movnti [{to}], {low:e}", "movnti [{to} + 4], {high:e}", to = in(reg) to.add(8 * i),
                     low = in(reg) word, high = in(reg) word >> 32, options(nostack, preserves_flags));
            }
        }
    }
}

/// Four loads by the instruction named.
macro_rules! take4 {
    ($name:literal, $from:ident) => {{
        let (a, b, c, d);
        // SAFETY: the caller gives 64 readable bytes on a line
        unsafe {
            asm!(concat!($name, " {a}, [{from}]"), concat!($name, " {b}, [{from} + 16]"),
                 concat!($name, " {c}, [{from} + 32]"), concat!($name, " {d}, [{from} + 48]"), from = in(reg) $from,
                 a = out(xmm_reg) a, b = out(xmm_reg) b, c = out(xmm_reg) c, d = out(xmm_reg) d,
                 options(nostack, readonly, preserves_flags))
        };
        [a, b, c, d]
    }};
}

/// The hints and fences, the same for every x86 width.
macro_rules! hints {
    () => {
        #[inline(always)]
        fn call<const KIND: usize>(self, at: *const u8) {
            // SAFETY: a prefetch of any address is without effect on the program
            unsafe {
                match KIND {
                    0 => asm!("prefetchnta [{}]", in(reg) at, options(nostack, readonly, preserves_flags)),
                    1 => asm!("prefetcht0 [{}]", in(reg) at, options(nostack, readonly, preserves_flags)),
                    2 => asm!("prefetcht1 [{}]", in(reg) at, options(nostack, readonly, preserves_flags)),
                    _ => asm!("prefetcht2 [{}]", in(reg) at, options(nostack, readonly, preserves_flags)),
                }
            }
        }

        #[inline(always)]
        unsafe fn claim(self, at: *const u8) {
            // SAFETY: the caller proved the instruction; a prefetch of any address is without effect on the program
            unsafe { asm!("prefetchw [{}]", in(reg) at, options(nostack, readonly, preserves_flags)) };
        }

        #[inline(always)]
        fn stores(self) {
            // SAFETY: a fence
            unsafe { asm!("sfence", options(nostack, preserves_flags)) };
        }

        #[inline(always)]
        fn loads(self) {
            // SAFETY: a fence
            unsafe { asm!("lfence", options(nostack, preserves_flags)) };
        }

        #[inline(always)]
        fn both(self) {
            // SAFETY: a fence
            unsafe { asm!("mfence", options(nostack, preserves_flags)) };
        }
    };
}

impl Streams for Sse2 {
    #[inline(always)]
    unsafe fn put<const KIND: usize>(self, v: [__m128i; 4], to: *mut u8) {
        match KIND {
            0 => put4!("movntdq", v, to),
            1 => put4!("movntps", v, to),
            2 => put4!("movntpd", v, to),
            // SAFETY: the caller gives 64 writable bytes on a line
            3 => unsafe { put_words(self.words(v), to) },
            4 => put4!("movdqa", v, to),
            5 => put4!("movaps", v, to),
            6 => put4!("movapd", v, to),
            _ => put4!("movdqu", v, to),
        }
    }

    #[inline(always)]
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> [__m128i; 4] {
        match KIND {
            0 => take4!("movdqa", from),
            1 => take4!("movaps", from),
            2 => take4!("movapd", from),
            _ => take4!("movdqu", from),
        }
    }

    hints!();
}

/// Two stores by the instruction named.
macro_rules! put2 {
    ($name:literal, $v:ident, $to:ident) => {
        // SAFETY: the caller gives 64 writable bytes on a line, and of `Avx2::new` proved avx2
        unsafe {
            asm!(concat!($name, " [{to}], {a}"), concat!($name, " [{to} + 32], {b}"), to = in(reg) $to,
                 a = in(ymm_reg) $v[0], b = in(ymm_reg) $v[1], options(nostack, preserves_flags))
        }
    };
}

/// Two loads by the instruction named.
macro_rules! take2 {
    ($name:literal, $from:ident) => {{
        let (a, b);
        // SAFETY: the caller gives 64 readable bytes on a line, and of `Avx2::new` proved avx2
        unsafe {
            asm!(concat!($name, " {a}, [{from}]"), concat!($name, " {b}, [{from} + 32]"), from = in(reg) $from,
                 a = out(ymm_reg) a, b = out(ymm_reg) b, options(nostack, readonly, preserves_flags))
        };
        [a, b]
    }};
}

// Assembly on wide vectors asks for the feature in the very function that it stands in, so these are no `inline(always)`.

impl Streams for Avx2 {
    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn put<const KIND: usize>(self, v: [__m256i; 2], to: *mut u8) {
        match KIND {
            0 => put2!("vmovntdq", v, to),
            1 => put2!("vmovntps", v, to),
            2 => put2!("vmovntpd", v, to),
            // SAFETY: the caller gives 64 writable bytes on a line
            3 => unsafe { put_words(self.words(v), to) },
            4 => put2!("vmovdqa", v, to),
            5 => put2!("vmovaps", v, to),
            6 => put2!("vmovapd", v, to),
            _ => put2!("vmovdqu", v, to),
        }
    }

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> [__m256i; 2] {
        match KIND {
            0 => take2!("vmovntdqa", from),
            1 => take2!("vmovdqa", from),
            2 => take2!("vmovaps", from),
            _ => take2!("vmovapd", from),
        }
    }

    hints!();
}

/// One store of a whole line by the instruction named.
macro_rules! put1 {
    ($name:literal, $v:ident, $to:ident) => {
        // SAFETY: the caller gives 64 writable bytes on a line, and of `Avx512::new` proved avx512f
        unsafe {
            asm!(concat!($name, " [{to}], {v}"), to = in(reg) $to, v = in(zmm_reg) $v, options(nostack, preserves_flags))
        }
    };
}

/// One load of a whole line by the instruction named.
macro_rules! take1 {
    ($name:literal, $from:ident) => {{
        let v;
        // SAFETY: the caller gives 64 readable bytes on a line, and of `Avx512::new` proved avx512f
        unsafe {
            asm!(concat!($name, " {v}, [{from}]"), from = in(reg) $from, v = out(zmm_reg) v,
                 options(nostack, readonly, preserves_flags))
        };
        v
    }};
}

impl Streams for Avx512 {
    #[inline]
    #[target_feature(enable = "avx512f")]
    unsafe fn put<const KIND: usize>(self, v: __m512i, to: *mut u8) {
        match KIND {
            0 => put1!("vmovntdq", v, to),
            1 => put1!("vmovntps", v, to),
            2 => put1!("vmovntpd", v, to),
            // SAFETY: the caller gives 64 writable bytes on a line
            3 => unsafe { put_words(self.words(v), to) },
            4 => put1!("vmovdqa64", v, to),
            5 => put1!("vmovaps", v, to),
            6 => put1!("vmovapd", v, to),
            _ => put1!("vmovdqu64", v, to),
        }
    }

    #[inline]
    #[target_feature(enable = "avx512f")]
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> __m512i {
        match KIND {
            0 => take1!("vmovntdqa", from),
            1 => take1!("vmovdqa64", from),
            2 => take1!("vmovaps", from),
            _ => take1!("vmovapd", from),
        }
    }

    hints!();
}
