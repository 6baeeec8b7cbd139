//! What is known of one cpu at the end of a window, what speaks for and against it, and what would settle it.

use std::collections::BTreeSet;

use serde::Serialize;

use super::figures::short;
use super::gathering::{Before, Frame, Gathering, WrongIn, wrong_in};
use crate::event::{Confirmation, Finding, Purpose, tells_of_memory};
use crate::host::Cpu;
use crate::judge::design::{DESIGN, Exposure, SETTLED_AFTER};
use crate::judge::verdict::Known;
use crate::stats::{Observed, compare_rates};

const HOUR_NS: f64 = 3.6e12;

/// Part of a window that the plan gives to kernels in which a cpu was wrong before: half of what a sweep leaves.
const ATTENTION: f64 = 0.45;

/// A core is watched for about so many windows after a mismatch that did not come again: longer would put more healthy
/// cores on watch than the rules promise, and what was seen stays on record anyway.
const WATCHED: f64 = 2.0;

/// Silence that would settle the mismatches of a core in one kernel.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Settle {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Slices with mismatches on record.
    pub slices_wrong: u64,
    /// Busy hours of it without a wrong output that are needed: three times what the mismatch took to show, but no more
    /// than a few windows can give.
    pub hours_needed: f64,
    /// The probability of such silence if the core is as bad as it showed.
    pub silence: f64,
    /// Of these, done since the last mismatch.
    pub hours_done: f64,
    /// Windows like this one that the rest takes, about.
    pub windows: u64,
    /// Slices with mismatches, on this core in all, that withdraw it.
    pub withdraw_at: u64,
}

impl Settle {
    /// In a sentence, after "to settle".
    pub fn sentence(&self) -> String {
        let Settle { kernel, variant, windows, withdraw_at, .. } = self;
        format!(
            "{kernel} {variant}: {} busy hours of it without a wrong output, {} done, about {windows} window{} like this (a core \
             as bad as it showed keeps silent so long with probability {}); it stays on record, and {withdraw_at} wrong \
             slices in all withdraw the core",
            short(self.hours_needed),
            short(self.hours_done),
            if *windows == 1 { "" } else { "s" },
            short(self.silence),
        )
    }
}

impl Gathering {
    /// What the rules are asked about.
    pub(super) fn known(&self, cpu: Cpu, frame: &Frame) -> Known {
        let before = frame.before.get(&cpu).cloned().unwrap_or_default();
        let total = self.tally.cpus.get(&cpu);
        let convicted =
            |other: Cpu| self.findings.iter().any(|f| f.cpu == other && f.confirmation == Confirmation::Repeated);
        let unexplained =
            self.pairs_wrong.iter().filter(|(a, b)| (*a == cpu && !convicted(*b)) || (*b == cpu && !convicted(*a)));
        let orphans = self.tally.without_slice().filter(|m| m.cpu == cpu && m.purpose == Purpose::Plan);
        let mine: Vec<&Finding> = self.about(cpu).collect();
        let memory = |f: &&Finding| f.counters.iter().any(|c| tells_of_memory(c));
        Known {
            runs: total.map_or(0, |t| u64::try_from(t.all.runs + t.together.runs).unwrap_or(u64::MAX)),
            together_wrong: unexplained.count() as u64,
            slices_wrong: total.map_or(0, |t| t.all.bad.len() as u64) + u64::from(orphans.count() > 0),
            slices_wrong_before: before.slices_wrong,
            occasions_needed: DESIGN.occasions_needed(&self.exposure(cpu, frame)),
            unsettled: self.settle(cpu, frame).iter().filter(|s| s.hours_done < s.hours_needed).count() as u64,
            memory_errors: self.memory.contains(&cpu) || mine.iter().any(memory),
            confirmations: mine.iter().map(|f| f.confirmation).collect(),
            confirmed_before: before.confirmed,
            // of a worker that was lost with two cpus at work nobody knows which of them it was, unless one is convicted
            lost: self
                .lost
                .iter()
                .filter(|l| match l.partner {
                    None => l.cpu == cpu,
                    Some(partner) => (l.cpu == cpu && !convicted(partner)) || (partner == cpu && !convicted(l.cpu)),
                })
                .map(|l| l.how.clone())
                .collect(),
        }
    }

    /// Findings about a cpu; where it could not be told which of two it was, about both.
    fn about(&self, cpu: Cpu) -> impl Iterator<Item = &Finding> {
        self.findings
            .iter()
            .filter(move |f| f.cpu == cpu || f.confirmation != Confirmation::Repeated && f.partner == Some(cpu))
    }

    fn busy_ns(&self, cpu: Cpu) -> u128 {
        self.tally.cpus.get(&cpu).map_or(0, |t| t.all.busy_ns + t.together.busy_ns)
    }

    fn exposure(&self, cpu: Cpu, frame: &Frame) -> Exposure {
        let before = frame.before.get(&cpu).map_or(0, |b| b.busy_ns);
        let cores: BTreeSet<u32> = frame.cpus.iter().map(|(_, core)| *core).collect();
        Exposure {
            hours: (before + self.busy_ns(cpu)) as f64 / HOUR_NS,
            hours_a_window: self.opened.budget_s / 3600.0,
            cores: cores.len() as u64,
        }
    }

