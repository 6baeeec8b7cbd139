//! `drill`: made-up faults through the whole chain of workers, comparison, second opinion, confirmation and ledger, to
//! prove that this build on this host would notice. Every record is marked and never counts.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::rc::Rc;
use std::time::{Duration, Instant};

use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

use super::args::{DrillArgs, Format};
use super::bench::Bench;
use super::live::Truths;
use super::{common, say, say_json};
use crate::condition::Setting;
use crate::error::Error;
use crate::event::{Closed, Event, Job, NoticedBy, Purpose};
use crate::exit_code::Exit;
use crate::host::Cpu;
use crate::judge::confirm::Confirmer;
use crate::plan::{Site, Unit};
use crate::report::drill::{DrillReport, Drilled, Noticed};
use crate::run::driver::{self, unix_ms};
use crate::run::fault::Fault;
use crate::run::spec::{Phase, Post, Setup, Span, Spec, Track};

/// Length of a drilled slice.
const SLICE: Duration = Duration::from_millis(80);
/// How long past its span a slice may answer before the worker counts as hung.
const GRACE: Duration = Duration::from_millis(1500);

/// Runs the command.
pub fn run(args: &DrillArgs, start: Instant) -> Result<Exit, Error> {
    common::open_golden()?;
    let host = common::host()?;
    let seats = common::seats(&host, &args.choice)?;
    let (mut units, _) = common::units(&args.choice)?;
    // a made-up fault belongs to one core
    units.retain(|u| kernels::catalogue::find(u.kernel).is_some_and(|k| k.cpus() == 1));
    if units.is_empty() {
        return Err(Error::Usage("--kernels: a drill needs a kernel for one cpu; try 'integer.*'".to_owned()));
    }
    let seed = common::seed(args.seed);
    let (journal, opening, path) = common::open_journal(&args.place, |_| {})?;
    let all = common::all_seats(&host);
    if all.iter().all(|(_, core)| *core == all[0].1) {
        return Err(Error::CannotDo(
            "a drill needs two cores, one to be wrong and one to notice; widen the affinity mask or the cpuset"
                .to_owned(),
        ));
    }
    let cpus: Vec<Cpu> = seats.iter().map(|(cpu, _)| *cpu).collect();
    let mut drilled = invent(args.faults, &cpus, &units, seed);
    let tracks = tracks(&seats, &units, &drilled, seed);
    // generous: the job ends when its slices are done
    let budget = Duration::from_secs(120) + (SLICE * 4 + GRACE) * (args.faults + 8);
    let opened = common::opened(&host, Job::Drill, opening.next_job, budget.as_secs_f64(), seed, &seats);
    let confirmer = Confirmer::new(opened.job_id, Job::Drill, all.clone(), cpus.clone());
    let mut bench = Bench::new(&host, journal, confirmer, opened.job_id, &seats, None, None);
    let watch = Rc::new(RefCell::new(Watcher::new(&drilled)));
    let listener = watch.clone();
    bench.listener = Box::new(move |event| listener.borrow_mut().see(event));
    let memory = watch.clone();
    bench.remembered = Box::new(move |cpu, kernel| memory.borrow().faults_of(cpu, kernel));
    bench.show_progress(budget);
    let cannot = |why: String| Error::CannotDo(format!("ledger: {why}"));
    bench.keep(&Event::Opened(opened.clone())).map_err(cannot)?;
    for lost in &opening.abandoned {
        bench.keep(&Event::Lost(lost.clone())).map_err(cannot)?;
    }
    let setup = Setup {
        job_id: opened.job_id,
        job: Job::Drill,
        budget,
        longest: SLICE,
        grace: GRACE,
        losses_borne: u32::MAX,
        posts: seats.iter().map(|&(cpu, core)| Post { cpu, core }).collect(),
        phases: vec![Phase { seconds: budget.as_secs_f64(), open: true, whole: true, tracks }],
    };
    let truths = Truths { live: None, site: Site::of(&host, &seats) };
    let outcome = driver::run(start, setup, Box::new(truths), all, &mut bench)
        .map_err(|why| Error::CannotDo(format!("the workers cannot be run: {why}")))?;
    bench.hide_progress();
    bench.close("the drill ended").map_err(cannot)?;
    let slices = bench.slices;
    let (on_others, findings) = {
        let watch = watch.borrow();
        for (fault, seen) in drilled.iter_mut().zip(&watch.seen) {
            fault.noticed = seen.clone();
        }
        (watch.on_others.clone(), watch.findings.clone())
    };
    let report = DrillReport::new(
        opened.job_id,
        seed,
        path.display().to_string(),
        start.elapsed().as_secs_f64(),
        drilled,
        on_others,
        findings,
    );
    let closed = Closed {
        job_id: opened.job_id,
        job: Job::Drill,
        wall_ms: unix_ms(),
        wall_s: report.wall_s,
        ending: outcome.ending,
        verdict: if report.passed { "noticed" } else { "missed" }.to_owned(),
        slices,
    };
    let kept = bench.keep(&Event::Closed(closed));
    match args.output.format {
        Format::Text => say(&report.text())?,
        Format::Json => say_json(&report)?,
    }
    if let Some(why) = outcome.disk.or(kept.err()) {
        return Err(cannot(why));
    }
    // a mismatch where no fault was made up is no failure of the drill: it is the real thing
    Ok(match (report.on_others.is_empty(), report.passed) {
        (false, _) => Exit::Watch,
        (true, true) => Exit::Clear,
        (true, false) => Exit::CannotDo,
    })
}

