//! The supervisor's phases: when one is over, what comes between two, and cpus that cannot go on with the others, because
//! they are too hot or were taken away.

use super::{SHORTEST, Supervisor, TAIL};
use crate::host::Cpu;
use crate::run::lane::{Lane, Worker};
use crate::run::protocol::Order;
use crate::run::spec::{Action, Now, Request, Span, Track};

impl Supervisor {
    /// Whether every cpu has done its part of the phase under way.
    pub(super) fn phase_over(&mut self, now: Now) -> bool {
        let late = now.at >= self.phase_end;
        for lane in self.lanes.values_mut() {
            // a cpu that could not work meanwhile does not hold the others up
            let absent = lane.hot.is_some() || (!self.whole && lane.worker != Worker::Up);
            if late && absent || lane.worker == Worker::GivenUp {
                lane.planned.clear();
            }
        }
        self.lanes
            .values()
            .all(|l| l.flights.is_empty() && l.planned.is_empty() && (!self.suspicion || l.checking.is_empty()))
    }

    /// Between two phases: does what the judge asked for, each cpu by itself and then pairs; true while there is any.
    pub(super) fn interlude(&mut self, now: Now) -> bool {
        let end = self.setup.budget.saturating_sub(TAIL);
        let left = end.saturating_sub(now.at);
        if left < SHORTEST {
            self.together.clear();
            self.lanes.values_mut().for_each(|l| l.urgent.clear());
            return false;
        }
        self.open = false;
        let able = |lane: &Lane| lane.worker == Worker::Up && lane.hot.is_none();
        let gone = |lane: Option<&Lane>| lane.is_none_or(|l| l.worker == Worker::GivenUp || l.hot.is_some());
        let cpus: Vec<Cpu> = self.lanes.keys().copied().collect();
        let mut any = false;
        for cpu in cpus {
            let Some(lane) = self.lanes.get_mut(&cpu) else { continue };
            if lane.worker == Worker::GivenUp || lane.hot.is_some() {
                lane.urgent.clear();
            }
            any |= !lane.urgent.is_empty();
            if able(lane)
                && lane.can_take()
                && let Some((spec, span)) = lane.next_urgent(left)
            {
                self.order(now, cpu, spec, span);
            }
        }
        if any {
            return true;
        }
        while let Some(request) = self.together.front() {
            let Some(partner) = request.spec.partner else { break };
            let (first, second) = (self.lanes.get(&request.cpu), self.lanes.get(&partner));
            if gone(first) || gone(second) {
                let Some(request) = self.together.pop_front() else { break };
                let text = format!(
                    "cpus {} and {partner} could not be run together for a confirmation: one of them has no worker",
                    request.cpu
                );
                self.remark(now, text);
                self.actions.push(Action::CannotRun(request));
                continue;
            }
            if first.is_some_and(able) && second.is_some_and(able) {
                let Some(Request { cpu, spec }) = self.together.pop_front() else { break };
                let span = match spec.span {
                    Span::Fixed(span) => span.min(left),
                    Span::Share(_) => left,
                };
                self.order(now, cpu, spec, span);
            }
            return true;
        }
        false
    }

    /// Gives every cpu its part of the next phase; false when there is none.
    pub(super) fn next_phase(&mut self, now: Now) -> bool {
        let end = self.setup.budget.saturating_sub(TAIL);
        let all: f64 = self.phases.iter().map(|p| p.seconds.max(0.0)).sum();
        let Some(phase) = self.phases.pop_front() else {
            self.open = true;
            self.phase_end = end;
            return false;
        };
        self.whole = phase.whole;
        let share = if all > 0.0 { (phase.seconds / all).clamp(0.0, 1.0) } else { 1.0 };
        self.phase_end = now.at + end.saturating_sub(now.at).mul_f64(share);
        self.open = phase.open;
        self.suspicion = false;
        for Track { cpu, slices } in phase.tracks {
            // one that is too hot may cool while the phase lasts
            if let Some(lane) = self.lanes.get_mut(&cpu)
                && lane.worker != Worker::GivenUp
            {
                lane.planned = slices.into();
            }
        }
        self.without_partners(now);
        true
    }

    /// Takes out what needs a second cpu that has no worker any more.
    fn without_partners(&mut self, now: Now) {
        let gone: Vec<Cpu> =
            self.lanes.values().filter(|l| l.worker == Worker::GivenUp || l.hot.is_some()).map(|l| l.cpu).collect();
        let mut left_out = 0;
        for lane in self.lanes.values_mut() {
            let before = lane.planned.len();
            lane.planned.retain(|spec| spec.partner.is_none_or(|p| !gone.contains(&p)));
            left_out += before - lane.planned.len();
        }
        if left_out > 0 {
            self.remark(now, format!("{left_out} slices of kernels for two cpus left out: a partner is not available"));
        }
    }

    /// A cpu above its limit gets no work until it has cooled; what it is doing ends now.
    pub(super) fn hot(&mut self, now: Now, cpu: Cpu, celsius: f64) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        if lane.hot.replace(celsius).is_some() || self.ending.is_some() {
            return;
        }
        if let Some(last) = lane.flights.back() {
            self.actions.push(Action::Order(cpu, Order::Halt { upto: last.slice }));
        }
        // work that it does for another cpu ends as well
        for other in self.lanes.values() {
            if let Some(flight) = other.flights.iter().find(|f| f.spec.partner == Some(cpu)) {
                self.actions.push(Action::Order(other.cpu, Order::Halt { upto: flight.slice }));
            }
        }
        self.remark(now, format!("cpu {cpu} pauses: {celsius:.1} °C is above the limit"));
    }

    /// The system has taken a cpu away: what it was doing is void, it gets nothing more, and nothing is held against it.
    pub(super) fn taken_away(&mut self, now: Now, cpu: Cpu, why: &str) {
        let Some(lane) = self.lanes.get_mut(&cpu) else { return };
        if lane.worker == Worker::GivenUp {
            return;
        }
        lane.worker = Worker::GivenUp;
        lane.planned.clear();
        lane.urgent.clear();
        let flights = std::mem::take(&mut lane.flights);
        self.actions.push(Action::Kill(cpu));
        for flight in flights {
            self.close_void(now, cpu, &flight, "its cpu was taken away".to_owned());
        }
        self.without_partners(now);
        self.remark(now, format!("cpu {cpu} is skipped from now on: {why}"));
    }
}
