//! The supervisor: a state machine without IO. It is fed (time, what happened) and answers with actions, so that a
//! simulation can play whole windows, with any fault at any point, in microseconds.
//!
//! Each cpu has at most two slices with its worker: the one under way and the next, so that a core never waits for
//! the disk. An intent is recorded before each order. The shares of time are worked out when a slice is ordered, so
//! lateness anywhere is made up by all later slices and the window ends on its budget.
//!
//! The work comes in phases that end for all cpus together, because a condition speaks of what the other cpus do. Work
//! for confirmations is put between the slices of an open phase, where everybody is busy anyway, or waits for the
//! end of the phase; what takes two cpus always waits.

mod phases;

use std::collections::{BTreeMap, VecDeque};
use std::time::Duration;

use super::lane::{Flight, Lane, Worker};
use super::pinning::Place;
use super::protocol::{Message, Order, SliceReport, WrongOutput};
use super::records::About;
use super::spec::{Action, FoldTask, Input, Now, Opinion, Phase, Pulse, Request, Setup, Spec, Truth};
use crate::event::{Ending, Event, How, Remark};
use crate::host::Cpu;

/// Kept free at the end of the budget for last answers and the closing record.
const TAIL: Duration = Duration::from_millis(120);
/// A slice shorter than this says nothing worth its record.
const SHORTEST: Duration = Duration::from_millis(4);
/// A worker that is not ready by then was not started.
const READY_WITHIN: Duration = Duration::from_secs(10);
/// Inputs come far more often than this; a longer silence means that the program itself was held up (a frozen control
/// group, a suspended machine, a disk that took seconds), and with it everybody's chance to answer.
const SILENCE: Duration = Duration::from_millis(400);
/// A late worker that could have run, but had less of its processor than this, was starved by others.
const STARVED_BELOW: f64 = 0.5;
/// After a halt, answers are waited for this long.
const HALT_WITHIN: Duration = Duration::from_millis(400);

/// See the file's head.
pub struct Supervisor {
    setup: Setup,
    truth: Box<dyn Truth>,
    lanes: BTreeMap<Cpu, Lane>,
    phases: VecDeque<Phase>,
    /// The phase under way takes work for confirmations.
    open: bool,
    /// The phase under way goes on past its end until everything in it was run.
    whole: bool,
    /// When the phase under way is to end.
    phase_end: Duration,
    /// How often, and how long in all, the program itself was held up.
    held_ups: (u32, Duration),
    /// Something was wrong in this phase: the judge may want more before the next one begins.
    suspicion: bool,
    /// Work for two cpus that the judge asked for.
    together: VecDeque<Request>,
    next_slice: u64,
    ending: Option<(Ending, Duration)>,
    finished: bool,
    last_input: Duration,
    actions: Vec<Action>,
}

impl Supervisor {
    /// A supervisor for one job; the first actions start the workers.
    pub fn new(setup: Setup, truth: Box<dyn Truth>) -> Supervisor {
        let lanes = setup.posts.iter().map(|p| (p.cpu, Lane::new(p))).collect();
        let phases = setup.phases.iter().cloned().collect();
        Supervisor {
            setup,
            truth,
            lanes,
            phases,
            open: false,
            whole: false,
            phase_end: Duration::ZERO,
            held_ups: (0, Duration::ZERO),
            suspicion: false,
            together: VecDeque::new(),
            next_slice: 0,
            ending: None,
            finished: false,
            last_input: Duration::ZERO,
            actions: Vec::new(),
        }
    }

    /// Starts every worker.
    pub fn begin(&mut self, now: Now) -> Vec<Action> {
        self.last_input = now.at;
        self.next_phase(now);
        for lane in self.lanes.values_mut() {
            lane.worker = Worker::Starting(now.at);
            self.actions.push(Action::Start(lane.cpu));
        }
        std::mem::take(&mut self.actions)
    }