/// Faults of every kind in turn, on every cpu in turn, in units drawn by the seed.
fn invent(count: u32, cpus: &[Cpu], units: &[Unit], seed: u64) -> Vec<Drilled> {
    let mut rng = ChaCha12Rng::seed_from_u64(seed ^ 0x6472_696c_6c00);
    (0..count as usize)
        .map(|i| {
            let unit = units[(rng.next_u64() % units.len() as u64) as usize];
            // 10^-3 to 1 per run, evenly over the decades
            let per_run = 10f64.powf(-3.0 * (rng.next_u64() >> 11) as f64 / (1u64 << 53) as f64);
            let after = (rng.next_u64() % 90) as f64 / 100.0;
            let seed = rng.next_u64() >> 16;
            let fault = match i / cpus.len() % 6 {
                0 => Fault::FlippedBit { per_run, seed },
                1 => Fault::StuckLane { lane: (seed & 3) as u8, value: rng.next_u64() },
                2 => Fault::BlindComparison { per_run, seed },
                3 => Fault::Crash { signal: [libc::SIGSEGV, libc::SIGILL, libc::SIGBUS][(seed % 3) as usize], after },
                4 => Fault::Hang { after },
                _ => Fault::Babble,
            };
            Drilled { cpu: cpus[i % cpus.len()], unit: (unit.kernel, unit.variant, unit.size.0), fault, noticed: None }
        })
        .collect()
}

/// Each cpu's faulty slices with clean ones between, so that what a loss takes with it is never a fault.
fn tracks(seats: &[(Cpu, u32)], units: &[Unit], drilled: &[Drilled], seed: u64) -> Vec<Track> {
    let mut rng = ChaCha12Rng::seed_from_u64(seed ^ 0x636c_6561_6e00);
    let spec = |unit: Unit, seeds: Vec<u64>, faults: Vec<Fault>| Spec {
        purpose: Purpose::Plan,
        kernel: unit.kernel,
        variant: unit.variant,
        size: unit.size,
        seeds,
        next_seed: None,
        fresh: false,
        partner: None,
        setting: Setting::PLAIN,
        span: Span::Fixed(SLICE),
        faults,
    };
    seats
        .iter()
        .map(|&(cpu, _)| {
            let mut slices = Vec::new();
            for fault in drilled.iter().filter(|d| d.cpu == cpu) {
                let (kernel, variant, size) = fault.unit;
                let unit = Unit { kernel, variant, size: kernels::Size(size) };
                let seeds = |unit: &Unit| (0..common::seeds_of(unit).min(2)).collect();
                slices.push(spec(unit, seeds(&unit), vec![fault.fault.clone()]));
                let clean = units[(rng.next_u64() % units.len() as u64) as usize];
                slices.push(spec(clean, seeds(&clean), Vec::new()));
            }
            Track { cpu, slices }
        })
        .collect()
}

