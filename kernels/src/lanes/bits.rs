//! Registers of f64 lanes whose bit patterns can be reckoned with as 64-bit integers.

use super::Arithmetic;

/// Integer operations on the lanes' bit patterns.
///
/// # Safety
/// The caller proves that the CPU has the register's instructions.
#[expect(clippy::missing_safety_doc, reason = "one contract for all methods, stated on the trait")]
pub trait Bits: Arithmetic<Scalar = f64> {
    /// One number in every lane.
    unsafe fn all(number: f64) -> Self;
    /// Sum modulo 2^64.
    unsafe fn plus_bits(self, other: Self) -> Self;
    /// Difference modulo 2^64.
    unsafe fn minus_bits(self, other: Self) -> Self;
    /// Bits in both.
    unsafe fn and_bits(self, other: Self) -> Self;
    /// Bits in one of the two.
    unsafe fn flip_bits(self, other: Self) -> Self;
    /// Toward the highest bit.
    unsafe fn left<const BY: i32>(self) -> Self;
    /// Toward the lowest bit, zeros from above.
    unsafe fn right<const BY: i32>(self) -> Self;
    /// `yes` in the lanes whose highest bit is set in self, else `no`.
    unsafe fn choose(self, yes: Self, no: Self) -> Self;
}

macro_rules! bits {
    ($register:ty, $all:path, |$a:ident, $b:ident| $plus:expr, $minus:expr, $and:expr, $flip:expr,
     |$by:ident| $left:expr, $right:expr, |$yes:ident, $no:ident| $choose:expr) => {
        impl $crate::lanes::bits::Bits for $register {
            #[inline(always)]
            unsafe fn all(number: f64) -> Self {
                // SAFETY: the trait's contract
                unsafe { $all(number) }
            }
            #[inline(always)]
            unsafe fn plus_bits(self, $b: Self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $plus }
            }
            #[inline(always)]
            unsafe fn minus_bits(self, $b: Self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $minus }
            }
            #[inline(always)]
            unsafe fn and_bits(self, $b: Self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $and }
            }
            #[inline(always)]
            unsafe fn flip_bits(self, $b: Self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $flip }
            }
            #[inline(always)]
            unsafe fn left<const $by: i32>(self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $left }
            }
            #[inline(always)]
            unsafe fn right<const $by: i32>(self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $right }
            }
            #[inline(always)]
            unsafe fn choose(self, $yes: Self, $no: Self) -> Self {
                let $a = self;
                // SAFETY: the trait's contract
                unsafe { $choose }
            }
        }
    };
}

impl Bits for f64 {
    #[inline(always)]
    unsafe fn all(number: f64) -> f64 {
        number
    }
    #[inline(always)]
    unsafe fn plus_bits(self, other: f64) -> f64 {
        f64::from_bits(self.to_bits().wrapping_add(other.to_bits()))
    }
    #[inline(always)]
    unsafe fn minus_bits(self, other: f64) -> f64 {
        f64::from_bits(self.to_bits().wrapping_sub(other.to_bits()))
    }
    #[inline(always)]
    unsafe fn and_bits(self, other: f64) -> f64 {
        f64::from_bits(self.to_bits() & other.to_bits())
    }
    #[inline(always)]
    unsafe fn flip_bits(self, other: f64) -> f64 {
        f64::from_bits(self.to_bits() ^ other.to_bits())
    }
    #[inline(always)]
    unsafe fn left<const BY: i32>(self) -> f64 {
        f64::from_bits(self.to_bits() << BY)
    }
    #[inline(always)]
    unsafe fn right<const BY: i32>(self) -> f64 {
        f64::from_bits(self.to_bits() >> BY)
    }
    #[inline(always)]
    unsafe fn choose(self, yes: f64, no: f64) -> f64 {
        if self.to_bits() >> 63 == 1 { yes } else { no }
    }
}

#[cfg(target_arch = "x86_64")]
mod x86 {
    use std::arch::x86_64::*;

    bits!(
        __m256d,
        _mm256_set1_pd,
        |a, b| _mm256_castsi256_pd(_mm256_add_epi64(_mm256_castpd_si256(a), _mm256_castpd_si256(b))),
        _mm256_castsi256_pd(_mm256_sub_epi64(_mm256_castpd_si256(a), _mm256_castpd_si256(b))),
        _mm256_and_pd(a, b),
        _mm256_xor_pd(a, b),
        |BY| _mm256_castsi256_pd(_mm256_slli_epi64::<BY>(_mm256_castpd_si256(a))),
        _mm256_castsi256_pd(_mm256_srli_epi64::<BY>(_mm256_castpd_si256(a))),
        |yes, no| _mm256_blendv_pd(no, yes, a)
    );

    // the shift counts are const generics of another type on this level: by a register of counts instead
    bits!(
        __m512d,
        _mm512_set1_pd,
        |a, b| _mm512_castsi512_pd(_mm512_add_epi64(_mm512_castpd_si512(a), _mm512_castpd_si512(b))),
        _mm512_castsi512_pd(_mm512_sub_epi64(_mm512_castpd_si512(a), _mm512_castpd_si512(b))),
        _mm512_castsi512_pd(_mm512_and_si512(_mm512_castpd_si512(a), _mm512_castpd_si512(b))),
        _mm512_castsi512_pd(_mm512_xor_si512(_mm512_castpd_si512(a), _mm512_castpd_si512(b))),
        |BY| _mm512_castsi512_pd(_mm512_sll_epi64(_mm512_castpd_si512(a), _mm_cvtsi32_si128(BY))),
        _mm512_castsi512_pd(_mm512_srl_epi64(_mm512_castpd_si512(a), _mm_cvtsi32_si128(BY))),
        |yes, no| _mm512_mask_blend_pd(
            _mm512_cmplt_epi64_mask(_mm512_castpd_si512(a), _mm512_setzero_si512()),
            no,
            yes
        )
    );
}

#[cfg(target_arch = "aarch64")]
mod arm {
    use std::arch::aarch64::*;

    /// # Safety
    /// None beyond the architecture's baseline.
    #[inline(always)]
    unsafe fn bits(x: float64x2_t) -> uint64x2_t {
        // SAFETY: NEON is aarch64's baseline
        unsafe { vreinterpretq_u64_f64(x) }
    }

    bits!(
        float64x2_t,
        vdupq_n_f64,
        |a, b| vreinterpretq_f64_u64(vaddq_u64(bits(a), bits(b))),
        vreinterpretq_f64_u64(vsubq_u64(bits(a), bits(b))),
        vreinterpretq_f64_u64(vandq_u64(bits(a), bits(b))),
        vreinterpretq_f64_u64(veorq_u64(bits(a), bits(b))),
        |BY| vreinterpretq_f64_u64(vshlq_u64(bits(a), vdupq_n_s64(BY as i64))),
        vreinterpretq_f64_u64(vshlq_u64(bits(a), vdupq_n_s64(-(BY as i64)))),
        |yes, no| vbslq_f64(vcltzq_s64(vreinterpretq_s64_f64(a)), yes, no)
    );
}
