//! Source of truth: numpy 2.4.6 and ml_dtypes 0.7.0, digests of whole conversions by `golden/witness/check_narrow.py`; and
//! the vector unit's own conversions, as `fma.mixed` uses them, against softfloat on the same operands.

use golden::softfloat::{self as soft, Format, Round};
use golden::table::sha256_hex;

const LOWER: [u32; 13] = [0, 1, 0xfff, 0x1000, 0x1001, 0x1fff, 0x7fff, 0x8000, 0x8001, 0xefff, 0xf000, 0xf001, 0xffff];

fn singles() -> Vec<u32> {
    let all = (0..1u32 << 16).flat_map(|upper| LOWER.map(|lower| upper << 16 | lower));
    all.filter(|bits| !f32::from_bits(*bits).is_nan()).collect()
}

fn widened(from: Format) -> Vec<u32> {
    (0..1 << 16).map(|bits| soft::convert(from, Format::F32, bits, Round::NearestEven).0 as u32).collect()
}

fn narrowed(to: Format) -> Vec<u16> {
    let one = |bits: u32| soft::convert(Format::F32, to, bits.into(), Round::NearestEven).0 as u16;
    singles().into_iter().map(one).collect()
}

#[test]
fn whole_conversions() {
    let mut lines = String::new();
    for (name, format) in [("half", Format::F16), ("bfloat", Format::BF16)] {
        let wide: Vec<u8> = widened(format).into_iter().flat_map(u32::to_le_bytes).collect();
        let narrow: Vec<u8> = narrowed(format).into_iter().flat_map(u16::to_le_bytes).collect();
        lines += &format!("{name}-to-single {}\nsingle-to-{name} {}\n", sha256_hex(&wide), sha256_hex(&narrow));
    }
    assert_eq!(lines, include_str!("../data/narrow.txt"));
}

/// All conversions of one register type.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[cfg(any(target_arch = "x86_64", target_arch = "aarch64"))]
#[inline(always)]
unsafe fn lanes<V: kernels::lanes::mixed::MixedLanes>() {
    let every: Vec<u16> = (0..=u16::MAX).collect();
    for (format, half) in [(Format::F16, true), (Format::BF16, false)] {
        let mut wide = vec![0.0f32; every.len()];
        for at in (0..every.len()).step_by(V::WIDTH) {
            // SAFETY: the width divides the length; instructions by this function's contract
            unsafe {
                let from = every.as_ptr().add(at);
                let x = if half { V::widen_half(from) } else { V::widen_bfloat(from) };
                x.store(wide.as_mut_ptr().add(at));
            }
        }
        for ((bits, wide), right) in every.iter().zip(wide).zip(widened(format)) {
            assert!(wide.is_nan() && f32::from_bits(right).is_nan() || wide.to_bits() == right, "{format:?} {bits:#x}");
        }
        let mut from = singles();
        from.resize(from.len().next_multiple_of(V::WIDTH), 0);
        let mut short = vec![0u16; from.len()];
        for at in (0..from.len()).step_by(V::WIDTH) {
            // SAFETY: the width divides the length; instructions by this function's contract
            unsafe {
                let x = V::load(from.as_ptr().add(at).cast());
                let to = short.as_mut_ptr().add(at);
                if half { x.narrow_half(to) } else { x.narrow_bfloat(to) }
            }
        }
        for ((bits, short), right) in from.iter().zip(short).zip(narrowed(format)) {
            assert_eq!(short, right, "{format:?} {bits:#x}");
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[test]
fn vector_conversions() {
    #[target_feature(enable = "avx2,fma,f16c")]
    fn avx2() {
        // SAFETY: the features are enabled on this function
        unsafe { lanes::<std::arch::x86_64::__m256>() }
    }
    let has = is_x86_feature_detected!("avx2") && is_x86_feature_detected!("fma") && is_x86_feature_detected!("f16c");
    if has {
        // SAFETY: just detected
        unsafe { avx2() }
    }
}

#[cfg(target_arch = "aarch64")]
#[test]
fn vector_conversions() {
    // SAFETY: NEON is the architecture's baseline
    unsafe { lanes::<std::arch::aarch64::float32x4_t>() }
}
