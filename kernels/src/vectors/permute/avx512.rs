//! A block in one 512-bit register.

use std::arch::x86_64::*;

use super::Order;
use crate::vectors::Line;

/// A block.
pub type P = __m512i;

/// A block from memory.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn load(line: &Line) -> P {
    // SAFETY: a line has the 64 bytes that are read
    unsafe { _mm512_loadu_si512(line.0.as_ptr().cast()) }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn store(line: &mut Line, p: P) {
    // SAFETY: a line has the 64 bytes that are written
    unsafe { _mm512_storeu_si512(line.0.as_mut_ptr().cast(), p) }
}

/// Which elements of 16 bits a mask register picks where instructions blend: the lowest 16, 32 and 64 bits of a lane.
const FIRST16: u64 = 0x0808_0808;
const FIRST32: u64 = 0x1111;
const FIRST64: u64 = 0x55;

/// Source a, result r, t for what is between, k for masks.
macro_rules! alone {
    ($($name:ident $mask:expr, $($text:literal)+;)*) => {$(
        #[doc = concat!("See [`super::avx2::", stringify!($name), "`].")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(p: P) -> P {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!("kmovq {k}, {m}", $($text,)+ "/* {a} {r} {t} {k} */", a = in(zmm_reg) p,
                    m = in(reg) const { $mask }, k = out(kreg) _, r = out(zmm_reg) r, t = out(zmm_reg) _,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

alone! {
    swap32 0xaaaa_u64, "vmovshdup {r}, {a}" "vmovsldup {r} {{{k}}}, {a}";
    swap64 0xaa_u64, "vpermilpd {r}, {a}, 0x55" "vmovddup {r} {{{k}}}, {a}";
    turn32 0xffff_u64, "vpermilps {r} {{{k}}} {{z}}, {a}, 0x39";
    turn16 0xffff_ffff_u64, "vpshuflw {t}, {a}, 0x93" "vpshufhw {r} {{{k}}} {{z}}, {t}, 0x39";
    up64 0xff_u64, "vpermq {r} {{{k}}} {{z}}, {a}, 0x39";
    down64 0xff_u64, "vpermpd {r} {{{k}}} {{z}}, {a}, 0x93";
    middle64 0x66_u64, "vmovdqa64 {r}, {a}" "vpermq {r} {{{k}}}, {a}, 0xd8";
    swap128 0xff_u64, "vshuff64x2 {r} {{{k}}} {{z}}, {a}, {a}, 0xb1";
    first32 FIRST32, "vshufi64x2 {t}, {a}, {a}, 0xb1" "vpblendmd {r} {{{k}}}, {a}, {t}";
    first64 FIRST64, "vshufi32x4 {t}, {a}, {a}, 0xb1" "vpblendmq {r} {{{k}}}, {a}, {t}";
    turn512 0xffff_u64, "valignd {r} {{{k}}} {{z}}, {a}, {a}, 1";
    lanes 0xffff_u64, "vshuff32x4 {r} {{{k}}} {{z}}, {a}, {a}, 0x72";
}

/// Sources a and b, results r and s.
macro_rules! both {
    ($($name:ident $mask:expr, $($text:literal)+;)*) => {$(
        #[doc = concat!("See [`super::avx2::", stringify!($name), "`].")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(p: P, q: P) -> (P, P) {
            let (r, s);
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!("kmovq {k}, {m}", $($text,)+ "/* {a} {b} {r} {s} {k} */", a = in(zmm_reg) p,
                    b = in(zmm_reg) q, m = in(reg) const { $mask }, k = out(kreg) _, r = out(zmm_reg) r,
                    s = out(zmm_reg) s, options(pure, nomem, nostack, preserves_flags));
            }
            (r, s)
        }
    )*};
}

both! {
    zip32 0xffff_u64, "vunpcklps {r} {{{k}}} {{z}}, {a}, {b}" "vunpckhps {s}, {a}, {b}";
    zip64 0xff_u64, "vunpcklpd {r} {{{k}}} {{z}}, {a}, {b}" "vunpckhpd {s}, {a}, {b}";
    mix32 0xffff_u64, "vpunpckldq {r} {{{k}}} {{z}}, {a}, {b}" "vpunpckhdq {s}, {a}, {b}";
    change32 FIRST32, "vblendmps {r} {{{k}}}, {a}, {b}" "vpblendmd {s} {{{k}}}, {b}, {a}";
    change64 FIRST64, "vblendmpd {r} {{{k}}}, {a}, {b}" "vpblendmq {s} {{{k}}}, {b}, {a}";
    change16 FIRST16, "vpblendmw {r} {{{k}}}, {a}, {b}" "vpblendmw {s} {{{k}}}, {b}, {a}";
    align u64::MAX, "vpalignr {r} {{{k}}} {{z}}, {a}, {b}, 5" "vpalignr {s}, {b}, {a}, 5";
    split32 0xffff_u64, "vshufps {r} {{{k}}} {{z}}, {a}, {b}, 0x88" "vshufps {s}, {a}, {b}, 0xdd";
    odd64 0xff_u64, "vshufpd {r} {{{k}}} {{z}}, {a}, {b}, 0x55" "vshufpd {s}, {b}, {a}, 0x55";
}

/// See [`super::avx2::halves`], by `vpermt2q` and `vpermi2q`.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn halves(p: P, q: P) -> (P, P) {
    // elements of 64 bits, of the second block from 8 on
    let (lower, upper) = (_mm512_setr_epi64(0, 1, 8, 9, 4, 5, 12, 13), _mm512_setr_epi64(2, 3, 10, 11, 6, 7, 14, 15));
    let (r, s);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vpermi2q {i}, {a}, {b}", "vpermt2q {a}, {j}, {b}", i = inout(zmm_reg) lower => r,
            j = in(zmm_reg) upper, a = inout(zmm_reg) p => s, b = in(zmm_reg) q,
            options(pure, nomem, nostack, preserves_flags));
    }
    (r, s)
}

/// See [`super::avx2::elements`]: by `vpermd`, `vpermps`, `vpermb` and `vpermi2d`.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn elements<const FORM: usize>(p: P, order: &Order) -> P {
    let r;
    let (from, bytes) = (load(&order.elements), load(&order.bytes));
    // SAFETY: touches the registers named only; the kernel's variant needs avx512vbmi
    unsafe {
        match FORM {
            0 => std::arch::asm!("vpermd {r}, {i}, {a}", i = in(zmm_reg) from, a = in(zmm_reg) p,
                r = lateout(zmm_reg) r, options(pure, nomem, nostack, preserves_flags)),
            1 => std::arch::asm!("vpermps {r}, {i}, {a}", i = in(zmm_reg) from, a = in(zmm_reg) p,
                r = lateout(zmm_reg) r, options(pure, nomem, nostack, preserves_flags)),
            2 => std::arch::asm!("vpermb {r}, {i}, {a}", i = in(zmm_reg) bytes, a = in(zmm_reg) p,
                r = lateout(zmm_reg) r, options(pure, nomem, nostack, preserves_flags)),
            _ => std::arch::asm!("vpermi2d {i}, {a}, {a}", i = inout(zmm_reg) from => r, a = in(zmm_reg) p,
                options(pure, nomem, nostack, preserves_flags)),
        }
    }
    r
}
