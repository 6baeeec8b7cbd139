//! A cpu's history as a timeline, and the sentences from which its owner judges which results to compute again.

use std::collections::BTreeSet;
use std::fmt::Write;

use serde::Serialize;

use super::utc;
use crate::event::Ending;
use crate::host::Cpu;
use crate::ledger::history::{Happening, History, JobLine, Stay};
use crate::ledger::{Cell, View};
use crate::report::figures::{Figures, percent, short};
use crate::report::text::{Table, folded, printable};

/// Happenings and remarks of one cpu that the text lists, the latest ones.
const LISTED: usize = 20;

/// What one cpu did in one job.
#[derive(Clone, Debug, Serialize)]
pub struct StayLine {
    job_id: u64,
    began_ms: u64,
    began: String,
    /// Host clock at the job's end; null: it was cut off, or is under way.
    ended_ms: Option<u64>,
    ending: Option<Ending>,
    /// The verdict on the host, by which the job ended.
    host_verdict: Option<String>,
    #[serde(flatten)]
    figures: Figures,
    kernels: u64,
    together_runs: u64,
    together_mismatches: u64,
    /// Mismatches of slices that never came on record.
    without_slice: u64,
    void: u64,
    lost: u64,
    findings: u64,
    remarks: u64,
    risen: u64,
    celsius: Option<(f64, f64)>,
}

impl StayLine {
    fn wrong(&self) -> bool {
        self.figures.episodes > 0 || self.without_slice > 0
    }

    /// Runs that count, and nothing that speaks against the cpu.
    fn clear(&self) -> bool {
        self.figures.runs > 0 && !self.wrong() && self.together_mismatches == 0 && self.lost == 0 && self.findings == 0
    }

    fn name(&self) -> String {
        format!("job {} of {} UTC", self.job_id, utc::minute(self.began_ms))
    }
}

/// Something that happened.
#[derive(Clone, Debug, Serialize)]
pub struct Happened {
    wall_ms: u64,
    at: String,
    job_id: u64,
    what: &'static str,
    text: String,
}

/// The history of one cpu.
#[derive(Clone, Debug, Serialize)]
pub struct CpuTimeline {
    cpu: Cpu,
    jobs: Vec<StayLine>,
    happened: Vec<Happened>,
    /// What the last clear job shows, and what it does not.
    shown: Vec<String>,
}

/// Histories, and what is said of no single cpu.
#[derive(Clone, Debug, Serialize)]
pub struct Timeline {
    cpus: Vec<CpuTimeline>,
    remarks: Vec<Happened>,
    drills_left_out: u64,
    not_kept: u64,
}

impl Timeline {
    /// Of `only`, or else of every cpu with anything but clean slices.
    pub fn new(
        view: &View,
        history: &History,
        only: Option<Cpu>,
        confidence: f64,
        figures: &dyn Fn(&Cell) -> Figures,
    ) -> Timeline {
        let mut cpus = history.eventful();
        cpus.extend(view.orphans().map(|m| m.cpu));
        if let Some(only) = only {
            cpus = BTreeSet::from([only]);
        }
        let mut not_kept = history.more_happenings;
        let mut remarks = Vec::new();
        for job in history.order.iter().filter_map(|id| history.jobs.get(id)) {
            not_kept += job.more_remarks;
            remarks.extend(&job.remarks);
        }
        remarks.extend(&history.remarks);
        let mut remarks: Vec<Happened> = remarks
            .into_iter()
            .map(|r| Happened {
                wall_ms: r.wall_ms,
                at: utc::second(r.wall_ms),
                job_id: r.job_id,
                what: "remark",
                text: r.text.clone(),
            })
            .collect();
        remarks.sort_by_key(|r| r.wall_ms);
        Timeline {
            cpus: cpus.into_iter().map(|cpu| one(view, history, cpu, confidence, figures)).collect(),
            remarks,
            drills_left_out: history.drills,
            not_kept,
        }
    }

    /// For people.
    pub fn text(&self) -> String {
        let mut out = String::new();
        if self.cpus.is_empty() {
            let none = "No cpu has anything but clean slices on record. --cpu N shows the history of one all the same.";
            let _ = writeln!(out, "\n{}", folded(none));
        }
        for cpu in &self.cpus {
            out.push_str(&cpu.text());
        }
        listed(&mut out, "Remarks in these jobs, of no single cpu", &self.remarks);
        if self.drills_left_out > 0 {
            let _ = writeln!(out, "\n{} drills are left out.", self.drills_left_out);
        }
        if self.not_kept > 0 {
            let _ = writeln!(out, "\n{} further happenings and remarks are in the ledger only.", self.not_kept);
        }
        out
    }
}

