//! Four blocks of 16 bytes in a 512-bit register, EVEX encoding; what has no EVEX form is done by VEX on each half.

use std::arch::x86_64::*;

/// One register.
pub type V = __m512i;
/// A shift count for all elements; only its low 64 bits are looked at.
pub type Count = __m128i;
/// Bytes in a register.
pub const WIDTH: usize = 64;

/// The register's share of a line, from byte `at` on.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn load(line: &super::Line, at: usize) -> V {
    let from: &[u8; WIDTH] = line.0[at..].first_chunk().expect("a line has four nets");
    // SAFETY: the slice has the 64 bytes that are read
    unsafe { _mm512_loadu_si512(from.as_ptr().cast()) }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn store(line: &mut super::Line, at: usize, x: V) {
    let to: &mut [u8; WIDTH] = line.0[at..].first_chunk_mut().expect("a line has four nets");
    // SAFETY: the slice has the 64 bytes that are written
    unsafe { _mm512_storeu_si512(to.as_mut_ptr().cast(), x) }
}

/// The i-th word of a line as a count for all elements.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn count<const I: usize>(line: &super::Line) -> Count {
    let from = &line.0.as_chunks::<8>().0[I];
    // SAFETY: the slice has the 8 bytes that are read
    unsafe { _mm_loadl_epi64(from.as_ptr().cast()) }
}

/// `vpmovb2m` and `kmovq`: bit 7 of every byte, byte 0 lowest, into the register's share of a word.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn signs(a: V, word: &mut [u8; 8], at: usize) {
    assert_eq!(at, 0, "one register holds the whole line");
    let r: u64;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vpmovb2m {k}, {a}", "kmovq {r}, {k}", a = in(zmm_reg) a, k = out(kreg) _, r = lateout(reg) r,
            options(pure, nomem, nostack, preserves_flags));
    }
    *word = r.to_le_bytes();
}

#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
fn halved(a: V) -> (__m256i, __m256i) {
    (_mm512_castsi512_si256(a), _mm512_extracti64x4_epi64::<1>(a))
}

#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
fn joined(low: __m256i, high: __m256i) -> V {
    _mm512_inserti64x4::<1>(_mm512_castsi256_si512(low), high)
}

/// `vphminposuw`, block by block.
#[inline]
#[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
pub fn least_u16(a: V) -> V {
    let (low, high) = halved(a);
    joined(super::avx2::least_u16(low), super::avx2::least_u16(high))
}

/// Comparisons into a mask register, and that made a vector again.
macro_rules! comparisons {
    ($($name:ident $mnemonic:literal $spread:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "` and `", $spread, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {k}, {a}, {b}"), concat!($spread, " {r}, {k}"),
                    a = in(zmm_reg) a, b = in(zmm_reg) b, k = out(kreg) _, r = lateout(zmm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

comparisons! {
    eq8 "vpcmpeqb" "vpmovm2b"; eq16 "vpcmpeqw" "vpmovm2w"; eq32 "vpcmpeqd" "vpmovm2d"; eq64 "vpcmpeqq" "vpmovm2q";
    gt8 "vpcmpgtb" "vpmovm2b"; gt16 "vpcmpgtw" "vpmovm2w"; gt32 "vpcmpgtd" "vpmovm2d"; gt64 "vpcmpgtq" "vpmovm2q";
}

binaries! { halves;
    sad_window sign8 sign16 sign32 pairs_add16 pairs_add32 pairs_adds16 pairs_sub16 pairs_sub32 pairs_subs16
}

binaries! { evex;
    add8 "paddb"; add16 "paddw"; add32 "paddd"; add64 "paddq"; sub8 "psubb"; sub16 "psubw"; sub32 "psubd"; sub64 "psubq";
    and "pandd"; or "porq"; xor "pxorq"; andnot "pandnd";
    adds_s8 "paddsb"; adds_s16 "paddsw"; adds_u8 "paddusb"; adds_u16 "paddusw";
    subs_s8 "psubsb"; subs_s16 "psubsw"; subs_u8 "psubusb"; subs_u16 "psubusw";
    avg8 "pavgb"; avg16 "pavgw";
    mul_low16 "pmullw"; mul_high_s16 "pmulhw"; mul_high_u16 "pmulhuw"; mul_u32 "pmuludq"; madd16 "pmaddwd";
    mul_low32 "pmulld"; mul_s32 "pmuldq"; madd8 "pmaddubsw"; mul_round16 "pmulhrsw";
    min_u8 "pminub"; max_u8 "pmaxub"; min_s16 "pminsw"; max_s16 "pmaxsw";
    min_s8 "pminsb"; max_s8 "pmaxsb"; min_u16 "pminuw"; max_u16 "pmaxuw";
    min_s32 "pminsd"; max_s32 "pmaxsd"; min_u32 "pminud"; max_u32 "pmaxud";
    pack_s16 "packsswb"; pack_s32 "packssdw"; pack_u16 "packuswb"; pack_u32 "packusdw";
    low8 "punpcklbw"; low16 "punpcklwd"; low32 "punpckldq"; low64 "punpcklqdq";
    high8 "punpckhbw"; high16 "punpckhwd"; high32 "punpckhdq"; high64 "punpckhqdq";
    sad8 "psadbw";
    left_each32 "psllvd"; left_each64 "psllvq"; right_each32 "psrlvd"; right_each64 "psrlvq"; right_each_s32 "psravd";
}

unaries! { evex; abs8 "pabsb"; abs16 "pabsw"; abs32 "pabsd"; }

counted! { zmm_reg "avx512f,avx512bw,avx512dq,avx512vl";
    left16 "psllw"; left32 "pslld"; left64 "psllq"; right16 "psrlw"; right32 "psrld"; right64 "psrlq";
    right_s16 "psraw"; right_s32 "psrad";
}

immediates! { evex;
    left16_by "psllw"; left32_by "pslld"; left64_by "psllq"; right16_by "psrlw"; right32_by "psrld"; right64_by "psrlq";
    right_s16_by "psraw"; right_s32_by "psrad"; left_bytes "pslldq"; right_bytes "psrldq";
}

widenings! { zmm_reg "avx512f,avx512bw,avx512dq,avx512vl";
    zero8to16 "pmovzxbw" 2; zero8to32 "pmovzxbd" 4; zero8to64 "pmovzxbq" 8;
    zero16to32 "pmovzxwd" 2; zero16to64 "pmovzxwq" 4; zero32to64 "pmovzxdq" 2;
    sign8to16 "pmovsxbw" 2; sign8to32 "pmovsxbd" 4; sign8to64 "pmovsxbq" 8;
    sign16to32 "pmovsxwd" 2; sign16to64 "pmovsxwq" 4; sign32to64 "pmovsxdq" 2;
}
