//! A worker under every pace, spoken to as the supervisor speaks to it: what it says of the time that it worked, and what
//! two cpus say of work done together. How exactly a duty is kept is measured by `scripts/duty`.

use std::io::{BufReader, Write};
use std::process::{Child, ChildStdout, Stdio};

use kernels::{Case, Seed, Size};
use proofhouse::condition::Pace;
use proofhouse::host::Cpu;
use proofhouse::run::protocol::{CaseOrder, Message, Order, Received, SliceOrder, SliceReport, receive, send};

use crate::running::{alone, cpus, program};

struct Worker {
    child: Child,
    heard: BufReader<ChildStdout>,
}

impl Worker {
    fn start(cpu: u32) -> Worker {
        let mut child = program(&["worker", "--cpu", &cpu.to_string()]).stdin(Stdio::piped()).spawn().unwrap();
        let mut heard = BufReader::new(child.stdout.take().unwrap());
        assert!(matches!(receive::<Message>(&mut heard), Received::Message(Message::Ready { .. })));
        Worker { child, heard }
    }

    fn order(&mut self, order: SliceOrder) -> Result<SliceReport, String> {
        let mut input = self.child.stdin.as_ref().unwrap();
        send(&mut input, &Order::Slice(order)).unwrap();
        input.flush().unwrap();
        loop {
            match receive::<Message>(&mut self.heard) {
                Received::Message(Message::Begun { .. }) => {}
                Received::Message(Message::Ended(report)) => return Ok(report),
                Received::Message(Message::Refused { why, .. }) => return Err(why),
                other => panic!("{other:?}"),
            }
        }
    }
}

impl Drop for Worker {
    fn drop(&mut self) {
        drop(self.child.stdin.take());
        let _ = self.child.wait();
    }
}

fn order(kernel: &str, size: u32, pace: Pace, ms: u64, partner: Option<u32>) -> SliceOrder {
    let id = kernels::catalogue::find(kernel).unwrap().id();
    let case = Case { kernel: id, seed: Seed(1), size: Size(size) };
    let expected = golden::table::expected(&case).unwrap().iter().map(|w| format!("{w:016x}")).collect();
    SliceOrder {
        slice: 1,
        kernel: kernel.to_owned(),
        variant: "portable".to_owned(),
        size,
        span_ns: ms * 1_000_000,
        rest_ns: 0,
        pace,
        partner: partner.map(Cpu),
        cases: vec![CaseOrder { seed: 1, expected }],
        faults: Vec::new(),
    }
}

#[test]
fn no_pace_works_more_than_it_was_ordered_and_every_pace_works() {
    let _turn = alone();
    let mut worker = Worker::start(*cpus().last().unwrap());
    let paces = [
        Pace::Steady { percent: 5 },
        Pace::Steady { percent: 50 },
        Pace::Burst { on_us: 10, off_us: 10 },
        Pace::Burst { on_us: 1000, off_us: 20_000 },
        Pace::Burst { on_us: 100_000, off_us: 100_000 },
        Pace::Step { period_us: 2000, dithered: false },
        Pace::Step { period_us: 2000, dithered: true },
    ];
    for pace in paces {
        let report = worker.order(order("integer.multiply", 9, pace, 400, None)).unwrap();
        let share = report.busy_ns as f64 / report.span_ns as f64;
        assert!(report.cases[0].runs > 0 && report.cases[0].wrong == 0, "{pace}: {report:?}");
        // a burst is at least one run; the rest of the margin is a stretch that began just before the end
        assert!(share <= pace.duty() + 0.06, "{pace}: {share}");
        assert_eq!(report.steps.is_some(), matches!(pace, Pace::Step { .. }));
        if let Some((steps, on_time)) = report.steps {
            assert!(steps > 0 && steps <= 201 && on_time <= steps, "{pace}: {steps}, {on_time} on time");
        }
    }
}

#[test]
fn a_rest_before_a_slice_is_no_work_and_belongs_to_its_span() {
    let _turn = alone();
    let mut worker = Worker::start(cpus()[0]);
    let rested = SliceOrder { rest_ns: 200_000_000, ..order("integer.multiply", 9, Pace::FULL, 300, None) };
    let report = worker.order(rested).unwrap();
    assert!(report.span_ns >= 290_000_000 && report.busy_ns <= 120_000_000, "{report:?}");
    assert!(report.cases[0].runs > 0);
}

#[test]
fn kernels_for_two_run_on_both_cpus_and_never_on_one() {
    let _turn = alone();
    let all = cpus();
    let [first, .., last] = all.as_slice() else { return };
    let mut worker = Worker::start(*first);
    for kernel in kernels::catalogue::KERNELS.iter().filter(|k| k.cpus() == 2) {
        let size = kernel.sizes()[0].0;
        let report = worker.order(order(kernel.id(), size, Pace::FULL, 200, Some(*last))).unwrap();
        assert!(report.cases[0].runs > 0 && report.cases[0].wrong == 0, "{report:?}");
        let partner = report.partner.unwrap();
        assert!(partner.places.0.is_only(Cpu(*last)) && partner.places.1.is_only(Cpu(*last)), "{partner:?}");
        assert!(partner.busy_ns > 0);
        let why = worker.order(order(kernel.id(), size, Pace::FULL, 50, None)).unwrap_err();
        assert!(why.contains("takes 2 cpu"), "{why}");
    }
    let why = worker.order(order("integer.multiply", 9, Pace::FULL, 50, Some(*last))).unwrap_err();
    assert!(why.contains("takes 1 cpu"), "{why}");
}
