//! The result of one window, as a document and as text. Built from the window's events alone.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;

use super::figures::{Figures, short};
use super::text::{Table, folded, printable};
use crate::condition::Condition;
use crate::event::{Confirmation, Ending, Event, Finding, Lost, Opened, Purpose};
use crate::host::Cpu;
use crate::judge::verdict::{self, Known, Verdict};
use crate::ledger::{Scope, Tally};

/// Schema of the document.
pub const SCHEMA: &str = "proofhouse/window/1";

/// What the ledger knew of a cpu of this host and part before the window.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Before {
    /// Slices with mismatches.
    pub slices_wrong: u64,
    /// Confirmed findings.
    pub confirmed: u64,
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
    opened: Opened,
    tally: Tally,
    busy_ns: u128,
    findings: Vec<Finding>,
    lost: Vec<Lost>,
    remarks: Vec<String>,
    /// Pairs of cpus in each slice that went wrong for two.
    pairs_wrong: Vec<(Cpu, Cpu)>,
    conditions: BTreeMap<String, u128>,
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

    fn known(&self, cpu: Cpu, before: Before) -> Known {
        let total = self.tally.cpus.get(&cpu);
        // where it could not be told which of two it was, both are watched
        let mine = |f: &&Finding| f.cpu == cpu || f.confirmation != Confirmation::Repeated && f.partner == Some(cpu);
        let convicted =
            |other: Cpu| self.findings.iter().any(|f| f.cpu == other && f.confirmation == Confirmation::Repeated);
        let unexplained =
            self.pairs_wrong.iter().filter(|(a, b)| (*a == cpu && !convicted(*b)) || (*b == cpu && !convicted(*a)));
        let confirmations: Vec<Confirmation> = self.findings.iter().filter(mine).map(|f| f.confirmation).collect();
        let orphans = self.tally.without_slice().filter(|m| m.cpu == cpu && m.purpose == Purpose::Plan);
        Known {
            runs: total.map_or(0, |t| u64::try_from(t.all.runs + t.together.runs).unwrap_or(u64::MAX)),
            together_wrong: unexplained.count() as u64,
            slices_wrong: total.map_or(0, |t| t.all.bad.len() as u64) + u64::from(orphans.count() > 0),
            slices_wrong_before: before.slices_wrong,
            confirmations,
            confirmed_before: before.confirmed,
            // of a worker that was lost with two cpus at work nobody knows which of them it was
            lost: self.lost.iter().filter(|l| l.cpu == cpu || l.partner == Some(cpu)).map(|l| l.how.clone()).collect(),
        }
    }

    /// The verdict on the host so far.
    pub fn verdict(&self, frame: &Frame) -> Verdict {
        let before = |cpu| frame.before.get(cpu).copied().unwrap_or_default();
        verdict::worst(frame.cpus.iter().map(|(cpu, _)| verdict::decide(&self.known(*cpu, before(cpu))).then))
    }

    /// The document.
    pub fn report(&self, frame: &Frame, wall_s: f64, ending: Ending) -> WindowReport {
        let cores: Vec<CoreReport> = frame.cpus.iter().map(|&(cpu, core)| self.core(cpu, core, frame)).collect();
        let kernels = self.tally.covers.iter().map(|(key, cover)| KernelReport {
            kernel: key.kernel.clone(),
            variant: key.variant.clone(),
            cpu: key.cpu,
            runs: u64::try_from(cover.all.runs).unwrap_or(u64::MAX),
            busy_s: cover.all.busy_ns as f64 / 1e9,
            operations: u64::try_from(cover.operations).unwrap_or(u64::MAX),
            unit: cover.unit.clone(),
            per_second: if cover.all.busy_ns == 0 {
                0.0
            } else {
                cover.operations as f64 * 1e9 / cover.all.busy_ns as f64
            },
        });
        WindowReport {
            schema: SCHEMA,
            verdict: verdict::worst(cores.iter().map(|c| c.verdict)),
            job_id: self.opened.job_id,
            seed: self.opened.seed,
            host: self.opened.host.clone(),
            part: self.opened.part.clone(),
            virtualised: self.opened.virtualised,
            program: self.opened.program.clone(),
            golden: self.opened.golden.clone(),
            ledger: frame.ledger.clone(),
            ending,
            budget_s: self.opened.budget_s,
            wall_s,
            kernel_share: self.busy_ns as f64 / 1e9 / (wall_s * frame.cpus.len().max(1) as f64),
            rounds: frame.rounds,
            left_out: frame.left_out,
            grid: frame.grid,
            conditions: self
                .conditions
                .iter()
                .map(|(condition, busy)| ConditionReport { condition: condition.clone(), busy_s: *busy as f64 / 1e9 })
                .collect(),
            cores,
            kernels: kernels.collect(),
            skipped: frame.skipped.clone(),
            findings: self.findings.clone(),
            lost: self
                .lost
                .iter()
                .map(|l| LostReport {
                    cpu: l.cpu,
                    core: l.core,
                    kernel: l.kernel.clone(),
                    variant: l.variant.clone(),
                    condition: l.condition.clone(),
                    how: l.how.to_string(),
                    partner: l.partner,
                })
                .collect(),
            remarks: self.remarks.clone(),
        }
    }

    fn core(&self, cpu: Cpu, core: u32, frame: &Frame) -> CoreReport {
        let before = frame.before.get(&cpu).copied().unwrap_or_default();
        let rule = verdict::decide(&self.known(cpu, before));
        let empty = crate::ledger::Cell::default();
        let all = self.tally.cpus.get(&cpu).map_or(&empty, |t| &t.all);
        let figures = Figures::of(all, frame.confidence, frame.gap_ms);
        CoreReport {
            cpu,
            core,
            verdict: rule.then,
            because: rule.when,
            next: rule.next,
            statement: figures.statement(),
            figures,
            together: self.tally.cpus.get(&cpu).map_or(Together::default(), |t| Together {
                runs: u64::try_from(t.together.runs).unwrap_or(u64::MAX),
                mismatches: u64::try_from(t.together.mismatches).unwrap_or(u64::MAX),
            }),
        }
    }
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