fn listed(out: &mut String, title: &str, things: &[Happened]) {
    if things.is_empty() {
        return;
    }
    let earlier = things.len().saturating_sub(LISTED);
    let more = if earlier > 0 { format!(" ({earlier} earlier ones with --format json)") } else { String::new() };
    let _ = writeln!(out, "\n{title}{more}:");
    for thing in &things[earlier..] {
        let _ = writeln!(out, "{}", folded(&format!("{}  {}: {}", thing.at, thing.what, printable(&thing.text))));
    }
}

fn one(view: &View, history: &History, cpu: Cpu, confidence: f64, figures: &dyn Fn(&Cell) -> Figures) -> CpuTimeline {
    let stays = history.stays.get(&cpu);
    let empty = Stay::default();
    let mut jobs = Vec::new();
    let mut clear = Vec::new();
    for (id, job) in history.order.iter().filter_map(|id| Some((id, history.jobs.get(id)?))) {
        let orphans = view.orphans().filter(|m| m.cpu == cpu && m.partner.is_none() && m.job_id == *id).count() as u64;
        let stay = match stays.and_then(|s| s.get(id)) {
            Some(stay) => stay,
            None if orphans > 0 => &empty,
            None => continue,
        };
        let line = line(job, stay, orphans, figures);
        if line.clear() {
            clear.push((line.job_id, &stay.alone));
        }
        jobs.push(line);
    }
    let pooled = |wanted: &BTreeSet<u64>| {
        let mut all = Cell::default();
        clear.iter().filter(|(id, _)| wanted.contains(id)).for_each(|(_, cell)| all.merge(cell));
        figures(&all)
    };
    let shown = sentences(cpu, &jobs, confidence, &pooled);
    let happened = history.happenings.get(&cpu).into_iter().flatten().map(happened).collect();
    CpuTimeline { cpu, jobs, happened, shown }
}

fn line(job: &JobLine, stay: &Stay, without_slice: u64, figures: &dyn Fn(&Cell) -> Figures) -> StayLine {
    let narrow = |n: u128| u64::try_from(n).unwrap_or(u64::MAX);
    StayLine {
        job_id: job.opened.job_id,
        began_ms: job.opened.wall_ms,
        began: utc::second(job.opened.wall_ms),
        ended_ms: job.closed.as_ref().map(|c| c.wall_ms),
        ending: job.closed.as_ref().map(|c| c.ending),
        host_verdict: job.closed.as_ref().map(|c| c.verdict.clone()),
        figures: figures(&stay.alone),
        kernels: stay.kernels(),
        together_runs: narrow(stay.together.runs),
        together_mismatches: narrow(stay.together.mismatches),
        without_slice,
        void: stay.void,
        lost: stay.lost,
        findings: stay.findings,
        remarks: job.remarks.len() as u64 + job.more_remarks,
        risen: stay.risen,
        celsius: stay.celsius,
    }
}

fn happened(happening: &Happening) -> Happened {
    let (wall_ms, job_id, what, text) = match happening {
        Happening::Lost(l) => {
            let with = l.partner.map_or(String::new(), |p| format!(" (cpus {} and {p})", l.cpu));
            (l.wall_ms, l.job_id, "lost", format!("in {} {}{with}: {}", l.kernel, l.variant, l.how))
        }
        Happening::Finding(f) => (f.wall_ms, f.job_id, "finding", f.statement.clone()),
        Happening::Risen(at, job, slice, lines) => (*at, *job, "risen", format!("slice {slice}: {}", lines.join("; "))),
        Happening::Void(at, job, slice, why) => (*at, *job, "void", format!("slice {slice}: {why}")),
    };
    Happened { wall_ms, at: utc::second(wall_ms), job_id, what, text }
}

/// "fewer than 12.3 wrong per busy hour of that work (95 %), from 4.5 s".
fn bound(figures: &Figures, confidence: f64) -> String {
    let upper = figures.per_hour.as_ref().map_or("an unknown number".to_owned(), |r| short(r.interval.upper));
    format!(
        "fewer than {upper} wrong per busy hour of the work that was run ({}), from {} s of it",
        percent(confidence),
        short(figures.busy_s)
    )
}

