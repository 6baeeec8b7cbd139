//! One cpu's side of the supervisor: its worker's state, what it has been ordered, what it is still to do.

use std::collections::VecDeque;
use std::sync::Arc;
use std::time::Duration;

use kernels::{Case, Seed, Work, catalogue};

use super::protocol::{CaseOrder, SliceOrder, SliceReport};
use super::spec::{Span, Spec, Track, Truth};
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
    pub expected: Vec<Arc<Vec<u64>>>,
    /// When it became the worker's next slice.
    pub ordered: Duration,
    pub begun: Option<Duration>,
    /// Processor time of the worker when the slice began.
    pub busy_before: Duration,
    pub wall_ms: u64,
    pub surroundings: Surroundings,
}

impl Flight {
    pub fn new(slice: u64, spec: Spec, span: Duration, condition: String, truth: &dyn Truth) -> Result<Flight, String> {
        let kernel = catalogue::find(spec.kernel).ok_or_else(|| format!("no kernel {}", spec.kernel))?;
        let mut expected = Vec::with_capacity(spec.seeds.len());
        for &seed in &spec.seeds {
            let case = Case { kernel: spec.kernel, seed: Seed(seed), size: spec.size };
            let words = truth.expected(&case).ok_or_else(|| format!("no golden words for {case}"))?;
            expected.push(Arc::new(words));
        }
        let work = kernel.work(spec.size);
        Ok(Flight {
            slice,
            spec,
            span,
            condition,
            work,
            expected,
            ordered: Duration::ZERO,
            begun: None,
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
        Ok(())
    }
}

/// One cpu's side of the supervisor.
pub(super) struct Lane {
    pub cpu: Cpu,
    pub core: u32,
    pub worker: Worker,
    pub planned: VecDeque<Spec>,
    pub urgent: VecDeque<Spec>,
    pub flights: VecDeque<Flight>,
    pub checking: Vec<(Flight, SliceReport)>,
    pub losses: u32,
    pub stopped: bool,
    /// Late, and the system has been asked after it.
    pub asked: bool,
    pub previous_kernel: Option<&'static str>,
}

impl Lane {
    pub fn new(track: &Track) -> Lane {
        Lane {
            cpu: track.cpu,
            core: track.core,
            worker: Worker::Down,
            planned: track.slices.iter().cloned().collect(),
            urgent: VecDeque::new(),
            flights: VecDeque::new(),
            checking: Vec::new(),
            losses: 0,
            stopped: false,
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
        self.worker == Worker::Up && room
    }

    /// When a slice that is ordered now will begin, by plan.
    pub fn free_at(&self, now: Duration) -> Duration {
        self.flights.iter().fold(now, |at, f| f.begun.unwrap_or(at) + f.span).max(now)
    }

    /// The next slice and its span, when `left` is left for all of them.
    pub fn next(&mut self, left: Duration, longest: Duration) -> Option<(Spec, Duration)> {
        let slices = (self.urgent.len() + self.planned.len()) as u32;
        let spec = self.urgent.pop_front().or_else(|| self.planned.pop_front())?;
        let span = match spec.span {
            Span::Share => (left / slices.max(1)).min(longest),
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
