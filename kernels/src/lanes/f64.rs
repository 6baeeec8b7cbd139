//! Double precision: one scalar, 4 × AVX2, 8 × AVX-512, 2 × NEON.

#[cfg(target_arch = "x86_64")]
use std::arch::x86_64::{_mm256_andnot_pd, _mm256_set1_pd, _mm512_abs_pd};

super::arithmetic::scalar!(f64);

#[cfg(target_arch = "x86_64")]
super::arithmetic::x86!(
    __m256d,
    f64,
    4,
    _mm256_loadu_pd,
    _mm256_storeu_pd,
    _mm256_add_pd,
    _mm256_sub_pd,
    _mm256_mul_pd,
    _mm256_div_pd,
    _mm256_sqrt_pd,
    |x| _mm256_andnot_pd(_mm256_set1_pd(-0.0), x)
);

#[cfg(target_arch = "x86_64")]
super::arithmetic::x86!(
    __m512d,
    f64,
    8,
    _mm512_loadu_pd,
    _mm512_storeu_pd,
    _mm512_add_pd,
    _mm512_sub_pd,
    _mm512_mul_pd,
    _mm512_div_pd,
    _mm512_sqrt_pd,
    |x| _mm512_abs_pd(x)
);

#[cfg(target_arch = "aarch64")]
super::arithmetic::neon!(
    float64x2_t,
    f64,
    2,
    vld1q_f64,
    vst1q_f64,
    vaddq_f64,
    vsubq_f64,
    vmulq_f64,
    vdivq_f64,
    vsqrtq_f64,
    vabsq_f64
);
