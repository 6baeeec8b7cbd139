//! Gathers the events of one window, for its verdict and its report.

use std::collections::{BTreeMap, BTreeSet};

use serde::Serialize;

use crate::condition::Condition;
use crate::event::{Event, Finding, Lost, Opened, Purpose, tells_of_memory};
use crate::host::Cpu;
use crate::judge::verdict::{self, Verdict};
use crate::ledger::cells::CpuTotal;
use crate::ledger::{Scope, Tally};

/// What the ledger knew of a cpu of this host and part before the window.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Before {
    /// Slices with mismatches.
    pub slices_wrong: u64,
    /// Confirmed findings.
    pub confirmed: u64,
    /// Processor time inside kernels, nanoseconds, pairs included.
    pub busy_ns: u128,
    /// Kernels and variants that it was wrong in.
    pub wrong_in: Vec<WrongIn>,
    /// Processor time by kernel and variant, nanoseconds.
    pub busy_in: BTreeMap<(String, String), u128>,
}

/// A kernel's variant in which a cpu was wrong.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct WrongIn {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Slices with mismatches.
    pub slices: u64,
    /// Processor time up to the last of them, nanoseconds.
    pub until_ns: u128,
    /// Processor time since.
    pub since_ns: u128,
}

impl Before {
    /// What a ledger's sums say of a cpu.
    pub fn of(tally: &Tally, cpu: Cpu) -> Before {
        let Some(CpuTotal { all, together, findings, .. }) = tally.cpus.get(&cpu) else { return Before::default() };
        // a finding beside which memory errors were counted convicts nobody
        let convicts = |f: &&Finding| f.confirmed && !f.counters.iter().any(|c| tells_of_memory(c));
        Before {
            slices_wrong: all.bad.len() as u64,
            confirmed: findings.iter().filter(convicts).count() as u64,
            busy_ns: all.busy_ns + together.busy_ns,
            wrong_in: wrong_in(tally, cpu),
            busy_in: tally
                .covers
                .iter()
                .filter(|(key, _)| key.cpu == cpu)
                .map(|(key, cover)| ((key.kernel.clone(), key.variant.clone()), cover.all.busy_ns))
                .collect(),
        }
    }
}

/// Kernels and variants in which `cpu` was wrong by itself.
pub(super) fn wrong_in(tally: &Tally, cpu: Cpu) -> Vec<WrongIn> {
    let mine = tally.covers.iter().filter(|(key, cover)| key.cpu == cpu && cover.until_wrong_ns > 0);
    mine.map(|(key, cover)| WrongIn {
        kernel: key.kernel.clone(),
        variant: key.variant.clone(),
        slices: cover.all.bad.len() as u64,
        until_ns: cover.until_wrong_ns,
        since_ns: cover.all.busy_ns - cover.until_wrong_ns,
    })
    .collect()
}

/// Everything that there is to cover on this host.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct GridReport {
    /// Cpu × kernel × variant × condition.
    pub cells: u64,
    /// Never covered before this window.
    pub uncovered_before: u64,
    /// Windows like this one that cover all of it; absent where they are too short for it.
    pub windows: Option<u64>,
}

/// A variant that cannot run here.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Skipped {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Why.
    pub why: String,
}

/// What the report is told beside the events.
#[derive(Clone, Debug)]
pub struct Frame {
    /// Confidence of intervals.
    pub confidence: f64,
    /// Episode gap in milliseconds.
    pub gap_ms: u64,
    /// Core of each tested cpu.
    pub cpus: Vec<(Cpu, u32)>,
    /// History by cpu.
    pub before: BTreeMap<Cpu, Before>,
    /// Whole rounds planned; 0 where the budget was too short for one.
    pub rounds: u32,
    /// Units that each cpu leaves out.
    pub left_out: usize,
    /// What there is to cover.
    pub grid: GridReport,
    /// Variants that cannot run here.
    pub skipped: Vec<Skipped>,
    /// Where the records are.
    pub ledger: String,
}

/// Gathers the events of one window.
pub struct Gathering {
    pub(super) opened: Opened,
    pub(super) tally: Tally,
    pub(super) busy_ns: u128,
    pub(super) findings: Vec<Finding>,
    pub(super) lost: Vec<Lost>,
    pub(super) remarks: Vec<String>,
    /// Pairs of cpus in each slice that went wrong for two.
    pub(super) pairs_wrong: Vec<(Cpu, Cpu)>,
    /// Cpus whose mismatches came while memory errors were counted.
    pub(super) memory: BTreeSet<Cpu>,
    pub(super) conditions: BTreeMap<String, u128>,
}

impl Gathering {
    /// Begins with the window's opening.
    pub fn new(opened: Opened) -> Gathering {
        let mut tally = Tally::new(Scope { job_id: Some(opened.job_id), ..Scope::default() });
        tally.add(&Event::Opened(opened.clone()));
        Gathering {
            opened,
            tally,
            busy_ns: 0,
            findings: Vec::new(),
            lost: Vec::new(),
            remarks: Vec::new(),
            pairs_wrong: Vec::new(),
            memory: BTreeSet::new(),
            conditions: BTreeMap::new(),
        }
    }

    /// Takes the next event in.
    pub fn add(&mut self, event: &Event) {
        self.tally.add(event);
        match event {
            Event::Slice(slice) => {
                let busy = slice.busy_ns + slice.partner.map_or(0, |p| p.busy_ns);
                self.busy_ns += u128::from(busy);
                if slice.void.is_none()
                    && slice.purpose == Purpose::Plan
                    && let Ok(condition) = slice.condition.parse::<Condition>()
                {
                    *self.conditions.entry(condition.setting.to_string()).or_default() += u128::from(busy);
                }
                if let (true, true, Some(partner)) = (slice.mismatches > 0, slice.void.is_none(), slice.partner) {
                    self.pairs_wrong.push((slice.cpu, partner.cpu));
                }
                if slice.mismatches > 0 && slice.counters.iter().any(|c| tells_of_memory(c)) {
                    self.memory.insert(slice.cpu);
                }
                if !slice.counters.is_empty() {
                    self.remarks.push(format!(
                        "during slice {} of cpu {} in {}: {}",
                        slice.slice,
                        slice.cpu,
                        slice.kernel,
                        slice.counters.join("; ")
                    ));
                }
                if let (Some(why), true) = (&slice.void, slice.runs > 0) {
                    self.remarks.push(format!("slice {} of cpu {} is void: {why}", slice.slice, slice.cpu));
                }
            }
            // an earlier job's open intents are recorded by this job under their own number
            Event::Lost(lost) if lost.job_id == self.opened.job_id => self.lost.push(lost.clone()),
            Event::Lost(lost) => self.remarks.push(format!(
                "cpu {} was running {} {} when an earlier job was cut off (job {}); on record as lost",
                lost.cpu, lost.kernel, lost.variant, lost.job_id
            )),
            Event::Finding(finding) => self.findings.push((**finding).clone()),
            Event::Remark(remark) => self.remarks.push(remark.text.clone()),
            _ => {}
        }
    }

    /// The verdict on the host so far.
    pub fn verdict(&self, frame: &Frame) -> Verdict {
        verdict::worst(frame.cpus.iter().map(|(cpu, _)| verdict::decide(&self.known(*cpu, frame)).then))
    }
}
