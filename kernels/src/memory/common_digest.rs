//! Digest of a sequence of lines, lane by lane: for each line v in the order of reading u = v ⊕ (v >> 32), a ← a + u,
//! b ← b + a mod 2⁶⁴; at the end one word a lane, a + F · b mod 2⁶⁴ with the odd constant F.
//!
//! b weights u by its distance from the end. All steps are bijections, so one wrong word always changes a for good. A flipped
//! bit k ≥ 32 changes u by ±2^k ± 2^(k−32), one below by ±2^k; two flips that cancel in a are flips of the same bit, and then b
//! differs, in its low bits, by their distance times 2^(k mod 32): never 0 for less than 2³² lines. Without u the flips of the
//! top bits would be lost beyond 2⁶⁴. The differences of a and b, where they are known, give the place of a single wrong word.
//! What may pass: two lines an even distance apart, in both of which bits k and k − 32 are flipped together (k near 63).

use super::common_lanes::Lanes;

/// The odd constant F.
const F: u64 = 0xa24b_aed4_963e_e407;

/// A digest in registers.
#[derive(Clone, Copy)]
pub struct Digest<L: Lanes> {
    lanes: L,
    a: L::V,
    b: L::V,
}

impl<L: Lanes> Digest<L> {
    /// Starts with a as given, b zero.
    #[inline(always)]
    pub fn new(lanes: L, a: [u64; 8]) -> Digest<L> {
        Digest { lanes, a: lanes.of(a), b: lanes.of([0; 8]) }
    }

    /// Takes one line in.
    #[inline(always)]
    pub fn push(&mut self, v: L::V) {
        self.a = self.lanes.add(self.a, self.lanes.fold(v));
        self.b = self.lanes.add(self.b, self.a);
    }

    /// One word a lane.
    #[inline(always)]
    pub fn finish(self) -> [u64; 8] {
        let (a, b) = (self.lanes.words(self.a), self.lanes.words(self.b));
        std::array::from_fn(|l| a[l].wrapping_add(b[l].wrapping_mul(F)))
    }
}

#[cfg(test)]
mod tests {
    use super::super::common_lanes::Words;
    use super::*;

    fn of(lines: &[[u64; 8]]) -> [u64; 8] {
        let mut digest = Digest::new(Words, [3; 8]);
        lines.iter().for_each(|v| digest.push(*v));
        digest.finish()
    }

    #[test]
    fn equal_and_opposite_flips_at_every_distance_show() {
        let lines: Vec<[u64; 8]> = (0..40u64).map(|i| [i.wrapping_mul(0x9e37_79b9_7f4a_7c15); 8]).collect();
        let right = of(&lines);
        for bit in 0..64 {
            for i in 0..40 {
                for j in i..40 {
                    let mut bad = lines.clone();
                    bad[i][0] ^= 1 << bit;
                    if j != i {
                        bad[j][0] ^= 1 << bit;
                    }
                    let wrong = of(&bad);
                    assert_ne!(wrong[0], right[0], "bit {bit} of lines {i} and {j}");
                    assert_eq!(wrong[1..], right[1..], "other lanes stay as they are");
                }
            }
        }
    }
}
