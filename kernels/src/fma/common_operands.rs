//! Operands of the FMA kernels: bit patterns made from the stream by integer arithmetic alone.
//!
//! Stream order: the starts, then row by row the raw words of c, w, u, b and the exponents, a lane each. Even seeds
//! draw the *bounded* profile: everything in (−1, 1). Odd seeds draw the *full-range* profile: w lifts by 2^up and u
//! lowers by 2^(up + down), with v restoring 2^down, so that values swing over nearly the whole exponent range and the
//! scale step's addend stays comparable with its product; every fourth row goes down to where numbers are subnormal.
//! No operation overflows or gives a NaN.
//!
//! | operand | sign | bounded: significand, exponent | full range: exponent |
//! |---|---|---|---|
//! | start | random | random, −1 | the same |
//! | c | − | 7 zero bits, then random; −1 | the same |
//! | w | + | 1.1110 then random; −1 | 1.11110 then random; up |
//! | u | random | random, −1 | −1 − up − down |
//! | b | random | random, −9 | −9 − down |
//! | v | + | 1/\|u\| − 1 | 2^down / \|u\| of the bounded u |

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

/// The least swing: at 2^16 the addend of a lift changes the gain too little to leave (−1, 1).
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
        sign | (((exponent - self.least + 1) as u64) << self.fraction) + (significand - (1 << self.fraction))
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
            return (0, (reach - raw % 12) as i32);
        }
        let (low, high) = (raw & ((1 << (self.width / 2)) - 1), raw >> (self.width / 2));
        let up = SWING + low % (reach - 2 * SWING - 5);
        (up as i32, (SWING + high % (reach - SWING + 1 - up)) as i32)
    }

    /// c, w, u, b, v of one lane from its five raw words.
    pub fn row(&self, raw: [u64; 5], full_range: bool, row: usize) -> [u64; 5] {
        let [c, w, u, b, e] = raw;
        let (up, down) = self.swing(e, full_range, row);
        let lift = if up == 0 {
            self.encode(false, self.significand(w, 0b1110, 4), -1)
        } else {
            self.encode(false, self.significand(w, 0b11110, 5), up)
        };
        let scale = self.significand(u, 0, 0);
        [
            self.encode(true, self.significand(c, 0, 7), -1),
            lift,
            self.encode(self.negative(u), scale, -1 - up - down),
            self.encode(self.negative(b), self.significand(b, 0, 0), -9 - down),
            self.restore(scale, down),
        ]
    }

    /// The factor that undoes a scale by `significand` · 2^(−1 − fraction), cut, never rounded up.
    fn restore(&self, significand: u64, down: i32) -> u64 {
        let one = 1u64 << self.fraction;
        // 1/u in (1, 2] with `fraction` bits after the point; u = 1/2 itself is treated as the number above it
        let inverse = ((1u128 << (2 * self.fraction + 1)) / u128::from(significand)) as u64;
        let inverse = inverse.min(2 * one - 1);
        if down > 0 {
            return self.encode(false, inverse, down);
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
            let [c, w, u, b, v] = BINARY64.row(raw, full_range, case / 2 % 4).map(f64::from_bits);
            let narrow = raw.map(|r| r >> 32);
            let small = BINARY32.row(narrow, full_range, case / 2 % 4).map(|x| f64::from(f32::from_bits(x as u32)));
            for [c, w, u, b, v] in [[c, w, u, b, v], small] {
                assert!((-0.504..=-0.5).contains(&c), "{c}");
                // widest value after each step, from a chain in [-1, 1]
                let folded = (1.0 + c).max(-c);
                let widened = folded * (1.0 + w);
                let scaled = widened * u.abs() + b.abs();
                let restored = scaled * (1.0 + v);
                assert!(restored < 1.0, "{c} {w} {u} {b} {v} gives {restored}");
                assert!(widened.is_finite() && v.is_finite() && u.abs().is_normal());
                assert!((1.93..1.97).contains(&(u.abs() * (1.0 + w) * (1.0 + v))), "{w} {u} {v}");
                assert!(full_range || [c, w, u, b, v].iter().all(|x| x.abs() < 1.0));
            }
        }
    }
}
