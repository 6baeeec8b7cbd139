//! Multiplication, and multiplication fused with addition.

use super::add::zero_sign;
use super::parts::{Number, invalid, nan_of, round, shift_right_sticky_wide, signed, unpack};
use super::{Flags, Format, Round};

/// a · b.
#[inline]
pub fn mul(f: Format, a: u64, b: u64, r: Round) -> (u64, Flags) {
    use Number::{Finite, Infinite, Nan, Zero};
    let ((a_negative, x), (b_negative, y)) = (unpack(f, a), unpack(f, b));
    let negative = a_negative != b_negative;
    match (x, y) {
        (Finite { exponent: ae, significand: am }, Finite { exponent: be, significand: bm }) => {
            let product = u128::from(am) * u128::from(bm);
            narrow(f, negative, ae + be + 1, product, r)
        }
        (Nan { .. }, _) | (_, Nan { .. }) => nan_of(f, &[x, y]),
        (Zero, Infinite) | (Infinite, Zero) => invalid(f),
        (Infinite, _) | (_, Infinite) => (signed(f, negative, f.infinity()), Flags::NONE),
        (Zero, _) | (_, Zero) => (signed(f, negative, 0), Flags::NONE),
    }
}

/// a · b + c, rounded once.
#[inline]
pub fn fma(f: Format, a: u64, b: u64, c: u64, r: Round) -> (u64, Flags) {
    use Number::{Finite, Infinite, Nan, Zero};
    let ((a_negative, x), (b_negative, y), (c_negative, z)) = (unpack(f, a), unpack(f, b), unpack(f, c));
    let negative = a_negative != b_negative;
    match (x, y, z) {
        (
            Finite { exponent: ae, significand: am },
            Finite { exponent: be, significand: bm },
            Finite { exponent: ce, significand: cm },
        ) => {
            let product = (negative, ae + be + 1, u128::from(am) * u128::from(bm));
            sum(f, product, (c_negative, ce, u128::from(cm) << 64), r)
        }
        (Zero, Infinite, _) | (Infinite, Zero, _) => invalid(f),
        (Nan { .. }, _, _) | (_, Nan { .. }, _) | (_, _, Nan { .. }) => nan_of(f, &[x, y, z]),
        (Infinite, _, Infinite) | (_, Infinite, Infinite) if negative != c_negative => invalid(f),
        (Infinite, _, _) | (_, Infinite, _) => (signed(f, negative, f.infinity()), Flags::NONE),
        (_, _, Infinite) => (signed(f, c_negative, f.infinity()), Flags::NONE),
        (Finite { .. }, Finite { .. }, Zero) => mul(f, a, b, r),
        (_, _, Finite { .. }) => (c & (f.sign_bit() | (f.sign_bit() - 1)), Flags::NONE),
        (_, _, Zero) => (signed(f, zero_sign(negative, c_negative, r), 0), Flags::NONE),
    }
}

/// ± significand · 2^(exponent − 127); the leading one at bit 127 or 126 for products, anywhere for sums.
type Wide = (bool, i32, u128);

#[inline(always)]
fn sum(f: Format, p: Wide, c: Wide, r: Round) -> (u64, Flags) {
    let p = normal(p);
    let (big, small) = if (p.1, p.2) < (c.1, c.2) { (c, p) } else { (p, c) };
    // one bit of head room. A product has 106 significant bits at most, so 21 zeros below; when bits are lost the
    // exponents differ by far more than one and cancellation costs one leading place at most.
    let low = shift_right_sticky_wide(small.2 >> 1, (big.1 - small.1) as u32);
    let high = big.2 >> 1;
    let total = if big.0 == small.0 { high + low } else { high - low };
    if total == 0 {
        return (signed(f, zero_sign(p.0, c.0, r), 0), Flags::NONE);
    }
    narrow(f, big.0, big.1 + 1, total, r)
}

#[inline(always)]
fn normal((negative, exponent, significand): Wide) -> Wide {
    let up = significand.leading_zeros();
    (negative, exponent - up as i32, significand << up)
}

/// Rounds a non-zero wide significand.
#[inline(always)]
fn narrow(f: Format, negative: bool, exponent: i32, significand: u128, r: Round) -> (u64, Flags) {
    let (negative, exponent, significand) = normal((negative, exponent, significand));
    let high = (significand >> 64) as u64 | u64::from(significand as u64 != 0);
    round(f, negative, exponent, high, r)
}
