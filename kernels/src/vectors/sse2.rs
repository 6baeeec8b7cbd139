//! One block of 16 bytes in a 128-bit register: the x86-64 baseline, in its legacy encoding. What it lacks is made from
//! what it has, in `sse2_made`.

use std::arch::x86_64::*;

pub use super::sse2_made::*;

/// One register.
pub type V = __m128i;
/// A shift count for all elements; only its low 64 bits are looked at.
pub type Count = __m128i;
/// Bytes in a register.
pub const WIDTH: usize = 16;

/// The register's share of a line, from byte `at` on.
#[inline]
#[target_feature(enable = "sse2")]
pub fn load(line: &super::Line, at: usize) -> V {
    let from: &[u8; WIDTH] = line.0[at..].first_chunk().expect("a line has four nets");
    // SAFETY: the slice has the 16 bytes that are read
    unsafe { _mm_loadu_si128(from.as_ptr().cast()) }
}

/// The inverse of [`load`].
#[inline]
#[target_feature(enable = "sse2")]
pub fn store(line: &mut super::Line, at: usize, x: V) {
    let to: &mut [u8; WIDTH] = line.0[at..].first_chunk_mut().expect("a line has four nets");
    // SAFETY: the slice has the 16 bytes that are written
    unsafe { _mm_storeu_si128(to.as_mut_ptr().cast(), x) }
}

/// The i-th word of a line as a count for all elements.
#[inline]
#[target_feature(enable = "sse2")]
pub fn count<const I: usize>(line: &super::Line) -> Count {
    let from = &line.0.as_chunks::<8>().0[I];
    // SAFETY: the slice has the 8 bytes that are read
    unsafe { _mm_loadl_epi64(from.as_ptr().cast()) }
}

/// `pmovmskb`: bit 7 of every byte, byte 0 lowest, into the register's share of a word.
#[inline]
#[target_feature(enable = "sse2")]
pub fn signs(a: V, word: &mut [u8; 8], at: usize) {
    let r: u32;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("pmovmskb {r:e}, {a}", a = in(xmm_reg) a, r = lateout(reg) r,
            options(nomem, nostack, preserves_flags));
    }
    word[at / 8..at / 8 + 2].copy_from_slice(&(r as u16).to_le_bytes());
}

binaries! { legacy;
    add8 "paddb"; add16 "paddw"; add32 "paddd"; add64 "paddq"; sub8 "psubb"; sub16 "psubw"; sub32 "psubd"; sub64 "psubq";
    and "pand"; or "por"; xor "pxor"; andnot "pandn";
    adds_s8 "paddsb"; adds_s16 "paddsw"; adds_u8 "paddusb"; adds_u16 "paddusw";
    subs_s8 "psubsb"; subs_s16 "psubsw"; subs_u8 "psubusb"; subs_u16 "psubusw";
    avg8 "pavgb"; avg16 "pavgw";
    mul_low16 "pmullw"; mul_high_s16 "pmulhw"; mul_high_u16 "pmulhuw"; mul_u32 "pmuludq"; madd16 "pmaddwd";
    min_u8 "pminub"; max_u8 "pmaxub"; min_s16 "pminsw"; max_s16 "pmaxsw";
    eq8 "pcmpeqb"; eq16 "pcmpeqw"; eq32 "pcmpeqd"; gt8 "pcmpgtb"; gt16 "pcmpgtw"; gt32 "pcmpgtd";
    pack_s16 "packsswb"; pack_s32 "packssdw"; pack_u16 "packuswb";
    low8 "punpcklbw"; low16 "punpcklwd"; low32 "punpckldq"; low64 "punpcklqdq";
    high8 "punpckhbw"; high16 "punpckhwd"; high32 "punpckhdq"; high64 "punpckhqdq";
    sad8 "psadbw";
}

counted! { legacy;
    left16 "psllw"; left32 "pslld"; left64 "psllq"; right16 "psrlw"; right32 "psrld"; right64 "psrlq";
    right_s16 "psraw"; right_s32 "psrad";
}

immediates! { legacy;
    left16_by "psllw"; left32_by "pslld"; left64_by "psllq"; right16_by "psrlw"; right32_by "psrld"; right64_by "psrlq";
    right_s16_by "psraw"; right_s32_by "psrad"; left_bytes "pslldq"; right_bytes "psrldq";
}
