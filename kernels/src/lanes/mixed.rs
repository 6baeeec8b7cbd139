//! Registers of f32 lanes that read and write the two 16-bit formats: widening is exact, narrowing rounds to nearest even.
//! No NaN goes in.

use super::fma::FmaLanes;

/// f32 lanes between 16-bit memory and the six kinds of fused multiply-add.
///
/// # Safety
/// The caller proves that the CPU has the register's instructions and that `WIDTH` numbers lie at the pointers.
#[expect(clippy::missing_safety_doc, reason = "one contract for all methods, stated on the trait")]
pub trait MixedLanes: FmaLanes<Scalar = f32> {
    /// binary16 to binary32.
    unsafe fn widen_half(from: *const u16) -> Self;
    /// bfloat16 to binary32.
    unsafe fn widen_bfloat(from: *const u16) -> Self;
    /// binary32 to binary16.
    unsafe fn narrow_half(self, to: *mut u16);
    /// binary32 to bfloat16.
    unsafe fn narrow_bfloat(self, to: *mut u16);
    /// a·b − self.
    unsafe fn fused_minus(self, a: Self, b: Self) -> Self;
    /// self − a·b.
    unsafe fn minus_fused(self, a: Self, b: Self) -> Self;
    /// −self − a·b.
    unsafe fn minus_both(self, a: Self, b: Self) -> Self;
    /// a·b − self in even lanes, a·b + self in odd ones.
    unsafe fn even_minus(self, a: Self, b: Self) -> Self;
    /// a·b + self in even lanes, a·b − self in odd ones.
    unsafe fn odd_minus(self, a: Self, b: Self) -> Self;
}

macro_rules! mixed_lanes {
    (
        $register:ty,
        |$half:ident| $widen_half:expr, |$bfloat:ident| $widen_bfloat:expr,
        |$x:ident, $to:ident| $narrow_half:expr, $narrow_bfloat:expr,
        |$a:ident, $b:ident| $fused_minus:expr, $minus_fused:expr, $minus_both:expr, $even_minus:expr, $odd_minus:expr
    ) => {
        impl $crate::lanes::mixed::MixedLanes for $register {
            #[inline(always)]
            unsafe fn widen_half($half: *const u16) -> Self {
                // SAFETY: the trait's contract
                unsafe { $widen_half }
            }
            #[inline(always)]
            unsafe fn widen_bfloat($bfloat: *const u16) -> Self {
                // SAFETY: the trait's contract
                unsafe { $widen_bfloat }
            }
            #[inline(always)]
            unsafe fn narrow_half(self, $to: *mut u16) {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $narrow_half }
            }
            #[inline(always)]
            unsafe fn narrow_bfloat(self, $to: *mut u16) {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $narrow_bfloat }
            }
            #[inline(always)]
            unsafe fn fused_minus(self, $a: Self, $b: Self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $fused_minus }
            }
            #[inline(always)]
            unsafe fn minus_fused(self, $a: Self, $b: Self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $minus_fused }
            }
            #[inline(always)]
            unsafe fn minus_both(self, $a: Self, $b: Self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $minus_both }
            }
            #[inline(always)]
            unsafe fn even_minus(self, $a: Self, $b: Self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $even_minus }
            }
            #[inline(always)]
            unsafe fn odd_minus(self, $a: Self, $b: Self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract
                unsafe { $odd_minus }
            }
        }
    };
}

/// Half of the last place kept, less one where that place is even; a carry into the exponent is right.
#[cfg(any(target_arch = "x86_64", target_arch = "aarch64"))]
const BELOW_HALF: i32 = 0x7fff;

#[cfg(target_arch = "x86_64")]
mod x86 {
    use super::BELOW_HALF;
    use std::arch::x86_64::*;

