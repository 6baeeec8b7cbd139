//! `window`: test every core within a time budget.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;
use std::time::{Duration, Instant};

use super::args::{Format, WindowArgs};
use super::bench::Bench;
use super::common::OwnJobs;
use super::explain;
use super::live::{Live, Truths};
use super::sample::{Sampled, sample};
use super::{common, say, say_json};
use crate::error::Error;
use crate::event::Purpose;
use crate::event::{Closed, Confirmation, Ending, Event, Finding, Job, Opened};
use crate::exit_code::Exit;
use crate::host::Host;
use crate::judge::confirm::Confirmer;
use crate::ledger::{Scope, Tally};
use crate::plan::{self, Brief, History, Site};
use crate::report::gathering::{Before, Frame, Gathering, Skipped};
use crate::run::checker::Seat;
use crate::run::driver::{self, unix_ms};
use crate::run::spec::{Phase, Post, Setup, Span, Spec, Track};

/// Mismatches of one cell closer together than this are one episode.
const GAP_MS: u64 = 60_000;
/// How long past its span a slice may answer; longer where a hypervisor may withhold a cpu without a trace.
const GRACE: Duration = Duration::from_secs(2);
const GRACE_VIRTUAL: Duration = Duration::from_secs(6);
/// Workers of one cpu that may be lost before it is left alone.
const LOSSES_BORNE: u32 = 8;

/// Runs the command.
pub fn run(args: &WindowArgs, start: Instant) -> Result<Exit, Error> {
    common::open_golden()?;
    let host = common::host_below(&args.root)?;
    let seats = common::seats(&host, &args.choice)?;
    let (mut units, mut skipped) = common::units(&args.choice)?;
    common::without_pairs(&mut units, &mut skipped, seats.len())?;
    if args.max_temp.is_some() && seats.iter().all(|(cpu, _)| host.sensors.read(*cpu).celsius.is_none()) {
        return Err(Error::CannotDo(
            "--max-temp cannot be kept: no temperature of the tested cpus can be read here; see `proofhouse survey`, or leave it out"
                .to_owned(),
        ));
    }
    let seed = common::seed(args.seed);
    let site = Site::of(&host, &seats);
    if args.explain {
        return explain::run(args, &host, &site, &units, seed);
    }
    let identity = common::identity(&host);
    let mut history = History::default();
    let mut own = OwnJobs::of(&host);
    let mut past = Tally::new(Scope { host: Some(identity.0), part: Some(identity.1), job_id: None });
    let (journal, opening, path) = common::open_journal(&args.place, |event| {
        past.add(event);
        if own.counts(event) {
            common::remember(&mut history, event);
        }
    })?;
    let all = common::all_seats(&host);
    let sampled = sample(&all, seed);
    if let Some(case) = sampled.against_table.first() {
        return Err(Error::CannotDo(format!(
            "the reference gives other words than the golden table for {case} on {} cpus; reinstall the program, and if it \
             recurs do not trust this machine's memory",
            sampled.on.len()
        )));
    }
    let opened = common::opened(&host, Job::Window, opening.next_job, args.budget.as_secs_f64(), seed, &seats);
    let plan = plan::plan(&Brief {
        site: &site,
        units: &units,
        history: &history,
        budget: args.budget.saturating_sub(common::OVERHEAD),
        now_ms: opened.wall_ms,
        seed,
        seeds: &common::seeds_of,
    });
    let live = Arc::new(Live::start(opened.job_id, &all));
    let frame = Frame {
        confidence: args.confidence,
        gap_ms: GAP_MS,
        cpus: seats.clone(),
        before: past.cpus.keys().map(|cpu| (*cpu, Before::of(&past, *cpu))).collect::<BTreeMap<_, _>>(),
        rounds: plan.rounds(),
        left_out: plan.left_out,
        grid: explain::grid(&plan.grid),
        skipped: skipped
            .into_iter()
            .map(|s| Skipped { kernel: s.kernel.to_owned(), variant: s.variant.to_string(), why: s.why })
            .collect(),
        ledger: path.display().to_string(),
    };
    let confirmer = Confirmer::new(opened.job_id, Job::Window, all.clone(), opened.cpus.clone());
    let gathering = Rc::new(RefCell::new(Gathering::new(opened.clone())));
    let mut bench = Bench::new(&host, journal, confirmer, opened.job_id, &seats, args.max_temp, Some(live.clone()));
    let listener = gathering.clone();
    bench.listener = Box::new(move |event| listener.borrow_mut().add(event));
    bench.show_progress(args.budget);
    open(&mut bench, &opened, &opening.abandoned, &sampled, &seats, &host)
        .map_err(|why| Error::CannotDo(format!("ledger: {why}")))?;
    let setup = Setup {
        job_id: opened.job_id,
        job: Job::Window,
        budget: args.budget,
        longest: plan::LONGEST_SLICE,
        grace: if opened.virtualised { GRACE_VIRTUAL } else { GRACE },
        losses_borne: LOSSES_BORNE,
        posts: seats.iter().map(|&(cpu, core)| Post { cpu, core }).collect(),
        phases: plan.phases.iter().map(phase).collect(),
    };
    let truths = Truths { live: Some(live), site };
    let outcome = driver::run(start, setup, Box::new(truths), all, &mut bench)
        .map_err(|why| Error::CannotDo(format!("the workers cannot be run: {why}")))?;
    bench.hide_progress();
    let closing = close(&mut bench, &gathering, &frame, &opened, outcome.ending, start);
    let wall_s = start.elapsed().as_secs_f64();
    let report = gathering.borrow().report(&frame, wall_s, outcome.ending);
    match args.output.format {
        Format::Text => say(&report.text())?,
        Format::Json => say_json(&report)?,
    }
    if let Some(why) = outcome.disk.or(closing.err()) {
        return Err(Error::CannotDo(format!("ledger: {why}; the report above was not kept")));
    }
    Ok(report.verdict.exit())
}

