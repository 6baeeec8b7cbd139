//! A block in two 256-bit registers.

use std::arch::x86_64::*;

use super::Order;
use crate::vectors::Line;

/// A block.
pub type P = [__m256i; 2];

/// A block from memory.
#[inline]
#[target_feature(enable = "avx2")]
pub fn load(line: &Line) -> P {
    let from = line.0.as_chunks::<32>().0;
    // SAFETY: each slice has the 32 bytes that are read
    unsafe { [_mm256_loadu_si256(from[0].as_ptr().cast()), _mm256_loadu_si256(from[1].as_ptr().cast())] }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "avx2")]
pub fn store(line: &mut Line, p: P) {
    for (to, half) in line.0.as_chunks_mut::<32>().0.iter_mut().zip(p) {
        // SAFETY: the slice has the 32 bytes that are written
        unsafe { _mm256_storeu_si256(to.as_mut_ptr().cast(), half) }
    }
}

/// Instructions on each of a block's halves: source a, result r, t and u for what is between.
macro_rules! alone {
    ($($(#[$doc:meta])* $name:ident $($text:literal)+;)*) => {$(
        $(#[$doc])*
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name(p: P) -> P {
            let (low, high);
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text,)+ "/* {a} {r} {t} {u} {t:x} {u:x} */", a = in(ymm_reg) p[0],
                    r = out(ymm_reg) low, t = out(ymm_reg) _, u = out(ymm_reg) _,
                    options(pure, nomem, nostack, preserves_flags));
                std::arch::asm!($($text,)+ "/* {a} {r} {t} {u} {t:x} {u:x} */", a = in(ymm_reg) p[1],
                    r = out(ymm_reg) high, t = out(ymm_reg) _, u = out(ymm_reg) _,
                    options(pure, nomem, nostack, preserves_flags));
            }
            [low, high]
        }
    )*};
}

alone! {
    /// Elements of 32 bits change places with their neighbours.
    swap32 "vmovshdup {t}, {a}" "vmovsldup {u}, {a}" "vblendps {r}, {t}, {u}, 0xaa";
    /// The two 64-bit elements of each lane change places.
    swap64 "vunpckhpd {t}, {a}, {a}" "vmovddup {u}, {a}" "vblendpd {r}, {t}, {u}, 0x0a";
    /// Elements of 32 bits move down by one in each lane, the lowest to the top.
    turn32 "vpermilps {r}, {a}, 0x39";
    /// Of each lane's elements of 16 bits, the lower four move up by one, the upper four down by one, each in a ring.
    turn16 "vpshuflw {t}, {a}, 0x93" "vpshufhw {r}, {t}, 0x39";
    /// Elements of 64 bits move down by one in each half, the lowest to the top.
    up64 "vpermq {r}, {a}, 0x39";
    /// The same the other way.
    down64 "vpermpd {r}, {a}, 0x93";
    /// The middle two elements of 64 bits of each half change places.
    middle64 "vpermq {r}, {a}, 0xd8";
    /// The lanes of each half change places.
    swap128 "vextractf128 {t:x}, {a}, 1" "vinsertf128 {r}, {t}, {a:x}, 1";
    /// The lowest 32 bits of the two lanes of each half change places.
    first32 "vextracti128 {t:x}, {a}, 1" "vinsertps {u:x}, {t:x}, {a:x}, 0x00" "vinsertps {t:x}, {a:x}, {t:x}, 0x00"
        "vinserti128 {r}, {t}, {u:x}, 1";
    /// The lowest 64 bits of the two lanes of each half change places.
    first64 "vpermpd {t}, {a}, 0xaa" "vbroadcastsd {u}, {a:x}" "vpblendd {r}, {a}, {t}, 0x03"
        "vblendpd {r}, {r}, {u}, 0x04";
}

