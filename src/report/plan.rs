//! A plan as a document and as text.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;

use super::gathering::GridReport;
use super::text::{Table, folded, printable};
use crate::host::Cpu;

/// Schema of the document.
pub const SCHEMA: &str = "proofhouse/plan/1";

/// The document `proofhouse/plan/1`.
#[derive(Clone, Debug, Serialize)]
pub struct PlanReport {
    /// Names the document's kind.
    pub schema: &'static str,
    /// Budget in seconds.
    pub budget_s: f64,
    /// Seed of order and choice.
    pub seed: u64,
    /// Tested cpus.
    pub cpus: usize,
    /// Where the history comes from.
    pub ledger: String,
    /// Units that a cpu leaves out because the budget is too short for a sweep.
    pub left_out: usize,
    /// What there is to cover.
    pub grid: GridReport,
    /// Part of all core time that is idle for the sake of settings.
    pub idle: f64,
    /// Phases in order.
    pub phases: Vec<PhaseReport>,
}

/// A part of the window that ends for all cpus together.
#[derive(Clone, Debug, Serialize)]
pub struct PhaseReport {
    /// What it is for.
    pub aim: &'static str,
    /// Who else is busy, how hard, after what.
    pub setting: String,
    /// How long.
    pub seconds: f64,
    /// Part of all tested cpus' time in it that is idle.
    pub idle: f64,
    /// Slices by cpu.
    pub tracks: Vec<TrackReport>,
}

/// What one cpu does in a phase.
#[derive(Clone, Debug, Serialize)]
pub struct TrackReport {
    /// Logical cpu.
    pub cpu: Cpu,
    /// In order.
    pub slices: Vec<SliceReport>,
}

/// A planned slice.
#[derive(Clone, Debug, Serialize)]
pub struct SliceReport {
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Footprint in KiB.
    pub kib: u32,
    /// Where the footprint lies, if the caches are known.
    pub level: Option<String>,
    /// The second cpu of a kernel for two.
    pub partner: Option<Cpu>,
    /// Table seeds in order.
    pub seeds: Vec<u64>,
    /// Whether a case beyond the table is added if one is ready.
    pub fresh: bool,
}

impl PlanReport {
    /// Of phases in order.
    pub fn new(
        budget_s: f64,
        seed: u64,
        cpus: usize,
        ledger: String,
        left_out: usize,
        grid: GridReport,
        phases: Vec<PhaseReport>,
    ) -> PlanReport {
        let all: f64 = phases.iter().map(|p| p.seconds).sum();
        let idle: f64 = phases.iter().map(|p| p.seconds * p.idle).sum();
        let idle = if all > 0.0 { idle / all } else { 0.0 };
        PlanReport { schema: SCHEMA, budget_s, seed, cpus, ledger, left_out, grid, idle, phases }
    }

    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let slices: usize = self.phases.iter().flat_map(|p| &p.tracks).map(|t| t.slices.len()).sum();
        let head = format!(
            "Plan of {:.0} s for {} cpu{}: {} phases, {slices} slices, {:.1} % of the time idle for the sake of conditions; \
             seed {}, history from {}. Nothing was run.",
            self.budget_s,
            self.cpus,
            if self.cpus == 1 { "" } else { "s" },
            self.phases.len(),
            self.idle * 100.0,
            self.seed,
            printable(&self.ledger)
        );
        let _ = writeln!(out, "{}", folded(&head));
        let _ = writeln!(out, "{}\n", folded(&self.coverage()));
        let mut rows: BTreeMap<(&str, &str), (usize, f64, usize, usize)> = BTreeMap::new();
        for phase in &self.phases {
            let row = rows.entry((phase.aim, &phase.setting)).or_default();
            row.0 += 1;
            row.1 += phase.seconds;
            row.2 = row.2.max(phase.tracks.len());
            row.3 += phase.tracks.iter().map(|t| t.slices.len()).sum::<usize>();
        }
        let mut table = Table::new(&["aim", "condition", "phases", "seconds", "cpus", "slices"]);
        for ((aim, setting), (phases, seconds, cpus, slices)) in rows {
            table.row([
                aim.to_owned(),
                setting.to_owned(),
                phases.to_string(),
                format!("{seconds:.2}"),
                cpus.to_string(),
                slices.to_string(),
            ]);
        }
        out.push_str(&table.text());
        out
    }

    fn coverage(&self) -> String {
        let GridReport { cells, uncovered_before, windows } = self.grid;
        let grid = format!("The grid of this host has {cells} cells, {uncovered_before} of them not covered yet");
        match (self.left_out, windows) {
            (0, Some(n)) => format!("{grid}; {n} windows like this one cover each of them at least once."),
            (0, None) => format!("{grid}."),
            (n, Some(w)) => format!(
                "The budget is too short for every kernel: {n} units a cpu are left for next time, the longest untested first; \
                 {w} windows like this one make a sweep. {grid}."
            ),
            (n, None) => format!(
                "The budget is too short for every kernel: {n} units a cpu are left for next time, the longest untested first. \
                 {grid}; windows as short as this one never reach the conditions beyond the sweep: give a longer budget now and then."
            ),
        }
    }
}
