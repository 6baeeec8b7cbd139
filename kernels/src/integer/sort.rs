//! `integer.sort`: 512 records of key and payload, sorted in three ways from the same start.
//!
//! 1. By merging: blocks of 2, 4, … 512 records, each out of two sorted halves; the left record goes first where keys are
//!    equal, so the order is stable. Branches depend on the data.
//! 2. By counting (radix sort): eight passes over the keys' bytes, the lowest first, each stable.
//! 3. By a network without branches: K. Batcher's merge exchange (D. Knuth, The Art of Computer Programming vol. 3, §5.2.2,
//!    algorithm M), records ordered by key and then payload. For p = 256, 128 … 1: first d = p, r = 0; then for
//!    q = 256, 128 … while q > p: d = q − p, r = p. In each of these rounds records i and i + d are compared for all i, from 0
//!    upwards, with i + d < 512 and (i and p) = r.
//!
//! A merge that goes wrong leaves two records in an order that no later one mends, but a pass by a higher byte mends the order
//! that a lower one has spoilt, and a comparator may mend what another did. So the payloads' order after every pass is put
//! out, and every comparator's outcome goes into h ← 3h + (1 if the records change places), mod 2⁶⁴.
//!
//! A digest of a row of words has four sums, all 0 at first; word i goes into sum i mod 4:
//! s ← rotl(s + w, 29)·0x9e3779b97f4a7c15. A record is its payload, then its key.
//!
//! Operands, in stream order, for each record: w and the payload. The key is w, or w with all but the 7 highest bits cleared if
//! w mod 4 = 0. Output: digests of the records with blocks of 16 and of 512 merged; of the payloads after each pass, of the keys
//! after the last; of the records after the network; h.

use super::common_sort::{Exchange, OneByOne};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const COUNT: usize = 512;
const LEVELS: u32 = COUNT.ilog2();
const PASSES: usize = 8;
/// Levels after which merged blocks are put out.
const SHOWN: [u32; 2] = [4, LEVELS];
const SUMS: usize = 4;
/// 2⁶⁴ divided by the golden ratio: odd, with its ones spread.
const SPREAD: u64 = 0x9e37_79b9_7f4a_7c15;

/// A key in the high half, its payload in the low half.
pub(super) type Record = u128;
type Records = [Record; COUNT];

/// See the file's head.
pub struct Sort;

