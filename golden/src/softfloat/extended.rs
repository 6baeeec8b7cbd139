//! The x87 extended format: sign, 15 bits of exponent, 64 bits of significand with its leading one written out; results
//! rounded to 24, 53 or 64 bits by precision control (Intel SDM vol. 1 §4.2.2 and §8.1.5.2, from memory).
//!
//! Finite normal numbers and zero only: the exponents met here keep far from both ends of the range.

use super::parts::{round, shift_right_sticky_wide};
use super::{Format, Round};

/// ± significand · 2^(exponent − 63); the significand has bit 63 set, or is 0 for zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Extended {
    /// Sign bit.
    pub negative: bool,
    /// Exponent of the leading place.
    pub exponent: i32,
    /// See the type.
    pub significand: u64,
}

/// Rounding direction, and bits of the significand that results keep.
#[derive(Clone, Copy, Debug)]
pub struct Control {
    /// Rounding control.
    pub round: Round,
    /// Precision control: 24, 53 or 64.
    pub bits: u32,
}

/// Whether cutting off `rest`, of which `half` is one half of the last place kept, has to add one to it.
fn up(round: Round, negative: bool, odd: bool, rest: u128, half: u128) -> bool {
    match round {
        Round::NearestEven => rest > half || rest == half && odd,
        Round::TowardZero => false,
        Round::Up => rest != 0 && !negative,
        Round::Down => rest != 0 && negative,
    }
}

/// ± wide · 2^(exponent − 127) rounded; wide is not zero, its lowest bit may be sticky if 66 or more significant bits are there.
fn narrow(c: Control, negative: bool, exponent: i32, wide: u128) -> Extended {
    let lead = wide.leading_zeros();
    let (wide, exponent) = (wide << lead, exponent - lead as i32);
    let drop = 128 - c.bits;
    let (kept, rest) = (wide >> drop, wide & ((1 << drop) - 1));
    let kept = kept + u128::from(up(c.round, negative, kept & 1 == 1, rest, 1 << (drop - 1)));
    // a carry out leaves a power of two
    let carry = kept >> c.bits == 1;
    let significand = if carry { 1 << 63 } else { (kept as u64) << (64 - c.bits) };
    Extended { negative, exponent: exponent + i32::from(carry), significand }
}

impl Extended {
    /// Zero of this sign.
    pub fn zero(negative: bool) -> Extended {
        Extended { negative, exponent: 0, significand: 0 }
    }

    /// An integer, exactly.
    pub fn from_integer(v: i64) -> Extended {
        let size = v.unsigned_abs();
        if size == 0 {
            return Extended::zero(false);
        }
        let lead = size.leading_zeros();
        Extended { negative: v < 0, exponent: 63 - lead as i32, significand: size << lead }
    }

    /// A normal number of an interchange format, exactly.
    pub fn from_bits(f: Format, bits: u64) -> Extended {
        let biased = bits >> f.fraction_bits & ((1 << f.exponent_bits) - 1);
        let significand = 1 << 63 | (bits & ((1 << f.fraction_bits) - 1)) << (63 - f.fraction_bits);
        Extended { negative: bits & f.sign_bit() != 0, exponent: biased as i32 - f.emax(), significand }
    }

    /// Significand, then sign and biased exponent, as they lie in memory.
    pub fn words(self) -> [u64; 2] {
        let biased = if self.significand == 0 { 0 } else { (self.exponent + 16383) as u64 };
        [self.significand, biased | u64::from(self.negative) << 15]
    }

    /// −self.
    pub fn negate(self) -> Extended {
        Extended { negative: !self.negative, ..self }
    }

    fn order(self) -> (i32, u64) {
        (self.exponent, self.significand)
    }

    /// self < other, neither zero.
    pub fn less(self, other: Extended) -> bool {
        match (self.negative, other.negative) {
            (false, false) => self.order() < other.order(),
            (true, true) => self.order() > other.order(),
            (negative, _) => negative,
        }
    }

