//! The worker process: holds itself on one cpu, does what it is ordered, compares every output word for word with
//! the expected words that it was handed, folds every output, and says what it saw. It judges nothing.

use std::collections::VecDeque;
use std::io::{self, BufReader, Write};
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Receiver, channel};
use std::time::{Duration, Instant, SystemTime, UNIX_EPOCH};

use kernels::compare::{Fold, first_difference};
use kernels::{Case, Kernel, Roles, Seed, Size, Variant, catalogue, isa};

use super::fault::{Armed, Fault};
use super::pace::{Metronome, monotonic};
use super::partner::together;
use super::pinning::{self, Place, thread_time};
use super::protocol::{
    CaseReport, Message, Order, PartnerReport, Received, SliceOrder, SliceReport, WorkerArgs, WrongOutput, receive,
    send,
};
use crate::host::Cpu;

/// The clock is read about this often; a run longer than this is its own interval.
const CLOCK_EVERY: Duration = Duration::from_micros(200);
/// Wrong outputs of a slice that are sent in full; later ones are counted.
const FULL_REPORTS: u64 = 8;
/// Wrong words of an output that are sent.
const FULL_WORDS: usize = 8;

/// Everything up to this slice has been given up; written by the thread that reads orders.
static GIVEN_UP: AtomicU64 = AtomicU64::new(0);

/// Runs the worker until its standard input ends.
pub fn main(args: WorkerArgs) -> ExitCode {
    let mut out = io::stdout().lock();
    if let Err(why) = pinning::pin(args.cpu) {
        let _ = send(&mut out, &Message::Unpinned { why: format!("no thread can be held on it: {why}") });
        return ExitCode::from(3);
    }
    // whoever signals the whole group means the supervisor, which lets this worker report first; that its input ends is
    // what ends a worker
    for signal in [libc::SIGINT, libc::SIGTERM, libc::SIGHUP] {
        if let Err(why) = signal_hook::flag::register(signal, Arc::new(AtomicBool::new(false))) {
            let _ =
                send(&mut out, &Message::Refused { slice: 0, why: format!("cannot set signal {signal} aside: {why}") });
            return ExitCode::from(3);
        }
    }
    let orders = listen();
    let Ok(place) = pinning::place() else { return ExitCode::from(3) };
    let lacking = args.node.and_then(|node| {
        let why = pinning::take_memory_from(node).err()?;
        Some(format!("memory of node {node} cannot be asked for: {why}"))
    });
    pinning::wake_exactly();
    if send(&mut out, &Message::Ready { place, lacking }).is_err() {
        return ExitCode::from(3);
    }
    for order in orders {
        if work(&mut out, args.cpu, &order).is_err() {
            // nobody listens any more
            break;
        }
    }
    ExitCode::SUCCESS
}

/// Reads orders on a thread of its own, so that a halt is seen during a slice and the supervisor's end is seen always.
fn listen() -> Receiver<SliceOrder> {
    let (give, take) = channel();
    std::thread::spawn(move || {
        let mut input = BufReader::new(io::stdin());
        loop {
            match receive::<Order>(&mut input) {
                Received::Message(Order::Slice(order)) => {
                    if give.send(order).is_err() {
                        return;
                    }
                }
                // slices are numbered from 0, so "up to and including n" is kept as n + 1
                Received::Message(Order::Halt { upto }) => GIVEN_UP.store(upto + 1, Ordering::Relaxed),
                // the supervisor is gone: nobody may go on heating this core
                Received::Babble(_) | Received::End => std::process::exit(0),
            }
        }
    });
    take
}

fn given_up(slice: u64) -> bool {
    slice < GIVEN_UP.load(Ordering::Relaxed)
}

fn unix_ms() -> u64 {
    SystemTime::now().duration_since(UNIX_EPOCH).map_or(0, |d| d.as_millis() as u64)
}

fn work(out: &mut impl Write, cpu: Cpu, order: &SliceOrder) -> io::Result<()> {
    send(out, &Message::Begun { slice: order.slice })?;
    let slice = order.slice;
    let mut before = pinning::place();
    if before.as_ref().is_ok_and(|place| !place.is_only(cpu)) {
        // somebody moved this worker while it had no work, or during the slice before, which is void
        if let Err(why) = pinning::pin(cpu) {
            return send(out, &Message::Unpinned { why: format!("no thread can be held on it any more: {why}") });
        }
        before = pinning::place();
    }
    let outcome = before.map_err(|e| e.to_string()).and_then(|before| Bench::new(order, before));
    let mut bench = match outcome {
        Ok(bench) => bench,
        Err(why) => return send(out, &Message::Refused { slice, why }),
    };
    if bench.faults.iter().any(|f| matches!(f, Fault::Babble)) {
        out.write_all(b"\x1b[2Jthis is no message\n")?;
        out.flush()?;
    }
    let report = bench.run(out)?;
    match report {
        Ok(report) => send(out, &Message::Ended(report)),
        Err(why) => send(out, &Message::Refused { slice, why: format!("cpu {cpu}: {why}") }),
    }
}

