//! Single stores and loads of x86: by SSE2 registers and general ones, and the same with the encodings of AVX and its 32 bytes.

use std::arch::asm;
use std::arch::x86_64::*;

use super::common_touch::Touch;

/// SSE2, part of the x86-64 baseline.
#[derive(Clone, Copy)]
pub struct Sse2;

/// Evidence that AVX2 is present.
#[derive(Clone, Copy)]
pub struct Avx2(());

impl Avx2 {
    /// # Safety
    /// The CPU must have `avx2`.
    #[inline(always)]
    pub unsafe fn new() -> Avx2 {
        Avx2(())
    }
}

/// One store: instruction, size of the memory operand, register class, modifier of the register's name.
macro_rules! store {
    ($name:literal, $size:literal, $class:ident, $modifier:literal, $v:expr, $to:ident) => {
        // SAFETY: the caller gives the bytes
        unsafe {
            asm!(concat!($name, " ", $size, " ptr [{to}], {v", $modifier, "}"), to = in(reg) $to, v = in($class) $v,
                 options(nostack, preserves_flags))
        }
    };
}

/// One load: instruction, size of the memory operand, register class, modifier of the register's name, type.
macro_rules! load {
    ($name:literal, $size:literal, $class:ident, $modifier:literal, $type:ty, $from:ident) => {{
        let v: $type;
        // SAFETY: the caller gives the bytes
        unsafe {
            asm!(concat!($name, " {v", $modifier, "}, ", $size, " ptr [{from}]"), from = in(reg) $from,
                 v = out($class) v, options(nostack, readonly, preserves_flags))
        };
        v
    }};
}

/// One load into half of a register of zeros: instruction and operand between.
macro_rules! load_half {
    ($name:literal, $between:literal, $from:ident) => {{
        let mut v = vector(0, 0);
        // SAFETY: the caller gives 8 bytes
        unsafe {
            asm!(concat!($name, " {v}, ", $between, "qword ptr [{from}]"), from = in(reg) $from, v = inout(xmm_reg) v,
                 options(nostack, readonly, preserves_flags))
        };
        v
    }};
}

#[inline(always)]
fn low(v: __m128i) -> u64 {
    // SAFETY: SSE2 is part of the x86-64 baseline
    unsafe { _mm_cvtsi128_si64(v) as u64 }
}

#[inline(always)]
fn high(v: __m128i) -> u64 {
    // SAFETY: SSE2 is part of the x86-64 baseline
    unsafe { _mm_cvtsi128_si64(_mm_unpackhi_epi64(v, v)) as u64 }
}

#[inline(always)]
fn vector(low: u64, high: u64) -> __m128i {
    // SAFETY: SSE2 is part of the x86-64 baseline
    unsafe { _mm_set_epi64x(high as i64, low as i64) }
}

/// The stores of up to 16 bytes, the vector instructions by name.
macro_rules! stores {
    ($words:ident, $to:ident, $movd:literal, $movss:literal, $movq:literal, $movlps:literal, $movhps:literal, $movsd:literal,
     $dqu:literal, $ups:literal, $upd:literal) => {
        match (BYTES, FORM) {
            (1, _) => store!("mov", "byte", reg_byte, "", $words[0] as u8, $to),
            (2, _) => store!("mov", "word", reg, ":x", $words[0], $to),
            (4, 0 | 2) => store!("mov", "dword", reg, ":e", $words[0], $to),
            (4, 1) => store!($movd, "dword", xmm_reg, "", vector($words[0], 0), $to),
            (4, _) => store!($movss, "dword", xmm_reg, "", vector($words[0], 0), $to),
            (8, 0) => store!("mov", "qword", reg, "", $words[0], $to),
            (8, 1) => store!($movq, "qword", xmm_reg, "", vector($words[0], 0), $to),
            (8, 2) => store!($movlps, "qword", xmm_reg, "", vector($words[0], 0), $to),
            (8, _) => store!($movhps, "qword", xmm_reg, "", vector(0, $words[0]), $to),
            (_, 0) => store!($dqu, "xmmword", xmm_reg, "", vector($words[0], $words[1]), $to),
            (_, 1) => store!($ups, "xmmword", xmm_reg, "", vector($words[0], $words[1]), $to),
            (_, 2) => store!($upd, "xmmword", xmm_reg, "", vector($words[0], $words[1]), $to),
            _ => {
                let second = $to.wrapping_add(8);
                store!($movsd, "qword", xmm_reg, "", vector($words[0], 0), $to);
                store!($movsd, "qword", xmm_reg, "", vector($words[1], 0), second)
            }
        }
    };
}

