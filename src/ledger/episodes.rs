//! Mismatches that lie close together are one episode: failures cluster, and a burst of a thousand says little more
//! about how often a core fails than a single one.

use serde::Serialize;

use crate::event::{FoldCheck, Slice};

/// Gap that ends an episode unless the caller says otherwise, in milliseconds.
pub const GAP_MS: u64 = 60_000;

/// A slice with wrong outputs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct BadSlice {
    /// The job.
    pub job_id: u64,
    /// Slice number within the job.
    pub slice: u64,
    /// Host clock of the first mismatch, Unix milliseconds; where only the fold was wrong, the start of the slice.
    pub first_ms: u64,
    /// Host clock of the last mismatch; where only the fold was wrong, the end of the slice.
    pub last_ms: u64,
    /// Runs of the slice.
    pub runs: u64,
    /// Processor time inside kernels.
    pub busy_ns: u64,
    /// Runs that the worker itself reported as wrong.
    pub mismatches: u64,
    /// The fold showed wrong outputs beyond these.
    pub fold_wrong: bool,
}

impl BadSlice {
    /// Of a slice with mismatches or with a wrong fold.
    pub fn of(slice: &Slice) -> BadSlice {
        let end_ms = slice.wall_ms.saturating_add(slice.span_ns / 1_000_000);
        let (first_ms, last_ms) = slice.mismatch_ms.unwrap_or((slice.wall_ms, end_ms));
        BadSlice {
            job_id: slice.job_id,
            slice: slice.slice,
            first_ms,
            last_ms,
            runs: slice.runs,
            busy_ns: slice.busy_ns,
            mismatches: slice.mismatches,
            fold_wrong: slice.fold == FoldCheck::Wrong,
        }
    }
}

/// Mismatches with no longer gap between them than the one asked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct Episode {
    /// Host clock of the first mismatch, Unix milliseconds.
    pub first_ms: u64,
    /// Host clock of the last.
    pub last_ms: u64,
    /// Wrong runs, as far as workers reported them.
    pub mismatches: u128,
    /// Slices that have a part in it.
    pub slices: u64,
}

/// Groups slices into episodes: two slices are in one episode if the time between the mismatches of the one and those
/// of the other is `gap_ms` or less, and so on along the chain. The order of the slices does not matter: the host
/// clock may have been set back meanwhile.
pub fn episodes(bad: &[BadSlice], gap_ms: u64) -> Vec<Episode> {
    let mut sorted: Vec<&BadSlice> = bad.iter().collect();
    sorted.sort_unstable_by_key(|b| (b.first_ms, b.last_ms));
    let mut found: Vec<Episode> = Vec::new();
    for slice in sorted {
        let last_ms = slice.last_ms.max(slice.first_ms);
        match found.last_mut().filter(|e| slice.first_ms.saturating_sub(e.last_ms) <= gap_ms) {
            Some(episode) => {
                episode.last_ms = episode.last_ms.max(last_ms);
                episode.mismatches += u128::from(slice.mismatches);
                episode.slices += 1;
            }
            None => found.push(Episode {
                first_ms: slice.first_ms,
                last_ms,
                mismatches: u128::from(slice.mismatches),
                slices: 1,
            }),
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn bad(first_ms: u64, last_ms: u64) -> BadSlice {
        BadSlice { job_id: 1, slice: 1, first_ms, last_ms, runs: 10, busy_ns: 5, mismatches: 2, fold_wrong: false }
    }

    fn spans(bad: &[BadSlice], gap_ms: u64) -> Vec<(u64, u64, u128, u64)> {
        episodes(bad, gap_ms).iter().map(|e| (e.first_ms, e.last_ms, e.mismatches, e.slices)).collect()
    }

    #[test]
    fn gap_is_included_and_one_more_is_not() {
        assert_eq!(spans(&[bad(0, 10), bad(70, 70)], 60), [(0, 70, 4, 2)]);
        assert_eq!(spans(&[bad(0, 10), bad(71, 71)], 60), [(0, 10, 2, 1), (71, 71, 2, 1)]);
        assert_eq!(spans(&[], 60), []);
    }

    #[test]
    fn long_one_covers_short_ones_and_order_does_not_matter() {
        let slices = [bad(500, 500), bad(0, 400), bad(10, 20), bad(1000, 990)];
        let expected = [(0, 500, 6, 3), (1000, 1000, 2, 1)];
        assert_eq!(spans(&slices, 100), expected);
        for by in 1..4 {
            let mut turned = slices;
            turned.rotate_left(by);
            assert_eq!(spans(&turned, 100), expected);
        }
    }

    /// Against the definition: connected components of the relation "not further apart than the gap".
    #[test]
    fn agrees_with_the_definition() {
        let mut state = 1u64;
        let mut draw = |below: u64| {
            // Knuth, TAOCP 2, 3.3.4 table 1, line 26: MMIX's generator
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 33) % below
        };
        for _ in 0..500 {
            let slices: Vec<BadSlice> = (0..draw(12)).map(|_| draw(200)).map(|a| bad(a, a + a % 17)).collect();
            let gap = draw(20);
            let near = |a: &BadSlice, b: &BadSlice| a.first_ms <= b.last_ms + gap && b.first_ms <= a.last_ms + gap;
            let mut group: Vec<usize> = (0..slices.len()).collect();
            for _ in 0..slices.len() {
                for i in 0..slices.len() {
                    for j in 0..slices.len() {
                        if near(&slices[i], &slices[j]) {
                            group[i] = group[i].min(group[j]);
                        }
                    }
                }
            }
            group.sort_unstable();
            group.dedup();
            assert_eq!(episodes(&slices, gap).len(), group.len(), "{slices:?} gap {gap}");
        }
    }
}
