//! Four blocks of 16 bytes; masks are in mask registers.

use std::arch::x86_64::*;

use crate::vectors::{Line, avx512::*};

binaries! { evex;
    and_f32 "andps"; or_f32 "orps"; xor_f32 "xorps"; andnot_f32 "andnps";
    and_f64 "andpd"; or_f64 "orpd"; xor_f64 "xorpd"; andnot_f64 "andnpd";
}

/// Comparisons into a mask register, and that made a vector.
macro_rules! compares {
    ($spread:literal; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "` and `", $spread, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {k}, {a}, {b}"), concat!($spread, " {r}, {k}"),
                    a = in(zmm_reg) a, b = in(zmm_reg) b, k = out(kreg) _, r = lateout(zmm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

compares! { "vpmovm2d";
    eq_f32 "cmpeqps"; lt_f32 "cmpltps"; le_f32 "cmpleps"; unord_f32 "cmpunordps"; neq_f32 "cmpneqps";
    nlt_f32 "cmpnltps"; nle_f32 "cmpnleps"; ord_f32 "cmpordps"; eq_uq_f32 "cmpeq_uqps"; nge_f32 "cmpngeps";
    ngt_f32 "cmpngtps"; never_f32 "cmpfalseps"; neq_oq_f32 "cmpneq_oqps"; ge_f32 "cmpgeps"; gt_f32 "cmpgtps";
    always_f32 "cmptrueps";
}

compares! { "vpmovm2q";
    eq_f64 "cmpeq_ospd"; lt_f64 "cmplt_oqpd"; le_f64 "cmple_oqpd"; unord_f64 "cmpunord_spd"; neq_f64 "cmpneq_uspd";
    nlt_f64 "cmpnlt_uqpd"; nle_f64 "cmpnle_uqpd"; ord_f64 "cmpord_spd"; eq_uq_f64 "cmpeq_uspd"; nge_f64 "cmpnge_uqpd";
    ngt_f64 "cmpngt_uqpd"; never_f64 "cmpfalse_ospd"; neq_oq_f64 "cmpneq_ospd"; ge_f64 "cmpge_oqpd";
    gt_f64 "cmpgt_oqpd"; always_f64 "cmptrue_uspd";
}

/// Blends by a mask: bits of b where it has the top bit, else of a.
macro_rules! blends {
    ($($name:ident $take:literal $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $take, "` and `", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V, m: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!($take, " {k}, {m}"), concat!($mnemonic, " {r} {{{k}}}, {a}, {b}"),
                    a = in(zmm_reg) a, b = in(zmm_reg) b, m = in(zmm_reg) m, k = out(kreg) _, r = lateout(zmm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

blends! { select8 "vpmovb2m" "vpblendmb"; select32 "vpmovd2m" "vblendmps"; select64 "vpmovq2m" "vblendmpd"; }

/// Blends by a mask made of three, in mask registers.
macro_rules! combined {
    ($($name:ident $take:literal $first:literal $second:literal $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $take, "`, `", $first, "`, `", $second, "` and `", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V, m: V, n: V, o: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!($take, " {k}, {m}"), concat!($take, " {l}, {n}"),
                    concat!($first, " {k}, {k}, {l}"), concat!($take, " {l}, {o}"),
                    concat!($second, " {k}, {k}, {l}"), concat!($mnemonic, " {r} {{{k}}}, {a}, {b}"),
                    a = in(zmm_reg) a, b = in(zmm_reg) b, m = in(zmm_reg) m, n = in(zmm_reg) n, o = in(zmm_reg) o,
                    k = out(kreg) _, l = out(kreg) _, r = lateout(zmm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

combined! {
    select8_by_and "vpmovb2m" "kandq" "kxorq" "vpblendmb";
    select8_by_xnor "vpmovb2m" "kxnorq" "kandq" "vpblendmb";
    select16_by_or "vpmovw2m" "kord" "kxord" "vpblendmw";
    select32_by_andnot "vpmovd2m" "kandnw" "korw" "vpblendmd";
}

/// Masked loads and stores.
macro_rules! memory {
    ($($keep:ident $put:ident $take:literal $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "`, loading under a mask")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $keep(line: &Line, at: usize, m: V) -> V {
            assert_eq!(at, 0, "one register holds the whole line");
            let r;
            // SAFETY: reads no more than the line's 64 bytes
            unsafe {
                std::arch::asm!(concat!($take, " {k}, {m}"), concat!($mnemonic, " {r} {{{k}}} {{z}}, [{p}]"),
                    p = in(reg) line, m = in(zmm_reg) m, k = out(kreg) _, r = lateout(zmm_reg) r,
                    options(pure, readonly, nostack, preserves_flags));
            }
            r
        }

        #[doc = concat!("`", $mnemonic, "`, storing over `under` under a mask")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $put(under: V, m: V, v: V, line: &mut Line, at: usize) {
            store(line, at, under);
            // SAFETY: writes no more than the line's 64 bytes
            unsafe {
                std::arch::asm!(concat!($take, " {k}, {m}"), concat!($mnemonic, " [{p}] {{{k}}}, {v}"),
                    p = in(reg) &mut *line, m = in(zmm_reg) m, v = in(zmm_reg) v, k = out(kreg) _,
                    options(nostack, preserves_flags));
            }
        }
    )*};
}

memory! {
    keep_i32 put_i32 "vpmovd2m" "vmovdqu32"; keep_f32 put_f32 "vpmovd2m" "vmovups";
    keep_i64 put_i64 "vpmovq2m" "vmovdqu64"; keep_f64 put_f64 "vpmovq2m" "vmovupd";
}

/// As the function of this name for SSE2: signs by `vpmovd2m` and `vpmovq2m`, tests as for AVX2.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn tests(a: V, b: V, m: V, n: V, word: &mut [u8; 8], at: usize) {
    assert_eq!(at, 0, "one register holds the whole line");
    let (r, s): (u32, u32);
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vpmovd2m {k}, {a}", "kmovw {r:e}, {k}", "vpmovq2m {k}, {b}", "kmovb {s:e}, {k}",
            a = in(zmm_reg) a, b = in(zmm_reg) b, k = out(kreg) _, r = out(reg) r, s = out(reg) s,
            options(pure, nomem, nostack, preserves_flags));
    }
    let flags = [
        super::avx2::tested(
            _mm512_extracti64x2_epi64::<0>(a),
            _mm512_extracti64x2_epi64::<0>(b),
            _mm512_extracti64x2_epi64::<0>(m),
            _mm512_extracti64x2_epi64::<0>(n),
        ),
        super::avx2::tested(
            _mm512_extracti64x2_epi64::<1>(a),
            _mm512_extracti64x2_epi64::<1>(b),
            _mm512_extracti64x2_epi64::<1>(m),
            _mm512_extracti64x2_epi64::<1>(n),
        ),
        super::avx2::tested(
            _mm512_extracti64x2_epi64::<2>(a),
            _mm512_extracti64x2_epi64::<2>(b),
            _mm512_extracti64x2_epi64::<2>(m),
            _mm512_extracti64x2_epi64::<2>(n),
        ),
        super::avx2::tested(
            _mm512_extracti64x2_epi64::<3>(a),
            _mm512_extracti64x2_epi64::<3>(b),
            _mm512_extracti64x2_epi64::<3>(m),
            _mm512_extracti64x2_epi64::<3>(n),
        ),
    ];
    for (net, flags) in flags.into_iter().enumerate() {
        let bits = r >> (4 * net) & 15 | (s >> (2 * net) & 3) << 4 | flags << 6;
        word[2 * net..2 * net + 2].copy_from_slice(&(bits as u16).to_le_bytes());
    }
}
