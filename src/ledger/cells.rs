//! Counts and times per cell, cpu and kernel, gathered from events. No statistics: those are made of these numbers.
//!
//! What counts: slices of windows (not drills) that were part of the plan (a repeat of a failing case was chosen
//! because it failed) and are not void, of jobs on the host and part that is asked for. Everything else is counted as
//! left out, by reason. Lost workers and findings count for windows whatever the purpose.
//!
//! Sums are `u128`: 2⁶⁴ records of the largest `u64` fit.

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::path::Path;

use serde::Serialize;

use crate::event::{Event, Finding, FoldCheck, Job, Lost, Mismatch, Opened, Purpose, Slice};
use crate::host::Cpu;
use crate::ledger::episodes::{BadSlice, Episode, episodes};
use crate::ledger::error::Error;
use crate::ledger::record::Record;
use crate::ledger::recover::{Reader, Summary};
use crate::ledger::scatter::Spread;
use crate::stats::Scatter;

/// The unit that statistics speak of.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub struct CellKey {
    /// Physical core.
    pub core: u32,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Condition in words.
    pub condition: String,
}

/// Exposure and mismatches of some slices that count.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Cell {
    /// Logical cpus that the slices ran on.
    pub cpus: BTreeSet<Cpu>,
    /// The second cpus of slices that ran on two; nobody tells the two apart here.
    #[serde(skip_serializing_if = "BTreeSet::is_empty")]
    pub partners: BTreeSet<Cpu>,
    /// Slices.
    pub slices: u64,
    /// Runs.
    pub runs: u128,
    /// Processor time inside kernels, nanoseconds.
    pub busy_ns: u128,
    /// Wrong runs that the workers themselves reported.
    pub mismatches: u128,
    /// Slices whose fold showed wrong outputs beyond these: at least one further wrong run each.
    pub fold_wrong: u64,
    /// Slices whose fold nobody could check.
    pub fold_unchecked: u64,
    /// Every slice with mismatches, or with a wrong fold, in the order of the ledger.
    pub bad: Vec<BadSlice>,
    /// Host clock at the earliest start, Unix milliseconds.
    pub first_ms: u64,
    /// Host clock at the latest end.
    pub last_ms: u64,
    /// How mismatches lie over time.
    #[serde(skip)]
    spread: Spread,
}

impl Cell {
    /// The slices with mismatches, grouped.
    pub fn episodes(&self, gap_ms: u64) -> Vec<Episode> {
        episodes(&self.bad, gap_ms)
    }

    /// Wrong runs: those that workers reported, and one for each slice whose fold showed more.
    pub fn wrong(&self) -> u128 {
        self.mismatches + u128::from(self.fold_wrong)
    }

    /// How wrong runs lie over slices, minutes and windows, for the choice of an interval. Exposures in hours.
    pub fn scatter(&self, gap_ms: u64) -> Scatter {
        self.spread.scatter(self.busy_ns, &self.bad, gap_ms)
    }

    /// Takes all of another cell in, as if its slices had been added here.
    pub fn merge(&mut self, other: &Cell) {
        if other.slices == 0 {
            return;
        }
        self.first_ms = if self.slices == 0 { other.first_ms } else { self.first_ms.min(other.first_ms) };
        self.last_ms = self.last_ms.max(other.last_ms);
        self.cpus.extend(&other.cpus);
        self.partners.extend(&other.partners);
        self.slices += other.slices;
        self.runs += other.runs;
        self.busy_ns += other.busy_ns;
        self.mismatches += other.mismatches;
        self.fold_wrong += other.fold_wrong;
        self.fold_unchecked += other.fold_unchecked;
        self.bad.extend(&other.bad);
        self.spread.merge(&other.spread);
    }

    /// Takes a slice that counts.
    pub(super) fn add(&mut self, slice: &Slice) {
        let end_ms = slice.wall_ms.saturating_add(slice.span_ns / 1_000_000);
        self.first_ms = if self.slices == 0 { slice.wall_ms } else { self.first_ms.min(slice.wall_ms) };
        self.last_ms = self.last_ms.max(end_ms);
        self.cpus.insert(slice.cpu);
        self.partners.extend(slice.partner.map(|p| p.cpu));
        self.slices += 1;
        self.runs += u128::from(slice.runs);
        self.busy_ns += u128::from(slice.busy_ns);
        self.mismatches += u128::from(slice.mismatches);
        self.fold_wrong += u64::from(slice.fold == FoldCheck::Wrong);
        self.fold_unchecked += u64::from(slice.fold == FoldCheck::NotChecked);
        let wrong = slice.mismatches.saturating_add(u64::from(slice.fold == FoldCheck::Wrong));
        self.spread.add(slice.job_id, slice.wall_ms, slice.busy_ns, wrong);
        if wrong > 0 {
            self.bad.push(BadSlice::of(slice));
        }
    }
}

