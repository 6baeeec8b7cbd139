//! What the supervisor is given to do, what it is told, and what it answers with.

use std::sync::Arc;
use std::time::Duration;

use kernels::{Case, Size, Variant};

use super::fault::Fault;
use super::protocol::{Message, Order};
use crate::event::{Ending, Event, How, Job, Purpose, Surroundings};
use crate::host::Cpu;

/// How long a slice lasts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Span {
    /// An equal share of the time that is left for the slices that are left, at most [`Setup::longest`].
    Share,
    /// This long, unless the window ends before.
    Fixed(Duration),
}

/// One slice to be run on one cpu.
#[derive(Clone, Debug, PartialEq)]
pub struct Spec {
    /// Why.
    pub purpose: Purpose,
    /// Kernel id.
    pub kernel: &'static str,
    /// Variant.
    pub variant: Variant,
    /// Footprint.
    pub size: Size,
    /// Operand seeds, in order.
    pub seeds: Vec<u64>,
    /// How long.
    pub span: Span,
    /// Made-up faults; only in a drill.
    pub faults: Vec<Fault>,
}

/// A cpu with its work.
#[derive(Clone, Debug)]
pub struct Track {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Its slices in order.
    pub slices: Vec<Spec>,
}

/// A job for the supervisor.
#[derive(Clone, Debug)]
pub struct Setup {
    /// Names the job in its records.
    pub job_id: u64,
    /// Window or drill.
    pub job: Job,
    /// All work is over by then.
    pub budget: Duration,
    /// Longest slice.
    pub longest: Duration,
    /// How long past its span a slice may answer before its worker counts as hung.
    pub grace: Duration,
    /// Workers of one cpu that may be lost before it is left alone.
    pub losses_borne: u32,
    /// Who else is busy, and how hard, in words: `all steady 100%`.
    pub arrangement: String,
    /// The cpus with their work.
    pub tracks: Vec<Track>,
}

/// Extra work that the judge asks for.
#[derive(Clone, Debug, PartialEq)]
pub struct Request {
    /// Where.
    pub cpu: Cpu,
    /// What.
    pub spec: Spec,
}

/// Where expected words come from.
pub trait Truth {
    /// The golden words of `case`.
    fn expected(&self, case: &Case) -> Option<Vec<u64>>;
}

/// What the supervisor is told.
#[derive(Debug)]
pub enum Input {
    /// A worker said something.
    Said(Cpu, Message),
    /// A worker sent what is no message.
    Babbled(Cpu, String),
    /// A worker ended.
    Gone(Cpu, How),
    /// A worker was stopped by a signal from outside (true), or goes on (false).
    Stopped(Cpu, bool),
    /// What the system says of a worker that was asked after.
    Felt(Cpu, Option<Pulse>),
    /// The second opinion on a slice's folds.
    Checked(Opinion),
    /// The judge wants more.
    Wanted(Vec<Request>),
    /// Somebody asked the job to end.
    Interrupt,
    /// A record could not be written: no further work may start.
    DiskFailed,
    /// Time has passed.
    Tick,
}

/// The second opinion on the folds of one slice.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Opinion {
    /// Slice number.
    pub slice: u64,
    /// Cpu of the slice.
    pub of: Cpu,
    /// The cpu that checked; none where no other core could.
    pub on: Option<Cpu>,
    /// Positions of the cases whose fold is wrong, two cpus agreeing on what it should be.
    pub wrong: Vec<usize>,
    /// What went wrong with the check itself, if anything.
    pub remark: Option<String>,
}

/// A fold to be checked elsewhere.
#[derive(Clone, Debug)]
pub struct FoldTask {
    /// Slice number.
    pub slice: u64,
    /// Cpu of the slice.
    pub of: Cpu,
    /// Expected words, number of outputs folded, and the worker's fold, by case.
    pub cases: Vec<(Arc<Vec<u64>>, u64, u64)>,
}

/// What the supervisor answers with; carried out in order.
#[derive(Debug)]
pub enum Action {
    /// Start a worker on this cpu.
    Start(Cpu),
    /// Send an order.
    Order(Cpu, Order),
    /// Ask the system after a worker that is late.
    Feel(Cpu),
    /// End a worker at once.
    Kill(Cpu),
    /// Have folds checked on another core.
    Check(FoldTask),
    /// Record an event.
    Record(Event),
    /// All is over.
    Finish(Ending),
}

/// What the system says of a worker's main thread.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Pulse {
    /// It could run, or waits for the system, and is not asleep or stopped of itself.
    pub waiting: bool,
    /// Processor time that the worker has used since it was started.
    pub busy: Duration,
}

/// The clock and sensors of the moment, handed to the supervisor with every input.
#[derive(Clone, Copy, Debug)]
pub struct Now {
    /// Since the job began, monotonic.
    pub at: Duration,
    /// Host clock, Unix milliseconds.
    pub wall_ms: u64,
    /// Readings of the cpu that the input speaks of.
    pub surroundings: Surroundings,
    /// The worker that the input comes from.
    pub pulse: Option<Pulse>,
}