fn sentences(cpu: Cpu, jobs: &[StayLine], confidence: f64, pooled: &dyn Fn(&BTreeSet<u64>) -> Figures) -> Vec<String> {
    let mut said = Vec::new();
    let ids = |jobs: &[StayLine]| jobs.iter().map(|j| j.job_id).collect::<BTreeSet<u64>>();
    let all_of = |ids: BTreeSet<u64>| bound(&pooled(&ids), confidence);
    let clear = |jobs: &[StayLine]| jobs.iter().filter(|j| j.clear()).count();
    let wrong = |j: &StayLine| j.wrong();
    let Some(first) = jobs.iter().position(wrong) else {
        match jobs.iter().rev().find(|j| j.clear()) {
            None => said.push(format!(
                "Cpu {cpu} was never shown clear on this record: no job ran work on it without anything against it."
            )),
            Some(last) => {
                said.push(format!(
                    "Cpu {cpu} was last shown clear in {}: {}.",
                    last.name(),
                    bound(&last.figures, confidence)
                ));
                if clear(jobs) > 1 {
                    said.push(format!("All {} clear jobs together: {}.", clear(jobs), all_of(ids(jobs))));
                }
            }
        }
        return said;
    };
    let (before, last) = (&jobs[..first], jobs.iter().rposition(wrong).unwrap_or(first));
    said.push(format!("Cpu {cpu} was first wrong on this record in {}.", jobs[first].name()));
    match before.iter().rev().find(|j| j.clear()) {
        None => said.push(
            "No clear job before that is on record: nothing here says from when on its results can be relied on."
                .to_owned(),
        ),
        Some(clear_one) => {
            said.push(format!(
                "It was last shown clear before that in {}: {}.",
                clear_one.name(),
                bound(&clear_one.figures, confidence)
            ));
            if clear(before) > 1 {
                said.push(format!("All {} clear jobs before it together: {}.", clear(before), all_of(ids(before))));
            }
            said.push(
                "Results computed on it since then are the first to do again; earlier ones are covered by that bound only, \
                 for work like this under conditions like these."
                    .to_owned(),
            );
        }
    }
    let after = &jobs[last + 1..];
    if clear(after) > 0 {
        said.push(format!(
            "It was last wrong in {}; {} after that clear: {}. That takes nothing back.",
            jobs[last].name(),
            if clear(after) == 1 { "1 job was".to_owned() } else { format!("{} jobs were", clear(after)) },
            all_of(ids(after))
        ));
    }
    said
}

impl CpuTimeline {
    fn text(&self) -> String {
        let mut out = format!("\nCpu {}, job by job; times are UTC, the verdict is the host's:\n", self.cpu);
        let celsius = self.jobs.iter().any(|j| j.celsius.is_some());
        let mut headings = vec!["began", "job", "busy s", "runs", "kernels", "wrong", "per busy hour"];
        headings.extend(celsius.then_some("°C"));
        headings.push("verdict");
        let mut table = Table::new(&headings);
        for job in &self.jobs {
            let degrees = job.celsius.map_or("unknown".to_owned(), |(low, high)| format!("{low:.0} to {high:.0}"));
            let ending = match (&job.host_verdict, job.ending) {
                (None, _) => "no end".to_owned(),
                (Some(verdict), Some(Ending::Signal | Ending::Failed)) => format!("{} (cut short)", printable(verdict)),
                (Some(verdict), _) => printable(verdict),
            };
            let row = [
                utc::minute(job.began_ms),
                job.job_id.to_string(),
                format!("{:.2}", job.figures.busy_s),
                job.figures.runs.to_string(),
                job.kernels.to_string(),
                job.figures.mismatches.to_string(),
                super::columns::rate(&job.figures, false),
            ];
            table.row(row.into_iter().chain(celsius.then_some(degrees)).chain([ending]));
        }
        let text = table.text();
        let mut lines = text.lines();
        let _ = writeln!(out, "{}", lines.next().unwrap_or_default());
        for (line, job) in lines.zip(&self.jobs) {
            let _ = writeln!(out, "{line}");
            let also = job.also();
            if !also.is_empty() {
                let _ = writeln!(out, "    also: {also}");
            }
        }
        for sentence in &self.shown {
            let _ = writeln!(out, "{}", folded(sentence));
        }
        listed(&mut out, &format!("What happened on cpu {}", self.cpu), &self.happened);
        out
    }
}

impl StayLine {
    fn also(&self) -> String {
        let also: Vec<String> = [
            (self.together_mismatches, "wrong together"),
            (self.without_slice, "wrong without a slice"),
            (self.lost, "lost"),
            (self.findings, "findings"),
            (self.risen, "slices with risen counters"),
            (self.void, "void"),
            (self.remarks, "remarks"),
        ]
        .into_iter()
        .filter(|(n, _)| *n > 0)
        .map(|(n, what)| format!("{what} {n}"))
        .collect();
        also.join(", ")
    }
}
