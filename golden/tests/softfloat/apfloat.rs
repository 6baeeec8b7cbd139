//! Source of truth: crate `rustc_apfloat` 0.2.3 (LLVM's APFloat), results and exceptions.
//!
//! Two known differences in exceptions, both settled by MPFR in `mpfr.rs`:
//! - APFloat raises underflow for every inexact result that is subnormal or zero, and not for one that became the
//!   smallest normal number; ours decides after rounding with unbounded exponent. They can differ only where the result
//!   is ± the smallest normal number.
//! - APFloat leaves overflow out where a directed rounding gives the largest finite number; IEEE 754-2019 §7.4 has it.

use golden::softfloat::{self as soft, Flags, Format, Round};
use rustc_apfloat::ieee::{BFloat, Double, Half, Single};
use rustc_apfloat::{Float, FloatConvert, Round as Their, Status, StatusAnd};

use crate::inputs::Mix;

const EACH: u64 = 1_000_000;

fn their(r: Round) -> Their {
    match r {
        Round::NearestEven => Their::NearestTiesToEven,
        Round::TowardZero => Their::TowardZero,
        Round::Up => Their::TowardPositive,
        Round::Down => Their::TowardNegative,
    }
}

fn flags(s: Status) -> Flags {
    [
        (Status::INVALID_OP, Flags::INVALID),
        (Status::DIV_BY_ZERO, Flags::DIVIDE_BY_ZERO),
        (Status::OVERFLOW, Flags::OVERFLOW),
        (Status::UNDERFLOW, Flags::UNDERFLOW),
        (Status::INEXACT, Flags::INEXACT),
    ]
    .into_iter()
    .filter(|(theirs, _)| s.intersects(*theirs))
    .fold(Flags::NONE, |all, (_, ours)| all | ours)
}

/// Compares one result; `what` is only formatted when it is wrong.
fn agree<F: Float>(f: Format, ours: (u64, Flags), theirs: StatusAnd<F>, what: impl Fn() -> String) {
    let bits = if theirs.value.is_nan() { f.nan() } else { theirs.value.to_bits() as u64 };
    let mut expected = flags(theirs.status);
    if ours.1.contains(Flags::INEXACT) {
        let magnitude = bits & !f.sign_bit();
        let open = match magnitude {
            _ if magnitude == 1 << f.fraction_bits => Flags::UNDERFLOW,
            _ if magnitude == f.largest() => Flags::OVERFLOW,
            _ => Flags::NONE,
        };
        expected = expected | Flags(ours.1.0 & open.0);
    }
    assert_eq!(ours, (bits, expected), "{}: ours {:#x}, theirs {bits:#x}", what(), ours.0);
}

fn float<F: Float>(bits: u64) -> F {
    F::from_bits(u128::from(bits))
}

fn two<F: Float>(
    f: Format,
    seed: u64,
    ours: impl Fn(Format, u64, u64, Round) -> (u64, Flags),
    theirs: impl Fn(F, F, Their) -> StatusAnd<F>,
) {
    let mut mix = Mix(seed);
    for i in 0..EACH {
        let a = mix.operand(f);
        let b = mix.partner(f, a);
        let r = Round::ALL[(i % 4) as usize];
        agree(f, ours(f, a, b, r), theirs(float(a), float(b), their(r)), || format!("{a:#x}, {b:#x} {r:?}"));
    }
}

fn fused<F: Float>(f: Format, seed: u64) {
    let mut mix = Mix(seed);
    for i in 0..EACH {
        let (a, b) = (mix.operand(f), mix.operand(f));
        let product = soft::mul(f, a, b, Round::NearestEven).0;
        let c = mix.partner(f, product);
        let r = Round::ALL[(i % 4) as usize];
        let result = float::<F>(a).mul_add_r(float(b), float(c), their(r));
        agree(f, soft::fma(f, a, b, c, r), result, || format!("fma {a:#x}, {b:#x}, {c:#x} {r:?}"));
    }
}

fn convert<A: Float + FloatConvert<B>, B: Float>(from: Format, to: Format, seed: u64) {
    let mut mix = Mix(seed);
    for i in 0..EACH {
        let r = Round::ALL[(i % 4) as usize];
        // every second one is next to a number, or to the midpoint of two, of the target format
        let wide = mix.operand(from);
        let a = if i % 2 == 0 || from.fraction_bits <= to.fraction_bits {
            wide
        } else {
            let near = soft::convert(to, from, mix.operand(to), r).0;
            let below = from.fraction_bits - to.fraction_bits;
            let half = if mix.next() & 1 == 0 { 0 } else { 1 << (below - 1) };
            (near ^ half).wrapping_add(mix.below(3)).wrapping_sub(1) & (from.sign_bit() | (from.sign_bit() - 1))
        };
        let mut loses = false;
        let result: StatusAnd<B> = float::<A>(a).convert_r(their(r), &mut loses);
        agree(to, soft::convert(from, to, a, r), result, || format!("convert {from:?} to {to:?} {a:#x} {r:?}"));
    }
}