/// Sets what is noticed against what was made up.
struct Watcher {
    /// Planned slices of each cpu in order: the fault in each, if any.
    expected: BTreeMap<Cpu, Vec<Option<usize>>>,
    faults: Vec<(Cpu, &'static str, Fault)>,
    /// How many planned intents each cpu has had.
    begun: BTreeMap<Cpu, usize>,
    /// Slice number to fault.
    of_slice: BTreeMap<(Cpu, u64), Option<usize>>,
    /// Slices that belong to confirmations.
    legs: BTreeMap<(Cpu, u64), ()>,
    seen: Vec<Option<Noticed>>,
    on_others: Vec<String>,
    findings: Vec<crate::event::Finding>,
}

impl Watcher {
    fn new(drilled: &[Drilled]) -> Watcher {
        let mut expected: BTreeMap<Cpu, Vec<Option<usize>>> = BTreeMap::new();
        for (i, d) in drilled.iter().enumerate() {
            expected.entry(d.cpu).or_default().extend([Some(i), None]);
        }
        Watcher {
            expected,
            faults: drilled.iter().map(|d| (d.cpu, d.unit.0, d.fault.clone())).collect(),
            begun: BTreeMap::new(),
            of_slice: BTreeMap::new(),
            legs: BTreeMap::new(),
            seen: vec![None; drilled.len()],
            on_others: Vec::new(),
            findings: Vec::new(),
        }
    }

    /// The fault that made this cpu wrong in this kernel stays for the confirmation, if it changes outputs.
    fn faults_of(&self, cpu: Cpu, kernel: &str) -> Vec<Fault> {
        let lasting =
            |f: &Fault| matches!(f, Fault::FlippedBit { .. } | Fault::StuckLane { .. } | Fault::BlindComparison { .. });
        let mine = self
            .faults
            .iter()
            .zip(&self.seen)
            .filter(|((c, k, f), seen)| *c == cpu && *k == kernel && lasting(f) && seen.is_some());
        mine.map(|((_, _, f), _)| f.clone()).next().into_iter().collect()
    }

    fn see(&mut self, event: &Event) {
        match event {
            Event::Intent(intent) => {
                for a in &intent.assignments {
                    self.intend(a.cpu, a.slice, a.purpose);
                }
            }
            Event::Mismatch(m) => {
                let how = match m.noticed_by {
                    NoticedBy::Comparison => Noticed::ByComparison,
                    NoticedBy::Fold => Noticed::ByFold,
                };
                self.notice(m.cpu, m.slice, how, &format!("a mismatch in {}", m.kernel));
            }
            Event::Lost(l) => {
                self.notice(
                    l.cpu,
                    l.slice,
                    Noticed::ByLoss(l.how.to_string()),
                    &format!("a lost worker in {}", l.kernel),
                );
            }
            Event::Finding(f) => self.findings.push((**f).clone()),
            _ => {}
        }
    }

    fn intend(&mut self, cpu: Cpu, slice: u64, purpose: Purpose) {
        if purpose == Purpose::Plan {
            let index = self.begun.entry(cpu).or_default();
            let fault = self.expected.get(&cpu).and_then(|e| e.get(*index)).copied().flatten();
            *index += 1;
            self.of_slice.insert((cpu, slice), fault);
        } else if purpose == Purpose::Suspect {
            self.legs.insert((cpu, slice), ());
        } else {
            self.of_slice.insert((cpu, slice), None);
        }
    }

    fn notice(&mut self, cpu: Cpu, slice: u64, how: Noticed, what: &str) {
        if self.legs.contains_key(&(cpu, slice)) {
            return;
        }
        match self.of_slice.get(&(cpu, slice)) {
            Some(Some(fault)) => {
                self.seen[*fault].get_or_insert(how);
            }
            _ => self.on_others.push(format!("cpu {cpu}: {what}, slice {slice}, where no fault was made up")),
        }
    }
}