struct Bench<'a> {
    order: &'a SliceOrder,
    kernel: &'static dyn Kernel,
    proof: isa::Proof,
    cases: VecDeque<(u64, Vec<u64>)>,
    faults: Vec<Fault>,
    before: Place,
    wrong_seen: u64,
    wrong_ms: Option<(u64, u64)>,
    beat: Metronome,
    partner: Option<PartnerReport>,
}

impl<'a> Bench<'a> {
    fn new(order: &'a SliceOrder, before: Place) -> Result<Bench<'a>, String> {
        let kernel = catalogue::find(&order.kernel).ok_or_else(|| format!("no kernel {}", order.kernel))?;
        let variant = Variant::parse(&order.variant).ok_or_else(|| format!("no variant {}", order.variant))?;
        let proof = isa::prove(kernel, variant).map_err(|why| format!("{} {variant}: {why}", order.kernel))?;
        if !kernel.sizes().contains(&Size(order.size)) {
            return Err(format!("{} has no size {} KiB", order.kernel, order.size));
        }
        let words = kernel.output_words(Size(order.size));
        let mut cases = VecDeque::new();
        for case in &order.cases {
            let expected = parse_words(&case.expected).filter(|w| w.len() == words);
            cases.push_back((
                case.seed,
                expected.ok_or_else(|| format!("expected words of seed {} are not {words} words", case.seed))?,
            ));
        }
        if (kernel.cpus() == 2) != order.partner.is_some() {
            return Err(format!("{} takes {} cpu(s), which is not what was ordered", order.kernel, kernel.cpus()));
        }
        Ok(Bench {
            order,
            kernel,
            proof,
            cases,
            faults: order.faults.clone(),
            before,
            wrong_seen: 0,
            wrong_ms: None,
            beat: Metronome::new(order.pace, order.slice),
            partner: None,
        })
    }

    /// The outer error is a broken pipe, the inner one a slice that cannot be reported.
    fn run(&mut self, out: &mut impl Write) -> io::Result<Result<SliceReport, String>> {
        let begun = Instant::now();
        rest(Duration::from_nanos(self.order.rest_ns.min(self.order.span_ns)), self.order.slice);
        // the duty is that of the work, not of the rest before it
        self.beat = Metronome::new(self.order.pace, self.order.slice);
        let start = Instant::now();
        let span = Duration::from_nanos(self.order.span_ns.saturating_sub(self.order.rest_ns));
        let mut armed: Vec<Armed> = self.faults.drain(..).map(Armed::new).collect();
        let mut reports = Vec::with_capacity(self.cases.len());
        let mut busy = Duration::ZERO;
        while let Some((seed, expected)) = self.cases.pop_front() {
            if given_up(self.order.slice) {
                break;
            }
            // what is left is shared equally among the cases left, so preparation cannot push the end out
            let left = span.saturating_sub(start.elapsed());
            let until = start.elapsed() + left / (self.cases.len() as u32 + 1);
            let dwell = Dwell { seed, expected: &expected, start, until, span };
            match self.dwell(out, &dwell, &mut armed)? {
                Ok((report, time)) => {
                    reports.push(report);
                    busy += time;
                }
                Err(why) => return Ok(Err(why)),
            }
        }
        let after = match pinning::place() {
            Ok(place) => place,
            Err(why) => return Ok(Err(why.to_string())),
        };
        Ok(Ok(SliceReport {
            slice: self.order.slice,
            span_ns: begun.elapsed().as_nanos() as u64,
            busy_ns: busy.as_nanos() as u64,
            cases: reports,
            wrong_ms: self.wrong_ms,
            places: (self.before.clone(), after),
            partner: self.partner.take(),
            steps: self.beat.steps(),
        }))
    }

    /// The outer error is a broken pipe, the inner one a second cpu that could not be had.
    fn dwell(&mut self, out: &mut impl Write, dwell: &Dwell, armed: &mut [Armed]) -> io::Result<Result<Dwelt, String>> {
        let case = Case { kernel: self.kernel.id(), seed: Seed(dwell.seed), size: Size(self.order.size) };
        match (self.kernel.prepare(&case, self.proof), self.order.partner) {
            (Roles::One(mut ready), _) => self.runs(out, dwell, armed, &mut |words| ready.run(words)).map(Ok),
            (Roles::Two(roles), Some(cpu)) => {
                let words = dwell.expected.len();
                let (dwelt, seen) = match together(roles, cpu, words, |run| self.runs(out, dwell, armed, run)) {
                    Ok(both) => both,
                    Err(why) => return Ok(Err(why)),
                };
                // one thread a case: the first place of the first and the last of the last bracket the slice
                self.partner = Some(match self.partner.take() {
                    Some(all) => PartnerReport {
                        places: (worse(all.places.0, seen.places.0, cpu), worse(all.places.1, seen.places.1, cpu)),
                        busy_ns: all.busy_ns + seen.busy_ns,
                    },
                    None => seen,
                });
                dwelt.map(Ok)
            }
            (Roles::Two(_), None) => Ok(Err(format!("{} takes two cpus", case.kernel))),
        }
    }

    /// Runs one case again and again until its time is over.
    fn runs(
        &mut self,
        out: &mut impl Write,
        dwell: &Dwell,
        armed: &mut [Armed],
        run: &mut dyn FnMut(&mut [u64]),
    ) -> io::Result<Dwelt> {
        let mut output = vec![0u64; dwell.expected.len()];
        let mut report = CaseReport { seed: dwell.seed, runs: 0, wrong: 0, fold: 0 };
        let mut fold = Fold::default();
        let mut batch = 1u64;
        let look_every = self.beat.stretch().map_or(CLOCK_EVERY, |stretch| CLOCK_EVERY.min(stretch / 4));
        let until = monotonic() + dwell.until.saturating_sub(dwell.start.elapsed()).as_nanos() as u64;
        let slice = self.order.slice;
        let begun = thread_time();
        let mut worked = self.beat.worked;
        'case: while let Some(end) = self.beat.next(until, || given_up(slice)) {
            loop {
                let batch_start = Instant::now();
                for _ in 0..batch {
                    run(&mut output);
                    let blind = !armed.is_empty() && {
                        let elapsed = dwell.start.elapsed().as_secs_f64() / dwell.span.as_secs_f64();
                        armed.iter_mut().fold(false, |blind, a| a.apply(&mut output, elapsed).blind | blind)
                    };
                    match first_difference(&output, dwell.expected) {
                        Some(index) if !blind => {
                            report.wrong += 1;
                            self.wrong(out, dwell, report.runs, index, &output)?;
                        }
                        _ => fold.push(&output),
                    }
                    report.runs += 1;
                }
                if dwell.start.elapsed() >= dwell.until || given_up(slice) {
                    self.beat.ended();
                    break 'case;
                }
                // long enough not to be spent on the clock, short enough to end on time
                let took = batch_start.elapsed();
                if took < look_every / 2 {
                    batch *= 2;
                } else if took > look_every * 2 && batch > 1 {
                    batch /= 2;
                }
                if !self.beat.full() && monotonic() >= end {
                    self.beat.ended();
                    break;
                }
            }
        }
        report.fold = fold.0;
        worked = self.beat.worked - worked;
        let busy = thread_time().saturating_sub(begun);
        // what is spun between stretches is no work
        Ok((report, if self.beat.full() { busy } else { busy.min(Duration::from_nanos(worked)) }))
    }

