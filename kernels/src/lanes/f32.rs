//! Single precision: one scalar, 8 × AVX2, 16 × AVX-512, 4 × NEON.

#[cfg(target_arch = "x86_64")]
use std::arch::x86_64::{_mm256_andnot_ps, _mm256_set1_ps, _mm512_abs_ps};

super::arithmetic::scalar!(f32);

#[cfg(target_arch = "x86_64")]
super::arithmetic::x86!(
    __m256,
    f32,
    8,
    _mm256_loadu_ps,
    _mm256_storeu_ps,
    _mm256_add_ps,
    _mm256_sub_ps,
    _mm256_mul_ps,
    _mm256_div_ps,
    _mm256_sqrt_ps,
    |x| _mm256_andnot_ps(_mm256_set1_ps(-0.0), x)
);

#[cfg(target_arch = "x86_64")]
super::arithmetic::x86!(
    __m512,
    f32,
    16,
    _mm512_loadu_ps,
    _mm512_storeu_ps,
    _mm512_add_ps,
    _mm512_sub_ps,
    _mm512_mul_ps,
    _mm512_div_ps,
    _mm512_sqrt_ps,
    |x| _mm512_abs_ps(x)
);

#[cfg(target_arch = "aarch64")]
super::arithmetic::neon!(
    float32x4_t,
    f32,
    4,
    vld1q_f32,
    vst1q_f32,
    vaddq_f32,
    vsubq_f32,
    vmulq_f32,
    vdivq_f32,
    vsqrtq_f32,
    vabsq_f32
);