    /// self + other, neither zero and the sum not zero.
    pub fn add(self, other: Extended, c: Control) -> Extended {
        let (big, small) = if self.order() < other.order() { (other, self) } else { (self, other) };
        let high = u128::from(big.significand) << 63;
        let low = shift_right_sticky_wide(u128::from(small.significand) << 63, (big.exponent - small.exponent) as u32);
        let sum = if big.negative == small.negative { high + low } else { high - low };
        narrow(c, big.negative, big.exponent + 1, sum)
    }

    /// self · other, neither zero.
    pub fn mul(self, other: Extended, c: Control) -> Extended {
        let product = u128::from(self.significand) * u128::from(other.significand);
        narrow(c, self.negative != other.negative, self.exponent + other.exponent + 1, product)
    }

    /// self / other, neither zero.
    pub fn div(self, other: Extended, c: Control) -> Extended {
        let (a, b) = (u128::from(self.significand), u128::from(other.significand));
        let smaller = a < b;
        let numerator = a << if smaller { 64 } else { 63 };
        let (quotient, twice) = (numerator / b, 2 * (numerator % b));
        let rest = u128::from(twice >= b) << 63 | u128::from(twice != 0 && twice != b);
        let exponent = self.exponent - other.exponent - i32::from(smaller);
        narrow(c, self.negative != other.negative, exponent, quotient << 64 | rest)
    }

    /// √self of a positive number.
    pub fn sqrt(self, c: Control) -> Extended {
        // an even power of two is split off, leaving a radicand in [2^126, 2^128): its root has 64 bits
        let radicand = u128::from(self.significand) << if self.exponent % 2 == 0 { 63 } else { 64 };
        let root = radicand.isqrt();
        let beyond = radicand - root * root;
        // (root + 1/2)² = root² + root + 1/4
        let rest = u128::from(beyond > root) << 63 | u128::from(beyond != 0);
        narrow(c, false, self.exponent.div_euclid(2), root << 64 | rest)
    }

    /// The integer part in the direction, |self| < 2^64.
    fn whole(self, r: Round) -> u128 {
        if self.exponent >= 63 {
            return u128::from(self.significand) << (self.exponent - 63);
        }
        // units of 2^−64: below them lies nothing but what is sticky
        let fixed = shift_right_sticky_wide(u128::from(self.significand) << 64, (63 - self.exponent) as u32);
        let (whole, rest) = (fixed >> 64, fixed & ((1 << 64) - 1));
        whole + u128::from(up(r, self.negative, whole & 1 == 1, rest, 1 << 63))
    }

    /// To an integral value.
    pub fn integral(self, r: Round) -> Extended {
        if self.exponent >= 63 {
            return self;
        }
        let whole = self.whole(r);
        if whole == 0 {
            return Extended::zero(self.negative);
        }
        let lead = (whole as u64).leading_zeros();
        // 2^64 cannot come out: all numbers of 63 bits or more are integers
        Extended { negative: self.negative, exponent: 63 - lead as i32, significand: (whole as u64) << lead }
    }

    /// To an integer that is in range.
    pub fn to_integer(self, r: Round) -> i64 {
        let size = self.whole(r) as i64;
        if self.negative { size.wrapping_neg() } else { size }
    }

    /// In an interchange format, overflow and subnormal numbers included.
    pub fn to_bits(self, f: Format, r: Round) -> u64 {
        round(f, self.negative, self.exponent, self.significand, r).0
    }

    /// self − other·⌊self/other⌋ cut toward zero, and the quotient's lowest bits; exponents less than 64 apart, self's not
    /// below other's by more than it takes to leave self as it is.
    pub fn remainder(self, other: Extended) -> (Extended, u64) {
        let apart = self.exponent - other.exponent;
        if apart < 0 {
            return (self, 0);
        }
        let (a, b) = (u128::from(self.significand) << apart, u128::from(other.significand));
        let (quotient, rest) = (a / b, (a % b) as u64);
        if rest == 0 {
            return (Extended::zero(self.negative), quotient as u64);
        }
        let lead = rest.leading_zeros();
        let exponent = other.exponent - lead as i32;
        (Extended { negative: self.negative, exponent, significand: rest << lead }, quotient as u64)
    }
}