    fn wrong(&mut self, out: &mut impl Write, dwell: &Dwell, run: u64, first: usize, output: &[u64]) -> io::Result<()> {
        let now = unix_ms();
        self.wrong_ms = Some((self.wrong_ms.map_or(now, |(begin, _)| begin), now));
        self.wrong_seen += 1;
        if self.wrong_seen > FULL_REPORTS {
            return Ok(());
        }
        let pairs = || output.iter().zip(dwell.expected).enumerate().skip(first).filter(|(_, (a, e))| a != e);
        let message = Message::Wrong(WrongOutput {
            slice: self.order.slice,
            seed: dwell.seed,
            run,
            wall_ms: now,
            wrong_words: pairs().count() as u64,
            first: pairs().take(FULL_WORDS).map(|(i, (actual, expected))| (i as u64, *expected, *actual)).collect(),
            place: pinning::place()?,
        });
        send(out, &message)
    }
}

/// What one case came to, and the processor time inside the kernel.
type Dwelt = (CaseReport, Duration);

/// The one of two places that is not `cpu` alone, if there is one.
fn worse(a: Place, b: Place, cpu: Cpu) -> Place {
    if a.is_only(cpu) { b } else { a }
}

/// Does nothing for so long, unless the slice is given up.
fn rest(span: Duration, slice: u64) {
    let end = Instant::now() + span;
    while !given_up(slice) {
        let left = end.saturating_duration_since(Instant::now());
        if left.is_zero() {
            return;
        }
        std::thread::sleep(left.min(Duration::from_millis(20)));
    }
}

struct Dwell<'a> {
    seed: u64,
    expected: &'a [u64],
    start: Instant,
    until: Duration,
    span: Duration,
}

fn parse_words(text: &str) -> Option<Vec<u64>> {
    if !text.is_ascii() || !text.len().is_multiple_of(16) {
        return None;
    }
    (0..text.len() / 16).map(|i| u64::from_str_radix(&text[i * 16..i * 16 + 16], 16).ok()).collect()
}
