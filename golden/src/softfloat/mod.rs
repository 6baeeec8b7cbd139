//! IEEE 754-2019 binary arithmetic on bit patterns, by integers alone: the floating-point references' only means.
//!
//! A number is its interchange encoding in the low bits of a `u64`. Every operation is correctly rounded in the
//! asked direction and returns the exceptions that it raises.
//!
//! Choices where the standard leaves one:
//! - Every NaN result is the one canonical quiet NaN: sign clear, only the top fraction bit set (IEEE 754 §6.2.3 lets
//!   an implementation choose). A signalling operand raises invalid, a quiet one does not.
//! - Tininess is detected after rounding (§7.5), as on x86: a result is tiny when, rounded with an unbounded exponent,
//!   it lies strictly between ±2^emin. Underflow is raised when it is tiny *and* inexact.
//! - `fma` of 0 × ∞ raises invalid even when the addend is a quiet NaN (§7.2 leaves it open; x86 does not,
//!   Arm does).
//! - Conversion to an integer outside its range clamps to the nearer end and NaN gives 0, with invalid (§5.8 leaves the
//!   value open; this is the rule of Rust's casts and of Arm).

mod add;
mod convert;
mod divide;
pub mod extended;
mod multiply;
mod parts;

use std::ops::BitOr;

pub use add::{add, sub};
pub use convert::{convert, from_int, from_uint, to_i32, to_i64, to_u32, to_u64};
pub use divide::{div, sqrt};
pub use multiply::{fma, mul};

use parts::{Number, unpack};

/// An interchange format: one sign bit, then the exponent's, then the fraction's bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Format {
    /// Width of the biased exponent.
    pub exponent_bits: u32,
    /// Width of the fraction, without the implicit leading bit. At most 52.
    pub fraction_bits: u32,
}

impl Format {
    /// binary16, IEEE 754-2019 table 3.5.
    pub const F16: Format = Format { exponent_bits: 5, fraction_bits: 10 };
    /// The upper half of a binary32.
    pub const BF16: Format = Format { exponent_bits: 8, fraction_bits: 7 };
    /// binary32.
    pub const F32: Format = Format { exponent_bits: 8, fraction_bits: 23 };
    /// binary64.
    pub const F64: Format = Format { exponent_bits: 11, fraction_bits: 52 };

    /// The largest exponent of a finite number, and the bias.
    #[inline]
    pub const fn emax(self) -> i32 {
        (1 << (self.exponent_bits - 1)) - 1
    }

    /// The exponent of the smallest normal number.
    #[inline]
    pub const fn emin(self) -> i32 {
        1 - self.emax()
    }

    /// The bit that holds the sign.
    #[inline]
    pub const fn sign_bit(self) -> u64 {
        1 << (self.exponent_bits + self.fraction_bits)
    }

    /// Positive infinity.
    #[inline]
    pub const fn infinity(self) -> u64 {
        self.sign_bit() - (1 << self.fraction_bits)
    }

    /// The canonical quiet NaN.
    #[inline]
    pub const fn nan(self) -> u64 {
        self.infinity() | 1 << (self.fraction_bits - 1)
    }

    /// The largest finite number.
    #[inline]
    pub const fn largest(self) -> u64 {
        self.infinity() - 1
    }
}

/// Rounding-direction attributes of IEEE 754-2019 §4.3.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Round {
    /// roundTiesToEven.
    NearestEven,
    /// roundTowardZero.
    TowardZero,
    /// roundTowardPositive.
    Up,
    /// roundTowardNegative.
    Down,
}

impl Round {
    /// All four.
    pub const ALL: [Round; 4] = [Round::NearestEven, Round::TowardZero, Round::Up, Round::Down];
}

/// The exceptions that an operation raised (IEEE 754-2019 §7).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Flags(pub u8);

impl Flags {
    /// No exception.
    pub const NONE: Flags = Flags(0);
    /// Invalid operation.
    pub const INVALID: Flags = Flags(1);
    /// Finite nonzero divided by zero.
    pub const DIVIDE_BY_ZERO: Flags = Flags(2);
    /// Overflow; inexact comes with it.
    pub const OVERFLOW: Flags = Flags(4);
    /// Tiny after rounding, and inexact.
    pub const UNDERFLOW: Flags = Flags(8);
    /// The result differs from the exact one.
    pub const INEXACT: Flags = Flags(16);

    /// Whether every flag of `other` is raised here.
    pub fn contains(self, other: Flags) -> bool {
        self.0 & other.0 == other.0
    }
}

impl BitOr for Flags {
    type Output = Flags;
    fn bitor(self, other: Flags) -> Flags {
        Flags(self.0 | other.0)
    }
}

/// The operand with its sign bit inverted; NaN too (§5.5.1, no exception).
#[inline]
pub fn negate(f: Format, a: u64) -> u64 {
    a ^ f.sign_bit()
}

/// a < b; false when either is NaN (flags are not reported).
pub fn less(f: Format, a: u64, b: u64) -> bool {
    !is_nan(f, a) && !is_nan(f, b) && order(f, a) < order(f, b)
}

/// a = b, with −0 = +0; false when either is NaN.
pub fn equal(f: Format, a: u64, b: u64) -> bool {
    !is_nan(f, a) && !is_nan(f, b) && order(f, a) == order(f, b)
}

/// Whether the encoding is a NaN, quiet or signalling.
pub fn is_nan(f: Format, a: u64) -> bool {
    matches!(unpack(f, a).1, Number::Nan { .. })
}

/// Sign and magnitude as one signed integer: encodings of one sign are ordered like their values.
fn order(f: Format, a: u64) -> i64 {
    let magnitude = (a & (f.sign_bit() - 1)) as i64;
    if a & f.sign_bit() == 0 { magnitude } else { -magnitude }
}