/// Time under one condition.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ConditionReport {
    /// Who else was busy, how hard, after what.
    pub condition: String,
    /// Processor time inside kernels, seconds, all cpus together.
    pub busy_s: f64,
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

/// One core in the document.
#[derive(Clone, Debug, Serialize)]
pub struct CoreReport {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// The word.
    pub verdict: Verdict,
    /// The rule that decided.
    pub because: &'static str,
    /// What to do.
    pub next: &'static str,
    /// Counts and rates over all of this window's work on it.
    #[serde(flatten)]
    pub figures: Figures,
    /// The bound in words.
    pub statement: String,
    /// What it ran together with another cpu; wrong outputs there are not told apart between the two.
    pub together: Together,
}

/// Work for two cpus.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Together {
    /// Runs.
    pub runs: u64,
    /// Wrong ones.
    pub mismatches: u64,
}

/// One kernel's variant on one cpu.
#[derive(Clone, Debug, Serialize)]
pub struct KernelReport {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Logical cpu.
    pub cpu: Cpu,
    /// Runs.
    pub runs: u64,
    /// Processor time inside the kernel, seconds.
    pub busy_s: f64,
    /// Operations, in `unit`.
    pub operations: u64,
    /// What is counted.
    pub unit: String,
    /// Operations per busy second.
    pub per_second: f64,
}

/// A lost worker.
#[derive(Clone, Debug, Serialize)]
pub struct LostReport {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// What it was running.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Condition in words.
    pub condition: String,
    /// What became of it.
    pub how: String,
    /// The second cpu of a kernel for two.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
}

/// The document `proofhouse/window/1`.
#[derive(Clone, Debug, Serialize)]
#[expect(missing_docs, reason = "the names are the document's; they are explained where their values are made")]
pub struct WindowReport {
    pub schema: &'static str,
    pub verdict: Verdict,
    pub job_id: u64,
    pub seed: u64,
    pub host: String,
    pub part: String,
    pub virtualised: bool,
    pub program: String,
    pub golden: String,
    pub ledger: String,
    pub ending: Ending,
    pub budget_s: f64,
    pub wall_s: f64,
    pub kernel_share: f64,
    pub rounds: u32,
    pub left_out: usize,
    pub grid: GridReport,
    pub conditions: Vec<ConditionReport>,
    pub cores: Vec<CoreReport>,
    pub kernels: Vec<KernelReport>,
    pub skipped: Vec<Skipped>,
    pub findings: Vec<Finding>,
    pub lost: Vec<LostReport>,
    pub remarks: Vec<String>,
}