    /// Takes in what happened and answers with what is to be done, in order.
    pub fn feed(&mut self, now: Now, input: Input) -> Vec<Action> {
        if self.finished {
            return Vec::new();
        }
        self.held_up(now);
        match input {
            Input::Said(cpu, message) => self.said(now, cpu, message),
            Input::Babbled(cpu, text) => {
                self.lose(now, cpu, How::Babbled(text));
                self.actions.push(Action::Kill(cpu));
            }
            Input::Gone(cpu, how) => self.gone(now, cpu, how),
            Input::Stopped(cpu, stopped) => {
                if let Some(lane) = self.lanes.get_mut(&cpu) {
                    lane.stopped = stopped;
                }
            }
            Input::Felt(cpu, pulse) => self.felt(now, cpu, pulse),
            Input::Checked(opinion) => self.checked(now, opinion),
            Input::Wanted(requests) => self.wanted(requests),
            Input::Hot(cpu, celsius) => self.hot(now, cpu, celsius),
            Input::Cooled(cpu, celsius) => {
                if let Some(lane) = self.lanes.get_mut(&cpu)
                    && lane.hot.take().is_some()
                {
                    self.remark(now, format!("cpu {cpu} goes on: it has cooled to {celsius:.1} °C"));
                }
            }
            Input::TakenAway(cpu, why) => self.taken_away(now, cpu, &why),
            Input::Interrupt => self.halt(now, Ending::Signal),
            Input::DiskFailed => self.halt(now, Ending::Failed),
            Input::Tick => {}
        }
        self.advance(now);
        std::mem::take(&mut self.actions)
    }

    /// Time of the next deadline, for the driver to wait until.
    pub fn next_deadline(&self) -> Duration {
        let lanes = self.lanes.values().filter_map(|l| l.deadline(self.setup.grace, READY_WITHIN));
        let end = self.ending.map_or(self.setup.budget, |(_, since)| since + HALT_WITHIN);
        lanes.chain([end]).min().unwrap_or(end)
    }

    /// Part of the job that is over, by time or by slices, whichever is further: for a progress bar.
    pub fn progress(&self, at: Duration) -> f64 {
        let planned: usize = self.setup.phases.iter().flat_map(|p| &p.tracks).map(|t| t.slices.len()).sum();
        let by_slices = 1.0 - self.slices_left() as f64 / planned.max(1) as f64;
        by_slices.max(at.as_secs_f64() / self.setup.budget.as_secs_f64()).clamp(0.0, 1.0)
    }

    /// Slices that are still to come.
    pub fn slices_left(&self) -> usize {
        let later: usize = self.phases.iter().flat_map(|p| &p.tracks).map(|t| t.slices.len()).sum();
        later + self.lanes.values().map(|l| l.planned.len() + l.urgent.len() + l.flights.len()).sum::<usize>()
    }

    fn remark(&mut self, now: Now, text: String) {
        let remark = Remark { job_id: self.setup.job_id, wall_ms: now.wall_ms, text };
        self.actions.push(Action::Record(Event::Remark(remark)));
    }