impl Kernel for Sort {
    fn id(&self) -> &'static str {
        "integer.sort"
    }

    fn summary(&self) -> &'static str {
        "branches, comparisons and moves: records sorted by merging, by counting and by a network"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(8)]
    }

    fn output_words(&self, _size: Size) -> usize {
        SUMS * (SHOWN.len() + PASSES + 2) + 1
    }

    fn work(&self, _size: Size) -> Work {
        let (count, levels) = (COUNT as u64, u64::from(LEVELS));
        // comparators of merge exchange: Knuth, the same section, exercise 14
        let network = (levels * levels - levels + 4) * (count / 4) - 1;
        Work { amount: count * (levels + PASSES as u64) + network, unit: "placing" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["sbb", "cmov"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi1, Feature::Bmi2],
                    marks: &["vpcmpgtq", "vpcmpeqq", "vblendv", "vmovmskpd"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["sbcs", "csel"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let records = Box::new(std::array::from_fn(|_| {
            let (w, payload) = (operands.word(), operands.word());
            let key = if w % 4 == 0 { w >> 57 << 57 } else { w };
            u128::from(key) << 64 | u128::from(payload)
        }));
        operands.finish(2 * COUNT);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        let spare = [Box::new([0; COUNT]), Box::new([0; COUNT])];
        Roles::One(Box::new(Ground { records, spare, run }))
    }
}

struct Ground {
    records: Box<Records>,
    spare: [Box<Records>; 2],
    run: fn(&Records, [&mut Records; 2], &mut [u64]),
}

impl Ready for Ground {
    fn run(&mut self, out: &mut [u64]) {
        let [first, second] = &mut self.spare;
        (self.run)(&self.records, [first, second], out);
    }
}

fn key(record: Record) -> u64 {
    (record >> 64) as u64
}

/// Digest of rows of four words.
#[inline(always)]
fn digest(rows: impl Iterator<Item = [u64; SUMS]>) -> [u64; SUMS] {
    let mut sums = [0u64; SUMS];
    for row in rows {
        for (s, w) in sums.iter_mut().zip(row) {
            *s = s.wrapping_add(w).rotate_left(29).wrapping_mul(SPREAD);
        }
    }
    sums
}

#[inline(always)]
fn digest_records(records: &Records) -> [u64; SUMS] {
    digest(records.as_chunks::<2>().0.iter().map(|[a, b]| [*a as u64, key(*a), *b as u64, key(*b)]))
}

#[inline(always)]
fn digest_words(records: &Records, word: impl Fn(Record) -> u64) -> [u64; SUMS] {
    digest(records.as_chunks::<4>().0.iter().map(|four| four.map(&word)))
}

/// Merges the two sorted halves of `from` into `to`, which is as long.
#[inline(always)]
fn merge(from: &[Record], to: &mut [Record]) {
    let (mut left, mut right) = from.split_at(from.len() / 2);
    for place in to {
        let take_left = match (left.first(), right.first()) {
            (Some(a), Some(b)) => key(*a) <= key(*b),
            (a, _) => a.is_some(),
        };
        let source = if take_left { &mut left } else { &mut right };
        let Some((first, rest)) = source.split_first() else { return };
        *place = *first;
        *source = rest;
    }
}

/// One stable pass by the byte of the keys at bit `shift`.
#[inline(always)]
fn pass(from: &Records, to: &mut Records, shift: usize) {
    let digit = |record: Record| usize::from((key(record) >> shift) as u8);
    let mut ends = [0u32; 256];
    for record in from {
        ends[digit(*record)] += 1;
    }
    let mut end = 0;
    for e in &mut ends {
        end += *e;
        *e = end;
    }
    // from the last record to the first, as places are counted down
    for record in from.iter().rev() {
        let e = &mut ends[digit(*record)];
        *e = e.wrapping_sub(1);
        to[*e as usize % COUNT] = *record;
    }
}

/// One round of the network. No closure: it would not have the features of the function that it is written in.
#[inline(always)]
fn round<E: Exchange>(records: &mut Records, [p, d, r]: [usize; 3], mut h: u64) -> u64 {
    for start in (r..COUNT - d).step_by(2 * p) {
        let length = p.min(COUNT - d - start);
        // d >= p keeps the first of one pair apart from the second of another
        let (low, high) = records.split_at_mut(start + d);
        h = E::pairs(&mut low[start..start + length], &mut high[..length], h);
    }
    h
}

/// The network; the hash of its comparators' outcomes.
#[inline(always)]
fn network<E: Exchange>(records: &mut Records) -> u64 {
    let mut h = 0;
    let mut p = COUNT / 2;
    while p > 0 {
        h = round::<E>(records, [p, p, 0], h);
        let mut q = COUNT / 2;
        while q > p {
            h = round::<E>(records, [p, q - p, p], h);
            q /= 2;
        }
        p /= 2;
    }
    h
}

#[inline(always)]
fn body<E: Exchange>(records: &Records, [mut one, mut two]: [&mut Records; 2], out: &mut [u64]) {
    let (digests, h) = out.as_chunks_mut::<SUMS>();
    let mut digests = digests.iter_mut();
    let mut show = |digest| {
        if let Some(place) = digests.next() {
            *place = digest;
        }
    };
    *one = *records;
    for level in 1..=LEVELS {
        let size = 1 << level;
        for (from, to) in one.chunks_exact(size).zip(two.chunks_exact_mut(size)) {
            merge(from, to);
        }
        std::mem::swap(&mut one, &mut two);
        if SHOWN.contains(&level) {
            show(digest_records(one));
        }
    }
    *one = *records;
    for number in 0..PASSES {
        pass(one, two, 8 * number);
        std::mem::swap(&mut one, &mut two);
        show(digest_words(one, |record| record as u64));
    }
    show(digest_words(one, key));
    *one = *records;
    h[0] = network::<E>(one);
    show(digest_records(one));
}

#[inline(never)]
fn portable(records: &Records, spare: [&mut Records; 2], out: &mut [u64]) {
    body::<OneByOne>(records, spare, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi1,bmi2")]
fn avx2(records: &Records, spare: [&mut Records; 2], out: &mut [u64]) {
    body::<super::common_sort::InPairs>(records, spare, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(records: &Records, spare: [&mut Records; 2], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when its features are present
    unsafe { avx2(records, spare, out) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sorted<E: Exchange>(records: &Records) -> (Records, u64) {
        let mut copy = *records;
        let h = network::<E>(&mut copy);
        (copy, h)
    }

    /// The zero-one principle (Knuth, §5.2.2, theorem Z), as far as 512 patterns go, against the library's sort.
    #[test]
    fn the_network_sorts_ones_and_zeros_and_the_vectors_agree() {
        let mut state = 1u64;
        for ones in 0..COUNT {
            let records: Records = std::array::from_fn(|_| {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                // equal keys with payloads of either half of the range, so that all of the comparison is asked
                let bit = u128::from((state >> 40) as usize % COUNT < ones);
                if ones % 2 == 0 { bit << 127 | 1 << 63 } else { 1 << 127 | bit << 63 }
            });
            let mut right = records;
            right.sort_unstable();
            let (made, h) = sorted::<OneByOne>(&records);
            assert_eq!(made, right);
            #[cfg(target_arch = "x86_64")]
            if crate::isa::Feature::Avx2.present() {
                assert_eq!(sorted::<super::super::common_sort::InPairs>(&records), (made, h));
            }
        }
    }
}
