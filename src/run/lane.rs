//! One cpu's side of the supervisor: its worker's state, what it has been ordered, what it is still to do.

use std::collections::VecDeque;
use std::sync::Arc;
use std::time::Duration;

use kernels::{Case, Seed, Work, catalogue};

use super::protocol::{CaseOrder, SliceOrder, SliceReport};
use super::spec::{Post, Span, Spec, Truth};
use crate::condition::{Before, Condition};
use crate::event::Surroundings;
use crate::host::Cpu;

/// State of a cpu's worker.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Worker {
    /// Not there; may be started.
    Down,
    /// Started at this time, not ready yet.
    Starting(Duration),
    /// Ready for orders.
    Up,
    /// Not there and not to be started again.
    GivenUp,
}

/// A slice that a worker has been ordered.
pub(super) struct Flight {
    pub slice: u64,
    pub spec: Spec,
    pub span: Duration,
    pub condition: String,
    pub work: Work,
    /// Of table seeds first, then of fresh ones.
    pub expected: Vec<Arc<Vec<u64>>>,
    /// When it became the worker's next slice.
    pub ordered: Duration,
    pub begun: Option<Duration>,
    /// The program itself was held up while this was the worker's next or present slice.
    pub shaken: bool,
    /// Processor time of the worker when the slice began.
    pub busy_before: Duration,
    pub wall_ms: u64,
    pub surroundings: Surroundings,
}

impl Flight {
    pub fn new(slice: u64, cpu: Cpu, mut spec: Spec, span: Duration, truth: &mut dyn Truth) -> Result<Flight, String> {
        let kernel = catalogue::find(spec.kernel).ok_or_else(|| format!("no kernel {}", spec.kernel))?;
        let mut expected = Vec::with_capacity(spec.seeds.len());
        for &seed in &spec.seeds {
            let case = Case { kernel: spec.kernel, seed: Seed(seed), size: spec.size };
            let words = truth.expected(&case).ok_or_else(|| format!("no golden words for {case}"))?;
            expected.push(Arc::new(words));
        }
        if let Some((seed, words)) = if spec.fresh { truth.fresh(spec.kernel, spec.size, cpu) } else { None } {
            spec.seeds.push(seed.0);
            expected.push(Arc::new(words));
        }
        let work = kernel.work(spec.size);
        let level = truth.level(spec.size, cpu, spec.setting);
        let paired = spec.partner.is_some();
        let condition = Condition { setting: spec.setting, paired, level, kib: spec.size.0 }.to_string();
        Ok(Flight {
            slice,
            spec,
            span,
            condition,
            work,
            expected,
            ordered: Duration::ZERO,
            begun: None,
            shaken: false,
            busy_before: Duration::ZERO,
            wall_ms: 0,
            surroundings: Surroundings::default(),
        })
    }

    pub fn order(&self) -> SliceOrder {
        let hex = |words: &[u64]| words.iter().map(|w| format!("{w:016x}")).collect();
        SliceOrder {
            slice: self.slice,
            kernel: self.spec.kernel.to_owned(),
            variant: self.spec.variant.to_string(),
            size: self.spec.size.0,
            span_ns: self.span.as_nanos() as u64,
            rest_ns: match self.spec.setting.before {
                Before::Rested(ms) => u64::from(ms) * 1_000_000,
                _ => 0,
            },
            pace: self.spec.setting.pace,
            partner: self.spec.partner,
            cases: self
                .spec
                .seeds
                .iter()
                .zip(&self.expected)
                .map(|(&seed, words)| CaseOrder { seed, expected: hex(words) })
                .collect(),
            faults: self.spec.faults.clone(),
        }
    }

    /// Whether a report can be about this slice: a worker's memory is under test too.
    pub fn plausible(&self, report: &SliceReport) -> Result<(), String> {
        let seeds_right = report.cases.iter().zip(&self.spec.seeds).all(|(c, s)| c.seed == *s);
        if report.cases.len() > self.spec.seeds.len() || !seeds_right {
            return Err(format!("a report of slice {} about other cases than were ordered", self.slice));
        }
        if report.cases.iter().any(|c| c.wrong > c.runs) {
            return Err(format!("a report of slice {} with more wrong outputs than runs", self.slice));
        }
        // processor time runs no faster than time; one millisecond for the two clocks' grain
        if report.busy_ns > report.span_ns.saturating_add(1_000_000) {
            return Err(format!("a report of slice {} with more busy time than time", self.slice));
        }
        if report.partner.as_ref().is_some_and(|p| p.busy_ns > report.span_ns.saturating_add(1_000_000)) {
            return Err(format!("a report of slice {} with more busy time of its partner than time", self.slice));
        }
        if report.partner.is_some() != self.spec.partner.is_some() && report.cases.iter().any(|c| c.runs > 0) {
            return Err(format!("a report of slice {} that knows another number of cpus than was ordered", self.slice));
        }
        Ok(())
    }
}

