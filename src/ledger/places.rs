//! Where in a vector wrong words lie: the index of a wrong word folded by the width of a datapath.
//!
//! Hardware does a wider vector in several goes, so a faulty part of a datapath of 256 bits shows at words 1, 5, 9 and so on.
//! The numbers here are of failing cases, each counted once at its first mismatch that can be placed: repeats of one case
//! are no news about the place. Only mismatches whose wrong words are all on record are placed, and only where the
//! output is a whole number of such vectors, so that every lane has the same share of it.

use std::collections::BTreeSet;

/// Widths of datapaths that are looked at, in bits.
pub const WIDTHS: [usize; 3] = [128, 256, 512];
/// Sizes of lanes, in bits. Lanes of 32 bits need every wrong word's flips to lie within one half.
pub const LANES: [usize; 2] = [64, 32];

/// The failing cases at one width and lane size.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place {
    /// Bits of the datapath.
    pub width: usize,
    /// Bits of a lane.
    pub lane: usize,
    /// Cases with one wrong lane, by lane.
    pub one: Vec<u64>,
    /// Cases with several wrong lanes next to each other.
    pub adjacent: u64,
    /// Cases with several others.
    pub scattered: u64,
}

/// All widths and lane sizes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Places {
    /// Cases that were placed.
    pub cases: u64,
    /// See there.
    pub places: Vec<Place>,
}

impl Default for Places {
    fn default() -> Places {
        let all = WIDTHS.iter().flat_map(|&width| LANES.map(|lane| (width, lane)));
        let empty = |(width, lane)| Place { width, lane, one: vec![0; width / lane], adjacent: 0, scattered: 0 };
        Places { cases: 0, places: all.map(empty).collect() }
    }
}

impl Places {
    /// Takes the wrong words of one output, index and XOR each; `output` is its length in words.
    pub fn add(&mut self, words: &[(u64, u64)], output: u64) {
        let halves = words.iter().all(|(_, xor)| half(*xor).is_some());
        let mut placed = false;
        for place in &mut self.places {
            let row = (place.width / 64) as u64;
            if !output.is_multiple_of(row) || words.is_empty() || (place.lane == 32 && !halves) {
                continue;
            }
            placed = true;
            let lane = |(index, xor): &(u64, u64)| {
                let word = index % row;
                if place.lane == 64 { word } else { 2 * word + u64::from(half(*xor).unwrap_or(0)) }
            };
            let lanes: BTreeSet<u64> = words.iter().map(lane).collect();
            match (lanes.first(), lanes.last()) {
                (Some(first), Some(_)) if lanes.len() == 1 => place.one[*first as usize] += 1,
                (Some(first), Some(last)) if last - first + 1 == lanes.len() as u64 => place.adjacent += 1,
                _ => place.scattered += 1,
            }
        }
        self.cases += u64::from(placed);
    }
}

/// Which half of the word all flips lie in, if in one: 0 the low one.
pub fn half(xor: u64) -> Option<u32> {
    match (xor as u32, xor >> 32) {
        (0, 0) => None,
        (_, 0) => Some(0),
        (0, _) => Some(1),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn place(places: &Places, width: usize, lane: usize) -> &Place {
        places.places.iter().find(|p| (p.width, p.lane) == (width, lane)).expect("looked at")
    }

    /// Words 1 and 5, high halves: 32-bit lanes 3 and 11 of 512 bits, which are one lane of 256.
    #[test]
    fn lanes_fold_by_the_width() {
        let mut places = Places::default();
        places.add(&[(1, 0x3fc << 32), (5, 0xc04 << 32)], 8);
        assert_eq!(place(&places, 512, 32).scattered, 1);
        assert_eq!(place(&places, 256, 32).one, [0, 0, 0, 1, 0, 0, 0, 0]);
        assert_eq!(place(&places, 256, 64).one, [0, 1, 0, 0]);
        assert_eq!(place(&places, 128, 32).one, [0, 0, 0, 1]);
        places.add(&[(2, 1), (3, 1)], 8);
        assert_eq!((place(&places, 256, 64).adjacent, place(&places, 512, 64).adjacent), (1, 1));
        assert_eq!(places.cases, 2);
    }

    #[test]
    fn outputs_without_whole_vectors_and_flips_in_both_halves_are_not_placed() {
        let mut places = Places::default();
        places.add(&[(0, 1)], 5);
        places.add(&[], 8);
        assert_eq!(places, Places::default());
        places.add(&[(3, 1 | 1 << 40)], 4);
        assert_eq!(place(&places, 256, 64).one, [0, 0, 0, 1]);
        assert_eq!(place(&places, 256, 32).one, [0; 8]);
        assert_eq!(place(&places, 512, 64).one, [0; 8]);
        assert_eq!((half(0), half(1), half(1 << 63)), (None, Some(0), Some(1)));
    }
}
