//! Dot products of four unsigned and four signed bytes, added to each 32-bit lane modulo 2³².
//!
//! Where no instruction does it at once, bytes are widened to 16 bits first: `pmaddubsw` would be shorter, but saturates.
//! `dot8` takes registers and splits even from odd bytes; `dot8_lines` takes memory and unpacks neighbours.

/// One round of `vector.dot8`, on the blocks `$x[0]` … `$x[11]`; `$y` is `$x` again, but where only speed matters.
/// `$k!(i)` is the i-th line of operands, `$both!(a u s)` is `a` with the dot products of lines u and s.
///
/// Four groups of three blocks take turns; each takes in functions of the two groups whose turn is the longest ago.
#[doc(hidden)]
#[macro_export]
macro_rules! dot8_round {
    ($x:ident, $y:ident, $k:ident, $both:ident) => {
        $crate::dot8_round!(@ $x, $y, $k, $both: (0 6 4 0 1) (1 7 5 2 3) (2 8 3 4 5));
        $crate::dot8_round!(@ $x, $y, $k, $both: (3 9 7 6 7) (4 10 8 8 9) (5 11 6 10 11));
        $crate::dot8_round!(@ $x, $y, $k, $both: (6 0 10 12 13) (7 1 11 14 15) (8 2 9 16 17));
        $crate::dot8_round!(@ $x, $y, $k, $both: (9 3 1 18 19) (10 4 2 20 21) (11 5 0 22 23));
    };
    // target, block as unsigned, block as signed, two lines
    (@ $x:ident, $y:ident, $k:ident, $both:ident: $(($t:literal $u:literal $s:literal $i:tt $j:tt))*) => {
        $($x[$t] = dot8($x[$t], $y[$u], $k!($i));)*
        $($x[$t] = dot8($x[$t], $k!($j), $y[$s]);)*
        $($x[$t] = dot8($x[$t], $y[$s], $y[$u]);)*
        $($x[$t] = $both!($x[$t], $i, $j);)*
    };
}

/// By baseline instructions.
#[cfg(target_arch = "x86_64")]
pub mod sse2 {
    use std::arch::x86_64::*;

    use crate::vectors::{Line, sse2::*};

    /// `a` with the dot products of unsigned bytes `u` and signed bytes `s`.
    #[inline]
    #[target_feature(enable = "sse2")]
    pub fn dot8(a: V, u: V, s: V) -> V {
        let r;
        // SAFETY: touches the registers named only
        unsafe {
            std::arch::asm!(
                "movdqa {v}, {u}",
                "movdqa {t}, {s}",
                "pand {u}, {low}",
                "psllw {t}, 8",
                "psraw {t}, 8",
                "pmaddwd {u}, {t}",
                "psrlw {v}, 8",
                "paddd {a}, {u}",
                "psraw {s}, 8",
                "pmaddwd {v}, {s}",
                "paddd {a}, {v}",
                a = inout(xmm_reg) a => r, u = inout(xmm_reg) u => _, s = inout(xmm_reg) s => _,
                low = in(xmm_reg) _mm_set1_epi16(255), t = out(xmm_reg) _, v = out(xmm_reg) _,
                options(pure, nomem, nostack, preserves_flags),
            );
        }
        r
    }

    /// [`dot8`] of what two lines have from byte `at` on.
    #[inline]
    #[target_feature(enable = "sse2")]
    pub fn dot8_lines(a: V, u: &Line, s: &Line, at: usize) -> V {
        let r;
        // SAFETY: touches the registers named only
        unsafe {
            std::arch::asm!(
                "movdqa {v}, {u}",
                "pxor {t}, {t}",
                "punpcklbw {u}, {t}",
                "punpckhbw {v}, {t}",
                "punpcklbw {t}, {s}",
                "psraw {t}, 8",
                "pmaddwd {u}, {t}",
                "pxor {t}, {t}",
                "punpckhbw {t}, {s}",
                "psraw {t}, 8",
                "pmaddwd {v}, {t}",
                "movaps {t}, {u}",
                "shufps {u}, {v}, 0x88",
                "shufps {t}, {v}, 0xdd",
                "paddd {a}, {u}",
                "paddd {a}, {t}",
                a = inout(xmm_reg) a => r, u = inout(xmm_reg) load(u, at) => _, s = in(xmm_reg) load(s, at),
                t = out(xmm_reg) _, v = out(xmm_reg) _,
                options(pure, nomem, nostack, preserves_flags),
            );
        }
        r
    }
}

/// By 256-bit instructions.
#[cfg(target_arch = "x86_64")]
pub mod avx2 {
    use std::arch::x86_64::*;

    use crate::vectors::{Line, avx2::*};

    /// `a` with the dot products of unsigned bytes `u` and signed bytes `s`.
    #[inline]
    #[target_feature(enable = "avx2")]
    pub fn dot8(a: V, u: V, s: V) -> V {
        let r;
        // SAFETY: touches the registers named only
        unsafe {
            std::arch::asm!(
                "vpand {v}, {u}, {low}",
                "vpsllw {t}, {s}, 8",
                "vpsraw {t}, {t}, 8",
                "vpmaddwd {v}, {v}, {t}",
                "vpsrlw {t}, {u}, 8",
                "vpsraw {w}, {s}, 8",
                "vpmaddwd {t}, {t}, {w}",
                "vpaddd {a}, {a}, {v}",
                "vpaddd {a}, {a}, {t}",
                a = inout(ymm_reg) a => r, u = in(ymm_reg) u, s = in(ymm_reg) s, low = in(ymm_reg) _mm256_set1_epi16(255),
                t = out(ymm_reg) _, v = out(ymm_reg) _, w = out(ymm_reg) _,
                options(pure, nomem, nostack, preserves_flags),
            );
        }
        r
    }

