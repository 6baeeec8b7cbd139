//! Taking encodings apart, and the one place that rounds.

use super::{Flags, Format, Round};

/// What an encoding says, its sign aside.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Number {
    Zero,
    /// significand · 2^(exponent − 63), significand in [2^63, 2^64).
    Finite {
        exponent: i32,
        significand: u64,
    },
    Infinite,
    Nan {
        signalling: bool,
    },
}

/// Sign (true: negative) and number of an encoding; bits above the format's are ignored.
#[inline(always)]
pub(super) fn unpack(f: Format, a: u64) -> (bool, Number) {
    let fraction = a & ((1 << f.fraction_bits) - 1);
    let biased = (a >> f.fraction_bits) & ((1 << f.exponent_bits) - 1);
    let negative = a & f.sign_bit() != 0;
    let number = if biased == (1 << f.exponent_bits) - 1 {
        if fraction == 0 {
            Number::Infinite
        } else {
            Number::Nan { signalling: fraction >> (f.fraction_bits - 1) == 0 }
        }
    } else if biased != 0 {
        let significand = (1 << 63) | fraction << (63 - f.fraction_bits);
        Number::Finite { exponent: biased as i32 - f.emax(), significand }
    } else if fraction == 0 {
        Number::Zero
    } else {
        // fraction · 2^(emin − fraction_bits), its leading one brought up to bit 63
        let up = fraction.leading_zeros();
        let exponent = f.emin() - f.fraction_bits as i32 + 63 - up as i32;
        Number::Finite { exponent, significand: fraction << up }
    };
    (negative, number)
}

/// A zero, infinity or other magnitude with its sign.
#[inline(always)]
pub(super) fn signed(f: Format, negative: bool, magnitude: u64) -> u64 {
    if negative { magnitude | f.sign_bit() } else { magnitude }
}

/// The answer to any operation with a NaN operand: the canonical NaN, invalid if one of them signals.
#[inline(never)]
pub(super) fn nan_of(f: Format, operands: &[Number]) -> (u64, Flags) {
    let signals = operands.contains(&Number::Nan { signalling: true });
    (f.nan(), if signals { Flags::INVALID } else { Flags::NONE })
}

/// The answer to an operation without a meaning, e.g. ∞ − ∞.
pub(super) fn invalid(f: Format) -> (u64, Flags) {
    (f.nan(), Flags::INVALID)
}

/// x / 2^by, with every bit shifted out remembered in the lowest bit ("sticky").
#[inline(always)]
pub(super) fn shift_right_sticky(x: u64, by: u32) -> u64 {
    if by == 0 {
        x
    } else if by < 64 {
        x >> by | u64::from(x << (64 - by) != 0)
    } else {
        u64::from(x != 0)
    }
}

/// [`shift_right_sticky`] for the wide products.
#[inline(always)]
pub(super) fn shift_right_sticky_wide(x: u128, by: u32) -> u128 {
    if by == 0 {
        x
    } else if by < 128 {
        x >> by | u128::from(x << (128 - by) != 0)
    } else {
        u128::from(x != 0)
    }
}

/// What to add below the last place kept, so that cutting the `drop` bits off rounds in the asked direction.
#[inline(always)]
fn increment(significand: u64, drop: u32, negative: bool, r: Round) -> u64 {
    let all = (1u64 << drop) - 1;
    match r {
        // half of the last place, less one where the last place kept is even: ties then stay
        Round::NearestEven => (all >> 1) + (significand >> drop & 1),
        Round::TowardZero => 0,
        Round::Up => all * u64::from(!negative),
        Round::Down => all * u64::from(negative),
    }
}

/// Rounds ±significand · 2^(exponent − 63) into the format.
///
/// The significand has its leading one at bit 63; its lowest bit may stand for any non-zero remainder below it.
/// At least eleven bits lie below the last place of every format, so that the remainder never is a rounding bit.
#[inline(always)]
pub(super) fn round(f: Format, negative: bool, exponent: i32, significand: u64, r: Round) -> (u64, Flags) {
    debug_assert!(significand >> 63 == 1);
    let drop = 63 - f.fraction_bits;
    let mask = (1u64 << drop) - 1;
    if exponent < f.emin() {
        return round_subnormal(f, negative, exponent, significand, r);
    }
    let (sum, carry) = significand.overflowing_add(increment(significand, drop, negative, r));
    // a carry leaves less than one last place in the word: the fraction is zero already, only the exponent moves
    let exponent = exponent + i32::from(carry);
    if exponent > f.emax() {
        let away = match r {
            Round::NearestEven => true,
            Round::TowardZero => false,
            Round::Up => !negative,
            Round::Down => negative,
        };
        let magnitude = if away { f.infinity() } else { f.largest() };
        return (signed(f, negative, magnitude), Flags::OVERFLOW | Flags::INEXACT);
    }
    let fraction = (sum << 1) >> (64 - f.fraction_bits);
    let magnitude = ((exponent + f.emax()) as u64) << f.fraction_bits | fraction;
    let flags = if significand & mask == 0 { Flags::NONE } else { Flags::INEXACT };
    (signed(f, negative, magnitude), flags)
}

#[inline(never)]
fn round_subnormal(f: Format, negative: bool, exponent: i32, significand: u64, r: Round) -> (u64, Flags) {
    let drop = 63 - f.fraction_bits;
    let aligned = shift_right_sticky(significand, (f.emin() - exponent) as u32);
    // bit 63 is clear after a shift of one or more, so the sum cannot carry out of the word; reaching bit 63
    // makes the smallest normal number, whose encoding is exactly this integer
    let magnitude = (aligned + increment(aligned, drop, negative, r)) >> drop;
    let inexact = aligned & ((1u64 << drop) - 1) != 0;
    // tiny unless rounding at full precision, exponent unbounded, would have carried up to 2^emin
    let reaches =
        exponent == f.emin() - 1 && significand.checked_add(increment(significand, drop, negative, r)).is_none();
    let flags = match (inexact, reaches) {
        (false, _) => Flags::NONE,
        (true, true) => Flags::INEXACT,
        (true, false) => Flags::INEXACT | Flags::UNDERFLOW,
    };
    (signed(f, negative, magnitude), flags)
}