    /// What would settle the mismatches of a cpu, this window's and earlier ones together.
    pub(super) fn settle(&self, cpu: Cpu, frame: &Frame) -> Vec<Settle> {
        let none = Before::default();
        let before = frame.before.get(&cpu).unwrap_or(&none);
        let mut open: Vec<WrongIn> = wrong_in(&self.tally, cpu);
        for now in &mut open {
            let key = (now.kernel.clone(), now.variant.clone());
            now.until_ns += before.busy_in.get(&key).copied().unwrap_or(0);
        }
        for earlier in &before.wrong_in {
            let same = |w: &&mut WrongIn| w.kernel == earlier.kernel && w.variant == earlier.variant;
            match open.iter_mut().find(same) {
                Some(now) => now.slices += earlier.slices,
                None => {
                    let here = |(key, _): &(&crate::ledger::cells::CoverKey, &crate::ledger::cells::Cover)| {
                        key.cpu == cpu && key.kernel == earlier.kernel && key.variant == earlier.variant
                    };
                    let since = self.tally.covers.iter().find(here).map_or(0, |(_, cover)| cover.all.busy_ns);
                    open.push(WrongIn { since_ns: earlier.since_ns + since, ..earlier.clone() });
                }
            }
        }
        let kernels: BTreeSet<&str> = open.iter().map(|w| w.kernel.as_str()).collect();
        let variants = |kernel: &str| {
            self.tally.covers.keys().filter(|key| key.cpu == cpu && key.kernel == kernel).count().max(1) as f64
        };
        let withdraw_at = DESIGN.occasions_needed(&self.exposure(cpu, frame));
        open.iter()
            .map(|w| {
                let took = w.until_ns as f64 / HOUR_NS / w.slices as f64;
                let hours_done = w.since_ns as f64 / HOUR_NS;
                let each = ATTENTION * self.opened.budget_s / 3600.0 / kernels.len() as f64 / variants(&w.kernel);
                let hours_needed = (SETTLED_AFTER * took).min(WATCHED * each);
                Settle {
                    kernel: w.kernel.clone(),
                    variant: w.variant.clone(),
                    slices_wrong: w.slices,
                    hours_needed,
                    hours_done,
                    silence: (-hours_needed / took).exp(),
                    windows: ((hours_needed - hours_done).max(0.0) / each).ceil() as u64,
                    withdraw_at,
                }
            })
            .collect()
    }

    /// What speaks for and against a cpu, a sentence each.
    pub(super) fn evidence(&self, cpu: Cpu, known: &Known, frame: &Frame) -> Vec<String> {
        let mut lines = Vec::new();
        let exposure = self.exposure(cpu, frame);
        let wrong = known.slices_wrong + known.slices_wrong_before;
        if wrong > 0 {
            let chance = DESIGN.by_upsets(wrong, exposure.hours);
            lines.push(format!(
                "wrong in {wrong} slice{} in {} busy hours on record; one-off upsets ({} per hour and core) would do that to \
                 a core with probability {}",
                if wrong == 1 { "" } else { "s" },
                short(exposure.hours),
                short(DESIGN.upsets_per_core_hour),
                short(chance)
            ));
            lines.extend(self.against_others(cpu, frame));
        }
        for f in self.about(cpu) {
            let sum = |legs: &[crate::event::Leg]| legs.iter().fold((0, 0), |(w, r), l| (w + l.mismatches, r + l.runs));
            let ((again, runs), (controls, control_runs)) = (sum(&f.suspect), sum(&f.controls));
            if runs + control_runs > 0 {
                lines.push(format!(
                    "{} {}: wrong in {again} of {runs} further runs here, in {controls} of {control_runs} on controls",
                    f.kernel, f.variant
                ));
            }
        }
        if known.memory_errors {
            lines.push("memory errors were counted at the same time: memory is not excluded".to_owned());
        }
        lines
    }

    /// Whether the other cores did as badly in the kernels that this one was wrong in.
    fn against_others(&self, cpu: Cpu, frame: &Frame) -> Option<String> {
        let wrong = wrong_in(&self.tally, cpu);
        let slices: u64 = wrong.iter().map(|w| w.slices).sum();
        let in_these =
            |own: bool| {
                let mine = |(key, _): &(&crate::ledger::cells::CoverKey, &crate::ledger::cells::Cover)| {
                    (key.cpu == cpu) == own && wrong.iter().any(|w| w.kernel == key.kernel && w.variant == key.variant)
                };
                self.tally.covers.iter().filter(mine).fold((0, 0), |(bad, busy), (_, cover)| {
                    (bad + cover.all.bad.len() as u64, busy + cover.all.busy_ns)
                })
            };
        let ((_, busy), (others_wrong, others_busy)) = (in_these(true), in_these(false));
        if slices == 0 || others_busy == 0 {
            return None;
        }
        let here = Observed { events: slices, exposure: busy as f64 / HOUR_NS };
        let there = Observed { events: others_wrong, exposure: others_busy as f64 / HOUR_NS };
        let p = compare_rates(here, there, 1.0).ok()?.p_greater * frame.cpus.len() as f64;
        let verdict = if p <= 0.01 {
            "a cause that all cores share is ruled out"
        } else {
            "a cause that all cores share is not ruled out by these counts alone"
        };
        Some(format!(
            "in the same kernels the other cpus were wrong in {others_wrong} slices in {} busy hours, this one in {slices} in \
             {}; {verdict} (p = {} over {} cpus)",
            short(there.exposure),
            short(here.exposure),
            short(p.min(1.0)),
            frame.cpus.len()
        ))
    }
}
