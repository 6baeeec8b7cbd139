//! One block of 16 bytes; what the baseline lacks is made with `andps`, `andnps`, `orps` and their like.

use std::arch::x86_64::*;

use crate::vectors::{Line, sse2::*};

binaries! { legacy;
    and_f32 "andps"; or_f32 "orps"; xor_f32 "xorps"; andnot_f32 "andnps";
    and_f64 "andpd"; or_f64 "orpd"; xor_f64 "xorpd"; andnot_f64 "andnpd";
    eq_f32 "cmpeqps"; lt_f32 "cmpltps"; le_f32 "cmpleps"; unord_f32 "cmpunordps"; neq_f32 "cmpneqps";
    nlt_f32 "cmpnltps"; nle_f32 "cmpnleps"; ord_f32 "cmpordps";
    eq_f64 "cmpeqpd"; lt_f64 "cmpltpd"; le_f64 "cmplepd"; unord_f64 "cmpunordpd"; neq_f64 "cmpneqpd";
    nlt_f64 "cmpnltpd"; nle_f64 "cmpnlepd"; ord_f64 "cmpordpd";
}

macro_rules! made {
    ($($(#[$doc:meta])* fn $name:ident($($a:ident),*) $body:block)*) => {$(
        $(#[$doc])*
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name($($a: V),*) -> V $body
    )*};
}

made! {
    /// Equal or unordered.
    fn eq_uq_f32(a, b) { or_f32(eq_f32(a, b), unord_f32(a, b)) }
    /// Different and ordered.
    fn neq_oq_f32(a, b) { and_f32(neq_f32(a, b), ord_f32(a, b)) }
    /// a ≥ b
    fn ge_f32(a, b) { le_f32(b, a) }
    /// a > b
    fn gt_f32(a, b) { lt_f32(b, a) }
    /// Not a ≥ b.
    fn nge_f32(a, b) { nle_f32(b, a) }
    /// Not a > b.
    fn ngt_f32(a, b) { nlt_f32(b, a) }
    /// No bit.
    fn never_f32(a, b) { and_f32(eq_f32(a, b), neq_f32(a, b)) }
    /// Every bit.
    fn always_f32(a, b) { or_f32(ord_f32(a, b), unord_f32(a, b)) }
    /// Equal or unordered.
    fn eq_uq_f64(a, b) { or_f64(eq_f64(a, b), unord_f64(a, b)) }
    /// Different and ordered.
    fn neq_oq_f64(a, b) { and_f64(neq_f64(a, b), ord_f64(a, b)) }
    /// a ≥ b
    fn ge_f64(a, b) { le_f64(b, a) }
    /// a > b
    fn gt_f64(a, b) { lt_f64(b, a) }
    /// Not a ≥ b.
    fn nge_f64(a, b) { nle_f64(b, a) }
    /// Not a > b.
    fn ngt_f64(a, b) { nlt_f64(b, a) }
    /// No bit.
    fn never_f64(a, b) { and_f64(eq_f64(a, b), neq_f64(a, b)) }
    /// Every bit.
    fn always_f64(a, b) { or_f64(ord_f64(a, b), unord_f64(a, b)) }
    /// Bytes of b where the mask has its top bit, else of a.
    fn select8(a, b, m) {
        let all = gt8(_mm_setzero_si128(), m);
        or(and(all, b), andnot(all, a))
    }
    /// Elements of 16 bits.
    fn select16(a, b, m) {
        let all = right_s16_by::<15>(m);
        or(and(all, b), andnot(all, a))
    }
    /// Elements of 32 bits.
    fn select32(a, b, m) {
        let all = right_s32_by::<31>(m);
        or_f32(and_f32(all, b), andnot_f32(all, a))
    }
    /// Elements of 64 bits.
    fn select64(a, b, m) {
        let all = order32::<0xf5>(right_s32_by::<31>(m));
        or_f64(and_f64(all, b), andnot_f64(all, a))
    }
    /// [`select8`] by (m and n) xor o.
    fn select8_by_and(a, b, m, n, o) { select8(a, b, xor(and(m, n), o)) }
    /// [`select8`] by not (m xor n), and o.
    fn select8_by_xnor(a, b, m, n, o) { select8(a, b, andnot(xor(m, n), o)) }
    /// [`select16`] by (m or n) xor o.
    fn select16_by_or(a, b, m, n, o) { select16(a, b, xor(or(m, n), o)) }
    /// [`select32`] by (n and not m) or o.
    fn select32_by_andnot(a, b, m, n, o) { select32(a, b, or(andnot(m, n), o)) }
}

/// Masked loads and stores, by ordinary ones.
macro_rules! memory {
    ($($keep:ident $put:ident $select:ident;)*) => {$(
        #[doc = concat!("[`", stringify!($select), "`] of nothing and a line's share.")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $keep(line: &Line, at: usize, m: V) -> V {
            $select(_mm_setzero_si128(), load(line, at), m)
        }

        #[doc = concat!("[`", stringify!($select), "`] of u and v into memory.")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $put(under: V, m: V, v: V, line: &mut Line, at: usize) {
            store(line, at, $select(under, v, m));
        }
    )*};
}

memory! {
    keep_i32 put_i32 select32; keep_f32 put_f32 select32; keep_i64 put_i64 select64; keep_f64 put_f64 select64;
}

/// Bits of a block's tests, from the lowest: signs of a's four elements of 32 bits and of b's two of 64; whether
/// a and m, not a and m have no bit in common; whether a and n, not a and n have no sign of 32 bits in common; the same
/// of b and n with signs of 64 bits.
#[inline]
#[target_feature(enable = "sse2")]
pub fn tests(a: V, b: V, m: V, n: V, word: &mut [u8; 8], at: usize) {
    let (mut r, mut s): (u32, u32);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("movmskps {r:e}, {a}", "movmskpd {s:e}, {b}", a = in(xmm_reg) a, b = in(xmm_reg) b,
            r = out(reg) r, s = out(reg) s, options(pure, nomem, nostack, preserves_flags));
    }
    let none = |x: V| u32::from(_mm_movemask_epi8(eq8(x, _mm_setzero_si128())) == 0xffff);
    r |= s << 4 | none(and(a, m)) << 6 | none(andnot(a, m)) << 7;
    s = u32::from(_mm_movemask_ps(_mm_castsi128_ps(and(a, n))) == 0);
    r |= s << 8 | u32::from(_mm_movemask_ps(_mm_castsi128_ps(andnot(a, n))) == 0) << 9;
    s = u32::from(_mm_movemask_pd(_mm_castsi128_pd(and(b, n))) == 0);
    r |= s << 10 | u32::from(_mm_movemask_pd(_mm_castsi128_pd(andnot(b, n))) == 0) << 11;
    word[at / 8..at / 8 + 2].copy_from_slice(&(r as u16).to_le_bytes());
}