/// One cpu's side of the supervisor.
pub(super) struct Lane {
    pub cpu: Cpu,
    pub core: u32,
    pub worker: Worker,
    /// Too hot for now, at this many °C.
    pub hot: Option<f64>,
    pub planned: VecDeque<Spec>,
    pub urgent: VecDeque<Spec>,
    pub flights: VecDeque<Flight>,
    pub checking: Vec<(Flight, SliceReport)>,
    pub losses: u32,
    pub stopped: bool,
    /// That its memory is not its node's has been told.
    pub lacking_told: bool,
    /// Late, and the system has been asked after it.
    pub asked: bool,
    pub previous_kernel: Option<&'static str>,
}

impl Lane {
    pub fn new(post: &Post) -> Lane {
        Lane {
            cpu: post.cpu,
            core: post.core,
            worker: Worker::Down,
            hot: None,
            planned: VecDeque::new(),
            urgent: VecDeque::new(),
            flights: VecDeque::new(),
            checking: Vec::new(),
            losses: 0,
            stopped: false,
            lacking_told: false,
            asked: false,
            previous_kernel: None,
        }
    }

    pub fn under_way(&self) -> Option<&Flight> {
        self.flights.front().filter(|f| f.begun.is_some())
    }

    /// Takes a slice that has ended out; the one behind it is the worker's next from `now` on.
    pub fn take_flight(&mut self, slice: u64, now: Duration) -> Option<Flight> {
        let index = self.flights.iter().position(|f| f.slice == slice)?;
        let flight = self.flights.remove(index);
        self.asked = false;
        if let Some(next) = self.flights.front_mut() {
            next.ordered = now;
        }
        flight
    }

    pub fn busy(&self) -> bool {
        !self.flights.is_empty() || !self.checking.is_empty()
    }

    pub fn idle(&self) -> bool {
        !self.busy() && self.planned.is_empty() && self.urgent.is_empty()
    }

    /// Ready, and either without work or with one slice that has begun: then the next is handed over early.
    pub fn can_take(&self) -> bool {
        let room = match self.flights.len() {
            0 => true,
            1 => self.under_way().is_some(),
            _ => false,
        };
        self.worker == Worker::Up && self.hot.is_none() && room
    }

    /// When a slice that is ordered now will begin, by plan.
    pub fn free_at(&self, now: Duration) -> Duration {
        self.flights.iter().fold(now, |at, f| f.begun.unwrap_or(at) + f.span).max(now)
    }

    /// The next planned slice and its span, when `left` is left for all of them.
    pub fn next(&mut self, left: Duration, longest: Duration) -> Option<(Spec, Duration)> {
        let weight = |spec: &Spec| match spec.span {
            Span::Share(weight) => u64::from(weight.max(1)),
            Span::Fixed(_) => 1,
        };
        let all: u64 = self.planned.iter().map(weight).sum();
        let spec = self.planned.pop_front()?;
        let span = match spec.span {
            Span::Share(_) => left.mul_f64(weight(&spec) as f64 / all as f64).min(longest),
            Span::Fixed(span) => span.min(left),
        };
        Some((spec, span))
    }

    /// The next slice that the judge asked for.
    pub fn next_urgent(&mut self, left: Duration) -> Option<(Spec, Duration)> {
        let spec = self.urgent.pop_front()?;
        let span = match spec.span {
            Span::Share(_) => left,
            Span::Fixed(span) => span.min(left),
        };
        Some((spec, span))
    }

    /// Moves every time that patience is counted from: for a while nobody could have answered.
    pub fn forgive(&mut self, held_up: Duration) {
        if let Worker::Starting(since) = &mut self.worker {
            *since += held_up;
        }
        for flight in &mut self.flights {
            flight.ordered += held_up;
            flight.begun = flight.begun.map(|at| at + held_up);
            flight.shaken = true;
        }
    }

    /// When patience with this worker ends: a slice that is not begun, or not ended, in time.
    pub fn deadline(&self, grace: Duration, ready_within: Duration) -> Option<Duration> {
        match self.worker {
            Worker::Starting(since) => Some(since + ready_within),
            Worker::Up => self.flights.front().map(|f| f.begun.map_or(f.ordered, |begun| begun + f.span) + grace),
            Worker::Down | Worker::GivenUp => None,
        }
    }
}
