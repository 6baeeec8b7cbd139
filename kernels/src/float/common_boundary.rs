//! Operands of `float.convert`: numbers on, next to and between the points where a conversion's rounding turns.
//!
//! Every number is made of two stream words, w (choices) and z (digits).
//! - `cut`: the places of the number that the target cannot hold. They become, by w bits 48–50: 0 … 0; 0 … 01;
//!   01 … 1 (just below the tie); 10 … 0 (the tie); 10 … 01 (just above); 1 … 1; else z's own. Where w bits 53–54 are
//!   zero, the places above the cut are all ones, so that rounding up carries through to the exponent.
//! - exponents: of the target's normal numbers; where w bits 56–58 are 0 or 1 of its subnormal ones and just below;
//!   where they are 2 of its overflow threshold.

/// Widths and exponent range of a format.
#[derive(Clone, Copy)]
pub struct Shape {
    fraction_bits: u32,
    emax: i64,
}

/// binary16.
pub const HALF: Shape = Shape { fraction_bits: 10, emax: 15 };
/// bfloat16.
pub const BFLOAT: Shape = Shape { fraction_bits: 7, emax: 127 };
/// binary32.
pub const SINGLE: Shape = Shape { fraction_bits: 23, emax: 127 };
/// binary64.
pub const DOUBLE: Shape = Shape { fraction_bits: 52, emax: 1023 };

fn cut_places(digits: u64, places: u32, cut: u32, w: u64) -> u64 {
    if cut == 0 {
        return digits;
    }
    let low = (1u64 << cut) - 1;
    let all = (1u64 << places) - 1;
    let above = if w >> 53 & 3 == 0 { all & !low } else { digits & !low };
    let half = 1u64 << (cut - 1);
    let below = match w >> 48 & 7 {
        0 => 0,
        1 => 1,
        2 => half - 1,
        3 => half,
        4 => half + 1,
        5 => low,
        _ => digits,
    };
    above | below & low
}

/// ±1.digits · 2^exponent in a format, cut where it is subnormal.
fn encode(shape: Shape, negative: bool, exponent: i64, digits: u64) -> u64 {
    let emin = 1 - shape.emax;
    let magnitude = if exponent < emin {
        (1 << shape.fraction_bits | digits) >> (emin - exponent)
    } else {
        ((exponent + shape.emax) as u64) << shape.fraction_bits | digits
    };
    let sign_bit = shape.fraction_bits + (2 * shape.emax as u64 + 1).count_ones();
    u64::from(negative) << sign_bit | magnitude
}

/// A number of `from` near a boundary of the narrower `to`.
pub fn narrowing(from: Shape, to: Shape, w: u64, z: u64) -> u64 {
    let emin = 1 - to.emax;
    let field = |n: i64| (w % n as u64) as i64;
    let exponent = match w >> 56 & 7 {
        0 | 1 => emin - 1 - field(i64::from(to.fraction_bits) + 2),
        2 => to.emax - 1 + field(3),
        _ => emin + field(to.emax - emin + 1),
    };
    let exponent = exponent.min(from.emax);
    let lost = (emin - exponent).max(0) as u32;
    let cut = (from.fraction_bits - to.fraction_bits + lost).min(from.fraction_bits);
    let digits = cut_places(z & ((1 << from.fraction_bits) - 1), from.fraction_bits, cut, w);
    encode(from, w >> 63 == 1, exponent, digits)
}

/// Any number of a format but NaN; infinity only where the format is binary16.
pub fn any(shape: Shape, w: u64, z: u64) -> u64 {
    let exponents = 2 * shape.emax as u64 + 1 + u64::from(shape.fraction_bits == HALF.fraction_bits);
    let biased = w % exponents;
    let fraction = if biased == 2 * shape.emax as u64 + 1 { 0 } else { z & ((1 << shape.fraction_bits) - 1) };
    let sign_bit = shape.fraction_bits + (2 * shape.emax as u64 + 1).count_ones();
    w >> 63 << sign_bit | biased << shape.fraction_bits | fraction
}

/// A binary64 with an exponent from −2 below `top`, its fraction below the unit on a boundary.
pub fn to_integer(top: u64, signed: bool, w: u64, z: u64) -> u64 {
    let exponent = (w % (top + 2)) as i64 - 2;
    let cut = (52 - exponent).clamp(0, 52) as u32;
    let digits = cut_places(z & ((1 << 52) - 1), 52, cut, w);
    encode(DOUBLE, signed && w >> 63 == 1, exponent, digits)
}

/// A magnitude of 1 to `longest` bits, those beyond the first `kept` on a boundary.
pub fn from_integer(longest: u64, kept: u32, w: u64, z: u64) -> u64 {
    let length = 1 + (w % longest) as u32;
    let places = length - 1;
    let digits = cut_places(z & ((1 << places) - 1), places, length.saturating_sub(kept), w);
    1 << places | digits
}