fn close(
    bench: &mut Bench,
    gathering: &Rc<RefCell<Gathering>>,
    frame: &Frame,
    opened: &Opened,
    ending: Ending,
    start: Instant,
) -> Result<(), String> {
    let why = match ending {
        Ending::Signal => "a signal ended the window",
        Ending::Failed => "the ledger failed",
        Ending::Budget | Ending::Done => "the window's budget ended",
    };
    bench.close(why)?;
    let verdict = gathering.borrow().verdict(frame);
    let slices = bench.slices;
    bench.keep(&Event::Closed(Closed {
        job_id: opened.job_id,
        job: Job::Window,
        wall_ms: unix_ms(),
        wall_s: start.elapsed().as_secs_f64(),
        ending,
        verdict: verdict.to_string(),
        slices,
    }))
}

/// Everything that has to stand in the ledger before the first slice.
fn open(
    bench: &mut Bench,
    opened: &Opened,
    abandoned: &[crate::event::Lost],
    sampled: &Sampled,
    seats: &[Seat],
    host: &Host,
) -> Result<(), String> {
    bench.keep(&Event::Opened(opened.clone()))?;
    for lost in abandoned {
        bench.keep(&Event::Lost(lost.clone()))?;
    }
    if sampled.on.len() < 2 {
        bench.remark("only one core may be used: nothing this window says was checked on another core".to_owned())?;
    }
    if host.virtualised.answer.is_none() {
        bench.remark(
            "whether this is a virtual machine cannot be told: take cpu numbers for cores with care".to_owned(),
        )?;
    }
    for (cpu, case) in &sampled.apart {
        let core = seats.iter().find(|(c, _)| c == cpu).map_or(cpu.0, |(_, core)| *core);
        bench.keep(&Event::Finding(Box::new(Finding {
            job_id: opened.job_id,
            job: Job::Window,
            cpu: *cpu,
            core,
            kernel: case.kernel.to_owned(),
            variant: "reference".to_owned(),
            seed: Some(case.seed.0),
            size: case.size.0,
            condition: "at start".to_owned(),
            wall_ms: unix_ms(),
            confirmed: false,
            confirmation: Confirmation::Incomplete,
            mismatches: 1,
            first: None,
            recomputed_on: sampled.on.clone(),
            suspect: Vec::new(),
            controls: Vec::new(),
            counters: Vec::new(),
            lacking: vec!["seen in the start's sample, before any worker ran".to_owned()],
            partner: None,
            statement: format!(
                "cpu {cpu} gave other words for {case} by the reference than the table and the other core"
            ),
        })))?;
    }
    Ok(())
}

/// A planned phase as the supervisor takes it.
fn phase(planned: &plan::Phase) -> Phase {
    let spec = |slice: &plan::Planned| Spec {
        purpose: Purpose::Plan,
        kernel: slice.unit.kernel,
        variant: slice.unit.variant,
        size: slice.unit.size,
        seeds: slice.seeds.clone(),
        next_seed: Some(slice.next_seed),
        fresh: slice.fresh,
        partner: slice.partner,
        setting: planned.setting,
        span: Span::Share(slice.share),
        faults: Vec::new(),
    };
    let tracks =
        planned.tracks.iter().map(|(cpu, slices)| Track { cpu: *cpu, slices: slices.iter().map(spec).collect() });
    let whole = planned.aim == plan::Aim::Sweep;
    Phase { seconds: planned.seconds, open: planned.open, whole, tracks: tracks.collect() }
}
