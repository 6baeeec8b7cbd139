//! What a ledger says: `ledger show` and `ledger verify`, as documents and as text.

use std::fmt::Write;

use serde::Serialize;

use super::figures::{Figures, short};
use super::text::{Table, folded, printable};
use crate::event::{Finding, Lost};
use crate::host::Cpu;
use crate::ledger::cells::LeftOut;
use crate::ledger::{Condition, Summary, Tally};

/// The document `proofhouse/ledger-show/1`.
#[derive(Clone, Debug, Serialize)]
pub struct Shown {
    schema: &'static str,
    condition: Condition,
    hosts: Vec<HostLine>,
    cpus: Vec<CpuLine>,
    cells: Vec<CellLine>,
    findings: Vec<Finding>,
    lost: Vec<Lost>,
    left_out: LeftOut,
}

#[derive(Clone, Debug, Serialize)]
struct HostLine {
    host: String,
    part: String,
    jobs: u64,
}

#[derive(Clone, Debug, Serialize)]
struct CpuLine {
    cpu: Cpu,
    #[serde(flatten)]
    figures: Figures,
}

#[derive(Clone, Debug, Serialize)]
struct CellLine {
    cpu: Cpu,
    kernel: String,
    variant: String,
    #[serde(flatten)]
    figures: Figures,
}

impl Shown {
    /// From the sums over a ledger and how reading it came out.
    pub fn new(tally: &Tally, summary: &Summary, confidence: f64, gap_ms: u64) -> Shown {
        let figures = |cell| Figures::of(cell, confidence, gap_ms);
        Shown {
            schema: "proofhouse/ledger-show/1",
            condition: summary.condition.clone(),
            hosts: tally
                .hosts
                .iter()
                .map(|((host, part), jobs)| HostLine { host: host.clone(), part: part.clone(), jobs: *jobs })
                .collect(),
            cpus: tally.cpus.iter().map(|(cpu, total)| CpuLine { cpu: *cpu, figures: figures(&total.all) }).collect(),
            cells: tally
                .covers
                .iter()
                .map(|(key, cover)| CellLine {
                    cpu: key.cpu,
                    kernel: key.kernel.clone(),
                    variant: key.variant.clone(),
                    figures: figures(&cover.all),
                })
                .collect(),
            findings: tally.cpus.values().flat_map(|t| t.findings.clone()).collect(),
            lost: tally.cpus.values().flat_map(|t| t.lost.clone()).collect(),
            left_out: tally.left_out,
        }
    }

    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let _ = writeln!(out, "The ledger is {}.", printable(&self.condition.to_string()));
        for h in &self.hosts {
            let _ = writeln!(out, "Host {}, part {}: {} jobs", printable(&h.host), printable(&h.part), h.jobs);
        }
        let _ = writeln!(out, "\nBy cpu, all work together:");
        let mut table = Table::new(&["cpu", "runs", "busy s", "wrong", "episodes", "wrong per busy hour"]);
        for line in &self.cpus {
            let f = &line.figures;
            table.row([
                line.cpu.to_string(),
                f.runs.to_string(),
                format!("{:.1}", f.busy_s),
                f.mismatches.to_string(),
                f.episodes.to_string(),
                rate(f, false),
            ]);
        }
        out.push_str(&table.text());
        let _ = writeln!(out, "\nBy cpu, kernel and variant:");
        let mut table = Table::new(&[
            "cpu",
            "kernel",
            "variant",
            "runs",
            "busy s",
            "wrong",
            "episodes",
            "wrong per run",
            "per busy hour",
        ]);
        for line in &self.cells {
            let f = &line.figures;
            table.row([
                line.cpu.to_string(),
                printable(&line.kernel),
                printable(&line.variant),
                f.runs.to_string(),
                format!("{:.1}", f.busy_s),
                f.mismatches.to_string(),
                f.episodes.to_string(),
                rate(f, true),
                rate(f, false),
            ]);
        }
        out.push_str(&table.text());
        for f in &self.findings {
            let _ = writeln!(out, "\n{}", folded(&format!("Finding: {}", printable(&f.statement))));
        }
        for l in &self.lost {
            let _ = writeln!(
                out,
                "\nLost: the worker of cpu {} in {}: {}",
                l.cpu,
                printable(&l.kernel),
                printable(&l.how.to_string())
            );
        }
        let l = &self.left_out;
        let left = format!(
            "Left out of every sum: {} records of drills, {} slices for confirmation, {} void slices, {} records without \
             an opening, {} of unknown kinds.",
            l.drill, l.confirmation, l.void, l.no_opening, l.unknown
        );
        let _ = writeln!(out, "\n{}", folded(&left));
        out
    }
}

fn rate(figures: &Figures, per_run: bool) -> String {
    let rate = if per_run { &figures.per_run } else { &figures.per_hour };
    let Some(rate) = rate else { return "unknown".to_owned() };
    let i = &rate.interval;
    if figures.mismatches == 0 {
        format!("< {}", short(i.upper))
    } else {
        format!("{} to {}", short(i.lower), short(i.upper))
    }
}

/// The document `proofhouse/ledger-verify/1`.
#[derive(Clone, Debug, Serialize)]
pub struct Verified<'a> {
    schema: &'static str,
    ledger: &'a str,
    sound: bool,
    #[serde(flatten)]
    summary: &'a Summary,
}

impl<'a> Verified<'a> {
    /// From how reading a ledger came out.
    pub fn new(ledger: &'a str, summary: &'a Summary) -> Verified<'a> {
        let sound = !matches!(summary.condition, Condition::Broken { .. });
        Verified { schema: "proofhouse/ledger-verify/1", ledger, sound, summary }
    }

    /// Whether every line can be relied on.
    pub fn sound(&self) -> bool {
        self.sound
    }

    /// The text for people.
    pub fn text(&self) -> String {
        let s = self.summary;
        let mut out = format!("{}: {}\n", self.ledger, printable(&s.condition.to_string()));
        let _ = writeln!(out, "{} lines in {} segments", s.lines, s.segments);
        if let Some(head) = &s.head {
            let _ = writeln!(out, "last line: seq {}, SHA-256 {}", head.seq, head.sha256);
        }
        out
    }
}
