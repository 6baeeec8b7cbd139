//! Operands of the FMA kernels: bit patterns made from the stream by integer arithmetic alone.
//!
//! Stream order: the starts, then row by row the raw words of c, u, b, w and the exponents, a lane each. Even seeds
//! draw the *bounded* profile: everything in (−1, 1). Odd seeds draw the *full-range* profile: v lifts by 2^up, u
//! lowers by 2^(up + down) and w lifts by 2^down, so that values swing over nearly the whole exponent range and the
//! scale step's addend stays comparable with its product; every fourth row goes down to where numbers are subnormal.
//! No operation overflows or gives a NaN.
//!
//! | operand | sign | bounded: significand, exponent | full range: exponent |
//! |---|---|---|---|
//! | start | random | random, −1 | the same |
//! | c | − | 1.1111110 then random; −2 | the same |
//! | v | + | 1/\|u\| − 1 | 2^up / \|u\| of the bounded u |
//! | u | random | random, −1 | −1 − up − down |
//! | b | random | random, −9 | −9 − down |
//! | w | + | 1.11110 then random; −1 | 1.111110 then random; down |
//!
//! With |x| ≤ 0.9971 before a fold these give at most 0.4981 after it, 0.9962 after the lift, 0.5020 after the scale and
//! 0.9961 after the widening.

/// An IEEE 754 binary format and how far the full-range profile may swing in it.
pub struct Format {
    /// Bits of the fraction field.
    pub fraction: u32,
    /// Bits of the whole format.
    pub width: u32,
    /// Exponent of the least normal number.
    pub least: i32,
}

/// binary64.
pub const BINARY64: Format = Format { fraction: 52, width: 64, least: -1022 };
/// binary32.
pub const BINARY32: Format = Format { fraction: 23, width: 32, least: -126 };

/// The least swing: from 2^16 the addend of a lift or widening changes its gain too little to leave (−1, 1).
const SWING: u64 = 16;

impl Format {
    /// ± significand · 2^(exponent − fraction), where the significand has `fraction + 1` bits; below the least normal
    /// number it is cut to a subnormal.
    fn encode(&self, negative: bool, significand: u64, exponent: i32) -> u64 {
        debug_assert_eq!(significand >> self.fraction, 1);
        let sign = u64::from(negative) << (self.width - 1);
        if exponent < self.least {
            return sign | significand >> (self.least - exponent);
        }
        let field = (exponent - self.least + 1) as u64;
        sign | field << self.fraction | (significand - (1 << self.fraction))
    }

    /// One and the raw word's low bits as fraction, the topmost `bits` of it set to those of `top`.
    fn significand(&self, raw: u64, top: u64, bits: u32) -> u64 {
        let free = self.fraction - bits;
        (1 << self.fraction) | top << free | raw & ((1 << free) - 1)
    }

    fn negative(&self, raw: u64) -> bool {
        raw >> (self.width - 1) & 1 == 1
    }

    /// A start of a chain: ± [1/2, 1).
    pub fn start(&self, raw: u64) -> u64 {
        self.encode(self.negative(raw), self.significand(raw, 0, 0), -1)
    }

    /// (up, down) of one lane.
    fn swing(&self, raw: u64, full_range: bool, row: usize) -> (i32, i32) {
        if !full_range {
            return (0, 0);
        }
        // u stays normal while up + down is at most `reach`
        let reach = (-self.least - 1) as u64;
        if row % 4 == 3 {
            return (0, (reach - raw % 4) as i32);
        }
        let (low, high) = (raw & ((1 << (self.width / 2)) - 1), raw >> (self.width / 2));
        let up = SWING + low % (reach - 2 * SWING - 5);
        (up as i32, (SWING + high % (reach - SWING + 1 - up)) as i32)
    }

    /// c, v, u, b, w of one lane from its five raw words.
    pub fn row(&self, raw: [u64; 5], full_range: bool, row: usize) -> [u64; 5] {
        let [c, u, b, w, e] = raw;
        let (up, down) = self.swing(e, full_range, row);
        let widen = if down == 0 {
            self.encode(false, self.significand(w, 0b1_1110, 5), -1)
        } else {
            self.encode(false, self.significand(w, 0b11_1110, 6), down)
        };
        let scale = self.significand(u, 0, 0);
        [
            self.encode(true, self.significand(c, 0b111_1110, 7), -2),
            self.lift(scale, up),
            self.encode(self.negative(u), scale, -1 - up - down),
            self.encode(self.negative(b), self.significand(b, 0, 0), -9 - down),
            widen,
        ]
    }

    /// The factor that undoes a scale by `significand` · 2^(−1 − fraction), cut, never rounded up.
    fn lift(&self, significand: u64, up: i32) -> u64 {
        let one = 1u64 << self.fraction;
        // 1/u in (1, 2] with `fraction` bits after the point; u = 1/2 itself is treated as the number above it
        let inverse = ((1u128 << (2 * self.fraction + 1)) / u128::from(significand)) as u64;
        let inverse = inverse.min(2 * one - 1);
        if up > 0 {
            return self.encode(false, inverse, up);
        }
        let rest = inverse - one;
        if rest == 0 {
            return 0;
        }
        let shift = self.fraction - rest.ilog2();
        self.encode(false, rest << shift, -(shift as i32))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn operands_stay_within_the_ranges_that_bound_the_chain() {
        let mut state = 1u64;
        for case in 0..200_000 {
            let raw = std::array::from_fn(|_| {
                state = state.wrapping_mul(0x5851_f42d_4c95_7f2d).wrapping_add(0x1405_7b7e_f767_814f);
                (state ^ state >> 33).wrapping_mul(0xff51_afd7_ed55_8ccd)
            });
            let full_range = case % 2 == 1;
            let wide = BINARY64.row(raw, full_range, case / 2 % 4).map(f64::from_bits);
            let narrow = BINARY32.row(raw.map(|r| r >> 32), full_range, case / 2 % 4);
            for [c, v, u, b, w] in [wide, narrow.map(|x| f64::from(f32::from_bits(x as u32)))] {
                const BOUND: f64 = 0.9971;
                // widest value after each step
                let folded = (BOUND * BOUND + c).max(-c);
                let lifted = folded * (1.0 + v);
                let scaled = lifted * u.abs() + b.abs();
                let widened = scaled * (1.0 + w);
                assert!(widened < BOUND, "{c} {v} {u} {b} {w} gives {widened}");
                assert!(lifted.is_finite() && w.is_finite() && u.abs() >= f64::MIN_POSITIVE);
                // chaos needs the whole cycle's gain near two
                assert!((1.96..1.99).contains(&((1.0 + v) * u.abs() * (1.0 + w))), "{v} {u} {w}");
                assert!(full_range || lifted < 1.0 && [c, v, u, b, w].iter().all(|x| x.abs() < 1.0));
            }
        }
    }
}
