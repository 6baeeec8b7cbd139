//! Vectors of 32 bytes as two Advanced SIMD registers; the extension is part of the aarch64 baseline.

use std::arch::aarch64::*;
use std::arch::asm;

use super::common_wide::Wide;

/// Advanced SIMD.
#[derive(Clone, Copy)]
pub struct Neon;

/// Loads two registers by the instruction named.
macro_rules! load {
    ($text:literal, $from:ident) => {{
        let (low, high);
        // SAFETY: the caller gives 32 bytes
        unsafe {
            asm!($text, out("v0") low, out("v1") high, from = in(reg) $from, options(nostack, readonly, preserves_flags))
        };
        [low, high]
    }};
}

/// Stores two registers by the instruction named.
macro_rules! store {
    ($text:literal, $v:ident, $to:ident) => {
        // SAFETY: the caller gives 32 bytes
        unsafe { asm!($text, in("v0") $v[0], in("v1") $v[1], to = in(reg) $to, options(nostack, preserves_flags)) }
    };
}

/// A bit for each byte that is all ones.
#[inline(always)]
fn bits(v: uint8x16_t) -> u32 {
    const PLACES: [u8; 16] = [1, 2, 4, 8, 16, 32, 64, 128, 1, 2, 4, 8, 16, 32, 64, 128];
    // SAFETY: the array is 16 readable bytes; Advanced SIMD is part of the baseline
    unsafe {
        let v = vandq_u8(v, vld1q_u8(PLACES.as_ptr()));
        u32::from(vaddv_u8(vget_low_u8(v))) | u32::from(vaddv_u8(vget_high_u8(v))) << 8
    }
}

impl Wide for Neon {
    type V = [uint8x16_t; 2];
    type H = uint8x16_t;

    #[inline(always)]
    unsafe fn load<const WIDTH: usize>(self, from: *const u8) -> [uint8x16_t; 2] {
        match WIDTH {
            1 => load!("ld1 {{v0.16b, v1.16b}}, [{from}]", from),
            2 => load!("ld1 {{v0.8h, v1.8h}}, [{from}]", from),
            4 => load!("ld1 {{v0.4s, v1.4s}}, [{from}]", from),
            _ => load!("ldp q0, q1, [{from}]", from),
        }
    }

    #[inline(always)]
    unsafe fn store<const WIDTH: usize>(self, v: [uint8x16_t; 2], to: *mut u8) {
        match WIDTH {
            1 => store!("st1 {{v0.16b, v1.16b}}, [{to}]", v, to),
            2 => store!("st1 {{v0.8h, v1.8h}}, [{to}]", v, to),
            4 => store!("st1 {{v0.4s, v1.4s}}, [{to}]", v, to),
            _ => store!("stp q0, q1, [{to}]", v, to),
        }
    }

    #[inline(always)]
    unsafe fn load_half(self, from: *const u8) -> uint8x16_t {
        // SAFETY: the caller gives 16 bytes
        unsafe { vld1q_u8(from) }
    }

    #[inline(always)]
    unsafe fn store_half(self, v: uint8x16_t, to: *mut u8) {
        // SAFETY: the caller gives 16 bytes
        unsafe { vst1q_u8(to, v) }
    }

    #[inline(always)]
    fn splat(self, width: usize, value: u64) -> [uint8x16_t; 2] {
        // SAFETY: Advanced SIMD is part of the aarch64 baseline
        let v = unsafe {
            match width {
                1 => vdupq_n_u8(value as u8),
                2 => vreinterpretq_u8_u16(vdupq_n_u16(value as u16)),
                4 => vreinterpretq_u8_u32(vdupq_n_u32(value as u32)),
                _ => vreinterpretq_u8_u64(vdupq_n_u64(value)),
            }
        };
        [v, v]
    }

    #[inline(always)]
    fn low(self, v: [uint8x16_t; 2]) -> uint8x16_t {
        v[0]
    }

    #[inline(always)]
    unsafe fn unequal(self, a: *const u8, b: *const u8) -> u32 {
        // SAFETY: the caller gives 32 bytes on both sides
        let half = |at: usize| unsafe { bits(vceqq_u8(vld1q_u8(a.add(at)), vld1q_u8(b.add(at)))) };
        !(half(0) | half(16) << 16)
    }

    #[inline(always)]
    unsafe fn equal(self, a: *const u8, width: usize, v: [uint8x16_t; 2]) -> u32 {
        let half = |i: usize| {
            // SAFETY: the caller gives 32 bytes; Advanced SIMD is part of the baseline
            unsafe {
                let a = vld1q_u8(a.add(16 * i));
                bits(match width {
                    1 => vceqq_u8(a, v[i]),
                    2 => vreinterpretq_u8_u16(vceqq_u16(vreinterpretq_u16_u8(a), vreinterpretq_u16_u8(v[i]))),
                    4 => vreinterpretq_u8_u32(vceqq_u32(vreinterpretq_u32_u8(a), vreinterpretq_u32_u8(v[i]))),
                    _ => vreinterpretq_u8_u64(vceqq_u64(vreinterpretq_u64_u8(a), vreinterpretq_u64_u8(v[i]))),
                })
            }
        };
        half(0) | half(1) << 16
    }
}