/// Instructions on one block's half and another's: sources a and b, results r and s.
macro_rules! both {
    ($($(#[$doc:meta])* $name:ident $($text:literal)+;)*) => {$(
        $(#[$doc])*
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name(p: P, q: P) -> (P, P) {
            let (first, second, third, fourth);
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!($($text),+, a = in(ymm_reg) p[0], b = in(ymm_reg) q[0], r = out(ymm_reg) first,
                    s = lateout(ymm_reg) second, options(pure, nomem, nostack, preserves_flags));
                std::arch::asm!($($text),+, a = in(ymm_reg) p[1], b = in(ymm_reg) q[1], r = out(ymm_reg) third,
                    s = lateout(ymm_reg) fourth, options(pure, nomem, nostack, preserves_flags));
            }
            ([first, third], [second, fourth])
        }
    )*};
}

both! {
    /// In each lane, the lower elements of 32 bits of both blocks alternate in the first, the upper ones in the second.
    zip32 "vunpcklps {r}, {a}, {b}" "vunpckhps {s}, {a}, {b}";
    /// The same with elements of 64 bits.
    zip64 "vunpcklpd {r}, {a}, {b}" "vunpckhpd {s}, {a}, {b}";
    /// As `zip32`.
    mix32 "vpunpckldq {r}, {a}, {b}" "vpunpckhdq {s}, {a}, {b}";
    /// The lowest 32 bits of each lane change places with the other block's.
    change32 "vblendps {r}, {a}, {b}, 0x11" "vpblendd {s}, {b}, {a}, 0x11";
    /// The lowest 64 bits of each lane do.
    change64 "vblendpd {r}, {a}, {b}, 0x05" "vblendpd {s}, {b}, {a}, 0x05";
    /// Bytes 6 and 7 of each lane do.
    change16 "vpblendw {r}, {a}, {b}, 0x08" "vpblendw {s}, {b}, {a}, 0x08";
    /// In each lane, bytes 5 to 20 of the lane of one block followed by that of the other: of the second and the first
    /// block, and of the first and the second.
    align "vpalignr {r}, {a}, {b}, 5" "vpalignr {s}, {b}, {a}, 5";
    /// In each lane, the even elements of 32 bits of both blocks, and the odd ones.
    split32 "vshufps {r}, {a}, {b}, 0x88" "vshufps {s}, {a}, {b}, 0xdd";
    /// In each lane, the upper 64 bits of the first block's and the lower of the second's, and the other way round.
    odd64 "vshufpd {r}, {a}, {b}, 0x05" "vshufpd {s}, {b}, {a}, 0x05";
    /// In each half, both blocks' lower lanes, and their upper ones.
    halves "vperm2i128 {r}, {a}, {b}, 0x20" "vperm2i128 {s}, {a}, {b}, 0x31";
}

/// Elements of 32 bits move down by one in the whole block, the lowest to the top.
#[inline]
#[target_feature(enable = "avx2")]
pub fn turn512(p: P) -> P {
    let (low, high);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vperm2i128 {r}, {a}, {b}, 0x21", "vperm2f128 {s}, {b}, {a}, 0x21", "vpalignr {r}, {r}, {a}, 4",
            "vpalignr {s}, {s}, {b}, 4", a = in(ymm_reg) p[0], b = in(ymm_reg) p[1], r = out(ymm_reg) low,
            s = out(ymm_reg) high, options(pure, nomem, nostack, preserves_flags));
    }
    [low, high]
}

/// Lanes 2, 0, 3, 1 in this order.
#[inline]
#[target_feature(enable = "avx2")]
pub fn lanes(p: P) -> P {
    let (low, high);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vperm2f128 {r}, {b}, {a}, 0x20", "vperm2f128 {s}, {b}, {a}, 0x31", a = in(ymm_reg) p[0],
            b = in(ymm_reg) p[1], r = out(ymm_reg) low, s = lateout(ymm_reg) high,
            options(pure, nomem, nostack, preserves_flags));
    }
    [low, high]
}

/// Each place gets the element of 32 bits that the order names, by `vpermd` in even forms and `vpermps` in odd ones.
#[inline]
#[target_feature(enable = "avx2")]
pub fn elements<const FORM: usize>(p: P, order: &Order) -> P {
    let [low, high] = load(&order.elements);
    [pick::<FORM>(p, low), pick::<FORM>(p, high)]
}

#[inline]
#[target_feature(enable = "avx2")]
fn pick<const FORM: usize>(p: P, from: __m256i) -> __m256i {
    let r;
    // the number's bit 3 chooses the half
    // SAFETY: touches the registers named only
    unsafe {
        if FORM.is_multiple_of(2) {
            std::arch::asm!("vpermd {r}, {i}, {a}", "vpermd {t}, {i}, {b}", "vpslld {u}, {i}, 28",
                "vblendvps {r}, {r}, {t}, {u}", i = in(ymm_reg) from, a = in(ymm_reg) p[0], b = in(ymm_reg) p[1],
                r = out(ymm_reg) r, t = out(ymm_reg) _, u = out(ymm_reg) _,
                options(pure, nomem, nostack, preserves_flags));
        } else {
            std::arch::asm!("vpermps {r}, {i}, {a}", "vpermps {t}, {i}, {b}", "vpslld {u}, {i}, 28",
                "vpsrad {u}, {u}, 31", "vpblendvb {r}, {r}, {t}, {u}", i = in(ymm_reg) from, a = in(ymm_reg) p[0],
                b = in(ymm_reg) p[1], r = out(ymm_reg) r, t = out(ymm_reg) _, u = out(ymm_reg) _,
                options(pure, nomem, nostack, preserves_flags));
        }
    }
    r
}
