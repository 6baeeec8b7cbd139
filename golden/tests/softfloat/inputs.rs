//! Encodings where rounding goes wrong first: ends of the exponent range, runs of ones, near-equal partners, specials.

use golden::softfloat::Format;

/// splitmix64 (Steele, Lea, Flood 2014).
pub struct Mix(pub u64);

impl Mix {
    pub fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    pub fn below(&mut self, n: u64) -> u64 {
        self.next() % n
    }

    /// Few-bit fractions, runs of ones and plain noise in turn.
    fn fraction(&mut self, f: Format) -> u64 {
        let mask = (1u64 << f.fraction_bits) - 1;
        let at = |m: &mut Mix| 1u64 << m.below(u64::from(f.fraction_bits) + 1);
        mask & match self.below(6) {
            0 => at(self) - 1,
            1 => !(at(self) - 1),
            2 => at(self) | at(self),
            3 => mask ^ at(self),
            _ => self.next(),
        }
    }

    /// One operand; every exponent can occur, the ends of the range often.
    pub fn operand(&mut self, f: Format) -> u64 {
        let top = (1u64 << f.exponent_bits) - 1;
        let exponent = match self.below(8) {
            0 => 0,
            1 => 1 + self.below(3),
            2 => top - self.below(3),
            3 => f.emax() as u64 - 2 + self.below(5),
            // products and quotients of two of these land at the ends
            4 => (f.emax() as u64 / 2 + self.below(u64::from(f.fraction_bits) * 2)) % top,
            5 => (f.emax() as u64 * 3 / 2 + self.below(u64::from(f.fraction_bits))) % top,
            _ => self.below(top),
        };
        let sign = if self.next() & 1 == 0 { 0 } else { f.sign_bit() };
        sign | exponent << f.fraction_bits | self.fraction(f)
    }

    /// A second operand, often close to `near` in exponent or value, so that sums cancel or round by a sticky bit.
    pub fn partner(&mut self, f: Format, near: u64) -> u64 {
        let mask = f.sign_bit() | (f.sign_bit() - 1);
        match self.below(4) {
            0 => {
                let steps = self.below(2 * u64::from(f.fraction_bits) + 6) << f.fraction_bits;
                (near.wrapping_sub(steps) ^ self.fraction(f) ^ (self.next() & f.sign_bit())) & mask
            }
            1 => (near ^ f.sign_bit()).wrapping_add(self.below(5)).wrapping_sub(2) & mask,
            _ => self.operand(f),
        }
    }
}
