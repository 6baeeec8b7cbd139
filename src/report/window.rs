//! The result of one window, as a document and as text.

use std::fmt::Write;

use serde::Serialize;

use super::evidence::Settle;
use super::figures::{Figures, MIX, Rate, short, silent};
use super::gathering::{Frame, Gathering, GridReport, Skipped};
use super::text::{Table, folded, printable};
use crate::event::{Ending, Finding};
use crate::host::Cpu;
use crate::judge::verdict::{self, Verdict};

/// Schema of the document.
pub const SCHEMA: &str = "proofhouse/window/1";

impl Gathering {
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
        let known = self.known(cpu, frame);
        let rule = verdict::decide(&known);
        let empty = crate::ledger::Cell::default();
        let all = self.tally.cpus.get(&cpu).map_or(&empty, |t| &t.all);
        let figures = Figures::of(all, frame.confidence, frame.gap_ms);
        let suspect = matches!(rule.then, Verdict::Watch | Verdict::Withdraw);
        CoreReport {
            cpu,
            core,
            verdict: rule.then,
            because: rule.when,
            next: rule.next,
            statement: figures.statement(),
            figures,
            weakest: self.weakest(cpu, frame),
            together: self.tally.cpus.get(&cpu).map_or(Together::default(), |t| Together {
                runs: u64::try_from(t.together.runs).unwrap_or(u64::MAX),
                mismatches: u64::try_from(t.together.wrong()).unwrap_or(u64::MAX),
            }),
            evidence: if suspect { self.evidence(cpu, &known, frame) } else { Vec::new() },
            settle: if rule.then == Verdict::Watch { self.settle(cpu, frame) } else { Vec::new() },
        }
    }

    /// The kernel's variant that was run least on this cpu, and the bound that its silence gives.
    fn weakest(&self, cpu: Cpu, frame: &Frame) -> Option<Weakest> {
        let alone = |cover: &crate::ledger::cells::Cover| cover.all.partners.is_empty() && cover.all.wrong() == 0;
        let clean = self.tally.covers.iter().filter(|(key, cover)| key.cpu == cpu && alone(cover));
        let (key, cover) = clean.min_by_key(|(_, cover)| cover.all.busy_ns)?;
        Some(Weakest {
            kernel: key.kernel.clone(),
            variant: key.variant.clone(),
            per_hour: silent(cover.all.busy_ns, frame.confidence)?,
        })
    }
}

/// Time under one condition.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ConditionReport {
    /// Who else was busy, how hard, after what.
    pub condition: String,
    /// Processor time inside kernels, seconds, all cpus together.
    pub busy_s: f64,
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
    /// The kernel's variant that was run least without a wrong output.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub weakest: Option<Weakest>,
    /// What it ran together with another cpu; wrong outputs there are not told apart between the two.
    pub together: Together,
    /// What speaks for and against a core that is to be watched or withdrawn, a sentence each.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub evidence: Vec<String>,
    /// What would settle the mismatches of a core that is to be watched.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub settle: Vec<Settle>,
}

/// The weakest part of a core's bound.
#[derive(Clone, Debug, Serialize)]
pub struct Weakest {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Its own bound.
    pub per_hour: Rate,
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
            let rate = c.figures.column();
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
            let _ = writeln!(out, "\n{}", folded(&format!("cpu {}: {}", c.cpu, c.statement)));
            if c.together.runs > 0 {
                let Together { runs, mismatches } = c.together;
                let _ = writeln!(out, "  together with another cpu: {mismatches} wrong in {runs} runs");
            }
            if let Some(w) = &c.weakest {
                let _ = writeln!(
                    out,
                    "  least tested: {} {}, < {} per hour",
                    w.kernel,
                    w.variant,
                    short(w.per_hour.interval.upper)
                );
            }
            if c.verdict != Verdict::Clear {
                let _ = writeln!(out, "{}", folded(&format!("  because {}", c.because)));
                for line in &c.evidence {
                    let _ = writeln!(out, "{}", folded(&format!("  {line}")));
                }
                let _ = writeln!(out, "{}", folded(&format!("  next: {}", c.next)));
                for settle in &c.settle {
                    let _ = writeln!(out, "{}", folded(&format!("  to settle {}", settle.sentence())));
                }
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
        let _ = writeln!(out, "{}", folded(MIX));
        let _ = writeln!(out, "A bound holds for this work at this condition; it is no safety certificate.");
    }
}
