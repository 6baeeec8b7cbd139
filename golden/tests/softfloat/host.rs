//! Sources of truth: this host's square root and arithmetic (IEEE 754 in hardware), and crate `half` 2.7.1.

use golden::softfloat::{self as soft, Format, Round};
use half::{bf16, f16};

use crate::inputs::Mix;

const NEAR: Round = Round::NearestEven;

/// The host's result with any NaN as the canonical one.
fn canonical(f: Format, bits: u64, nan: bool) -> u64 {
    if nan { f.nan() } else { bits }
}

#[test]
fn square_root_of_doubles() {
    let mut mix = Mix(1);
    for _ in 0..2_000_000 {
        let a = mix.operand(Format::F64);
        let host = f64::from_bits(a).sqrt();
        let ours = soft::sqrt(Format::F64, a, NEAR).0;
        assert_eq!(ours, canonical(Format::F64, host.to_bits(), host.is_nan()), "√{a:#x}");
    }
}

/// √(k² + d) for d = −1, 0, 1 in the last place: just below, on and just above an exact root.
#[test]
fn square_root_beside_exact_squares() {
    let mut mix = Mix(2);
    for _ in 0..1_000_000 {
        let k = (1.0 + (mix.next() >> 38) as f64 / 67_108_864.0) * if mix.next() & 1 == 0 { 1.0 } else { 1.5 };
        for d in [-1i64, 0, 1] {
            let a = (k * k).to_bits().wrapping_add_signed(d);
            assert_eq!(soft::sqrt(Format::F64, a, NEAR).0, f64::from_bits(a).sqrt().to_bits(), "√{a:#x}");
        }
    }
}

#[test]
fn square_root_of_singles() {
    let mut mix = Mix(3);
    for _ in 0..2_000_000 {
        let a = mix.operand(Format::F32);
        let host = f32::from_bits(a as u32).sqrt();
        let ours = soft::sqrt(Format::F32, a, NEAR).0;
        assert_eq!(ours, canonical(Format::F32, host.to_bits().into(), host.is_nan()), "√{a:#x}");
    }
}

/// Every one of the 65,536 halves to single and double. `half`'s `const` conversions are its software path: the ones
/// that switch to hardware at run time are `from_f32`, `to_f32` and so on.
#[test]
fn all_halves_widen() {
    for bits in 0..=u16::MAX {
        let a = f16::from_bits(bits);
        let single = a.to_f32_const();
        let ours = soft::convert(Format::F16, Format::F32, bits.into(), NEAR).0;
        assert_eq!(ours, canonical(Format::F32, single.to_bits().into(), a.is_nan()), "half {bits:#x}");
        let double = a.to_f64_const();
        let ours = soft::convert(Format::F16, Format::F64, bits.into(), NEAR).0;
        assert_eq!(ours, canonical(Format::F64, double.to_bits(), a.is_nan()), "half {bits:#x}");
    }
}

/// Every half and both neighbours, in single, of each half and of each midpoint of two, back to half.
#[test]
fn all_halves_and_their_boundaries_narrow() {
    for bits in 0..=u16::MAX {
        let a = f16::from_bits(bits);
        if a.is_nan() {
            continue;
        }
        let single = a.to_f32_const().to_bits();
        for (point, step) in [
            (single, 0),
            (single, 1),
            (single, -1),
            (single ^ 1 << 12, 0),
            (single ^ 1 << 12, 1),
            (single ^ 1 << 12, -1),
        ] {
            let x = f32::from_bits(point.wrapping_add_signed(step));
            if x.is_nan() {
                continue;
            }
            let ours = soft::convert(Format::F32, Format::F16, x.to_bits().into(), NEAR).0;
            assert_eq!(ours, u64::from(f16::from_f32_const(x).to_bits()), "{x:e}");
        }
    }
}

/// Every bfloat16 to single, and back with both neighbours of each and of each midpoint.
#[test]
fn all_bfloats() {
    for bits in 0..=u16::MAX {
        let a = bf16::from_bits(bits);
        let ours = soft::convert(Format::BF16, Format::F32, bits.into(), NEAR).0;
        assert_eq!(ours, canonical(Format::F32, a.to_f32_const().to_bits().into(), a.is_nan()), "bfloat {bits:#x}");
        let single = a.to_f32_const().to_bits();
        for point in [single, single.wrapping_add(1), single ^ 0x8000, (single ^ 0x8000) + 1, (single ^ 0x8000) - 1] {
            let x = f32::from_bits(point);
            if !x.is_nan() {
                let ours = soft::convert(Format::F32, Format::BF16, x.to_bits().into(), NEAR).0;
                assert_eq!(ours, u64::from(bf16::from_f32_const(x).to_bits()), "{x:e}");
            }
        }
    }
}
