//! Slices with wrong outputs by the cpu, or the two cpus together, that ran them, beside what was clean: what episodes and
//! comparisons of conditions are made of.

use std::collections::{BTreeMap, BTreeSet};

use rustc_hash::FxHashMap;

use crate::event::{FoldCheck, Slice};
use crate::host::Cpu;
use crate::ledger::episodes::{BadSlice, Episode, episodes};
use crate::ledger::groups::setting;

/// Who worked: one cpu, or two.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Seat {
    /// The cpu, or the first of two.
    pub cpu: Cpu,
    /// The second of two.
    pub partner: Option<Cpu>,
}

impl std::fmt::Display for Seat {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.partner {
            None => self.cpu.fmt(f),
            Some(partner) => write!(f, "{} with {partner}", self.cpu),
        }
    }
}

/// Words by small numbers.
#[derive(Clone, Debug, Default)]
pub struct Names {
    numbers: FxHashMap<String, usize>,
    names: Vec<String>,
}

impl Names {
    fn number(&mut self, name: &str, make: impl Fn(&str) -> String) -> usize {
        if let Some(number) = self.numbers.get(name) {
            return *number;
        }
        // several keys may make the same name
        let made = make(name);
        let number = self.names.iter().position(|n| *n == made).unwrap_or(self.names.len());
        if number == self.names.len() {
            self.names.push(made);
        }
        self.numbers.insert(name.to_owned(), number);
        number
    }

    /// The name of a number that was given out here.
    pub fn name(&self, number: usize) -> &str {
        self.names.get(number).map_or("", String::as_str)
    }
}

/// A slice with wrong outputs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bad {
    /// Counts and times.
    pub slice: BadSlice,
    /// Number of the kernel's name.
    pub kernel: usize,
    /// Number of the setting's name.
    pub setting: usize,
    /// °C at its end.
    pub celsius: Option<f64>,
}

/// What one cpu, or two together, did.
#[derive(Clone, Debug, Default)]
pub struct Work {
    /// Slices with wrong outputs, in the order of the ledger.
    pub bad: Vec<Bad>,
    /// Processor time by number of the setting, nanoseconds.
    pub busy_ns: BTreeMap<usize, u128>,
    /// Cases that slices ran; one that several slices ran counts in each.
    pub cases: u128,
    /// Wrong runs.
    pub mismatches: u128,
    /// Clean slices by whole °C at their end.
    pub clean_celsius: BTreeMap<i64, u64>,
}

/// An episode and what ran in it.
#[derive(Clone, Debug, PartialEq)]
pub struct EpisodeOf {
    /// Begin, end, counts.
    pub episode: Episode,
    /// Numbers of the kernels that were wrong in it.
    pub kernels: BTreeSet<usize>,
    /// The slice with its first mismatch.
    pub first: Bad,
}

impl Work {
    /// The episodes over all kernels and conditions together; gaps up to `gap_ms` are closed.
    pub fn episodes(&self, gap_ms: u64) -> Vec<EpisodeOf> {
        let mut bad: Vec<&Bad> = self.bad.iter().collect();
        bad.sort_by_key(|b| (b.slice.first_ms, b.slice.last_ms));
        let slices: Vec<BadSlice> = bad.iter().map(|b| b.slice).collect();
        let mut rest = bad.as_slice();
        let mut found = Vec::new();
        for episode in episodes(&slices, gap_ms) {
            // episodes come in the same order and share no slice
            let (its, later) = rest.split_at(usize::try_from(episode.slices).unwrap_or(rest.len()).min(rest.len()));
            rest = later;
            if let Some(first) = its.first() {
                let kernels = its.iter().map(|b| b.kernel).collect();
                found.push(EpisodeOf { episode, kernels, first: **first });
            }
        }
        found
    }
}

/// By cpu or pair.
#[derive(Clone, Debug, Default)]
pub struct Wrongs {
    /// Names of kernels.
    pub kernels: Names,
    /// Names of settings.
    pub settings: Names,
    /// Who worked, and what it came to.
    pub seats: BTreeMap<Seat, Work>,
}

impl Wrongs {
    /// Takes a slice that counts.
    pub(super) fn add(&mut self, slice: &Slice) {
        let setting = self.settings.number(&slice.condition, setting);
        let kernel = self.kernels.number(&slice.kernel, str::to_owned);
        let seat = Seat { cpu: slice.cpu, partner: slice.partner.map(|p| p.cpu) };
        let work = self.seats.entry(seat).or_default();
        *work.busy_ns.entry(setting).or_default() += u128::from(slice.busy_ns);
        work.cases += u128::from(slice.cases);
        work.mismatches += u128::from(slice.mismatches);
        let celsius = slice.surroundings.celsius.filter(|c| c.is_finite());
        if slice.mismatches == 0 && slice.fold != FoldCheck::Wrong {
            if let Some(celsius) = celsius {
                *work.clean_celsius.entry(celsius.floor() as i64).or_default() += 1;
            }
            return;
        }
        work.bad.push(Bad { slice: BadSlice::of(slice), kernel, setting, celsius });
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn episodes_name_their_kernels_and_their_first_slice() {
        let bad = |first_ms, kernel| Bad {
            slice: BadSlice {
                job_id: 1,
                slice: first_ms,
                first_ms,
                last_ms: first_ms + 5,
                runs: 1,
                busy_ns: 1,
                mismatches: 1,
                fold_wrong: false,
            },
            kernel,
            setting: 0,
            celsius: None,
        };
        let work = Work { bad: vec![bad(100, 2), bad(0, 1), bad(30, 3), bad(500, 1)], ..Work::default() };
        let found = work.episodes(70);
        let kernels: Vec<Vec<usize>> = found.iter().map(|e| e.kernels.iter().copied().collect()).collect();
        assert_eq!(kernels, [vec![1, 2, 3], vec![1]]);
        assert_eq!(found.iter().map(|e| e.first.slice.first_ms).collect::<Vec<_>>(), [0, 500]);
    }
}
