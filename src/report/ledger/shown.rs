//! The document of `ledger show`, and its text.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;

use super::episodes::{self, EpisodeLine};
use super::sums::{self, CellLine, CpuLine, SumLine};
use super::timeline::Timeline;
use super::utc;
use super::words::{self, WordsLine};
use super::{sentences, words_text};
use crate::event::{Finding, Lost};
use crate::host::Cpu;
use crate::ledger::cells::LeftOut;
use crate::ledger::filter::Filter;
use crate::ledger::groups::Dimension;
use crate::ledger::{Cell, Condition, View};
use crate::report::figures::{Figures, percent};
use crate::report::text::{folded, printable};
use crate::report::window::VIRTUAL;

/// Without `--by`, at most so many cpus have a line of their own if nothing is wrong with them.
const CPUS: usize = 16;
/// Findings that the text repeats, the latest ones.
const FINDINGS: usize = 10;

/// What is to be shown, and how.
#[derive(Clone, Debug)]
pub struct Ask {
    /// Confidence of intervals and bounds.
    pub confidence: f64,
    /// Gap that ends an episode, milliseconds.
    pub gap_ms: u64,
    /// Tables that were asked for.
    pub by: Vec<Dimension>,
    /// List episodes.
    pub episodes: bool,
    /// Which records were wanted.
    pub filter: Filter,
}

/// The document `proofhouse/ledger-show/1`.
#[derive(Clone, Debug, Serialize)]
pub struct Shown {
    schema: &'static str,
    condition: Condition,
    lines: u64,
    #[serde(skip_serializing_if = "Option::is_none")]
    only: Option<String>,
    confidence: f64,
    gap_ms: u64,
    virtualised: bool,
    hosts: Vec<HostLine>,
    cpus: Vec<CpuLine>,
    cells: Vec<CoverLine>,
    findings: Vec<Finding>,
    lost: Vec<Lost>,
    /// Mismatches whose slice never came on record, in no sum.
    without_slice: u64,
    left_out: LeftOut,
    /// `by_core` and so on.
    #[serde(flatten)]
    by: BTreeMap<String, Vec<SumLine>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    by_cell: Option<Vec<CellLine>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    episodes: Option<Vec<EpisodeLine>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    timeline: Option<Timeline>,
    #[serde(skip_serializing_if = "Option::is_none")]
    words: Option<Vec<WordsLine>>,
    #[serde(skip)]
    text: String,
}

#[derive(Clone, Debug, Serialize)]
struct HostLine {
    host: String,
    part: String,
    jobs: u64,
}

/// One kernel's variant on one cpu under all conditions.
#[derive(Clone, Debug, Serialize)]
struct CoverLine {
    cpu: Cpu,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    partners: Vec<Cpu>,
    kernel: String,
    variant: String,
    #[serde(flatten)]
    figures: Figures,
}

impl Shown {
    /// From what a pass over a ledger gathered.
    pub fn new(view: &View, ask: &Ask) -> Shown {
        let figures = |cell: &Cell| Figures::of(cell, ask.confidence, ask.gap_ms);
        let (tally, only) = (&view.tally, ask.filter.cpu);
        let host = |((host, part), jobs): (&(String, String), &u64)| HostLine {
            host: host.clone(),
            part: part.clone(),
            jobs: *jobs,
        };
        let by: BTreeMap<Dimension, Vec<SumLine>> = ask
            .by
            .iter()
            .filter(|d| !matches!(d, Dimension::Cpu | Dimension::Cell))
            .map(|d| (*d, sums::lines(view, *d, &figures)))
            .collect();
        let totals = || tally.cpus.iter().filter(|(cpu, _)| only.is_none_or(|c| c == **cpu)).map(|(_, t)| t);
        let mut shown = Shown {
            schema: "proofhouse/ledger-show/1",
            condition: view.summary.condition.clone(),
            lines: view.summary.lines,
            only: only_words(&ask.filter),
            confidence: ask.confidence,
            gap_ms: ask.gap_ms,
            virtualised: tally.jobs.values().any(|j| j.virtualised),
            hosts: tally.hosts.iter().map(host).collect(),
            cpus: sums::cpus(tally, only, &figures),
            cells: tally
                .covers
                .iter()
                .map(|(key, cover)| CoverLine {
                    cpu: key.cpu,
                    partners: cover.all.partners.iter().copied().collect(),
                    kernel: key.kernel.clone(),
                    variant: key.variant.clone(),
                    figures: figures(&cover.all),
                })
                .collect(),
            findings: totals().flat_map(|t| t.findings.clone()).collect(),
            lost: totals().flat_map(|t| t.lost.clone()).collect(),
            without_slice: view.orphans().count() as u64,
            left_out: tally.left_out,
            by: by.iter().map(|(d, lines)| (format!("by_{}", d.word()), lines.clone())).collect(),
            by_cell: ask.by.contains(&Dimension::Cell).then(|| sums::cells(tally, &figures)),
            episodes: view.wrongs.as_ref().filter(|_| ask.episodes).map(|w| episodes::lines(w, only, ask.gap_ms)),
            timeline: view.history.as_ref().map(|h| Timeline::new(view, h, only, ask.confidence, &figures)),
            words: None,
            text: String::new(),
        };
        if let (Some(wrongs), Some(words)) = (&view.wrongs, &view.words) {
            let mut lines = words::lines(view, words, wrongs, only, ask.gap_ms);
            lines.iter_mut().for_each(|line| line.suggests = sentences::of(line));
            shown.words = Some(lines);
        }
        shown.text = shown.tables(view, ask, &by, &figures);
        shown
    }

