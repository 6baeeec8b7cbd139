//! A made-up host with one weak core: its windows are planned by the real planner, confirmed by the real judge and decided
//! by the real rules; only the mismatches are made up.

use std::time::Duration;

use crate::process::generator;
use proofhouse::condition::Condition;
use proofhouse::event::{Event, FoldCheck, Job, Mismatch, NoticedBy, Opened, Purpose, Slice, Surroundings, WrongWord};
use proofhouse::host::Cpu;
use proofhouse::judge::confirm::{Confirmer, Counters, Want};
use proofhouse::judge::verdict::Verdict;
use proofhouse::ledger::{Scope, Tally};
use proofhouse::plan::{self, Brief, History, Ran, Seat, Site, Unit};
use proofhouse::report::gathering::{Before, Frame, Gathering, GridReport};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Exp1, Geometric, Poisson, Uniform};

/// Length of a window, seconds.
pub const BUDGET: f64 = 600.0;
const DAY_MS: u64 = 86_400_000;
const CPUS: u32 = 4;
/// The weak one.
const WEAK: Cpu = Cpu(0);
/// Of a run, for the legs of a confirmation.
const RUN_S: f64 = 20e-6;
/// Mismatches of a burst, and the seconds between them.
const BURST: f64 = 20.0;

/// How a core is weak; rates are mismatches per busy hour.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Weak {
    /// In everything, at one rate.
    Steady(f64),
    /// In one kernel alone; the rate is per busy hour of that kernel.
    Narrow(f64),
    /// In everything, in bursts of twenty about a second apart.
    Bursty(f64),
    /// In everything, in the last third of a window, when the core is hot; the rate is that of the hot time.
    Gated(f64),
    /// Once, in one slice of the first window, and never again.
    Upset,
}

const NARROW: &str = "fma.chain64";

struct Nothing;

impl Counters for Nothing {
    fn risen(&self) -> Vec<String> {
        Vec::new()
    }
}

/// One made-up host.
struct Host {
    weak: Weak,
    history: History,
    past: Tally,
    rng: ChaCha8Rng,
    seed: u64,
    /// Burst under way: times of its mismatches still to come, seconds of busy time since the first window.
    coming: Vec<f64>,
    busy: f64,
}

impl Host {
    fn new(weak: Weak, seed: u64, number: u64) -> Host {
        Host {
            weak,
            history: History::default(),
            past: Tally::new(Scope::default()),
            rng: generator(seed, 1 << 32, number),
            seed: seed.wrapping_mul(1_000_003).wrapping_add(number),
            coming: Vec::new(),
            busy: 0.0,
        }
    }

    /// Mismatches of a slice of `seconds` that begins `at` seconds into the window.
    fn wrong(&mut self, kernel: &str, at: f64, seconds: f64, first: bool) -> u64 {
        let hot = (at + seconds - at.max(BUDGET * 2.0 / 3.0)).clamp(0.0, seconds);
        let expected = match self.weak {
            Weak::Steady(rate) => rate * seconds / 3600.0,
            Weak::Narrow(rate) if kernel == NARROW => rate * seconds / 3600.0,
            Weak::Gated(rate) => rate * hot / 3600.0,
            Weak::Upset => return u64::from(first),
            Weak::Bursty(rate) => return self.burst(rate, seconds),
            Weak::Narrow(_) => 0.0,
        };
        if expected > 0.0 { Poisson::new(expected).expect("a mean").sample(&mut self.rng) as u64 } else { 0 }
    }

    fn burst(&mut self, rate: f64, seconds: f64) -> u64 {
        let (from, to) = (self.busy, self.busy + seconds);
        self.busy = to;
        let begun: f64 = match rate / BURST * seconds / 3600.0 {
            mean if mean > 0.0 => Poisson::new(mean).expect("a mean").sample(&mut self.rng),
            _ => 0.0,
        };
        for _ in 0..begun as u64 {
            let mut at = Uniform::new(from, to).expect("a slice").sample(&mut self.rng);
            for _ in 0..=Geometric::new(1.0 / BURST).expect("a size").sample(&mut self.rng) {
                self.coming.push(at);
                let pause: f64 = Exp1.sample(&mut self.rng);
                at += pause;
            }
        }
        let before = self.coming.len();
        self.coming.retain(|at| *at >= to);
        (before - self.coming.len()) as u64
    }

