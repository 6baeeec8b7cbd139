//! `integer.sort`: states of the merging and counting sorts from the library's stable sort alone; the network on ranks, in rounds
//! over all places.

use kernels::Case;

use crate::reference::chacha::Stream;

const COUNT: usize = 512;

type Record = (u64, u64);

fn digest(words: impl Iterator<Item = u64>) -> [u64; 4] {
    let mut sums = [0u64; 4];
    for (i, w) in words.enumerate() {
        let s = sums[i % 4].wrapping_add(w);
        sums[i % 4] = s.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    }
    sums
}

fn digest_records(records: &[Record]) -> [u64; 4] {
    digest(records.iter().flat_map(|(key, payload)| [*payload, *key]))
}

/// Distances and parities of all rounds: i meets i + d where (i and p) = r.
fn rounds() -> Vec<(usize, usize, usize)> {
    let powers = || (0..9).rev().map(|e| 1usize << e);
    let merges = |p| powers().filter(move |q| *q > p).map(move |q| (p, q - p, p));
    powers().flat_map(|p| std::iter::once((p, p, 0)).chain(merges(p))).collect()
}

/// The hash of the outcomes of all comparators.
fn outcomes(records: &[Record]) -> u64 {
    // a record's rank is the number of records before it; payloads differ, or the records are the same in every respect
    let mut ranks: Vec<usize> = records.iter().map(|r| records.iter().filter(|other| *other < r).count()).collect();
    let mut h = 0u64;
    for (p, d, r) in rounds() {
        let before = ranks.clone();
        for i in (0..COUNT - d).filter(|i| i & p == r) {
            let change = before[i] > before[i + d];
            if change {
                ranks[i] = before[i + d];
                ranks[i + d] = before[i];
            }
            h = h.wrapping_mul(3).wrapping_add(u64::from(change));
        }
    }
    assert!(ranks.is_sorted(), "merge exchange sorts");
    h
}

/// Digests of the merged blocks, of every pass, of the network's result, and its outcomes.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let records: Vec<Record> = (0..COUNT)
        .map(|_| {
            let (w, payload) = (stream.word(), stream.word());
            (if w & 3 == 0 { w & 0xfe00_0000_0000_0000 } else { w }, payload)
        })
        .collect();
    let mut out = Vec::new();
    for block in [16, COUNT] {
        let mut merged = records.clone();
        merged.chunks_mut(block).for_each(|block| block.sort_by_key(|r| r.0));
        out.extend(digest_records(&merged));
    }
    let mut passed = records.clone();
    for pass in 1..=8 {
        passed = records.clone();
        passed.sort_by_key(|r| u128::from(r.0) % (1 << (8 * pass)));
        out.extend(digest(passed.iter().map(|r| r.1)));
    }
    out.extend(digest(passed.iter().map(|r| r.0)));
    let mut whole = records.clone();
    whole.sort_unstable();
    out.extend(digest_records(&whole));
    out.push(outcomes(&records));
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Knuth, The Art of Computer Programming vol. 3, §5.2.2, exercise 14: (t² − t + 4)·2ᵗ⁻² − 1 comparators for 2ᵗ records.
    #[test]
    fn number_of_comparators() {
        let comparators: usize = rounds().iter().map(|(p, d, r)| (0..COUNT - d).filter(|i| i & p == *r).count()).sum();
        assert_eq!(comparators, (81 - 9 + 4) * 128 - 1);
    }
}
