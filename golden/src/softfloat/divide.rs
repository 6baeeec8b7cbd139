//! Division and square root by wide integers.

use super::parts::{Number, invalid, nan_of, round, signed, unpack};
use super::{Flags, Format, Round};

/// a / b.
#[inline]
pub fn div(f: Format, a: u64, b: u64, r: Round) -> (u64, Flags) {
    use Number::{Finite, Infinite, Nan, Zero};
    let ((a_negative, x), (b_negative, y)) = (unpack(f, a), unpack(f, b));
    let negative = a_negative != b_negative;
    match (x, y) {
        (Finite { exponent: ae, significand: am }, Finite { exponent: be, significand: bm }) => {
            // the numerator is scaled so that the quotient lies in [2^63, 2^64)
            let smaller = am < bm;
            let numerator = u128::from(am) << if smaller { 64 } else { 63 };
            let quotient = (numerator / u128::from(bm)) as u64;
            let remainder = numerator - u128::from(quotient) * u128::from(bm);
            round(f, negative, ae - be - i32::from(smaller), quotient | u64::from(remainder != 0), r)
        }
        (Nan { .. }, _) | (_, Nan { .. }) => nan_of(f, &[x, y]),
        (Zero, Zero) | (Infinite, Infinite) => invalid(f),
        (Infinite, _) => (signed(f, negative, f.infinity()), Flags::NONE),
        (Zero, _) | (_, Infinite) => (signed(f, negative, 0), Flags::NONE),
        (_, Zero) => (signed(f, negative, f.infinity()), Flags::DIVIDE_BY_ZERO),
    }
}

/// √a; √−0 = −0.
#[inline]
pub fn sqrt(f: Format, a: u64, r: Round) -> (u64, Flags) {
    let (negative, x) = unpack(f, a);
    match x {
        Number::Nan { .. } => nan_of(f, &[x]),
        Number::Zero => (signed(f, negative, 0), Flags::NONE),
        _ if negative => invalid(f),
        Number::Infinite => (f.infinity(), Flags::NONE),
        Number::Finite { exponent, significand } => {
            // an even power of two is split off, leaving a radicand in [2^126, 2^128): its root has 64 bits
            let radicand = u128::from(significand) << if exponent % 2 == 0 { 63 } else { 64 };
            let root = radicand.isqrt() as u64;
            let exact = u128::from(root) * u128::from(root) == radicand;
            round(f, false, exponent.div_euclid(2), root | u64::from(!exact), r)
        }
    }
}
