//! One block of 16 bytes; comparisons that aarch64 lacks are put together from `fcmeq`, `fcmgt` and `fcmge`.

use std::arch::aarch64::*;

use crate::vectors::{Line, neon::*};

/// Two vectors to one, all of the same elements.
macro_rules! plain {
    ($($name:ident $mnemonic:literal $elements:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(
                    concat!($mnemonic, " {r:v}.", $elements, ", {a:v}.", $elements, ", {b:v}.", $elements),
                    a = in(vreg) a, b = in(vreg) b, r = lateout(vreg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

plain! {
    eq_f32 "fcmeq" "4s"; ge_f32 "fcmge" "4s"; gt_f32 "fcmgt" "4s"; eq_f64 "fcmeq" "2d"; ge_f64 "fcmge" "2d";
    gt_f64 "fcmgt" "2d"; and_f32 "and" "16b"; or_f32 "orr" "16b"; xor_f32 "eor" "16b"; and_f64 "and" "16b";
    or_f64 "orr" "16b"; xor_f64 "eor" "16b"; or_not "orn" "16b";
}

/// Blends by a mask: bits of b where it has the top bit, else of a.
macro_rules! blends {
    ($($name:ident $elements:literal $pick:literal;)*) => {$(
        #[doc = concat!("`cmlt` and `", $pick, "`")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(a: V, b: V, m: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!("cmlt {t:v}.", $elements, ", {m:v}.", $elements, ", #0"),
                    "mov {r:v}.16b, {a:v}.16b", concat!($pick, " {r:v}.16b, {b:v}.16b, {t:v}.16b"), a = in(vreg) a,
                    b = in(vreg) b, m = in(vreg) m, t = out(vreg) _, r = out(vreg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

blends! { select8 "16b" "bit"; select16 "8h" "bit"; select64 "2d" "bit"; }

/// `cmge` and `bif`, the other way round
#[inline]
#[target_feature(enable = "neon")]
pub fn select32(a: V, b: V, m: V) -> V {
    let r;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("cmge {t:v}.4s, {m:v}.4s, #0", "mov {r:v}.16b, {a:v}.16b", "bif {r:v}.16b, {b:v}.16b, {t:v}.16b",
            a = in(vreg) a, b = in(vreg) b, m = in(vreg) m, t = out(vreg) _, r = out(vreg) r,
            options(pure, nomem, nostack, preserves_flags));
    }
    r
}

macro_rules! made {
    ($($(#[$doc:meta])* fn $name:ident($($a:ident),*) $body:block)*) => {$(
        $(#[$doc])*
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name($($a: V),*) -> V $body
    )*};
}

made! {
    /// All bits the other way.
    fn not(a) { or_not(vdupq_n_u8(0), a) }
    /// Not a, and b.
    fn andnot_f32(a, b) { andnot(a, b) }
    /// Not a, and b.
    fn andnot_f64(a, b) { andnot(a, b) }
    /// [`select8`] by (m and n) xor o.
    fn select8_by_and(a, b, m, n, o) { select8(a, b, xor(and(m, n), o)) }
    /// [`select8`] by not (m xor n), and o.
    fn select8_by_xnor(a, b, m, n, o) { select8(a, b, andnot(xor(m, n), o)) }
    /// [`select16`] by (m or n) xor o.
    fn select16_by_or(a, b, m, n, o) { select16(a, b, xor(or(m, n), o)) }
    /// [`select32`] by (n and not m) or o.
    fn select32_by_andnot(a, b, m, n, o) { select32(a, b, or(andnot(m, n), o)) }
    /// a < b
    fn lt_f32(a, b) { gt_f32(b, a) }
    /// a ≤ b
    fn le_f32(a, b) { ge_f32(b, a) }
    /// Neither is a NaN.
    fn ord_f32(a, b) { and(eq_f32(a, a), eq_f32(b, b)) }
    /// One is a NaN.
    fn unord_f32(a, b) { not(ord_f32(a, b)) }
    /// Different or unordered.
    fn neq_f32(a, b) { not(eq_f32(a, b)) }
    /// Not a < b.
    fn nlt_f32(a, b) { not(gt_f32(b, a)) }
    /// Not a ≤ b.
    fn nle_f32(a, b) { not(ge_f32(b, a)) }
    /// Not a ≥ b.
    fn nge_f32(a, b) { not(ge_f32(a, b)) }
    /// Not a > b.
    fn ngt_f32(a, b) { not(gt_f32(a, b)) }
    /// Equal or unordered.
    fn eq_uq_f32(a, b) { or_not(eq_f32(a, b), ord_f32(a, b)) }
    /// Different and ordered.
    fn neq_oq_f32(a, b) { andnot(eq_f32(a, b), ord_f32(a, b)) }
    /// No bit.
    fn never_f32(a, b) { and(eq_f32(a, b), neq_f32(a, b)) }
    /// Every bit.
    fn always_f32(a, b) { or(ord_f32(a, b), unord_f32(a, b)) }
    /// a < b
    fn lt_f64(a, b) { gt_f64(b, a) }
    /// a ≤ b
    fn le_f64(a, b) { ge_f64(b, a) }
    /// Neither is a NaN.
    fn ord_f64(a, b) { and(eq_f64(a, a), eq_f64(b, b)) }
    /// One is a NaN.
    fn unord_f64(a, b) { not(ord_f64(a, b)) }
    /// Different or unordered.
    fn neq_f64(a, b) { not(eq_f64(a, b)) }
    /// Not a < b.
    fn nlt_f64(a, b) { not(gt_f64(b, a)) }
    /// Not a ≤ b.
    fn nle_f64(a, b) { not(ge_f64(b, a)) }
    /// Not a ≥ b.
    fn nge_f64(a, b) { not(ge_f64(a, b)) }
    /// Not a > b.
    fn ngt_f64(a, b) { not(gt_f64(a, b)) }
    /// Equal or unordered.
    fn eq_uq_f64(a, b) { or_not(eq_f64(a, b), ord_f64(a, b)) }
    /// Different and ordered.
    fn neq_oq_f64(a, b) { andnot(eq_f64(a, b), ord_f64(a, b)) }
    /// No bit.
    fn never_f64(a, b) { and(eq_f64(a, b), neq_f64(a, b)) }
    /// Every bit.
    fn always_f64(a, b) { or(ord_f64(a, b), unord_f64(a, b)) }
}

/// Masked loads and stores, by ordinary ones.
macro_rules! memory {
    ($($keep:ident $put:ident $select:ident;)*) => {$(
        #[doc = concat!("[`", stringify!($select), "`] of nothing and a line's share.")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $keep(line: &Line, at: usize, m: V) -> V {
            $select(vdupq_n_u8(0), load(line, at), m)
        }

        #[doc = concat!("[`", stringify!($select), "`] of u and v into memory.")]
        #[inline]
        #[target_feature(enable = "neon")]
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
#[target_feature(enable = "neon")]
pub fn tests(a: V, b: V, m: V, n: V, word: &mut [u8; 8], at: usize) {
    let weights = vcombine_u32(vcreate_u32(0x0000_0002_0000_0001), vcreate_u32(0x0000_0008_0000_0004));
    let signs = vaddvq_u32(vandq_u32(vcltzq_s32(vreinterpretq_s32_u8(a)), weights)) as u16;
    let tops = |x: V| {
        let x = vreinterpretq_u64_u8(x);
        (vgetq_lane_u64::<0>(x) >> 63 | vgetq_lane_u64::<1>(x) >> 63 << 1) as u16
    };
    let none = u16::from(vmaxvq_u8(vtstq_u8(a, m)) == 0);
    let others = u16::from(vmaxvq_u8(andnot(a, m)) == 0);
    let none32 = |x: V| u16::from(vminvq_s32(vreinterpretq_s32_u8(x)) >= 0);
    let none64 = |x: V| u16::from(tops(x) == 0);
    let bits = signs
        | tops(b) << 4
        | none << 6
        | others << 7
        | none32(and(a, n)) << 8
        | none32(andnot(a, n)) << 9
        | none64(and(b, n)) << 10
        | none64(andnot(b, n)) << 11;
    word[at / 8..at / 8 + 2].copy_from_slice(&bits.to_le_bytes());
}