    mixed_lanes!(
        __m256,
        |half| _mm256_cvtph_ps(_mm_loadu_si128(half.cast())),
        |bfloat| _mm256_castsi256_ps(_mm256_slli_epi32::<16>(_mm256_cvtepu16_epi32(_mm_loadu_si128(bfloat.cast())))),
        |x, to| _mm_storeu_si128(to.cast(), _mm256_cvtps_ph::<_MM_FROUND_TO_NEAREST_INT>(x)),
        {
            let bits = _mm256_castps_si256(x);
            let odd = _mm256_and_si256(_mm256_srli_epi32::<16>(bits), _mm256_set1_epi32(1));
            let sum = _mm256_add_epi32(bits, _mm256_add_epi32(odd, _mm256_set1_epi32(BELOW_HALF)));
            let short = _mm256_srli_epi32::<16>(sum);
            let packed = _mm256_permute4x64_epi64::<0b1000>(_mm256_packus_epi32(short, short));
            _mm_storeu_si128(to.cast(), _mm256_castsi256_si128(packed))
        },
        |a, b| _mm256_fmsub_ps(a, b, x),
        _mm256_fnmadd_ps(a, b, x),
        _mm256_fnmsub_ps(a, b, x),
        _mm256_fmaddsub_ps(a, b, x),
        _mm256_fmsubadd_ps(a, b, x)
    );
    mixed_lanes!(
        __m512,
        |half| _mm512_cvtph_ps(_mm256_loadu_si256(half.cast())),
        |bfloat| _mm512_castsi512_ps(_mm512_slli_epi32::<16>(_mm512_cvtepu16_epi32(_mm256_loadu_si256(bfloat.cast())))),
        |x, to| _mm256_storeu_si256(to.cast(), _mm512_cvtps_ph::<_MM_FROUND_TO_NEAREST_INT>(x)),
        {
            let bits = _mm512_castps_si512(x);
            let odd = _mm512_and_si512(_mm512_srli_epi32::<16>(bits), _mm512_set1_epi32(1));
            let sum = _mm512_add_epi32(bits, _mm512_add_epi32(odd, _mm512_set1_epi32(BELOW_HALF)));
            _mm256_storeu_si256(to.cast(), _mm512_cvtepi32_epi16(_mm512_srli_epi32::<16>(sum)))
        },
        |a, b| _mm512_fmsub_ps(a, b, x),
        _mm512_fnmadd_ps(a, b, x),
        _mm512_fnmsub_ps(a, b, x),
        _mm512_fmaddsub_ps(a, b, x),
        _mm512_fmsubadd_ps(a, b, x)
    );
}

#[cfg(target_arch = "aarch64")]
mod arm {
    use super::BELOW_HALF;
    use std::arch::aarch64::*;

    /// Sign bits of the even (first) or odd lanes of a pair.
    const EVEN: u64 = 1 << 31;
    const ODD: u64 = 1 << 63;

    /// # Safety
    /// None beyond the architecture's baseline.
    #[inline(always)]
    unsafe fn flip(x: float32x4_t, signs: u64) -> float32x4_t {
        // SAFETY: NEON is aarch64's baseline
        unsafe {
            let mask = vreinterpretq_u32_u64(vdupq_n_u64(signs));
            vreinterpretq_f32_u32(veorq_u32(vreinterpretq_u32_f32(x), mask))
        }
    }

    mixed_lanes!(
        float32x4_t,
        |half| vcvt_f32_f16(vreinterpret_f16_u16(vld1_u16(half))),
        |bfloat| vreinterpretq_f32_u32(vshll_n_u16::<16>(vld1_u16(bfloat))),
        |x, to| vst1_u16(to, vreinterpret_u16_f16(vcvt_f16_f32(x))),
        {
            let bits = vreinterpretq_u32_f32(x);
            let odd = vandq_u32(vshrq_n_u32::<16>(bits), vdupq_n_u32(1));
            let sum = vaddq_u32(bits, vaddq_u32(odd, vdupq_n_u32(BELOW_HALF as u32)));
            vst1_u16(to, vshrn_n_u32::<16>(sum))
        },
        |a, b| vfmaq_f32(vnegq_f32(x), a, b),
        vfmsq_f32(x, a, b),
        vfmsq_f32(vnegq_f32(x), a, b),
        vfmaq_f32(flip(x, EVEN), a, b),
        vfmaq_f32(flip(x, ODD), a, b)
    );
}