/// What is known of one logical cpu.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct CpuTotal {
    /// Physical cores under which it stands on record; more than one if numbers shifted between boots.
    pub cores: BTreeSet<u32>,
    /// All that it ran by itself and that counts.
    pub all: Cell,
    /// All that it ran together with another cpu; a wrong output there is not told apart between the two.
    pub together: Cell,
    /// Workers lost on it, in the order of the ledger.
    pub lost: Vec<Lost>,
    /// Findings about it, in the order of the ledger.
    pub findings: Vec<Finding>,
}

/// One kernel's variant on one logical cpu: what the planner has to know.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
pub struct CoverKey {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
}

/// How much of it was done.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Cover {
    /// Exposure under all conditions together.
    pub all: Cell,
    /// Operations, in the kernel's unit.
    pub operations: u128,
    /// That unit.
    pub unit: String,
    /// Processor time, in nanoseconds, up to the end of the last slice with wrong outputs; 0 where there is none.
    pub until_wrong_ns: u128,
}

/// Whose records are wanted.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Scope {
    /// Key of the host; any if absent.
    pub host: Option<String>,
    /// Identity of the parts; any if absent. A repaired machine has the same key and another part.
    pub part: Option<String>,
    /// Only this job.
    pub job_id: Option<u64>,
}

/// Records that are not in the sums, by reason; the first that applies.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct LeftOut {
    /// Slices, mismatches, lost workers and findings of drills.
    pub drill: u64,
    /// The same of jobs whose opening is not on record: nobody knows which host they speak of.
    pub no_opening: u64,
    /// The same of other hosts, parts or jobs.
    pub other_scope: u64,
    /// Slices that were run because something failed, and their controls.
    pub confirmation: u64,
    /// Slices of the plan from which nothing can be concluded.
    pub void: u64,
    /// Records of kinds that this program does not know.
    pub unknown: u64,
}

/// The sums over a ledger.
#[derive(Clone, Debug, Default)]
pub struct Tally {
    /// Whose records these are.
    pub scope: Scope,
    /// By core, kernel, variant and condition.
    pub cells: BTreeMap<CellKey, Cell>,
    /// By logical cpu.
    pub cpus: BTreeMap<Cpu, CpuTotal>,
    /// By logical cpu, kernel and variant.
    pub covers: BTreeMap<CoverKey, Cover>,
    /// Every job's opening in scope, drills too.
    pub jobs: BTreeMap<u64, Opened>,
    /// Hosts and parts on record, with the number of their jobs, whatever the scope.
    pub hosts: BTreeMap<(String, String), u64>,
    /// What is not in the sums.
    pub left_out: LeftOut,
    standing: HashMap<u64, Standing>,
    /// Mismatches of planned slices by job, slice and cpu, until their slice is seen.
    waiting: BTreeMap<(u64, u64, Cpu), Vec<Mismatch>>,
    /// Slices with mismatches that were seen, whatever their purpose.
    told: BTreeSet<(u64, u64, Cpu)>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Standing {
    Counts,
    Drill,
    OtherScope,
}

impl Tally {
    /// Nothing yet.
    pub fn new(scope: Scope) -> Tally {
        Tally { scope, ..Tally::default() }
    }

    /// The sums over the ledger at `path`, as far as it can be relied on, and what reading it came to.
    pub fn read(path: &Path, scope: Scope) -> Result<(Tally, Summary), Error> {
        let mut tally = Tally::new(scope);
        let mut reader = Reader::open(path)?;
        reader.by_ref().for_each(|entry| tally.add_record(&entry.record));
        Ok((tally, reader.finish()))
    }

    /// Takes the next line of a ledger.
    pub fn add_record(&mut self, record: &Record) {
        match record {
            Record::Event(event) => self.add(event),
            Record::Unknown { .. } => self.left_out.unknown += 1,
        }
    }

