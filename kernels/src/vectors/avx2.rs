//! Two blocks of 16 bytes in a 256-bit register, VEX encoding.

use std::arch::x86_64::*;

/// One register.
pub type V = __m256i;
/// A shift count for all elements; only its low 64 bits are looked at.
pub type Count = __m128i;
/// Bytes in a register.
pub const WIDTH: usize = 32;

/// The register's share of a line, from byte `at` on.
#[inline]
#[target_feature(enable = "avx2")]
pub fn load(line: &super::Line, at: usize) -> V {
    let from: &[u8; WIDTH] = line.0[at..].first_chunk().expect("a line has four nets");
    // SAFETY: the slice has the 32 bytes that are read
    unsafe { _mm256_loadu_si256(from.as_ptr().cast()) }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "avx2")]
pub fn store(line: &mut super::Line, at: usize, x: V) {
    let to: &mut [u8; WIDTH] = line.0[at..].first_chunk_mut().expect("a line has four nets");
    // SAFETY: the slice has the 32 bytes that are written
    unsafe { _mm256_storeu_si256(to.as_mut_ptr().cast(), x) }
}

/// The i-th word of a line as a count for all elements.
#[inline]
#[target_feature(enable = "avx2")]
pub fn count<const I: usize>(line: &super::Line) -> Count {
    let from = &line.0.as_chunks::<8>().0[I];
    // SAFETY: the slice has the 8 bytes that are read
    unsafe { _mm_loadl_epi64(from.as_ptr().cast()) }
}

/// `vpmovmskb`: bit 7 of every byte, byte 0 lowest, into the register's share of a word.
#[inline]
#[target_feature(enable = "avx2")]
pub fn signs(a: V, word: &mut [u8; 8], at: usize) {
    let r: u32;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vpmovmskb {r:e}, {a}", a = in(ymm_reg) a, r = lateout(reg) r,
            options(pure, nomem, nostack, preserves_flags));
    }
    word[at / 8..at / 8 + 4].copy_from_slice(&r.to_le_bytes());
}

/// `vphminposuw` has 128 bits only: the least 16-bit number of a block, in its lowest place, then that number's place.
#[inline]
#[target_feature(enable = "avx2")]
pub fn least_u16(a: V) -> V {
    let (mut low, mut high) = (_mm256_castsi256_si128(a), _mm256_extracti128_si256::<1>(a));
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vphminposuw {a}, {a}", "vphminposuw {b}, {b}", a = inout(xmm_reg) low, b = inout(xmm_reg) high,
            options(pure, nomem, nostack, preserves_flags));
    }
    _mm256_inserti128_si256::<1>(_mm256_castsi128_si256(low), high)
}

/// `vmpsadbw`: sums of four absolute differences between the bytes from each place up to 7 on in `a` (from its byte 4 on)
/// and bytes 4 to 7 of `b`.
#[inline]
#[target_feature(enable = "avx2")]
pub fn sad_window(a: V, b: V) -> V {
    let r;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("vmpsadbw {r}, {a}, {b}, 0x2d", a = in(ymm_reg) a, b = in(ymm_reg) b, r = lateout(ymm_reg) r,
            options(pure, nomem, nostack, preserves_flags));
    }
    r
}

binaries! { vex;
    add8 "paddb"; add16 "paddw"; add32 "paddd"; add64 "paddq"; sub8 "psubb"; sub16 "psubw"; sub32 "psubd"; sub64 "psubq";
    and "pand"; or "por"; xor "pxor"; andnot "pandn";
    adds_s8 "paddsb"; adds_s16 "paddsw"; adds_u8 "paddusb"; adds_u16 "paddusw";
    subs_s8 "psubsb"; subs_s16 "psubsw"; subs_u8 "psubusb"; subs_u16 "psubusw";
    avg8 "pavgb"; avg16 "pavgw";
    mul_low16 "pmullw"; mul_high_s16 "pmulhw"; mul_high_u16 "pmulhuw"; mul_u32 "pmuludq"; madd16 "pmaddwd";
    mul_low32 "pmulld"; mul_s32 "pmuldq"; madd8 "pmaddubsw"; mul_round16 "pmulhrsw";
    sign8 "psignb"; sign16 "psignw"; sign32 "psignd";
    min_u8 "pminub"; max_u8 "pmaxub"; min_s16 "pminsw"; max_s16 "pmaxsw";
    min_s8 "pminsb"; max_s8 "pmaxsb"; min_u16 "pminuw"; max_u16 "pmaxuw";
    min_s32 "pminsd"; max_s32 "pmaxsd"; min_u32 "pminud"; max_u32 "pmaxud";
    eq8 "pcmpeqb"; eq16 "pcmpeqw"; eq32 "pcmpeqd"; eq64 "pcmpeqq";
    gt8 "pcmpgtb"; gt16 "pcmpgtw"; gt32 "pcmpgtd"; gt64 "pcmpgtq";
    pack_s16 "packsswb"; pack_s32 "packssdw"; pack_u16 "packuswb"; pack_u32 "packusdw";
    low8 "punpcklbw"; low16 "punpcklwd"; low32 "punpckldq"; low64 "punpcklqdq";
    high8 "punpckhbw"; high16 "punpckhwd"; high32 "punpckhdq"; high64 "punpckhqdq";
    sad8 "psadbw";
    pairs_add16 "phaddw"; pairs_add32 "phaddd"; pairs_adds16 "phaddsw";
    pairs_sub16 "phsubw"; pairs_sub32 "phsubd"; pairs_subs16 "phsubsw";
    left_each32 "psllvd"; left_each64 "psllvq"; right_each32 "psrlvd"; right_each64 "psrlvq"; right_each_s32 "psravd";
}

unaries! { vex; abs8 "pabsb"; abs16 "pabsw"; abs32 "pabsd"; }

counted! { ymm_reg "avx2";
    left16 "psllw"; left32 "pslld"; left64 "psllq"; right16 "psrlw"; right32 "psrld"; right64 "psrlq";
    right_s16 "psraw"; right_s32 "psrad";
}

immediates! { vex;
    left16_by "psllw"; left32_by "pslld"; left64_by "psllq"; right16_by "psrlw"; right32_by "psrld"; right64_by "psrlq";
    right_s16_by "psraw"; right_s32_by "psrad"; left_bytes "pslldq"; right_bytes "psrldq";
}

widenings! { ymm_reg "avx2";
    zero8to16 "pmovzxbw" 2; zero8to32 "pmovzxbd" 4; zero8to64 "pmovzxbq" 8;
    zero16to32 "pmovzxwd" 2; zero16to64 "pmovzxwq" 4; zero32to64 "pmovzxdq" 2;
    sign8to16 "pmovsxbw" 2; sign8to32 "pmovsxbd" 4; sign8to64 "pmovsxbq" 8;
    sign16to32 "pmovsxwd" 2; sign16to64 "pmovsxwq" 4; sign32to64 "pmovsxdq" 2;
}
