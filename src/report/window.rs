//! The result of one window, as a document and as text.

use std::fmt::Write;

use serde::Serialize;

use super::evidence::Settle;
use super::figures::{Figures, MIX, Rate, short};
use super::text::{Table, folded, printable};
use crate::event::{Ending, Finding};
use crate::host::Cpu;
use crate::judge::verdict::Verdict;

/// Schema of the document.
pub const SCHEMA: &str = "proofhouse/window/1";

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
            let _ = writeln!(out, "\ncpu {}: {}", c.cpu, c.statement);
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