    /// Takes the next event.
    pub fn add(&mut self, event: &Event) {
        match event {
            Event::Opened(opened) => self.open(opened),
            Event::Slice(slice) => {
                self.pass_over(slice);
                if self.counts(slice.job_id, slice.job) {
                    self.slice(slice);
                }
            }
            Event::Mismatch(mismatch) => {
                let key = (mismatch.job_id, mismatch.slice, mismatch.cpu);
                let counts = self.counts(mismatch.job_id, mismatch.job);
                // repeats for confirmation are told by their finding
                if counts && mismatch.purpose == Purpose::Plan && !self.told.contains(&key) {
                    self.waiting.entry(key).or_default().push(mismatch.clone());
                }
            }
            Event::Lost(lost) => {
                if self.counts(lost.job_id, lost.job) {
                    self.cpu(lost.cpu, lost.core).lost.push(lost.clone());
                }
            }
            Event::Finding(finding) => {
                if self.counts(finding.job_id, finding.job) {
                    self.cpu(finding.cpu, finding.core).findings.push((**finding).clone());
                }
            }
            Event::Intent(_) | Event::Remark(_) | Event::Closed(_) => {}
        }
    }

    /// Takes note of a slice that is not wanted in the sums: its mismatches have their slice on record all the same.
    pub fn pass_over(&mut self, slice: &Slice) {
        if slice.mismatches > 0 || slice.fold == FoldCheck::Wrong {
            let key = (slice.job_id, slice.slice, slice.cpu);
            self.waiting.remove(&key);
            self.told.insert(key);
        }
    }

    /// Whether records of this job count; the opening has to come first.
    pub fn in_scope(&self, job_id: u64, job: Job) -> bool {
        job == Job::Window && self.standing.get(&job_id) == Some(&Standing::Counts)
    }

    /// Mismatches whose slice never came on record, because its worker or the machine was lost. They are evidence
    /// without exposure, and in no sum.
    pub fn without_slice(&self) -> impl Iterator<Item = &Mismatch> {
        self.waiting.values().flatten()
    }

    /// When this variant of this kernel last ended a slice on this cpu, Unix milliseconds; `None`: never.
    pub fn last_covered(&self, cpu: Cpu, kernel: &str, variant: &str) -> Option<u64> {
        let key = CoverKey { cpu, kernel: kernel.into(), variant: variant.into() };
        self.covers.get(&key).map(|cover| cover.all.last_ms)
    }

    fn open(&mut self, opened: &Opened) {
        *self.hosts.entry((opened.host.clone(), opened.part.clone())).or_default() += 1;
        let Scope { host, part, job_id } = &self.scope;
        let wanted = host.as_ref().is_none_or(|h| *h == opened.host)
            && part.as_ref().is_none_or(|p| *p == opened.part)
            && job_id.is_none_or(|id| id == opened.job_id);
        let standing = match (opened.job, wanted) {
            (Job::Drill, _) => Standing::Drill,
            (Job::Window, false) => Standing::OtherScope,
            (Job::Window, true) => Standing::Counts,
        };
        self.standing.insert(opened.job_id, standing);
        if wanted {
            self.jobs.insert(opened.job_id, opened.clone());
        }
    }

    /// Whether a record of this job counts; if not, it is left out by the reason.
    fn counts(&mut self, job_id: u64, job: Job) -> bool {
        let counter = match (job, self.standing.get(&job_id)) {
            // either mark is enough: made-up faults must never pass as real ones
            (Job::Drill, _) | (_, Some(Standing::Drill)) => &mut self.left_out.drill,
            (_, None) => &mut self.left_out.no_opening,
            (_, Some(Standing::OtherScope)) => &mut self.left_out.other_scope,
            (_, Some(Standing::Counts)) => return true,
        };
        *counter += 1;
        false
    }

    fn slice(&mut self, slice: &Slice) {
        if slice.purpose != Purpose::Plan {
            self.left_out.confirmation += 1;
            return;
        }
        if slice.void.is_some() {
            self.left_out.void += 1;
            return;
        }
        let Slice { cpu, core, kernel, variant, condition, .. } = slice.clone();
        let key = CellKey { core, kernel: kernel.clone(), variant: variant.clone(), condition };
        self.cells.entry(key).or_default().add(slice);
        if let Some(partner) = slice.partner {
            self.cpu(cpu, core).together.add(slice);
            self.cpu(partner.cpu, partner.core).together.add(slice);
        } else {
            self.cpu(cpu, core).all.add(slice);
        }
        let cover = self.covers.entry(CoverKey { cpu, kernel, variant }).or_default();
        let wrong_before = cover.all.bad.len();
        cover.all.add(slice);
        if cover.all.bad.len() > wrong_before {
            cover.until_wrong_ns = cover.all.busy_ns;
        }
        cover.operations += u128::from(slice.operations);
        cover.unit.clone_from(&slice.unit);
    }

    fn cpu(&mut self, cpu: Cpu, core: u32) -> &mut CpuTotal {
        let total = self.cpus.entry(cpu).or_default();
        total.cores.insert(core);
        total
    }
}

#[cfg(test)]
#[path = "cells_tests.rs"]
mod tests;
