//! Streams by Advanced SIMD: the pairs of loads and stores with the hint that the lines will not be used again soon.

use std::arch::aarch64::*;
use std::arch::asm;

use super::common_lanes::Lanes;
use super::common_lanes_arm::Neon;
use super::common_stream::Streams;

/// Two stores of pairs by the instruction named.
macro_rules! put {
    ($name:literal, $v:ident, $to:ident) => {
        // SAFETY: the caller gives 64 writable bytes on a line
        unsafe {
            asm!(concat!($name, " {a:q}, {b:q}, [{to}]"), concat!($name, " {c:q}, {d:q}, [{to}, #32]"),
                 to = in(reg) $to, a = in(vreg) $v[0], b = in(vreg) $v[1], c = in(vreg) $v[2], d = in(vreg) $v[3],
                 options(nostack, preserves_flags))
        }
    };
}

/// Four stores of pairs of words by the instruction named.
macro_rules! put_words {
    ($name:literal, $words:expr, $to:ident) => {
        for (i, [low, high]) in $words.as_chunks::<2>().0.iter().enumerate() {
            // SAFETY: the caller gives 64 writable bytes on a line
            unsafe {
                asm!(concat!($name, " {low}, {high}, [{to}]"), to = in(reg) $to.add(16 * i), low = in(reg) *low,
                     high = in(reg) *high, options(nostack, preserves_flags))
            }
        }
    };
}

/// Two loads of pairs by the instruction named.
macro_rules! take {
    ($name:literal, $from:ident) => {{
        let (a, b, c, d);
        // SAFETY: the caller gives 64 readable bytes on a line
        unsafe {
            asm!(concat!($name, " {a:q}, {b:q}, [{from}]"), concat!($name, " {c:q}, {d:q}, [{from}, #32]"),
                 from = in(reg) $from, a = out(vreg) a, b = out(vreg) b, c = out(vreg) c, d = out(vreg) d,
                 options(nostack, readonly, preserves_flags))
        };
        [a, b, c, d]
    }};
}

/// One prefetch of the operation named.
macro_rules! prefetch {
    ($operation:literal, $at:ident) => {
        // SAFETY: a prefetch of any address is without effect on the program
        unsafe { asm!(concat!("prfm ", $operation, ", [{}]"), in(reg) $at, options(nostack, readonly, preserves_flags)) }
    };
}

impl Streams for Neon {
    #[inline(always)]
    unsafe fn put<const KIND: usize>(self, v: [uint64x2_t; 4], to: *mut u8) {
        match KIND {
            0 | 1 => put!("stnp", v, to),
            2 | 3 => put_words!("stnp", self.words(v), to),
            4 | 5 => put!("stp", v, to),
            6 => put_words!("stp", self.words(v), to),
            // SAFETY: the caller gives 64 writable bytes on a line
            _ => unsafe { self.store(v, to) },
        }
    }

    #[inline(always)]
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> [uint64x2_t; 4] {
        match KIND {
            0 | 2 => take!("ldnp", from),
            1 => take!("ldp", from),
            // SAFETY: the caller gives 64 readable bytes on a line
            _ => unsafe { self.load(from) },
        }
    }

    #[inline(always)]
    fn call<const KIND: usize>(self, at: *const u8) {
        match KIND {
            0 => prefetch!("pldl1strm", at),
            1 => prefetch!("pldl1keep", at),
            2 => prefetch!("pldl2keep", at),
            _ => prefetch!("pldl3keep", at),
        }
    }

    #[inline(always)]
    unsafe fn claim(self, at: *const u8) {
        prefetch!("pstl1keep", at);
    }

    #[inline(always)]
    fn stores(self) {
        // SAFETY: a barrier
        unsafe { asm!("dmb ishst", options(nostack, preserves_flags)) };
    }

    #[inline(always)]
    fn loads(self) {
        // SAFETY: a barrier
        unsafe { asm!("dmb ishld", options(nostack, preserves_flags)) };
    }

    #[inline(always)]
    fn both(self) {
        // SAFETY: a barrier
        unsafe { asm!("dmb ish", options(nostack, preserves_flags)) };
    }
}
