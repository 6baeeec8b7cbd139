//! Single stores and loads of aarch64: by general registers, and by those of Advanced SIMD, which is part of the baseline too.

use std::arch::aarch64::*;
use std::arch::asm;

use super::common_touch::Touch;

/// General registers.
#[derive(Clone, Copy)]
pub struct General;

/// Advanced SIMD in the odd forms, general registers in the even ones.
#[derive(Clone, Copy)]
pub struct Neon;

/// One store: the instruction with its register.
macro_rules! store {
    ($text:literal, $class:ident, $v:expr, $to:expr) => {
        // SAFETY: the caller gives the bytes
        unsafe { asm!(concat!($text, ", [{to}]"), to = in(reg) $to, v = in($class) $v, options(nostack, preserves_flags)) }
    };
}

/// One load: the instruction with its register, and the type.
macro_rules! load {
    ($text:literal, $class:ident, $type:ty, $from:expr) => {{
        let v: $type;
        // SAFETY: the caller gives the bytes
        unsafe {
            asm!(concat!($text, ", [{from}]"), from = in(reg) $from, v = out($class) v,
                 options(nostack, readonly, preserves_flags))
        };
        v
    }};
}

impl Touch for General {
    #[inline(always)]
    unsafe fn store<const BYTES: usize, const FORM: usize>(self, words: &[u64; 4], to: *mut u8) {
        match BYTES {
            1 => store!("strb {v:w}", reg, words[0], to),
            2 => store!("strh {v:w}", reg, words[0], to),
            4 => store!("str {v:w}", reg, words[0], to),
            8 => store!("str {v:x}", reg, words[0], to),
            _ => {
                for (i, [low, high]) in words.as_chunks::<2>().0[..BYTES / 16].iter().enumerate() {
                    // SAFETY: the caller gives the bytes
                    unsafe {
                        asm!("stp {low}, {high}, [{to}]", to = in(reg) to.add(16 * i), low = in(reg) *low,
                             high = in(reg) *high, options(nostack, preserves_flags));
                    }
                }
            }
        }
    }

    #[inline(always)]
    unsafe fn load<const BYTES: usize, const FORM: usize>(self, from: *const u8) -> [u64; 4] {
        match (BYTES, FORM % 2) {
            (1, 0) => [load!("ldrb {v:w}", reg, u64, from), 0, 0, 0],
            (1, _) => [load!("ldrsb {v:x}", reg, u64, from) & 0xff, 0, 0, 0],
            (2, 0) => [load!("ldrh {v:w}", reg, u64, from), 0, 0, 0],
            (2, _) => [load!("ldrsh {v:x}", reg, u64, from) & 0xffff, 0, 0, 0],
            (4, 0) => [load!("ldr {v:w}", reg, u64, from), 0, 0, 0],
            (4, _) => [load!("ldrsw {v:x}", reg, u64, from) & 0xffff_ffff, 0, 0, 0],
            (8, _) => [load!("ldr {v:x}", reg, u64, from), 0, 0, 0],
            _ => {
                let mut words = [0; 4];
                for (i, [low, high]) in words.as_chunks_mut::<2>().0[..BYTES / 16].iter_mut().enumerate() {
                    // SAFETY: the caller gives the bytes
                    unsafe {
                        asm!("ldp {low}, {high}, [{from}]", from = in(reg) from.add(16 * i), low = out(reg) *low,
                             high = out(reg) *high, options(nostack, readonly, preserves_flags));
                    }
                }
                words
            }
        }
    }
}

#[inline(always)]
fn vector(low: u64, high: u64) -> uint64x2_t {
    // SAFETY: Advanced SIMD is part of the aarch64 baseline
    unsafe { vcombine_u64(vcreate_u64(low), vcreate_u64(high)) }
}

#[inline(always)]
fn low(v: uint64x2_t) -> u64 {
    // SAFETY: Advanced SIMD is part of the aarch64 baseline
    unsafe { vgetq_lane_u64::<0>(v) }
}

#[inline(always)]
fn high(v: uint64x2_t) -> u64 {
    // SAFETY: Advanced SIMD is part of the aarch64 baseline
    unsafe { vgetq_lane_u64::<1>(v) }
}

impl Touch for Neon {
    #[inline(always)]
    unsafe fn store<const BYTES: usize, const FORM: usize>(self, words: &[u64; 4], to: *mut u8) {
        let v = vector(words[0], words[1]);
        match BYTES {
            // SAFETY: the caller gives the bytes
            _ if FORM % 2 == 0 => unsafe { General.store::<BYTES, FORM>(words, to) },
            1 => store!("str {v:b}", vreg, v, to),
            2 => store!("str {v:h}", vreg, v, to),
            4 => store!("str {v:s}", vreg, v, to),
            8 => store!("str {v:d}", vreg, v, to),
            16 => store!("str {v:q}", vreg, v, to),
            // SAFETY: the caller gives 32 bytes
            _ => unsafe {
                asm!("stp {low:q}, {high:q}, [{to}]", to = in(reg) to, low = in(vreg) v,
                     high = in(vreg) vector(words[2], words[3]), options(nostack, preserves_flags));
            },
        }
    }

    #[inline(always)]
    unsafe fn load<const BYTES: usize, const FORM: usize>(self, from: *const u8) -> [u64; 4] {
        match (BYTES, FORM) {
            // a value that went out of a general register comes back into a vector register, and the other way round
            // SAFETY: the caller gives the bytes
            (_, 1 | 2) => unsafe { General.load::<BYTES, FORM>(from) },
            (1, _) => [low(load!("ldr {v:b}", vreg, uint64x2_t, from)), 0, 0, 0],
            (2, _) => [low(load!("ldr {v:h}", vreg, uint64x2_t, from)), 0, 0, 0],
            (4, _) => [low(load!("ldr {v:s}", vreg, uint64x2_t, from)), 0, 0, 0],
            (8, _) => [low(load!("ldr {v:d}", vreg, uint64x2_t, from)), 0, 0, 0],
            (16, _) => {
                let v = load!("ldr {v:q}", vreg, uint64x2_t, from);
                [low(v), high(v), 0, 0]
            }
            _ => {
                let (a, b): (uint64x2_t, uint64x2_t);
                // SAFETY: the caller gives 32 bytes
                unsafe {
                    asm!("ldp {a:q}, {b:q}, [{from}]", from = in(reg) from, a = out(vreg) a, b = out(vreg) b,
                         options(nostack, readonly, preserves_flags));
                }
                [low(a), high(a), low(b), high(b)]
            }
        }
    }
}