fn integers<F: Float>(f: Format, seed: u64) {
    let mut mix = Mix(seed);
    for i in 0..EACH {
        let r = Round::ALL[(i % 4) as usize];
        let noise = mix.next() >> mix.below(64);
        let v = if mix.next() & 1 == 0 {
            noise
        } else {
            (1u64 << mix.below(64)).wrapping_add(mix.below(5)).wrapping_sub(2)
        };
        agree(f, soft::from_uint(f, v, r), F::from_u128_r(v.into(), their(r)), || format!("from {v} {r:?}"));
        let s = v as i64;
        agree(f, soft::from_int(f, s, r), F::from_i128_r(s.into(), their(r)), || format!("from {s} {r:?}"));

        let a = match mix.below(3) {
            0 => mix.operand(f),
            1 => soft::from_int(f, s, r).0,
            _ => soft::div(f, soft::from_int(f, s, r).0, soft::from_uint(f, 1 << mix.below(8), r).0, r).0,
        };
        let x = float::<F>(a);
        let what = || format!("{a:#x} of {f:?} to integer {r:?}");
        let mut exact = false;
        let want = |s: StatusAnd<i128>| (s.value, flags(s.status));
        let ours = soft::to_i32(f, a, r);
        assert_eq!((ours.0.into(), ours.1), want(x.to_i128_r(32, their(r), &mut exact)), "{}", what());
        let ours = soft::to_i64(f, a, r);
        assert_eq!((ours.0.into(), ours.1), want(x.to_i128_r(64, their(r), &mut exact)), "{}", what());
        let want = |s: StatusAnd<u128>| (s.value, flags(s.status));
        let ours = soft::to_u32(f, a, r);
        assert_eq!((ours.0.into(), ours.1), want(x.to_u128_r(32, their(r), &mut exact)), "{}", what());
        let ours = soft::to_u64(f, a, r);
        assert_eq!((ours.0.into(), ours.1), want(x.to_u128_r(64, their(r), &mut exact)), "{}", what());
    }
}

fn comparisons<F: Float>(f: Format, seed: u64) {
    let mut mix = Mix(seed);
    for _ in 0..EACH {
        let a = mix.operand(f);
        let b = if mix.below(8) == 0 { a & f.sign_bit() } else { mix.partner(f, a) };
        assert_eq!(soft::less(f, a, b), float::<F>(a) < float::<F>(b), "{a:#x} < {b:#x}");
        assert_eq!(soft::equal(f, a, b), float::<F>(a) == float::<F>(b), "{a:#x} = {b:#x}");
    }
}

macro_rules! formats {
    ($($name:ident $format:ident $theirs:ident $seed:literal),*) => {$(
        mod $name {
            use super::*;
            const F: Format = Format::$format;

            #[test]
            fn add() {
                two::<$theirs>(F, $seed, soft::add, |a, b, r| a.add_r(b, r));
            }

            #[test]
            fn sub() {
                two::<$theirs>(F, $seed + 1, soft::sub, |a, b, r| a.sub_r(b, r));
            }

            #[test]
            fn mul() {
                two::<$theirs>(F, $seed + 2, soft::mul, |a, b, r| a.mul_r(b, r));
            }

            #[test]
            fn div() {
                two::<$theirs>(F, $seed + 3, soft::div, |a, b, r| a.div_r(b, r));
            }

            #[test]
            fn fma() {
                fused::<$theirs>(F, $seed + 4);
            }

            #[test]
            fn integers() {
                super::integers::<$theirs>(F, $seed + 5);
            }

            #[test]
            fn comparisons() {
                super::comparisons::<$theirs>(F, $seed + 6);
            }
        }
    )*};
}
formats!(binary16 F16 Half 100, bfloat16 BF16 BFloat 200, binary32 F32 Single 300, binary64 F64 Double 400);

macro_rules! conversions {
    ($($name:ident $from:ident $a:ident $to:ident $b:ident),*) => {$(
        #[test]
        fn $name() {
            convert::<$a, $b>(Format::$from, Format::$to, 500);
        }
    )*};
}
conversions!(
    binary64_to_binary32 F64 Double F32 Single,
    binary64_to_binary16 F64 Double F16 Half,
    binary64_to_bfloat16 F64 Double BF16 BFloat,
    binary32_to_binary64 F32 Single F64 Double,
    binary32_to_binary16 F32 Single F16 Half,
    binary32_to_bfloat16 F32 Single BF16 BFloat,
    binary16_to_binary64 F16 Half F64 Double,
    binary16_to_binary32 F16 Half F32 Single,
    binary16_to_bfloat16 F16 Half BF16 BFloat,
    bfloat16_to_binary32 BF16 BFloat F32 Single,
    bfloat16_to_binary16 BF16 BFloat F16 Half
);
