//! A block in four 128-bit registers. Moves of whole lanes cost nothing: the registers change their names.

use std::arch::aarch64::*;

use super::Order;
use crate::vectors::Line;

/// A block.
pub type P = [uint8x16_t; 4];

/// A block from memory.
#[inline]
#[target_feature(enable = "neon")]
pub fn load(line: &Line) -> P {
    // SAFETY: a line has the 64 bytes that are read
    let uint8x16x4_t(a, b, c, d) = unsafe { vld1q_u8_x4(line.0.as_ptr()) };
    [a, b, c, d]
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "neon")]
pub fn store(line: &mut Line, p: P) {
    // SAFETY: a line has the 64 bytes that are written
    unsafe { vst1q_u8_x4(line.0.as_mut_ptr(), uint8x16x4_t(p[0], p[1], p[2], p[3])) }
}

/// Sources a and b, results r and s.
macro_rules! pairs {
    ($($name:ident $($text:literal)+;)*) => {$(
        #[inline]
        #[target_feature(enable = "neon")]
        fn $name(a: uint8x16_t, b: uint8x16_t) -> (uint8x16_t, uint8x16_t) {
            let (r, s);
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text),+, a = in(vreg) a, b = in(vreg) b, r = out(vreg) r, s = out(vreg) s,
                    options(pure, nomem, nostack, preserves_flags));
            }
            (r, s)
        }
    )*};
}

pairs! {
    lane_swap32 "rev64 {r:v}.4s, {a:v}.4s" "rev64 {s:v}.4s, {b:v}.4s";
    lane_swap64 "ext {r:v}.16b, {a:v}.16b, {a:v}.16b, #8" "ext {s:v}.16b, {b:v}.16b, {b:v}.16b, #8";
    lane_turn32 "ext {r:v}.16b, {a:v}.16b, {a:v}.16b, #4" "ext {s:v}.16b, {b:v}.16b, {b:v}.16b, #4";
    lane_zip32 "zip1 {r:v}.4s, {a:v}.4s, {b:v}.4s" "zip2 {s:v}.4s, {a:v}.4s, {b:v}.4s";
    lane_zip64 "zip1 {r:v}.2d, {a:v}.2d, {b:v}.2d" "zip2 {s:v}.2d, {a:v}.2d, {b:v}.2d";
    lane_middle64 "trn1 {r:v}.2d, {a:v}.2d, {b:v}.2d" "trn2 {s:v}.2d, {a:v}.2d, {b:v}.2d";
    lane_up64 "ext {r:v}.16b, {a:v}.16b, {b:v}.16b, #8" "ext {s:v}.16b, {b:v}.16b, {a:v}.16b, #8";
    lane_change32 "mov {r:v}.16b, {a:v}.16b" "ins {r:v}.s[0], {b:v}.s[0]" "mov {s:v}.16b, {b:v}.16b"
        "ins {s:v}.s[0], {a:v}.s[0]";
    lane_change64 "mov {r:v}.16b, {a:v}.16b" "ins {r:v}.d[0], {b:v}.d[0]" "mov {s:v}.16b, {b:v}.16b"
        "ins {s:v}.d[0], {a:v}.d[0]";
    lane_change16 "mov {r:v}.16b, {a:v}.16b" "ins {r:v}.h[3], {b:v}.h[3]" "mov {s:v}.16b, {b:v}.16b"
        "ins {s:v}.h[3], {a:v}.h[3]";
    lane_align "ext {r:v}.16b, {b:v}.16b, {a:v}.16b, #5" "ext {s:v}.16b, {a:v}.16b, {b:v}.16b, #5";
    lane_split32 "uzp1 {r:v}.4s, {a:v}.4s, {b:v}.4s" "uzp2 {s:v}.4s, {a:v}.4s, {b:v}.4s";
    lane_turn "ext {r:v}.16b, {a:v}.16b, {b:v}.16b, #4" "mov {s:v}.16b, {b:v}.16b";
}

