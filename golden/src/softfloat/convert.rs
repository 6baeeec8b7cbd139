//! Between formats, and between formats and integers.

use super::parts::{Number, nan_of, round, shift_right_sticky, signed, unpack};
use super::{Flags, Format, Round};

/// `a` of one format in another.
#[inline]
pub fn convert(from: Format, to: Format, a: u64, r: Round) -> (u64, Flags) {
    let (negative, x) = unpack(from, a);
    match x {
        Number::Zero => (signed(to, negative, 0), Flags::NONE),
        Number::Infinite => (signed(to, negative, to.infinity()), Flags::NONE),
        Number::Nan { .. } => nan_of(to, &[x]),
        Number::Finite { exponent, significand } => round(to, negative, exponent, significand, r),
    }
}

/// An unsigned integer; zero gives +0.
pub fn from_uint(f: Format, v: u64, r: Round) -> (u64, Flags) {
    signed_integer(f, false, v, r)
}

/// A signed integer; zero gives +0.
pub fn from_int(f: Format, v: i64, r: Round) -> (u64, Flags) {
    signed_integer(f, v < 0, v.unsigned_abs(), r)
}

fn signed_integer(f: Format, negative: bool, magnitude: u64, r: Round) -> (u64, Flags) {
    if magnitude == 0 {
        return (0, Flags::NONE);
    }
    let up = magnitude.leading_zeros();
    round(f, negative, 63 - up as i32, magnitude << up, r)
}

/// The integer nearest in direction `r` within [`low`, `high`]; outside it the nearer end, and 0 for NaN, with invalid.
fn to_integer(f: Format, a: u64, r: Round, low: i128, high: i128) -> (i128, Flags) {
    let (negative, x) = unpack(f, a);
    let clamp = if negative { low } else { high };
    match x {
        Number::Zero => (0, Flags::NONE),
        Number::Nan { .. } => (0, Flags::INVALID),
        Number::Infinite => (clamp, Flags::INVALID),
        Number::Finite { exponent, .. } if exponent > 64 => (clamp, Flags::INVALID),
        Number::Finite { exponent, significand } => {
            // value · 2^2: two bits below the unit, the lower one sticky
            let quarters = if exponent >= 61 {
                u128::from(significand) << (exponent - 61)
            } else {
                u128::from(shift_right_sticky(significand, (61 - exponent) as u32))
            };
            let (whole, rest) = (quarters >> 2, quarters & 3);
            let up = match r {
                Round::NearestEven => rest == 3 || (rest == 2 && whole & 1 == 1),
                Round::TowardZero => false,
                Round::Up => rest != 0 && !negative,
                Round::Down => rest != 0 && negative,
            };
            let magnitude = whole as i128 + i128::from(up);
            let value = if negative { -magnitude } else { magnitude };
            if value < low || value > high {
                (clamp, Flags::INVALID)
            } else {
                (value, if rest == 0 { Flags::NONE } else { Flags::INEXACT })
            }
        }
    }
}

macro_rules! to {
    ($($name:ident $int:ident),*) => {$(
        #[doc = concat!("`a` rounded to an integer of type `", stringify!($int), "`; out of range see the module's head.")]
        pub fn $name(f: Format, a: u64, r: Round) -> ($int, Flags) {
            let (value, flags) = to_integer(f, a, r, $int::MIN.into(), $int::MAX.into());
            (value as $int, flags)
        }
    )*};
}
to!(to_i32 i32, to_i64 i64, to_u32 u32, to_u64 u64);
