//! One block of 16 bytes in a 128-bit aarch64 register.

use std::arch::aarch64::*;

/// One register.
pub type V = uint8x16_t;
/// A shift count for all elements.
pub type Count = i64;
/// Bytes in a register.
pub const WIDTH: usize = 16;

/// The register's share of a line, from byte `at` on.
#[inline]
#[target_feature(enable = "neon")]
pub fn load(line: &super::Line, at: usize) -> V {
    let from: &[u8; WIDTH] = line.0[at..].first_chunk().expect("a line has four nets");
    // SAFETY: the slice has the 16 bytes that are read
    unsafe { vld1q_u8(from.as_ptr()) }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "neon")]
pub fn store(line: &mut super::Line, at: usize, x: V) {
    let to: &mut [u8; WIDTH] = line.0[at..].first_chunk_mut().expect("a line has four nets");
    // SAFETY: the slice has the 16 bytes that are written
    unsafe { vst1q_u8(to.as_mut_ptr(), x) }
}

/// The i-th word of a line as a count for all elements.
#[inline]
#[target_feature(enable = "neon")]
pub fn count<const I: usize>(line: &super::Line) -> Count {
    i64::from_le_bytes(line.0.as_chunks::<8>().0[I])
}

/// Bit 7 of every byte, byte 0 lowest, into the register's share of a word.
#[inline]
#[target_feature(enable = "neon")]
pub fn signs(a: V, word: &mut [u8; 8], at: usize) {
    let weights = vreinterpretq_u8_u64(vdupq_n_u64(0x8040_2010_0804_0201));
    let bits = vandq_u8(vcltzq_s8(vreinterpretq_s8_u8(a)), weights);
    word[at / 8] = vaddv_u8(vget_low_u8(bits));
    word[at / 8 + 1] = vaddv_u8(vget_high_u8(bits));
}

