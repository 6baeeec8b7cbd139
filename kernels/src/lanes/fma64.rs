//! Registers of f64 lanes with fused multiply-add.

use super::fma::fma_lanes;

#[cfg(target_arch = "x86_64")]
mod x86 {
    use std::arch::x86_64 as arch;
    super::fma_lanes!(
        arch::__m256d,
        f64,
        4,
        arch::_mm256_loadu_pd,
        arch::_mm256_set1_pd,
        arch::_mm256_storeu_pd,
        |x, factor, addend| arch::_mm256_fmadd_pd(x, factor, addend),
        arch::_mm256_setzero_pd(),
        |a, b| arch::_mm256_castsi256_pd(arch::_mm256_add_epi64(
            arch::_mm256_castpd_si256(a),
            arch::_mm256_castpd_si256(b)
        ))
    );
    super::fma_lanes!(
        arch::__m512d,
        f64,
        8,
        arch::_mm512_loadu_pd,
        arch::_mm512_set1_pd,
        arch::_mm512_storeu_pd,
        |x, factor, addend| arch::_mm512_fmadd_pd(x, factor, addend),
        arch::_mm512_setzero_pd(),
        |a, b| arch::_mm512_castsi512_pd(arch::_mm512_add_epi64(
            arch::_mm512_castpd_si512(a),
            arch::_mm512_castpd_si512(b)
        ))
    );
}

#[cfg(target_arch = "aarch64")]
mod arm {
    use std::arch::aarch64 as arch;
    // the addend comes first in this architecture's intrinsic
    super::fma_lanes!(
        arch::float64x2_t,
        f64,
        2,
        arch::vld1q_f64,
        arch::vdupq_n_f64,
        arch::vst1q_f64,
        |x, factor, addend| arch::vfmaq_f64(addend, x, factor),
        arch::vdupq_n_f64(0.0),
        |a, b| arch::vreinterpretq_f64_u64(arch::vaddq_u64(
            arch::vreinterpretq_u64_f64(a),
            arch::vreinterpretq_u64_f64(b)
        ))
    );
    super::super::fma::fma_scalar!(f64, "fmadd {end:d}, {x:d}, {factor:d}, {addend:d}");
}