    fn said(&mut self, now: Now, cpu: Cpu, message: Message) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        match message {
            Message::Ready { place, lacking } => {
                if place.is_only(cpu) {
                    lane.worker = Worker::Up;
                    if let Some(why) = lacking
                        && !std::mem::replace(&mut lane.lacking_told, true)
                    {
                        self.remark(now, format!("cpu {cpu}: {why}"));
                    }
                } else {
                    let how =
                        How::NotPinned(format!("asked for cpu {cpu}, is on cpu {} of {:?}", place.cpu, place.mask));
                    self.lose(now, cpu, how);
                    self.actions.push(Action::Kill(cpu));
                }
            }
            Message::Begun { slice } => match lane.flights.iter_mut().find(|f| f.slice == slice) {
                Some(flight) => {
                    flight.begun = Some(now.at);
                    flight.busy_before = now.pulse.map_or(Duration::ZERO, |p| p.busy);
                    flight.wall_ms = now.wall_ms;
                    lane.stopped = false;
                }
                None => self.babbled(now, cpu, format!("began slice {slice}, which it was not ordered")),
            },
            Message::Wrong(wrong) => self.wrong(now, cpu, wrong),
            Message::Ended(report) => self.ended(now, cpu, report),
            Message::Refused { slice, why } => {
                if let Some(flight) = lane.take_flight(slice, now.at) {
                    self.close_void(now, cpu, &flight, format!("refused by the worker: {why}"));
                } else {
                    self.babbled(now, cpu, format!("refused slice {slice}, which it was not ordered"));
                }
            }
            Message::Unpinned { why } => self.taken_away(now, cpu, &why),
        }
    }

    fn babbled(&mut self, now: Now, cpu: Cpu, text: String) {
        self.lose(now, cpu, How::Babbled(text));
        self.actions.push(Action::Kill(cpu));
    }

    fn wrong(&mut self, now: Now, cpu: Cpu, wrong: WrongOutput) {
        let neighbours = self.neighbours(cpu);
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        let Some(flight) = lane.flights.iter().find(|f| f.slice == wrong.slice) else {
            return self.babbled(
                now,
                cpu,
                format!("a wrong output in slice {}, which it was not ordered", wrong.slice),
            );
        };
        if !wrong.place.is_only(cpu) {
            let text = format!(
                "a wrong output of {} was seen while the worker of cpu {cpu} ran on cpu {}: blamed on nobody",
                flight.spec.kernel, wrong.place.cpu
            );
            return self.remark(now, text);
        }
        self.suspicion = true;
        let about = About { setup: &self.setup, cpu, core: lane.core, flight };
        let mismatch = about.mismatch(&wrong, lane.previous_kernel, neighbours, now.surroundings);
        self.actions.push(Action::Record(Event::Mismatch(mismatch)));
    }

    fn neighbours(&self, cpu: Cpu) -> Vec<(Cpu, String)> {
        let busy = self.lanes.values().filter(|l| l.cpu != cpu);
        busy.filter_map(|l| l.under_way().map(|f| (l.cpu, f.spec.kernel.to_owned()))).collect()
    }

    fn ended(&mut self, now: Now, cpu: Cpu, report: SliceReport) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        let Some(mut flight) = lane.take_flight(report.slice, now.at) else {
            return self.babbled(now, cpu, format!("ended slice {}, which it was not ordered", report.slice));
        };
        if let Err(why) = flight.plausible(&report) {
            lane.flights.push_front(flight);
            return self.babbled(now, cpu, why);
        }
        lane.previous_kernel = Some(flight.spec.kernel);
        if report.cases.iter().all(|c| c.runs == 0) {
            return self.close_void(now, cpu, &flight, "given up before its first run".to_owned());
        }
        let cases = report
            .cases
            .iter()
            .zip(&flight.expected)
            .map(|(case, expected)| (expected.clone(), case.runs - case.wrong, case.fold))
            .collect();
        let partner = flight.spec.partner;
        flight.surroundings = now.surroundings;
        self.actions.push(Action::Check(FoldTask { slice: report.slice, of: cpu, with: partner, cases }));
        lane.checking.push((flight, report));
    }

    fn checked(&mut self, now: Now, opinion: Opinion) {
        let Some(lane) = self.lanes.get_mut(&opinion.of) else { return };
        let Some(index) = lane.checking.iter().position(|(f, _)| f.slice == opinion.slice) else { return };
        let (flight, report) = lane.checking.remove(index);
        let places = |of: Cpu, places: &(Place, Place)| {
            [&places.0, &places.1]
                .into_iter()
                .find(|p| !p.is_only(of))
                .map(|p| format!("the worker was on cpu {} with mask {:?} instead of cpu {of} alone", p.cpu, p.mask))
        };
        let second = flight.spec.partner.zip(report.partner.as_ref());
        let void = places(lane.cpu, &report.places).or_else(|| places(second?.0, &second?.1.places));
        let core = lane.core;
        if let Some(text) = &opinion.remark {
            self.remark(now, text.clone());
        }
        if void.is_none() {
            self.suspicion |= !opinion.wrong.is_empty();
            for &position in &opinion.wrong {
                self.folded_wrong(&flight, &report, core, position, opinion.of);
            }
        }
        let about = About { setup: &self.setup, cpu: opinion.of, core, flight: &flight };
        let slice = about.slice(&report, &opinion, void);
        self.actions.push(Action::Record(Event::Slice(slice)));
    }

    fn folded_wrong(&mut self, flight: &Flight, report: &SliceReport, core: u32, position: usize, cpu: Cpu) {
        let about = About { setup: &self.setup, cpu, core, flight };
        let mismatch = about.folded_mismatch(report.cases.get(position).map(|c| c.seed), self.neighbours(cpu));
        self.actions.push(Action::Record(Event::Mismatch(mismatch)));
    }

    /// Records that nothing can be concluded from a slice; this also settles its intent.
    fn close_void(&mut self, now: Now, cpu: Cpu, flight: &Flight, why: String) {
        let core = self.lanes.get(&cpu).map_or(0, |l| l.core);
        let slice = About { setup: &self.setup, cpu, core, flight }.void(now.wall_ms, now.surroundings, why);
        self.actions.push(Action::Record(Event::Slice(slice)));
    }

    fn gone(&mut self, now: Now, cpu: Cpu, how: How) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        match lane.worker {
            // it was told to go, or its loss is on record already
            Worker::Down | Worker::GivenUp => {}
            _ => self.lose(now, cpu, how),
        }
    }

    /// Records the loss of a worker against its core, and settles every intent it had.
    fn lose(&mut self, now: Now, cpu: Cpu, how: How) {
        let ending = self.ending.is_some();
        self.suspicion = true;
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        lane.losses += 1;
        lane.worker = if lane.losses >= self.setup.losses_borne || ending { Worker::GivenUp } else { Worker::Down };
        lane.stopped = false;
        lane.asked = false;
        let core = lane.core;
        let mut flights = std::mem::take(&mut lane.flights).into_iter();
        let given_up = lane.worker == Worker::GivenUp && !ending;
        if let Some(flight) = flights.next() {
            let lost = About { setup: &self.setup, cpu, core, flight: &flight }.lost(now.wall_ms, how);
            self.actions.push(Action::Record(Event::Lost(lost)));
        } else {
            self.remark(now, format!("the worker of cpu {cpu} {how} while it had no work"));
        }
        for flight in flights {
            self.close_void(now, cpu, &flight, "its worker was lost before it began".to_owned());
        }
        if given_up {
            self.remark(now, format!("cpu {cpu} is left alone after {} lost workers", self.setup.losses_borne));
        }
    }

    fn wanted(&mut self, requests: Vec<Request>) {
        for Request { cpu, spec } in requests {
            if spec.partner.is_some() {
                self.together.push_back(Request { cpu, spec });
            } else if let Some(lane) = self.lanes.get_mut(&cpu) {
                lane.urgent.push_back(spec);
            }
        }
    }

    fn halt(&mut self, now: Now, ending: Ending) {
        if self.ending.is_some() {
            return;
        }
        self.ending = Some((ending, now.at));
        self.phases.clear();
        self.together.clear();
        for lane in self.lanes.values_mut() {
            lane.planned.clear();
            lane.urgent.clear();
            if ending == Ending::Failed {
                // without a ledger nothing may go on, and nothing can be recorded
                lane.flights.clear();
                lane.worker = Worker::GivenUp;
                self.actions.push(Action::Kill(lane.cpu));
            } else if let Some(last) = lane.flights.back() {
                self.actions.push(Action::Order(lane.cpu, Order::Halt { upto: last.slice }));
            }
        }
    }

    /// Deadlines, restarts, new orders, the end.
    fn advance(&mut self, now: Now) {
        let cpus: Vec<Cpu> = self.lanes.keys().copied().collect();
        for &cpu in &cpus {
            self.overdue(now, cpu);
            self.restart(now, cpu);
            while self.order_next(now, cpu) {}
        }
        while self.ending.is_none() && self.phase_over(now) {
            let between = self.interlude(now);
            if !between && !self.next_phase(now) {
                break;
            }
            for &cpu in &cpus {
                self.restart(now, cpu);
                while !between && self.order_next(now, cpu) {}
            }
            if between {
                break;
            }
        }
        if now.at >= self.setup.budget {
            self.halt(now, Ending::Budget);
        }
        let still = self.lanes.values().any(Lane::busy);
        let nothing_left = self.phases.is_empty()
            && self.together.is_empty()
            && self.lanes.values().all(|l| l.worker == Worker::GivenUp || l.idle());
        let (ending, forced) = match self.ending {
            Some((ending, since)) => (Some(ending), now.at >= since + HALT_WITHIN),
            None if nothing_left => (Some(Ending::Done), false),
            None => (None, false),
        };
        if let Some(ending) = ending
            && (!still || forced)
        {
            self.finish(now, ending);
        }
    }

    fn finish(&mut self, now: Now, ending: Ending) {
        let cpus: Vec<Cpu> = self.lanes.keys().copied().collect();
        for cpu in cpus {
            let Some(lane) = self.lanes.get_mut(&cpu) else { continue };
            let flights = std::mem::take(&mut lane.flights);
            let unchecked = std::mem::take(&mut lane.checking);
            lane.worker = Worker::GivenUp;
            self.actions.push(Action::Kill(cpu));
            for flight in flights {
                self.close_void(now, cpu, &flight, "cut off at the end of the job".to_owned());
            }
            for (flight, _) in unchecked {
                self.close_void(now, cpu, &flight, "the second opinion came too late".to_owned());
            }
        }
        if let (times @ 2.., all) = self.held_ups {
            self.remark(
                now,
                format!("the program itself was held up {times} times, {:.1} s in all", all.as_secs_f64()),
            );
        }
        self.finished = true;
        self.actions.push(Action::Finish(ending));
    }

    fn overdue(&mut self, now: Now, cpu: Cpu) {
        let grace = self.setup.grace;
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        if lane.deadline(grace, READY_WITHIN).is_none_or(|deadline| now.at < deadline) {
            return;
        }
        let how = match lane.worker {
            Worker::Starting(_) => How::NotStarted("not ready in time".to_owned()),
            _ if lane.stopped => How::Stopped,
            _ if lane.asked => return,
            _ => {
                lane.asked = true;
                self.actions.push(Action::Feel(cpu));
                return;
            }
        };
        self.lose(now, cpu, how);
        self.actions.push(Action::Kill(cpu));
    }

    /// A late worker that the machine did not let run is not held against its core.
    fn felt(&mut self, now: Now, cpu: Cpu, pulse: Option<Pulse>) {
        let Some(flight) = self.lanes.get(&cpu).filter(|l| l.asked).and_then(|l| l.flights.front()) else { return };
        let waited = now.at.saturating_sub(flight.begun.unwrap_or(flight.ordered));
        // where the whole program was held up meanwhile, a virtual cpu may have been as well, and nothing in it tells
        let starved = flight.shaken
            || pulse.is_some_and(|p| {
                let ran = p.busy.saturating_sub(flight.busy_before);
                p.waiting && ran.as_secs_f64() < STARVED_BELOW * waited.as_secs_f64()
            });
        self.lose(now, cpu, if starved { How::Starved } else { How::Hung });
        self.actions.push(Action::Kill(cpu));
    }

    fn held_up(&mut self, now: Now) {
        let silence = now.at.saturating_sub(self.last_input);
        self.last_input = now.at;
        if silence < SILENCE {
            return;
        }
        self.lanes.values_mut().for_each(|l| l.forgive(silence));
        self.held_ups.0 += 1;
        self.held_ups.1 += silence;
        if self.held_ups.0 == 1 {
            let text = format!(
                "the program itself was held up for {:.1} s; no worker's lateness in it counts",
                silence.as_secs_f64()
            );
            self.remark(now, text);
        }
    }

    fn restart(&mut self, now: Now, cpu: Cpu) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        let wanted = !lane.planned.is_empty()
            || !lane.urgent.is_empty()
            || self.together.iter().any(|r| r.cpu == cpu || r.spec.partner == Some(cpu));
        if lane.worker == Worker::Down && wanted && self.ending.is_none() {
            lane.worker = Worker::Starting(now.at);
            self.actions.push(Action::Start(cpu));
        }
    }

    /// Orders one more slice if the cpu can take one; true if it did.
    fn order_next(&mut self, now: Now, cpu: Cpu) -> bool {
        let end = self.setup.budget.saturating_sub(TAIL);
        let (phase_end, open, longest) = (self.phase_end.min(end), self.open, self.setup.longest);
        let Some(lane) = self.lanes.get_mut(&cpu) else { return false };
        if self.ending.is_some() || !lane.can_take() {
            return false;
        }
        let start = lane.free_at(now.at);
        let urgent = open && !lane.urgent.is_empty();
        let mut left = if urgent { end } else { phase_end }.saturating_sub(start);
        if self.whole && !urgent {
            // a sweep that others held up is made up for by the phases behind it
            let least = SHORTEST * 2 * lane.planned.len() as u32;
            left = left.max(least).min(end.saturating_sub(start));
        }
        if left < SHORTEST {
            // what the judge wants ends with the job, what was planned with its phase
            if urgent {
                lane.urgent.clear();
            }
            lane.planned.clear();
            return false;
        }
        let next = if urgent { lane.next_urgent(left) } else { lane.next(left, longest) };
        let Some((spec, span)) = next else { return false };
        self.order(now, cpu, spec, span)
    }

    /// Orders `spec` on `cpu`; true if something was done about it.
    fn order(&mut self, now: Now, cpu: Cpu, spec: Spec, span: Duration) -> bool {
        let slice = self.next_slice;
        self.next_slice += 1;
        let mut flight = match Flight::new(slice, cpu, spec, span, self.truth.as_mut()) {
            Ok(flight) => flight,
            Err(why) => {
                self.remark(now, why);
                return true;
            }
        };
        let Some(lane) = self.lanes.get_mut(&cpu) else { return false };
        flight.ordered = now.at;
        let order = flight.order();
        let intent = About { setup: &self.setup, cpu, core: lane.core, flight: &flight }.intent(now.wall_ms);
        lane.flights.push_back(flight);
        self.actions.push(Action::Record(Event::Intent(intent)));
        self.actions.push(Action::Order(cpu, Order::Slice(order)));
        true
    }
}