/// The loads of up to 16 bytes, the vector instructions by name.
macro_rules! loads {
    ($from:ident, $movd:literal, $movss:literal, $movq:literal, $movlps:literal, $movhps:literal, $between:literal,
     $movsd:literal, $dqu:literal, $ups:literal, $upd:literal, $lddqu:literal) => {
        match (BYTES, FORM) {
            (1, 0 | 2) => [load!("movzx", "byte", reg, ":e", u64, $from), 0, 0, 0],
            (1, _) => [load!("movsx", "byte", reg, "", u64, $from) & 0xff, 0, 0, 0],
            (2, 0 | 2) => [load!("movzx", "word", reg, ":e", u64, $from), 0, 0, 0],
            (2, _) => [load!("movsx", "word", reg, "", u64, $from) & 0xffff, 0, 0, 0],
            (4, 0) => [load!("mov", "dword", reg, ":e", u64, $from), 0, 0, 0],
            (4, 1) => [load!("movsxd", "dword", reg, "", u64, $from) & 0xffff_ffff, 0, 0, 0],
            (4, 2) => [low(load!($movd, "dword", xmm_reg, "", __m128i, $from)), 0, 0, 0],
            (4, _) => [low(load!($movss, "dword", xmm_reg, "", __m128i, $from)), 0, 0, 0],
            (8, 0) => [load!("mov", "qword", reg, "", u64, $from), 0, 0, 0],
            (8, 1) => [low(load!($movsd, "qword", xmm_reg, "", __m128i, $from)), 0, 0, 0],
            (8, 2) => [high(load_half!($movhps, $between, $from)), 0, 0, 0],
            (8, _) => [low(load_half!($movlps, $between, $from)), 0, 0, 0],
            _ => {
                let v = match FORM {
                    0 => load!($ups, "xmmword", xmm_reg, "", __m128i, $from),
                    1 => load!($upd, "xmmword", xmm_reg, "", __m128i, $from),
                    2 => load!($lddqu, "xmmword", xmm_reg, "", __m128i, $from),
                    _ => load!($dqu, "xmmword", xmm_reg, "", __m128i, $from),
                };
                [low(v), high(v), 0, 0]
            }
        }
    };
}

impl Touch for Sse2 {
    #[inline(always)]
    unsafe fn store<const BYTES: usize, const FORM: usize>(self, words: &[u64; 4], to: *mut u8) {
        if BYTES == 32 {
            let (upper, beyond) = ([words[2], words[3], 0, 0], to.wrapping_add(16));
            // SAFETY: the caller gives 32 bytes
            unsafe {
                self.store::<16, FORM>(words, to);
                self.store::<16, FORM>(&upper, beyond);
            }
            return;
        }
        stores!(words, to, "movd", "movss", "movq", "movlps", "movhps", "movsd", "movdqu", "movups", "movupd");
    }

    #[inline(always)]
    unsafe fn load<const BYTES: usize, const FORM: usize>(self, from: *const u8) -> [u64; 4] {
        if BYTES == 32 {
            // SAFETY: the caller gives 32 bytes
            let (a, b) = unsafe { (self.load::<16, FORM>(from), self.load::<16, FORM>(from.add(16))) };
            return [a[0], a[1], b[0], b[1]];
        }
        loads!(from, "movd", "movss", "movq", "movlps", "movhps", "", "movsd", "movdqu", "movups", "movupd", "movdqu")
    }
}

// Assembly on wide vectors asks for the feature in the very function that it stands in, so these are no `inline(always)`.

impl Touch for Avx2 {
    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn store<const BYTES: usize, const FORM: usize>(self, words: &[u64; 4], to: *mut u8) {
        if BYTES == 32 {
            let v = _mm256_set_epi64x(words[3] as i64, words[2] as i64, words[1] as i64, words[0] as i64);
            match FORM {
                0 => store!("vmovdqu", "ymmword", ymm_reg, "", v, to),
                1 => store!("vmovups", "ymmword", ymm_reg, "", v, to),
                2 => store!("vmovupd", "ymmword", ymm_reg, "", v, to),
                _ => {
                    // the upper half by the instruction that stores just that
                    store!("vmovdqu", "xmmword", ymm_reg, ":x", v, to);
                    // SAFETY: the caller gives 32 bytes, and of `Avx2::new` proved avx2
                    unsafe {
                        asm!("vextracti128 xmmword ptr [{to} + 16], {v}, 1", to = in(reg) to, v = in(ymm_reg) v,
                             options(nostack, preserves_flags));
                    }
                }
            }
            return;
        }
        stores!(words, to, "vmovd", "vmovss", "vmovq", "vmovlps", "vmovhps", "vmovsd", "vmovdqu", "vmovups", "vmovupd");
    }

    #[inline]
    #[target_feature(enable = "avx2")]
    unsafe fn load<const BYTES: usize, const FORM: usize>(self, from: *const u8) -> [u64; 4] {
        if BYTES == 32 {
            let v = match FORM {
                0 => load!("vmovups", "ymmword", ymm_reg, "", __m256i, from),
                1 => load!("vmovupd", "ymmword", ymm_reg, "", __m256i, from),
                2 => load!("vlddqu", "ymmword", ymm_reg, "", __m256i, from),
                _ => load!("vmovdqu", "ymmword", ymm_reg, "", __m256i, from),
            };
            let (a, b) = (_mm256_castsi256_si128(v), _mm256_extracti128_si256::<1>(v));
            return [low(a), high(a), low(b), high(b)];
        }
        loads!(
            from, "vmovd", "vmovss", "vmovq", "vmovlps", "vmovhps", "{v}, ", "vmovsd", "vmovdqu", "vmovups", "vmovupd",
            "vlddqu"
        )
    }
}
