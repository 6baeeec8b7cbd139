//! Registers of f32 lanes with fused multiply-add.

use super::fma::fma_lanes;

#[cfg(target_arch = "x86_64")]
mod x86 {
    use std::arch::x86_64 as arch;
    super::fma_lanes!(
        arch::__m256,
        f32,
        8,
        arch::_mm256_loadu_ps,
        arch::_mm256_set1_ps,
        arch::_mm256_storeu_ps,
        |x, factor, addend| arch::_mm256_fmadd_ps(x, factor, addend),
        arch::_mm256_setzero_ps(),
        |a, b| arch::_mm256_castsi256_ps(arch::_mm256_add_epi32(
            arch::_mm256_castps_si256(a),
            arch::_mm256_castps_si256(b)
        ))
    );
    super::fma_lanes!(
        arch::__m512,
        f32,
        16,
        arch::_mm512_loadu_ps,
        arch::_mm512_set1_ps,
        arch::_mm512_storeu_ps,
        |x, factor, addend| arch::_mm512_fmadd_ps(x, factor, addend),
        arch::_mm512_setzero_ps(),
        |a, b| arch::_mm512_castsi512_ps(arch::_mm512_add_epi32(
            arch::_mm512_castps_si512(a),
            arch::_mm512_castps_si512(b)
        ))
    );
}

#[cfg(target_arch = "aarch64")]
mod arm {
    use std::arch::aarch64 as arch;
    // the addend comes first in this architecture's intrinsic
    super::fma_lanes!(
        arch::float32x4_t,
        f32,
        4,
        arch::vld1q_f32,
        arch::vdupq_n_f32,
        arch::vst1q_f32,
        |x, factor, addend| arch::vfmaq_f32(addend, x, factor),
        arch::vdupq_n_f32(0.0),
        |a, b| arch::vreinterpretq_f32_u32(arch::vaddq_u32(
            arch::vreinterpretq_u32_f32(a),
            arch::vreinterpretq_u32_f32(b)
        ))
    );
    super::super::fma::fma_scalar!(f32, "fmadd {end:s}, {x:s}, {factor:s}, {addend:s}");
}