    /// The text for people, at most 100 columns where no table needs more.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let _ = writeln!(out, "{}", folded(&format!("The ledger is {}.", printable(&self.condition.to_string()))));
        for h in &self.hosts {
            let jobs = if h.jobs == 1 { "1 job".to_owned() } else { format!("{} jobs", h.jobs) };
            let text = format!("Host {}, part {}: {jobs}", printable(&h.host), printable(&h.part));
            let _ = writeln!(out, "{}", folded(&text));
        }
        if self.hosts.len() > 1 {
            let text = "Several hosts or parts are on record: a cpu number here puts together what bears it on each.";
            let _ = writeln!(out, "{}", folded(text));
        }
        if self.virtualised {
            let _ = writeln!(out, "{}", folded(VIRTUAL));
        }
        if let Some(only) = &self.only {
            let _ = writeln!(out, "{}", folded(&format!("Shown is only {}.", printable(only))));
        }
        out.push_str(&self.text);
        if let Some(lines) = &self.episodes {
            out.push_str(&episodes::text(lines, self.gap_ms));
        }
        if let Some(timeline) = &self.timeline {
            out.push_str(&timeline.text());
        } else {
            self.found(&mut out);
        }
        if let Some(words) = &self.words {
            out.push_str(&words_text::text(words));
        }
        self.left(&mut out);
        out
    }

    /// The tables that were asked for, or without any wish the short view.
    fn tables(
        &self,
        view: &View,
        ask: &Ask,
        by: &BTreeMap<Dimension, Vec<SumLine>>,
        figures: &dyn Fn(&Cell) -> Figures,
    ) -> String {
        let mut out = String::new();
        if self.cpus.is_empty() && self.cells.is_empty() {
            return "\nNothing that counts is on record here.\n".to_owned();
        }
        let mut note = format!(
            "Intervals and bounds hold with {} each; \"<\" is a one-sided bound where nothing wrong was seen. Busy is processor \
             time inside kernels.",
            percent(ask.confidence)
        );
        if ask.by.iter().any(|d| *d != Dimension::Cell) {
            note.push_str(sums::POOLED);
        }
        for dimension in &ask.by {
            out.push_str(&match (dimension, by.get(dimension)) {
                (Dimension::Cpu, _) => sums::cpu_table(&self.cpus, usize::MAX),
                (Dimension::Cell, _) => sums::all_cells(&view.tally, figures),
                (_, lines) => sums::table(*dimension, lines.map_or(&[], Vec::as_slice)),
            });
        }
        if ask.by.is_empty() && self.timeline.is_none() && self.words.is_none() && self.episodes.is_none() {
            out.push_str(&sums::cpu_table(&self.cpus, CPUS));
            out.push_str(&sums::wrong_cells(&view.tally, figures));
        }
        if !out.is_empty() {
            let _ = writeln!(out, "\n{}", folded(&note));
        }
        out
    }

    fn found(&self, out: &mut String) {
        let earlier = self.findings.len().saturating_sub(FINDINGS);
        let mut latest: Vec<&Finding> = self.findings.iter().collect();
        latest.sort_by_key(|f| f.wall_ms);
        for f in &latest[earlier..] {
            let at = utc::minute(f.wall_ms);
            let _ = writeln!(out, "\n{}", folded(&format!("Finding of {at} UTC: {}", printable(&f.statement))));
        }
        if earlier > 0 {
            let _ = writeln!(out, "\n{earlier} earlier findings: --format json lists them.");
        }
        let mut lost: BTreeMap<(Cpu, &str, String), u64> = BTreeMap::new();
        for l in &self.lost {
            *lost.entry((l.cpu, &l.kernel, l.how.to_string())).or_default() += 1;
        }
        for ((cpu, kernel, how), times) in lost {
            let times = if times > 1 { format!(" ({times} times)") } else { String::new() };
            let text = format!("Lost: the worker of cpu {cpu} in {}: {}{times}", printable(kernel), printable(&how));
            let _ = writeln!(out, "\n{}", folded(&text));
        }
    }

    fn left(&self, out: &mut String) {
        if self.without_slice > 0 {
            let text = format!(
                "{} on record whose slice never was, because its worker or the machine was lost: evidence without exposure, \
                 in no sum.",
                if self.without_slice == 1 {
                    "1 mismatch is".to_owned()
                } else {
                    format!("{} mismatches are", self.without_slice)
                }
            );
            let _ = writeln!(out, "\n{}", folded(&text));
        }
        let l = &self.left_out;
        let left = format!(
            "Left out of every sum: {} records of drills, {} slices for confirmation, {} void slices, {} records without \
             an opening, {} of unknown kinds.",
            l.drill, l.confirmation, l.void, l.no_opening, l.unknown
        );
        let _ = writeln!(out, "\n{}", folded(&left));
    }
}

/// What a filter lets pass, in words; `None` for all.
fn only_words(filter: &Filter) -> Option<String> {
    let mut parts = Vec::new();
    parts.extend(filter.cpu.map(|cpu| format!("cpu {cpu}")));
    if !filter.kernels.is_empty() {
        let kernels: Vec<&str> = filter.kernels.iter().map(glob::Pattern::as_str).collect();
        parts.push(format!("kernels {}", kernels.join(", ")));
    }
    parts.extend(filter.since_ms.map(|t| format!("from {} UTC on", utc::second(t))));
    parts.extend(filter.until_ms.map(|t| format!("before {} UTC", utc::second(t))));
    (!parts.is_empty()).then(|| parts.join(", "))
}