    /// [`dot8`] of what two lines have from byte `at` on.
    #[inline]
    #[target_feature(enable = "avx2")]
    pub fn dot8_lines(a: V, u: &Line, s: &Line, at: usize) -> V {
        let (u, s): (&[u8; 32], &[u8; 32]) =
            (u.0[at..].first_chunk().expect("four nets"), s.0[at..].first_chunk().expect("four nets"));
        let r;
        // SAFETY: reads the 32 bytes of each slice, touches nothing else but the registers named
        unsafe {
            std::arch::asm!(
                "vpmovzxbw {v}, [{u}]",
                "vpmovsxbw {t}, [{s}]",
                "vpmaddwd {v}, {v}, {t}",
                "vpmovzxbw {w}, [{u} + 16]",
                "vpmovsxbw {t}, [{s} + 16]",
                "vpmaddwd {w}, {w}, {t}",
                "vphaddd {v}, {v}, {w}",
                // sums of neighbours have come out with the words 1 and 2 exchanged
                "vpermq {v}, {v}, 0xd8",
                "vpaddd {a}, {a}, {v}",
                a = inout(ymm_reg) a => r, u = in(reg) u, s = in(reg) s,
                t = out(ymm_reg) _, v = out(ymm_reg) _, w = out(ymm_reg) _,
                options(pure, readonly, nostack, preserves_flags),
            );
        }
        r
    }
}

/// By `vpdpbusd`.
#[cfg(target_arch = "x86_64")]
pub mod avx512 {
    use crate::vectors::{Line, avx512::*};

    /// `vpdpbusd`: `a` with the dot products of unsigned bytes `u` and signed bytes `s`.
    #[inline]
    #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
    pub fn dot8(a: V, u: V, s: V) -> V {
        let r;
        // SAFETY: touches the registers named only; the kernel's variant needs avx512vnni
        unsafe {
            std::arch::asm!("vpdpbusd {a}, {u}, {s}", a = inlateout(zmm_reg) a => r, u = in(zmm_reg) u,
                s = in(zmm_reg) s, options(pure, nomem, nostack, preserves_flags));
        }
        r
    }

    /// `vpdpbusd` with the signed bytes from memory.
    #[inline]
    #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
    pub fn dot8_lines(a: V, u: &Line, s: &Line, at: usize) -> V {
        assert_eq!(at, 0, "one register holds the whole line");
        let r;
        // SAFETY: reads the line's 64 bytes, touches nothing else but the registers named; the kernel's variant needs
        // avx512vnni
        unsafe {
            std::arch::asm!("vpdpbusd {a}, {u}, [{s}]", a = inlateout(zmm_reg) a => r, u = in(zmm_reg) load(u, 0),
                s = in(reg) s, options(pure, readonly, nostack, preserves_flags));
        }
        r
    }
}

/// By `udot` and `sdot`: one operand is moved by 128 into the other's range, and what that adds is taken away.
#[cfg(target_arch = "aarch64")]
pub mod neon {
    use std::arch::aarch64::*;

    use crate::vectors::{Line, neon::*};

    macro_rules! dots {
        ($($name:ident $mnemonic:literal;)*) => {$(
            #[inline]
            #[target_feature(enable = "neon,dotprod")]
            fn $name(a: V, b: V, c: V) -> V {
                let r;
                // SAFETY: touches the registers named only
                unsafe {
                    std::arch::asm!(concat!($mnemonic, " {a:v}.4s, {b:v}.16b, {c:v}.16b"), a = inlateout(vreg) a => r,
                        b = in(vreg) b, c = in(vreg) c, options(pure, nomem, nostack, preserves_flags));
                }
                r
            }
        )*};
    }

    dots! { unsigned "udot"; signed "sdot"; }

    /// `a` with the dot products of unsigned bytes `u` and signed bytes `s`: u · (s + 128) − 128 Σu.
    #[inline]
    #[target_feature(enable = "neon,dotprod")]
    pub fn dot8(a: V, u: V, s: V) -> V {
        let sum = unsigned(vdupq_n_u8(0), u, vdupq_n_u8(1));
        sub32(unsigned(a, u, xor(s, vdupq_n_u8(128))), left32_by::<7>(sum))
    }

    /// [`dot8`] of what two lines have from byte `at` on: (u − 128) · s + 128 Σs.
    #[inline]
    #[target_feature(enable = "neon,dotprod")]
    pub fn dot8_lines(a: V, u: &Line, s: &Line, at: usize) -> V {
        let (u, s) = (load(u, at), load(s, at));
        let sum = signed(vdupq_n_u8(0), s, vdupq_n_u8(1));
        add32(signed(a, xor(u, vdupq_n_u8(128)), s), left32_by::<7>(sum))
    }
}