/// Said beside every verdict of a virtual machine.
pub const VIRTUAL: &str =
    "This is a virtual machine: a cpu number here is no physical core, and the hypervisor may move it between them.";

impl WindowReport {
    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let share = self.kernel_share * 100.0;
        let _ = writeln!(
            out,
            "{} on {} cpu{} in {:.1} s of {:.0} s; {share:.1} % of the time inside kernels",
            self.verdict.to_string().to_uppercase(),
            self.cores.len(),
            if self.cores.len() == 1 { "" } else { "s" },
            self.wall_s,
            self.budget_s
        );
        let coverage = match (self.rounds, self.left_out) {
            (0, n) => format!(
                "Budget too short for every kernel: {n} units a cpu left for next time (longest untested first)"
            ),
            _ => "Every kernel, variant and size was planned on every cpu, the rest of the budget by value".to_owned(),
        };
        let origin = format!("{coverage}; seed {}, job {} in {}", self.seed, self.job_id, printable(&self.ledger));
        let _ = writeln!(out, "{}", folded(&origin));
        if self.virtualised {
            let _ = writeln!(out, "{}", folded(VIRTUAL));
        }
        let _ = writeln!(out);
        let mut table =
            Table::new(&["cpu", "core", "verdict", "runs", "busy s", "wrong", "episodes", "wrong per busy hour"]);
        for c in &self.cores {
            let rate = c.figures.per_hour.as_ref().map_or("unknown".to_owned(), |r| {
                let i = &r.interval;
                if c.figures.mismatches == 0 {
                    format!("< {}", short(i.upper))
                } else {
                    format!("{} ({} to {})", short(i.estimate), short(i.lower), short(i.upper))
                }
            });
            table.row([
                c.cpu.to_string(),
                c.core.to_string(),
                c.verdict.to_string(),
                c.figures.runs.to_string(),
                format!("{:.1}", c.figures.busy_s),
                c.figures.mismatches.to_string(),
                c.figures.episodes.to_string(),
                rate,
            ]);
        }
        out.push_str(&table.text());
        self.details(&mut out);
        out
    }

    fn details(&self, out: &mut String) {
        for c in &self.cores {
            let _ = writeln!(out, "\ncpu {}: {}", c.cpu, c.statement);
            if c.together.runs > 0 {
                let Together { runs, mismatches } = c.together;
                let _ = writeln!(out, "  together with another cpu: {mismatches} wrong in {runs} runs");
            }
            if c.verdict != Verdict::Clear {
                let _ = writeln!(out, "{}", folded(&format!("  because {}", c.because)));
                let _ = writeln!(out, "{}", folded(&format!("  next: {}", c.next)));
            }
        }
        for f in &self.findings {
            let _ = writeln!(out, "\n{}", folded(&format!("Finding: {}", f.statement)));
            if let (Some(seed), Some(w)) = (f.seed, &f.first) {
                let _ = writeln!(
                    out,
                    "  seed {seed}, {}: word {} is {} for {}\n  xor {}, difference {}",
                    f.condition, w.index, w.actual, w.expected, w.xor, w.difference
                );
            }
            for line in f.counters.iter().chain(&f.lacking) {
                let _ = writeln!(out, "{}", folded(&format!("  {line}")));
            }
        }
        for l in &self.lost {
            let with = l.partner.map_or(String::new(), |p| format!(" together with cpu {p}"));
            let text =
                format!("Lost: the worker of cpu {}{with} in {} {}: {}", l.cpu, l.kernel, l.variant, printable(&l.how));
            let _ = writeln!(out, "\n{}", folded(&text));
        }
        for remark in &self.remarks {
            let _ = writeln!(out, "\n{}", folded(&format!("Remark: {}", printable(remark))));
        }
        if self.conditions.len() > 1 {
            let list: Vec<String> =
                self.conditions.iter().map(|c| format!("{} {:.1} s", c.condition, c.busy_s)).collect();
            let _ = writeln!(out, "\n{}", folded(&format!("Busy time by condition: {}", list.join(", "))));
        }
        if !self.skipped.is_empty() {
            let _ = writeln!(out, "\n{} variants cannot run here; `proofhouse survey` says why.", self.skipped.len());
        }
        let _ = writeln!(out, "A bound holds for this work at this condition; it is no safety certificate.");
    }
}