macro_rules! alone {
    ($($name:ident $pair:ident;)*) => {$(
        #[doc = concat!("As the function of this name for AVX2, by `", stringify!($pair), "`.")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(p: P) -> P {
            let ((a, b), (c, d)) = ($pair(p[0], p[1]), $pair(p[2], p[3]));
            [a, b, c, d]
        }
    )*};
}

alone! {
    swap32 lane_swap32; swap64 lane_swap64; turn32 lane_turn32; up64 lane_up64; middle64 lane_middle64;
    first32 lane_change32; first64 lane_change64;
}

macro_rules! both {
    ($($name:ident $pair:ident;)*) => {$(
        #[doc = concat!("As the function of this name for AVX2, by `", stringify!($pair), "`.")]
        #[inline]
        #[target_feature(enable = "neon")]
        pub fn $name(p: P, q: P) -> (P, P) {
            let ((a, e), (b, f)) = ($pair(p[0], q[0]), $pair(p[1], q[1]));
            let ((c, g), (d, h)) = ($pair(p[2], q[2]), $pair(p[3], q[3]));
            ([a, b, c, d], [e, f, g, h])
        }
    )*};
}

both! {
    zip32 lane_zip32; zip64 lane_zip64; change32 lane_change32; change64 lane_change64; change16 lane_change16;
    align lane_align; split32 lane_split32; odd64 lane_up64; mix32 lane_zip32;
}

/// Of each lane's elements of 16 bits, the lower four move up by one, the upper four down by one, each in a ring.
#[inline]
#[target_feature(enable = "neon")]
pub fn turn16(p: P) -> P {
    let low = vcreate_u8(0x0504_0302_0100_0706);
    let from = vcombine_u8(low, vcreate_u8(0x0908_0f0e_0d0c_0b0a));
    [vqtbl1q_u8(p[0], from), vqtbl1q_u8(p[1], from), vqtbl1q_u8(p[2], from), vqtbl1q_u8(p[3], from)]
}

/// Elements of 64 bits move up by one in each half, the highest to the bottom.
#[inline]
#[target_feature(enable = "neon")]
pub fn down64(p: P) -> P {
    let ((a, b), (c, d)) = (lane_up64(p[0], p[1]), lane_up64(p[2], p[3]));
    [b, a, d, c]
}

/// The lanes of each half change places.
#[inline]
#[target_feature(enable = "neon")]
pub fn swap128(p: P) -> P {
    [p[1], p[0], p[3], p[2]]
}

/// Lanes 2, 0, 3, 1 in this order.
#[inline]
#[target_feature(enable = "neon")]
pub fn lanes(p: P) -> P {
    [p[2], p[0], p[3], p[1]]
}

/// In each half, both blocks' lower lanes, and their upper ones.
#[inline]
#[target_feature(enable = "neon")]
pub fn halves(p: P, q: P) -> (P, P) {
    ([p[0], q[0], p[2], q[2]], [p[1], q[1], p[3], q[3]])
}

/// Elements of 32 bits move down by one in the whole block, the lowest to the top.
#[inline]
#[target_feature(enable = "neon")]
pub fn turn512(p: P) -> P {
    [lane_turn(p[0], p[1]).0, lane_turn(p[1], p[2]).0, lane_turn(p[2], p[3]).0, lane_turn(p[3], p[0]).0]
}

/// Each place gets the element of 32 bits that the order names, by `tbl` over four registers.
#[inline]
#[target_feature(enable = "neon")]
pub fn elements<const FORM: usize>(p: P, order: &Order) -> P {
    let (table, [a, b, c, d]) = (uint8x16x4_t(p[0], p[1], p[2], p[3]), load(&order.bytes));
    [vqtbl4q_u8(table, a), vqtbl4q_u8(table, b), vqtbl4q_u8(table, c), vqtbl4q_u8(table, d)]
}
