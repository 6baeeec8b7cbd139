//! Two blocks of 16 bytes.

use std::arch::x86_64::*;

use crate::vectors::{Line, avx2::*};

binaries! { vex;
    and_f32 "andps"; or_f32 "orps"; xor_f32 "xorps"; andnot_f32 "andnps";
    and_f64 "andpd"; or_f64 "orpd"; xor_f64 "xorpd"; andnot_f64 "andnpd";
    eq_f32 "cmpeqps"; lt_f32 "cmpltps"; le_f32 "cmpleps"; unord_f32 "cmpunordps"; neq_f32 "cmpneqps";
    nlt_f32 "cmpnltps"; nle_f32 "cmpnleps"; ord_f32 "cmpordps"; eq_uq_f32 "cmpeq_uqps"; nge_f32 "cmpngeps";
    ngt_f32 "cmpngtps"; never_f32 "cmpfalseps"; neq_oq_f32 "cmpneq_oqps"; ge_f32 "cmpgeps"; gt_f32 "cmpgtps";
    always_f32 "cmptrueps";
    eq_f64 "cmpeq_ospd"; lt_f64 "cmplt_oqpd"; le_f64 "cmple_oqpd"; unord_f64 "cmpunord_spd"; neq_f64 "cmpneq_uspd";
    nlt_f64 "cmpnlt_uqpd"; nle_f64 "cmpnle_uqpd"; ord_f64 "cmpord_spd"; eq_uq_f64 "cmpeq_uspd"; nge_f64 "cmpnge_uqpd";
    ngt_f64 "cmpngt_uqpd"; never_f64 "cmpfalse_ospd"; neq_oq_f64 "cmpneq_ospd"; ge_f64 "cmpge_oqpd";
    gt_f64 "cmpgt_oqpd"; always_f64 "cmptrue_uspd";
}

/// Blends by a mask: bits of b where it has the top bit, else of a.
macro_rules! blends {
    ($($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name(a: V, b: V, m: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {r}, {a}, {b}, {m}"), a = in(ymm_reg) a, b = in(ymm_reg) b,
                    m = in(ymm_reg) m, r = lateout(ymm_reg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

blends! { select8 "vpblendvb"; select32 "vblendvps"; select64 "vblendvpd"; }

/// [`select8`] by (m and n) xor o.
#[inline]
#[target_feature(enable = "avx2")]
pub fn select8_by_and(a: V, b: V, m: V, n: V, o: V) -> V {
    select8(a, b, xor(and(m, n), o))
}

/// [`select8`] by not (m xor n), and o.
#[inline]
#[target_feature(enable = "avx2")]
pub fn select8_by_xnor(a: V, b: V, m: V, n: V, o: V) -> V {
    select8(a, b, andnot(xor(m, n), o))
}

/// Elements of 16 bits by (m or n) xor o.
#[inline]
#[target_feature(enable = "avx2")]
pub fn select16_by_or(a: V, b: V, m: V, n: V, o: V) -> V {
    select8(a, b, right_s16_by::<15>(xor(or(m, n), o)))
}

/// [`select32`] by (n and not m) or o.
#[inline]
#[target_feature(enable = "avx2")]
pub fn select32_by_andnot(a: V, b: V, m: V, n: V, o: V) -> V {
    select32(a, b, or(andnot(m, n), o))
}

/// Masked loads and stores.
macro_rules! memory {
    ($($keep:ident $put:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "`, loading")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $keep(line: &Line, at: usize, m: V) -> V {
            let from: &[u8; WIDTH] = line.0[at..].first_chunk().expect("a line has four nets");
            let r;
            // SAFETY: reads no more than the slice's 32 bytes
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {r}, {m}, [{p}]"), p = in(reg) from, m = in(ymm_reg) m,
                    r = lateout(ymm_reg) r, options(pure, readonly, nostack, preserves_flags));
            }
            r
        }

        #[doc = concat!("`", $mnemonic, "`, storing over `under`")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $put(under: V, m: V, v: V, line: &mut Line, at: usize) {
            store(line, at, under);
            let to: &mut [u8; WIDTH] = line.0[at..].first_chunk_mut().expect("a line has four nets");
            // SAFETY: writes no more than the slice's 32 bytes
            unsafe {
                std::arch::asm!(concat!($mnemonic, " [{p}], {m}, {v}"), p = in(reg) to, m = in(ymm_reg) m,
                    v = in(ymm_reg) v, options(nostack, preserves_flags));
            }
        }
    )*};
}

memory! {
    keep_i32 put_i32 "vpmaskmovd"; keep_f32 put_f32 "vmaskmovps"; keep_i64 put_i64 "vpmaskmovq";
    keep_f64 put_f64 "vmaskmovpd";
}

/// As the function of this name for SSE2: `vmovmskps`, `vmovmskpd`, `vptest`, `vtestps`, `vtestpd`, the last three on
/// 128 bits.
#[inline]
#[target_feature(enable = "avx2")]
pub fn tests(a: V, b: V, m: V, n: V, word: &mut [u8; 8], at: usize) {
    let (r, s): (u32, u32);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vmovmskps {r:e}, {a}", "vmovmskpd {s:e}, {b}", a = in(ymm_reg) a, b = in(ymm_reg) b,
            r = lateout(reg) r, s = out(reg) s, options(pure, nomem, nostack, preserves_flags));
    }
    let low = tested(
        _mm256_castsi256_si128(a),
        _mm256_castsi256_si128(b),
        _mm256_castsi256_si128(m),
        _mm256_castsi256_si128(n),
    );
    let high = tested(
        _mm256_extracti128_si256::<1>(a),
        _mm256_extracti128_si256::<1>(b),
        _mm256_extracti128_si256::<1>(m),
        _mm256_extracti128_si256::<1>(n),
    );
    let low = r & 15 | (s & 3) << 4 | low << 6;
    let high = r >> 4 | s >> 2 << 4 | high << 6;
    word[at / 8..at / 8 + 4].copy_from_slice(&(low | high << 16).to_le_bytes());
}

/// The six bits of the tests on one block.
#[inline]
#[target_feature(enable = "avx2")]
pub(super) fn tested(a: __m128i, b: __m128i, m: __m128i, n: __m128i) -> u32 {
    let [mut z, mut c, mut zs, mut cs, mut zd, mut cd] = [0u8; 6];
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vptest {a}, {m}", "setz {z}", "setc {c}", "vtestps {a}, {n}", "setz {zs}", "setc {cs}",
            "vtestpd {b}, {n}", "setz {zd}", "setc {cd}", a = in(xmm_reg) a, b = in(xmm_reg) b, m = in(xmm_reg) m,
            n = in(xmm_reg) n, z = inout(reg_byte) z, c = inout(reg_byte) c, zs = inout(reg_byte) zs,
            cs = inout(reg_byte) cs, zd = inout(reg_byte) zd, cd = inout(reg_byte) cd,
            options(pure, nomem, nostack));
    }
    let bit = |flag: u8, place: u32| u32::from(flag) << place;
    bit(z, 0) | bit(c, 1) | bit(zs, 2) | bit(cs, 3) | bit(zd, 4) | bit(cd, 5)
}