/// Two vectors to one: `name "instructions";`, sources a and b, result r, and t for what is between.
macro_rules! binaries {
    ($($name:ident $($text:literal)+;)*) => {$(
        #[doc = concat!($("`", $text, "` "),+)]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text,)+ "/* {a:v} {b:v} {t:v} {r:v} */", a = in(vreg) a, b = in(vreg) b,
                    t = out(vreg) _, r = out(vreg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

/// As `binaries`, of the same elements throughout.
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
    add8 "add" "16b"; add16 "add" "8h"; add32 "add" "4s"; add64 "add" "2d";
    sub8 "sub" "16b"; sub16 "sub" "8h"; sub32 "sub" "4s"; sub64 "sub" "2d";
    and "and" "16b"; or "orr" "16b"; xor "eor" "16b";
    adds_s8 "sqadd" "16b"; adds_s16 "sqadd" "8h"; adds_u8 "uqadd" "16b"; adds_u16 "uqadd" "8h";
    subs_s8 "sqsub" "16b"; subs_s16 "sqsub" "8h"; subs_u8 "uqsub" "16b"; subs_u16 "uqsub" "8h";
    avg8 "urhadd" "16b"; avg16 "urhadd" "8h";
    mul_low16 "mul" "8h"; mul_low32 "mul" "4s";
    min_u8 "umin" "16b"; max_u8 "umax" "16b"; min_s16 "smin" "8h"; max_s16 "smax" "8h";
    min_s8 "smin" "16b"; max_s8 "smax" "16b"; min_u16 "umin" "8h"; max_u16 "umax" "8h";
    min_s32 "smin" "4s"; max_s32 "smax" "4s"; min_u32 "umin" "4s"; max_u32 "umax" "4s";
    eq8 "cmeq" "16b"; eq16 "cmeq" "8h"; eq32 "cmeq" "4s"; eq64 "cmeq" "2d";
    gt8 "cmgt" "16b"; gt16 "cmgt" "8h"; gt32 "cmgt" "4s"; gt64 "cmgt" "2d";
    low8 "zip1" "16b"; low16 "zip1" "8h"; low32 "zip1" "4s"; low64 "zip1" "2d";
    high8 "zip2" "16b"; high16 "zip2" "8h"; high32 "zip2" "4s"; high64 "zip2" "2d";
    pairs_add16 "addp" "8h"; pairs_add32 "addp" "4s";
    left_each32 "ushl" "4s"; left_each64 "ushl" "2d";
}

binaries! {
    andnot "bic {r:v}.16b, {b:v}.16b, {a:v}.16b";
    mul_high_s16 "smull {t:v}.4s, {a:v}.4h, {b:v}.4h" "smull2 {r:v}.4s, {a:v}.8h, {b:v}.8h"
        "uzp2 {r:v}.8h, {t:v}.8h, {r:v}.8h";
    mul_high_u16 "umull {t:v}.4s, {a:v}.4h, {b:v}.4h" "umull2 {r:v}.4s, {a:v}.8h, {b:v}.8h"
        "uzp2 {r:v}.8h, {t:v}.8h, {r:v}.8h";
    mul_u32 "xtn {t:v}.2s, {a:v}.2d" "xtn {r:v}.2s, {b:v}.2d" "umull {r:v}.2d, {t:v}.2s, {r:v}.2s";
    mul_s32 "xtn {t:v}.2s, {a:v}.2d" "xtn {r:v}.2s, {b:v}.2d" "smull {r:v}.2d, {t:v}.2s, {r:v}.2s";
    madd16 "smull {t:v}.4s, {a:v}.4h, {b:v}.4h" "smull2 {r:v}.4s, {a:v}.8h, {b:v}.8h"
        "addp {r:v}.4s, {t:v}.4s, {r:v}.4s";
    pack_s16 "sqxtn {r:v}.8b, {a:v}.8h" "sqxtn2 {r:v}.16b, {b:v}.8h";
    pack_s32 "sqxtn {r:v}.4h, {a:v}.4s" "sqxtn2 {r:v}.8h, {b:v}.4s";
    pack_u16 "sqxtun {r:v}.8b, {a:v}.8h" "sqxtun2 {r:v}.16b, {b:v}.8h";
    pack_u32 "sqxtun {r:v}.4h, {a:v}.4s" "sqxtun2 {r:v}.8h, {b:v}.4s";
    sad8 "uabd {r:v}.16b, {a:v}.16b, {b:v}.16b" "uaddlp {r:v}.8h, {r:v}.16b" "uaddlp {r:v}.4s, {r:v}.8h"
        "uaddlp {r:v}.2d, {r:v}.4s";
    pairs_adds16 "uzp1 {t:v}.8h, {a:v}.8h, {b:v}.8h" "uzp2 {r:v}.8h, {a:v}.8h, {b:v}.8h"
        "sqadd {r:v}.8h, {t:v}.8h, {r:v}.8h";
    pairs_sub16 "uzp1 {t:v}.8h, {a:v}.8h, {b:v}.8h" "uzp2 {r:v}.8h, {a:v}.8h, {b:v}.8h"
        "sub {r:v}.8h, {t:v}.8h, {r:v}.8h";
    pairs_subs16 "uzp1 {t:v}.8h, {a:v}.8h, {b:v}.8h" "uzp2 {r:v}.8h, {a:v}.8h, {b:v}.8h"
        "sqsub {r:v}.8h, {t:v}.8h, {r:v}.8h";
    pairs_sub32 "uzp1 {t:v}.4s, {a:v}.4s, {b:v}.4s" "uzp2 {r:v}.4s, {a:v}.4s, {b:v}.4s"
        "sub {r:v}.4s, {t:v}.4s, {r:v}.4s";
    right_each32 "neg {t:v}.4s, {b:v}.4s" "ushl {r:v}.4s, {a:v}.4s, {t:v}.4s";
    right_each64 "neg {t:v}.2d, {b:v}.2d" "ushl {r:v}.2d, {a:v}.2d, {t:v}.2d";
    right_each_s32 "neg {t:v}.4s, {b:v}.4s" "sshl {r:v}.4s, {a:v}.4s, {t:v}.4s";
    // a negated where b is negative, nothing where b is zero
    sign8 "neg {t:v}.16b, {a:v}.16b" "cmlt {r:v}.16b, {b:v}.16b, #0" "bsl {r:v}.16b, {t:v}.16b, {a:v}.16b"
        "cmeq {t:v}.16b, {b:v}.16b, #0" "bic {r:v}.16b, {r:v}.16b, {t:v}.16b";
    sign16 "neg {t:v}.8h, {a:v}.8h" "cmlt {r:v}.8h, {b:v}.8h, #0" "bsl {r:v}.16b, {t:v}.16b, {a:v}.16b"
        "cmeq {t:v}.8h, {b:v}.8h, #0" "bic {r:v}.16b, {r:v}.16b, {t:v}.16b";
    sign32 "neg {t:v}.4s, {a:v}.4s" "cmlt {r:v}.4s, {b:v}.4s, #0" "bsl {r:v}.16b, {t:v}.16b, {a:v}.16b"
        "cmeq {t:v}.4s, {b:v}.4s, #0" "bic {r:v}.16b, {r:v}.16b, {t:v}.16b";
    least_in_two "umin {t:v}.8h, {a:v}.8h, {b:v}.8h" "uminv {r:h}, {t:v}.8h" "dup {r:v}.8h, {r:v}.h[0]";
}

/// Products of unsigned bytes of a and signed bytes of b, sums of two, saturated.
#[inline]
#[target_feature(enable = "neon")]
pub fn madd8(a: V, b: V) -> V {
    let b = vreinterpretq_s8_u8(b);
    let wide = |x| vreinterpretq_s16_u16(vmovl_u8(x));
    let low = vmulq_s16(wide(vget_low_u8(a)), vmovl_s8(vget_low_s8(b)));
    let high = vmulq_s16(wide(vget_high_u8(a)), vmovl_s8(vget_high_s8(b)));
    vreinterpretq_u8_s16(vqaddq_s16(vuzp1q_s16(low, high), vuzp2q_s16(low, high)))
}

/// `sqrdmulh`, but for −1 · −1 in units of 2¹⁵, which wraps around instead of saturating.
#[inline]
#[target_feature(enable = "neon")]
pub fn mul_round16(a: V, b: V) -> V {
    let (a, b, least) = (vreinterpretq_s16_u8(a), vreinterpretq_s16_u8(b), vdupq_n_s16(i16::MIN));
    let both = vandq_u16(vceqq_s16(a, least), vceqq_s16(b, least));
    veorq_u8(vreinterpretq_u8_s16(vqrdmulhq_s16(a, b)), vreinterpretq_u8_u16(both))
}

/// The least 16-bit number, in the lowest place, then that number's first place.
#[inline]
#[target_feature(enable = "neon")]
pub fn least_u16(a: V) -> V {
    let least = least_in_two(a, a);
    let places =
        vreinterpretq_u8_u64(vcombine_u64(vdup_n_u64(0x0003_0002_0001_0000), vdup_n_u64(0x0007_0006_0005_0004)));
    // elsewhere all ones, which is no place
    let place = vminvq_u16(vreinterpretq_u16_u8(vornq_u8(places, eq16(a, least))));
    let number = vgetq_lane_u16::<0>(vreinterpretq_u16_u8(least));
    vreinterpretq_u8_u32(vsetq_lane_u32::<0>(u32::from(number) | u32::from(place) << 16, vdupq_n_u32(0)))
}

/// Sums of four absolute differences between the bytes from each place up to 7 on in `a` (from its byte 4 on) and bytes
/// 4 to 7 of `b`.
#[inline]
#[target_feature(enable = "neon")]
pub fn sad_window(a: V, b: V) -> V {
    let b = vget_low_u8(b);
    let sum = vabdl_u8(vget_low_u8(vextq_u8::<4>(a, a)), vdup_lane_u8::<4>(b));
    let sum = vabal_u8(sum, vget_low_u8(vextq_u8::<5>(a, a)), vdup_lane_u8::<5>(b));
    let sum = vabal_u8(sum, vget_low_u8(vextq_u8::<6>(a, a)), vdup_lane_u8::<6>(b));
    vreinterpretq_u8_u16(vabal_u8(sum, vget_low_u8(vextq_u8::<7>(a, a)), vdup_lane_u8::<7>(b)))
}

/// One vector to one, with intrinsics between reinterpretations.
macro_rules! unaries {
    ($($name:ident |$a:ident| $made:expr;)*) => {$(
        #[doc = concat!("`", stringify!($made), "`")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name($a: V) -> V {
            $made
        }
    )*};
}

unaries! {
    abs8 |a| vreinterpretq_u8_s8(vabsq_s8(vreinterpretq_s8_u8(a)));
    abs16 |a| vreinterpretq_u8_s16(vabsq_s16(vreinterpretq_s16_u8(a)));
    abs32 |a| vreinterpretq_u8_s32(vabsq_s32(vreinterpretq_s32_u8(a)));
}

/// All elements by one count: negative counts shift right.
macro_rules! counted {
    ($($name:ident $shift:ident $splat:ident $type:ty, $back:ident, $sign:literal;)*) => {$(
        #[doc = concat!("`", stringify!($shift), "` by one count")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(a: V, count: Count) -> V {
            $shift(a, $back($splat(($sign * count) as $type)))
        }
    )*};
}

plain! { left_any16 "ushl" "8h"; right_any_s16 "sshl" "8h"; right_any_s32 "sshl" "4s"; }

counted! {
    left16 left_any16 vdupq_n_s16 i16, vreinterpretq_u8_s16, 1;
    left32 left_each32 vdupq_n_s32 i32, vreinterpretq_u8_s32, 1;
    left64 left_each64 vdupq_n_s64 i64, vreinterpretq_u8_s64, 1;
    right16 left_any16 vdupq_n_s16 i16, vreinterpretq_u8_s16, -1;
    right32 left_each32 vdupq_n_s32 i32, vreinterpretq_u8_s32, -1;
    right64 left_each64 vdupq_n_s64 i64, vreinterpretq_u8_s64, -1;
    right_s16 right_any_s16 vdupq_n_s16 i16, vreinterpretq_u8_s16, -1;
    right_s32 right_any_s32 vdupq_n_s32 i32, vreinterpretq_u8_s32, -1;
}

/// With a number in the instruction.
macro_rules! immediates {
    ($($name:ident $mnemonic:literal $elements:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "` by N")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name<const N: i32>(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {r:v}.", $elements, ", {a:v}.", $elements, ", #{n}"),
                    a = in(vreg) a, n = const N, r = lateout(vreg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

immediates! {
    left16_by "shl" "8h"; left32_by "shl" "4s"; left64_by "shl" "2d"; right16_by "ushr" "8h"; right32_by "ushr" "4s";
    right64_by "ushr" "2d"; right_s16_by "sshr" "8h"; right_s32_by "sshr" "4s";
}

/// `ext` with zeros below
#[inline]
#[target_feature(enable = "neon")]
pub fn left_bytes<const N: i32>(a: V) -> V {
    let r;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("ext {r:v}.16b, {z:v}.16b, {a:v}.16b, #{n}", a = in(vreg) a, z = in(vreg) vdupq_n_u8(0),
            n = const 16 - N, r = lateout(vreg) r, options(pure, nomem, nostack, preserves_flags));
    }
    r
}

/// `ext` with zeros above
#[inline]
#[target_feature(enable = "neon")]
pub fn right_bytes<const N: i32>(a: V) -> V {
    let r;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("ext {r:v}.16b, {a:v}.16b, {z:v}.16b, #{n}", a = in(vreg) a, z = in(vreg) vdupq_n_u8(0),
            n = const N, r = lateout(vreg) r, options(pure, nomem, nostack, preserves_flags));
    }
    r
}

/// Elements of memory widened to fill a register, in steps of `ushll` or `sshll`.
macro_rules! widenings {
    ($($name:ident $bytes:literal $($text:literal)+;)*) => {$(
        #[doc = concat!($("`", $text, "` "),+)]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(line: &super::Line, at: usize) -> V {
            let from: &[u8; $bytes] = line.0[at * $bytes / 16..].first_chunk().expect("a line has four nets");
            let mut word = [0; 8];
            word[..$bytes].copy_from_slice(from);
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text),+, a = in(vreg) vcreate_u8(u64::from_le_bytes(word)), r = out(vreg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

widenings! {
    zero8to16 8 "ushll {r:v}.8h, {a:v}.8b, #0";
    zero8to32 4 "ushll {r:v}.8h, {a:v}.8b, #0" "ushll {r:v}.4s, {r:v}.4h, #0";
    zero8to64 2 "ushll {r:v}.8h, {a:v}.8b, #0" "ushll {r:v}.4s, {r:v}.4h, #0" "ushll {r:v}.2d, {r:v}.2s, #0";
    zero16to32 8 "ushll {r:v}.4s, {a:v}.4h, #0";
    zero16to64 4 "ushll {r:v}.4s, {a:v}.4h, #0" "ushll {r:v}.2d, {r:v}.2s, #0";
    zero32to64 8 "ushll {r:v}.2d, {a:v}.2s, #0";
    sign8to16 8 "sshll {r:v}.8h, {a:v}.8b, #0";
    sign8to32 4 "sshll {r:v}.8h, {a:v}.8b, #0" "sshll {r:v}.4s, {r:v}.4h, #0";
    sign8to64 2 "sshll {r:v}.8h, {a:v}.8b, #0" "sshll {r:v}.4s, {r:v}.4h, #0" "sshll {r:v}.2d, {r:v}.2s, #0";
    sign16to32 8 "sshll {r:v}.4s, {a:v}.4h, #0";
    sign16to64 4 "sshll {r:v}.4s, {a:v}.4h, #0" "sshll {r:v}.2d, {r:v}.2s, #0";
    sign32to64 8 "sshll {r:v}.2d, {a:v}.2s, #0";
}