    /// Mismatches in a leg of a confirmation on the weak core, which follows its slice at once.
    fn again(&mut self, seconds: f64) -> u64 {
        let rate = match self.weak {
            Weak::Steady(rate) | Weak::Narrow(rate) | Weak::Gated(rate) => rate,
            // within a burst a mismatch a second
            Weak::Bursty(_) if !self.coming.is_empty() => 3600.0,
            Weak::Bursty(_) | Weak::Upset => return 0,
        };
        Poisson::new(rate * seconds / 3600.0).expect("a mean").sample(&mut self.rng) as u64
    }

    /// Plays a window; its verdict.
    fn window(&mut self, number: u64, site: &Site, units: &[Unit]) -> Verdict {
        let now_ms = number * DAY_MS;
        let budget = Duration::from_secs_f64(BUDGET);
        let seed = self.seed.wrapping_add(number << 40);
        let brief = Brief { site, units, history: &self.history, budget, now_ms, seed, seeds: &|_| 64 };
        let plan = plan::plan(&brief);
        let opened = opened(number, now_ms);
        let frame = frame(Before::of(&self.past, WEAK));
        let mut gathering = Gathering::new(opened.clone());
        self.past.add(&Event::Opened(opened));
        let seats: Vec<(Cpu, u32)> = (0..CPUS).map(|n| (Cpu(n), n)).collect();
        let cpus = seats.iter().map(|(cpu, _)| *cpu).collect();
        let mut confirmer = Confirmer::new(number, Job::Window, seats, cpus);
        let mut first = number == 1;
        let (mut at, mut slice) = (0.0, 0);
        for phase in &plan.phases {
            for (cpu, planned) in &phase.tracks {
                let shares: u32 = planned.iter().map(|p| p.share).sum();
                let mut begin = at;
                for one in planned {
                    let length = phase.seconds * f64::from(one.share) / f64::from(shares.max(1));
                    let seconds = length * phase.setting.pace.duty();
                    slice += 1;
                    let condition = Condition {
                        setting: phase.setting,
                        paired: one.partner.is_some(),
                        level: None,
                        kib: one.unit.size.0,
                    };
                    let mut wrong = 0;
                    if *cpu == WEAK && one.partner.is_none() {
                        wrong = self.wrong(one.unit.kernel, begin, seconds, first);
                        first &= wrong == 0;
                        let start_ms = now_ms + (begin * 1e3) as u64;
                        let mut ended = slice_of(WEAK, &one.unit, seconds, wrong, Purpose::Plan);
                        (ended.job_id, ended.slice, ended.wall_ms) = (number, slice, start_ms);
                        ended.condition = condition.to_string();
                        self.end(&mut gathering, &mut confirmer, ended, &one.unit);
                    }
                    begin += length;
                    self.history.add(&Ran {
                        cpu: *cpu,
                        partner: one.partner,
                        unit: one.unit,
                        condition,
                        end_ms: now_ms + (begin * 1e3) as u64,
                        busy_ns: (seconds * 1e9) as u64,
                        mismatches: wrong,
                        next_seed: Some(one.next_seed),
                    });
                }
            }
            at += phase.seconds;
        }
        gathering.verdict(&frame)
    }

    /// What the supervisor and the judge make of a slice that ended on the weak core.
    fn end(&mut self, gathering: &mut Gathering, confirmer: &mut Confirmer, ended: Slice, unit: &Unit) {
        let (job_id, now_ms) = (ended.job_id, ended.wall_ms);
        if ended.mismatches == 0 {
            return self.keep(gathering, &Event::Slice(ended));
        }
        let mismatch = Event::Mismatch(mismatch(&ended, unit.size.0));
        self.keep(gathering, &mismatch);
        self.keep(gathering, &Event::Slice(ended));
        let mut wants = confirmer.consider(&mismatch, |_| Some(vec![1]), || Box::new(Nothing));
        while let Some(want) = wants.pop() {
            match want {
                Want::Recompute { ticket, cpus, .. } => {
                    cpus.into_iter().for_each(|cpu| confirmer.recomputed(ticket, cpu, Ok(vec![1])));
                }
                Want::Leg { cpu, purpose, span, .. } => {
                    let seconds = span.as_secs_f64();
                    let again = if cpu == WEAK { self.again(seconds) } else { 0 };
                    let mut leg = slice_of(cpu, unit, seconds, again, purpose);
                    (leg.job_id, leg.wall_ms) = (job_id, now_ms);
                    let leg = Event::Slice(leg);
                    self.keep(gathering, &leg);
                    wants.extend(confirmer.consider(&leg, |_| None, || Box::new(Nothing)));
                }
            }
        }
        for finding in confirmer.completed(now_ms) {
            self.keep(gathering, &Event::Finding(Box::new(finding)));
        }
    }

