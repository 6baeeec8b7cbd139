//! Addition and subtraction.

use super::parts::{Number, invalid, nan_of, round, shift_right_sticky, signed, unpack};
use super::{Flags, Format, Round};

/// a + b.
#[inline]
pub fn add(f: Format, a: u64, b: u64, r: Round) -> (u64, Flags) {
    use Number::{Finite, Infinite, Nan, Zero};
    let ((a_negative, x), (b_negative, y)) = (unpack(f, a), unpack(f, b));
    match (x, y) {
        (Finite { exponent: ae, significand: am }, Finite { exponent: be, significand: bm }) => {
            if ae < be || (ae == be && am < bm) {
                sum(f, (b_negative, be, bm), (a_negative, ae, am), r)
            } else {
                sum(f, (a_negative, ae, am), (b_negative, be, bm), r)
            }
        }
        (Nan { .. }, _) | (_, Nan { .. }) => nan_of(f, &[x, y]),
        (Infinite, Infinite) if a_negative != b_negative => invalid(f),
        (Infinite, _) => (signed(f, a_negative, f.infinity()), Flags::NONE),
        (_, Infinite) => (signed(f, b_negative, f.infinity()), Flags::NONE),
        (Zero, Zero) => (signed(f, zero_sign(a_negative, b_negative, r), 0), Flags::NONE),
        (Zero, _) => (b & (f.sign_bit() | (f.sign_bit() - 1)), Flags::NONE),
        (_, Zero) => (a & (f.sign_bit() | (f.sign_bit() - 1)), Flags::NONE),
    }
}

/// a − b.
#[inline]
pub fn sub(f: Format, a: u64, b: u64, r: Round) -> (u64, Flags) {
    // a NaN's sign is not looked at, so negating is always right
    add(f, a, b ^ f.sign_bit(), r)
}

/// Sign of a zero sum: the common one, else negative only when rounding down (IEEE 754-2019 §6.3).
pub(super) fn zero_sign(a_negative: bool, b_negative: bool, r: Round) -> bool {
    if a_negative == b_negative { a_negative } else { r == Round::Down }
}

type Term = (bool, i32, u64);

/// The sum of two finite numbers, the first not smaller in magnitude.
#[inline(always)]
fn sum(f: Format, (negative, exponent, big): Term, (other, low_exponent, small): Term, r: Round) -> (u64, Flags) {
    // one bit of head room; ten or more bits stay below the last place. A sticky bit appears only for shifts of
    // eleven or more, when cancellation can cost one leading place at most.
    let big = big >> 1;
    let small = shift_right_sticky(small >> 1, (exponent - low_exponent) as u32);
    let total = if negative == other { big + small } else { big - small };
    if total == 0 {
        return (signed(f, zero_sign(negative, other, r), 0), Flags::NONE);
    }
    let up = total.leading_zeros();
    round(f, negative, exponent + 1 - up as i32, total << up, r)
}
