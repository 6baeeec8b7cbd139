//! The result of a drill.

use std::fmt::Write;

use kernels::Variant;
use serde::Serialize;

use super::text::Table;
use crate::event::Finding;
use crate::host::Cpu;
use crate::run::fault::Fault;

/// How a made-up fault was noticed.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Noticed {
    /// By the worker's own comparison.
    ByComparison,
    /// By the fold, checked on another core.
    ByFold,
    /// By the loss of the worker.
    ByLoss(String),
}

/// One made-up fault.
#[derive(Clone, Debug)]
pub struct Drilled {
    /// Where.
    pub cpu: Cpu,
    /// Kernel, variant, size in KiB.
    pub unit: (&'static str, Variant, u32),
    /// What.
    pub fault: Fault,
    /// How it was noticed on that cpu, if it was.
    pub noticed: Option<Noticed>,
}

/// The document `proofhouse/drill/1`.
#[derive(Clone, Debug, Serialize)]
pub struct DrillReport {
    schema: &'static str,
    /// Every fault noticed on its cpu, and nothing on others.
    pub passed: bool,
    job_id: u64,
    seed: u64,
    ledger: String,
    /// Seconds.
    pub wall_s: f64,
    faults: usize,
    noticed: usize,
    kinds: Vec<Kind>,
    missed: Vec<Missed>,
    /// What was seen where no fault was made up.
    pub on_others: Vec<String>,
    confirmed: usize,
    findings: Vec<Finding>,
}

#[derive(Clone, Debug, Default, Serialize)]
struct Kind {
    kind: &'static str,
    drilled: usize,
    by_comparison: usize,
    by_fold: usize,
    by_loss: usize,
    missed: usize,
}

#[derive(Clone, Debug, Serialize)]
struct Missed {
    cpu: Cpu,
    kernel: &'static str,
    variant: &'static str,
    size: u32,
    fault: Fault,
}

fn kind_of(fault: &Fault) -> &'static str {
    match fault {
        Fault::FlippedBit { .. } => "flipped bit",
        Fault::StuckLane { .. } => "stuck lane",
        Fault::BlindComparison { .. } => "flipped bit, blind comparison",
        Fault::Crash { .. } => "crash",
        Fault::Hang { .. } => "hang",
        Fault::Babble => "babble",
    }
}

impl DrillReport {
    /// From what was made up and what was seen.
    pub fn new(
        job_id: u64,
        seed: u64,
        ledger: String,
        wall_s: f64,
        drilled: Vec<Drilled>,
        on_others: Vec<String>,
        findings: Vec<Finding>,
    ) -> DrillReport {
        let mut kinds: Vec<Kind> = Vec::new();
        for d in &drilled {
            let name = kind_of(&d.fault);
            if !kinds.iter().any(|k| k.kind == name) {
                kinds.push(Kind { kind: name, ..Kind::default() });
            }
            for kind in kinds.iter_mut().filter(|k| k.kind == name) {
                kind.drilled += 1;
                match d.noticed {
                    Some(Noticed::ByComparison) => kind.by_comparison += 1,
                    Some(Noticed::ByFold) => kind.by_fold += 1,
                    Some(Noticed::ByLoss(_)) => kind.by_loss += 1,
                    None => kind.missed += 1,
                }
            }
        }
        let missed: Vec<Missed> = drilled
            .iter()
            .filter(|d| d.noticed.is_none())
            .map(|d| Missed {
                cpu: d.cpu,
                kernel: d.unit.0,
                variant: d.unit.1.name(),
                size: d.unit.2,
                fault: d.fault.clone(),
            })
            .collect();
        DrillReport {
            schema: "proofhouse/drill/1",
            passed: missed.is_empty() && on_others.is_empty(),
            job_id,
            seed,
            ledger,
            wall_s,
            faults: drilled.len(),
            noticed: drilled.len() - missed.len(),
            kinds,
            missed,
            on_others,
            confirmed: findings.iter().filter(|f| f.confirmed).count(),
            findings,
        }
    }

    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let _ = writeln!(
            out,
            "DRILL, nothing of it counts: {} of {} made-up faults noticed on the right core, {} sightings elsewhere, {:.1} s",
            self.noticed,
            self.faults,
            self.on_others.len(),
            self.wall_s
        );
        let _ = writeln!(out, "seed {}, job {} in {}\n", self.seed, self.job_id, self.ledger);
        let mut table = Table::new(&["fault", "drilled", "by comparison", "by fold", "by loss", "missed"]);
        for k in &self.kinds {
            let counts = [k.drilled, k.by_comparison, k.by_fold, k.by_loss, k.missed].map(|n| n.to_string());
            table.row(std::iter::once(k.kind.to_owned()).chain(counts));
        }
        out.push_str(&table.text());
        let _ = writeln!(
            out,
            "\n{} of {} findings confirmed by repeats, controls and recomputation.",
            self.confirmed,
            self.findings.len()
        );
        for m in &self.missed {
            let _ = writeln!(
                out,
                "Missed: {} on cpu {} in {} {} {} KiB",
                kind_of(&m.fault),
                m.cpu,
                m.kernel,
                m.variant,
                m.size
            );
        }
        for line in &self.on_others {
            let _ = writeln!(out, "Elsewhere: {line}");
        }
        out
    }
}
