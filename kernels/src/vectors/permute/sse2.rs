//! A block in four 128-bit registers. Moves of whole lanes cost nothing: the registers change their names.

use std::arch::x86_64::*;

use super::Order;
use crate::vectors::Line;

/// A block.
pub type P = [__m128i; 4];

/// A block from memory.
#[inline]
#[target_feature(enable = "sse2")]
pub fn load(line: &Line) -> P {
    let from = line.0.as_chunks::<16>().0;
    // SAFETY: each slice has the 16 bytes that are read
    unsafe {
        [
            _mm_loadu_si128(from[0].as_ptr().cast()),
            _mm_loadu_si128(from[1].as_ptr().cast()),
            _mm_loadu_si128(from[2].as_ptr().cast()),
            _mm_loadu_si128(from[3].as_ptr().cast()),
        ]
    }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn store(line: &mut Line, p: P) {
    for (to, lane) in line.0.as_chunks_mut::<16>().0.iter_mut().zip(p) {
        // SAFETY: the slice has the 16 bytes that are written
        unsafe { _mm_storeu_si128(to.as_mut_ptr().cast(), lane) }
    }
}

/// Instructions on registers: `name(sources) -> results "text"…;`, sources are overwritten where they are results.
macro_rules! pairs {
    ($($name:ident $($text:literal)+;)*) => {$(
        #[inline]
        #[target_feature(enable = "sse2")]
        fn $name(a: __m128i, b: __m128i) -> (__m128i, __m128i) {
            let (c, d);
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text,)+ "/* {a} {b} {t} {r:e} {s:e} */", a = inout(xmm_reg) a => c,
                    b = inout(xmm_reg) b => d, t = out(xmm_reg) _, r = out(reg) _, s = out(reg) _,
                    options(nomem, nostack, preserves_flags));
            }
            (c, d)
        }
    )*};
}

pairs! {
    lane_swap32 "pshufd {a}, {a}, 0xb1" "pshufd {b}, {b}, 0xb1";
    lane_swap64 "shufpd {a}, {a}, 1" "shufpd {b}, {b}, 1";
    lane_turn32 "pshufd {a}, {a}, 0x39" "shufps {b}, {b}, 0x39";
    lane_turn16 "pshuflw {a}, {a}, 0x93" "pshufhw {a}, {a}, 0x39" "pshuflw {b}, {b}, 0x93" "pshufhw {b}, {b}, 0x39";
    lane_zip32 "movaps {t}, {a}" "unpcklps {a}, {b}" "unpckhps {t}, {b}" "movaps {b}, {t}";
    lane_zip64 "movapd {t}, {a}" "unpcklpd {a}, {b}" "unpckhpd {t}, {b}" "movapd {b}, {t}";
    lane_middle64 "movaps {t}, {a}" "movlhps {a}, {b}" "movhlps {b}, {t}";
    lane_up64 "movapd {t}, {a}" "shufpd {a}, {b}, 1" "shufpd {b}, {t}, 1";
    lane_change32 "movaps {t}, {a}" "movss {a}, {b}" "movss {b}, {t}";
    lane_change64 "movapd {t}, {a}" "movsd {a}, {b}" "movsd {b}, {t}";
    lane_change16 "pextrw {r:e}, {a}, 3" "pextrw {s:e}, {b}, 3" "pinsrw {a}, {s:e}, 3" "pinsrw {b}, {r:e}, 3";
    lane_split32 "movaps {t}, {a}" "shufps {a}, {b}, 0x88" "shufps {t}, {b}, 0xdd" "movaps {b}, {t}";
    lane_mix32 "movdqa {t}, {a}" "punpckldq {a}, {b}" "punpckhdq {t}, {b}" "movdqa {b}, {t}";
}

/// Four registers, two and two.
macro_rules! alone {
    ($($name:ident $pair:ident;)*) => {$(
        #[doc = concat!("See [`super::avx2::", stringify!($name), "`].")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name(p: P) -> P {
            let ((a, b), (c, d)) = ($pair(p[0], p[1]), $pair(p[2], p[3]));
            [a, b, c, d]
        }
    )*};
}

alone! {
    swap32 lane_swap32; swap64 lane_swap64; turn32 lane_turn32; turn16 lane_turn16; up64 lane_up64;
    middle64 lane_middle64; first32 lane_change32; first64 lane_change64;
}

/// Each register of one block with that of another.
macro_rules! both {
    ($($name:ident $pair:ident;)*) => {$(
        #[doc = concat!("See [`super::avx2::", stringify!($name), "`].")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name(p: P, q: P) -> (P, P) {
            let ((a, e), (b, f)) = ($pair(p[0], q[0]), $pair(p[1], q[1]));
            let ((c, g), (d, h)) = ($pair(p[2], q[2]), $pair(p[3], q[3]));
            ([a, b, c, d], [e, f, g, h])
        }
    )*};
}

both! {
    zip32 lane_zip32; zip64 lane_zip64; change32 lane_change32; change64 lane_change64; change16 lane_change16;
    split32 lane_split32; odd64 lane_up64; mix32 lane_mix32;
}

/// See [`super::avx2::align`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn align(p: P, q: P) -> (P, P) {
    let one = |high, low| _mm_or_si128(_mm_srli_si128::<5>(low), _mm_slli_si128::<11>(high));
    let (mut r, mut s) = (p, q);
    for i in 0..4 {
        (r[i], s[i]) = (one(p[i], q[i]), one(q[i], p[i]));
    }
    (r, s)
}

/// See [`super::avx2::down64`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn down64(p: P) -> P {
    let ((a, b), (c, d)) = (lane_up64(p[0], p[1]), lane_up64(p[2], p[3]));
    [b, a, d, c]
}

/// See [`super::avx2::swap128`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn swap128(p: P) -> P {
    [p[1], p[0], p[3], p[2]]
}

/// See [`super::avx2::lanes`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn lanes(p: P) -> P {
    [p[2], p[0], p[3], p[1]]
}

/// See [`super::avx2::halves`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn halves(p: P, q: P) -> (P, P) {
    ([p[0], q[0], p[2], q[2]], [p[1], q[1], p[3], q[3]])
}

/// See [`super::avx2::turn512`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn turn512(p: P) -> P {
    let one = |low, high| _mm_or_si128(_mm_srli_si128::<4>(low), _mm_slli_si128::<12>(high));
    [one(p[0], p[1]), one(p[1], p[2]), one(p[2], p[3]), one(p[3], p[0])]
}

/// See [`super::avx2::elements`]; by a load of each element.
#[inline]
#[target_feature(enable = "sse2")]
pub fn elements<const FORM: usize>(p: P, order: &Order) -> P {
    let mut line = Line([0; 64]);
    store(&mut line, p);
    let from = line.0.as_chunks::<4>().0;
    let places = order.elements.0.as_chunks::<4>().0;
    let one = |i: usize| _mm_cvtsi32_si128(i32::from_le_bytes(from[usize::from(places[i][0] & 15)]));
    let four = |i: usize| {
        let (low, high) = (_mm_unpacklo_epi32(one(i), one(i + 1)), _mm_unpacklo_epi32(one(i + 2), one(i + 3)));
        _mm_unpacklo_epi64(low, high)
    };
    [four(0), four(4), four(8), four(12)]
}
