//! How the mismatches of a cell lie over slices, minutes, spells of two minutes and windows: what the choice of an
//! interval rests on. Groups without mismatches are only summed.

use crate::ledger::episodes::{BadSlice, episodes};
use crate::stats::{Clusters, Scatter};

/// Nanoseconds in an hour: exposures are handed over in hours.
const HOUR_NS: f64 = 3.6e12;
/// Length of a minute on the host's clock, and of a spell.
const MINUTE_MS: u64 = 60_000;
const SPELL_MS: u64 = 120_000;

/// Sums over groups of slices that follow each other.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
struct Groups {
    /// The group under way, its processor time and its mismatches.
    open: Option<(u64, u128, u64)>,
    number: u64,
    /// Sum of the squares of the processor times, ns².
    squares: u128,
    /// Number of the group, mismatches and processor time of each with mismatches.
    hit: Vec<(u64, u64, u128)>,
}

impl Groups {
    fn add(&mut self, group: u64, busy_ns: u64, wrong: u64) {
        match &mut self.open {
            Some((open, busy, events)) if *open == group => {
                *busy += u128::from(busy_ns);
                *events = events.saturating_add(wrong);
            }
            _ => {
                self.close();
                self.open = Some((group, u128::from(busy_ns), wrong));
            }
        }
    }

    fn close(&mut self) {
        if let Some((group, busy, events)) = self.open.take() {
            self.number += 1;
            self.squares = self.squares.saturating_add(busy.saturating_mul(busy));
            if events > 0 {
                self.hit.push((group, events, busy));
            }
        }
    }

    /// Groups of another cell stay groups of their own, also where they lie at the same time.
    fn merge(&mut self, other: &Groups) {
        let mut other = other.clone();
        other.close();
        self.close();
        self.number += other.number;
        self.squares = self.squares.saturating_add(other.squares);
        self.hit.extend(other.hit);
    }

    fn clusters(&self, busy_ns: u128) -> Clusters {
        let mut all = self.clone();
        all.close();
        let hours = |busy: u128| busy as f64 / HOUR_NS;
        Clusters {
            number: all.number,
            exposure: hours(busy_ns),
            squares: all.squares as f64 / (HOUR_NS * HOUR_NS),
            // a group that was slept through has no exposure to set events against
            hit: all.hit.iter().map(|&(_, events, busy)| (events, hours(busy.max(1)))).collect(),
        }
    }
}

/// The sums of one cell.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Spread {
    slices: Groups,
    minutes: Groups,
    spells: Groups,
    windows: Groups,
}

impl Spread {
    /// Takes the next slice: its place on the host's clock, its processor time and its mismatches.
    pub(super) fn add(&mut self, job_id: u64, start_ms: u64, busy_ns: u64, wrong: u64) {
        let next = self.slices.number + u64::from(self.slices.open.is_some());
        self.slices.add(next, busy_ns, wrong);
        self.minutes.add(start_ms / MINUTE_MS, busy_ns, wrong);
        self.spells.add(start_ms / SPELL_MS, busy_ns, wrong);
        self.windows.add(job_id, busy_ns, wrong);
    }

    /// Takes all of another cell in.
    pub(super) fn merge(&mut self, other: &Spread) {
        self.slices.merge(&other.slices);
        self.minutes.merge(&other.minutes);
        self.spells.merge(&other.spells);
        self.windows.merge(&other.windows);
    }

    /// As the statistics take it; exposures in hours. `bad` are the slices with mismatches, grouped into episodes by
    /// `gap_ms`.
    pub(super) fn scatter(&self, busy_ns: u128, bad: &[BadSlice], gap_ms: u64) -> Scatter {
        let windows = self.windows.clusters(busy_ns);
        let mut closed = self.windows.clone();
        closed.close();
        let mut hit: Vec<(u64, f64)> = Vec::new();
        if !bad.is_empty() {
            let mut begun: Vec<(u64, u64)> = closed.hit.iter().map(|&(job, ..)| (job, 0)).collect();
            for episode in episodes(bad, gap_ms) {
                // an episode belongs to the window of its first slice
                let first = bad.iter().find(|slice| slice.first_ms == episode.first_ms);
                if let Some((_, count)) = first.and_then(|f| begun.iter_mut().find(|(job, _)| *job == f.job_id)) {
                    *count += 1;
                }
            }
            let exposures = windows.hit.iter().map(|&(_, exposure)| exposure);
            hit = begun.iter().map(|&(_, count)| count).zip(exposures).filter(|(count, _)| *count > 0).collect();
        }
        Scatter {
            slices: self.slices.clusters(busy_ns),
            minutes: self.minutes.clusters(busy_ns),
            spells: self.spells.clusters(busy_ns),
            episodes: Clusters { hit, ..windows.clone() },
            windows,
        }
    }
}
