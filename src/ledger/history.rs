//! A cpu's history, job by job, and what else happened there.

use std::collections::{BTreeMap, BTreeSet};

use rustc_hash::FxHashSet;

use crate::event::{Closed, Finding, FoldCheck, Lost, Opened, Remark, Slice};
use crate::host::Cpu;
use crate::ledger::cells::Cell;

/// Things that happened which are kept of one cpu, and remarks of one job; later ones are numbered.
pub const KEPT: usize = 1_000;

/// One job.
#[derive(Clone, Debug)]
pub struct JobLine {
    /// How it began.
    pub opened: Opened,
    /// How it ended; a job without an end was cut off.
    pub closed: Option<Closed>,
    /// What was remarked in it.
    pub remarks: Vec<Remark>,
    /// Further remarks that are not kept here.
    pub more_remarks: u64,
}

/// What one cpu did in one job.
#[derive(Clone, Debug, Default)]
pub struct Stay {
    /// By itself.
    pub alone: Cell,
    /// Together with another cpu.
    pub together: Cell,
    /// Slices from which nothing can be concluded.
    pub void: u64,
    /// Workers lost.
    pub lost: u64,
    /// Findings about it.
    pub findings: u64,
    /// Slices beside which an error or throttling counter rose.
    pub risen: u64,
    /// Lowest and highest °C at the end of a slice.
    pub celsius: Option<(f64, f64)>,
    kernels: FxHashSet<String>,
}

impl Stay {
    /// Different kernels.
    pub fn kernels(&self) -> u64 {
        self.kernels.len() as u64
    }
}

/// Something that happened on a cpu.
#[derive(Clone, Debug, PartialEq)]
pub enum Happening {
    /// A worker was lost.
    Lost(Lost),
    /// A finding.
    Finding(Box<Finding>),
    /// Counters rose during a slice: host clock, job, slice, lines.
    Risen(u64, u64, u64, Vec<String>),
    /// A slice is void: host clock, job, slice, why.
    Void(u64, u64, u64, String),
}

/// Jobs, and what each cpu did in them.
#[derive(Clone, Debug, Default)]
pub struct History {
    only: Option<Cpu>,
    /// Jobs that count, in the order of the ledger.
    pub order: Vec<u64>,
    /// They by number.
    pub jobs: BTreeMap<u64, JobLine>,
    /// Drills, which are left out.
    pub drills: u64,
    /// By cpu and job.
    pub stays: BTreeMap<Cpu, BTreeMap<u64, Stay>>,
    /// What happened, in the order of the ledger.
    pub happenings: BTreeMap<Cpu, Vec<Happening>>,
    /// Further happenings that are not kept here.
    pub more_happenings: u64,
    /// Remarks of no job.
    pub remarks: Vec<Remark>,
}

impl History {
    /// Nothing yet; of `only` that cpu, if given.
    pub fn new(only: Option<Cpu>) -> History {
        History { only, ..History::default() }
    }

    /// Cpus on which anything but clean slices is on record.
    pub fn eventful(&self) -> BTreeSet<Cpu> {
        let wrong = |s: &Stay| !s.alone.bad.is_empty() || !s.together.bad.is_empty();
        let stays = self.stays.iter().filter(|(_, stays)| stays.values().any(wrong)).map(|(cpu, _)| *cpu);
        stays.chain(self.happenings.keys().copied()).collect()
    }

    pub(super) fn open(&mut self, opened: &Opened, counts: bool) {
        if !counts {
            self.drills += u64::from(opened.job == crate::event::Job::Drill);
            return;
        }
        let line = JobLine { opened: opened.clone(), closed: None, remarks: Vec::new(), more_remarks: 0 };
        if self.jobs.insert(opened.job_id, line).is_none() {
            self.order.push(opened.job_id);
        }
    }

    pub(super) fn close(&mut self, closed: &Closed) {
        if let Some(job) = self.jobs.get_mut(&closed.job_id) {
            job.closed = Some(closed.clone());
        }
    }

    pub(super) fn remark(&mut self, remark: &Remark) {
        match self.jobs.get_mut(&remark.job_id) {
            Some(job) if job.remarks.len() < KEPT => job.remarks.push(remark.clone()),
            Some(job) => job.more_remarks += 1,
            None if remark.job_id == 0 && self.remarks.len() < KEPT => self.remarks.push(remark.clone()),
            None => {}
        }
    }

    /// Takes a slice of the plan; `counts` is false for a void one.
    pub(super) fn slice(&mut self, slice: &Slice, counts: bool) {
        for cpu in [Some(slice.cpu), slice.partner.map(|p| p.cpu)].into_iter().flatten() {
            if self.only.is_some_and(|only| only != cpu) {
                continue;
            }
            let stay = self.stays.entry(cpu).or_default().entry(slice.job_id).or_default();
            stay.risen += u64::from(!slice.counters.is_empty());
            if !counts {
                stay.void += 1;
                continue;
            }
            if slice.partner.is_some() { &mut stay.together } else { &mut stay.alone }.add(slice);
            if !stay.kernels.contains(&slice.kernel) {
                stay.kernels.insert(slice.kernel.clone());
            }
            // readings are of the first cpu
            if let (true, Some(c)) = (cpu == slice.cpu, slice.surroundings.celsius.filter(|c| c.is_finite())) {
                let (low, high) = stay.celsius.unwrap_or((c, c));
                stay.celsius = Some((low.min(c), high.max(c)));
            }
        }
        if !slice.counters.is_empty() {
            self.keep(slice.cpu, || Happening::Risen(slice.wall_ms, slice.job_id, slice.slice, slice.counters.clone()));
        }
        // a slice that never began is no news
        if let (Some(why), true) = (&slice.void, slice.runs > 0 || slice.fold == FoldCheck::Wrong) {
            self.keep(slice.cpu, || Happening::Void(slice.wall_ms, slice.job_id, slice.slice, why.clone()));
        }
    }

    pub(super) fn lost(&mut self, lost: &Lost) {
        for cpu in [Some(lost.cpu), lost.partner].into_iter().flatten() {
            self.stay(cpu, lost.job_id, |s| s.lost += 1);
            self.keep(cpu, || Happening::Lost(lost.clone()));
        }
    }

    pub(super) fn finding(&mut self, finding: &Finding) {
        self.stay(finding.cpu, finding.job_id, |s| s.findings += 1);
        self.keep(finding.cpu, || Happening::Finding(Box::new(finding.clone())));
    }

    fn stay(&mut self, cpu: Cpu, job_id: u64, change: impl FnOnce(&mut Stay)) {
        if self.only.is_none_or(|only| only == cpu) {
            change(self.stays.entry(cpu).or_default().entry(job_id).or_default());
        }
    }

    fn keep(&mut self, cpu: Cpu, make: impl FnOnce() -> Happening) {
        if self.only.is_some_and(|only| only != cpu) {
            return;
        }
        let kept = self.happenings.entry(cpu).or_default();
        if kept.len() < KEPT { kept.push(make()) } else { self.more_happenings += 1 }
    }
}