    fn keep(&mut self, gathering: &mut Gathering, event: &Event) {
        gathering.add(event);
        self.past.add(event);
    }
}

fn opened(job_id: u64, wall_ms: u64) -> Opened {
    Opened {
        job_id,
        job: Job::Window,
        wall_ms,
        budget_s: BUDGET,
        seed: 1,
        host: "made-up".to_owned(),
        part: "made-up".to_owned(),
        virtualised: false,
        program: "0".to_owned(),
        golden: "0".to_owned(),
        cpus: (0..CPUS).map(Cpu).collect(),
    }
}

fn frame(before: Before) -> Frame {
    Frame {
        confidence: 0.95,
        gap_ms: 60_000,
        cpus: (0..CPUS).map(|n| (Cpu(n), n)).collect(),
        before: [(WEAK, before)].into(),
        rounds: 1,
        left_out: 0,
        grid: GridReport::default(),
        skipped: Vec::new(),
        ledger: String::new(),
    }
}

fn slice_of(cpu: Cpu, unit: &Unit, seconds: f64, wrong: u64, purpose: Purpose) -> Slice {
    let runs = ((seconds / RUN_S) as u64).max(1).max(wrong);
    Slice {
        job_id: 0,
        slice: 0,
        job: Job::Window,
        purpose,
        cpu,
        core: cpu.0,
        kernel: unit.kernel.to_owned(),
        variant: unit.variant.to_string(),
        condition: String::new(),
        wall_ms: 0,
        span_ns: (seconds * 1e9) as u64,
        busy_ns: (seconds * 1e9) as u64,
        cases: 1,
        runs,
        operations: runs,
        unit: "run".to_owned(),
        mismatches: wrong,
        mismatch_ms: None,
        fold: FoldCheck::Right,
        checked_on: Some(Cpu(1)),
        void: None,
        surroundings: Surroundings::default(),
        partner: None,
        next_seed: None,
        steps: None,
        counters: Vec::new(),
    }
}

fn mismatch(slice: &Slice, size: u32) -> Mismatch {
    Mismatch {
        job_id: slice.job_id,
        job: Job::Window,
        slice: slice.slice,
        purpose: Purpose::Plan,
        cpu: slice.cpu,
        core: slice.core,
        kernel: slice.kernel.clone(),
        variant: slice.variant.clone(),
        seed: Some(1),
        size,
        condition: slice.condition.clone(),
        wall_ms: slice.wall_ms,
        run: 1,
        noticed_by: NoticedBy::Comparison,
        wrong_words: 1,
        words: vec![WrongWord::new(0, 1, 3)],
        partner: None,
        previous_kernel: None,
        neighbours: Vec::new(),
        surroundings: Surroundings::default(),
    }
}

/// Verdict and wrong slices of each window.
pub type Path = Vec<(Verdict, u64)>;

/// Plays the windows of one host. `age`: windows of clean record before the first.
pub fn follow(weak: Weak, seed: u64, number: u64, windows: u64, age: u64) -> Path {
    let site = Site { seats: (0..CPUS).map(|n| Seat { cpu: Cpu(n), core: n, caches: [None; 3] }).collect() };
    let units = plan::available(|_| true).0;
    let mut host = Host::new(weak, seed, number);
    if age > 0 {
        host.past.add(&Event::Opened(opened(u64::MAX, 0)));
        for unit in &units {
            let mut slice = slice_of(WEAK, unit, age as f64 * BUDGET / units.len() as f64, 0, Purpose::Plan);
            slice.job_id = u64::MAX;
            host.past.add(&Event::Slice(slice));
        }
    }
    let slices = |host: &Host| host.past.cpus.get(&WEAK).map_or(0, |total| total.all.bad.len() as u64);
    let mut path = Vec::new();
    for window in 1..=windows {
        let before = slices(&host);
        let verdict = host.window(window, &site, &units);
        path.push((verdict, slices(&host) - before));
    }
    path
}
