//! What the supervisor is given to do, what it is told, and what it answers with.

use std::sync::Arc;
use std::time::Duration;

use kernels::{Case, Seed, Size, Variant};

use super::fault::Fault;
use super::protocol::{Message, Order};
use crate::condition::{Level, Setting};
pub use crate::event::FRESH_FROM;
use crate::event::{Ending, Event, How, Job, Purpose, Surroundings};
use crate::host::Cpu;

/// How long a slice lasts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Span {
    /// A share of the time that is left to the phase, by this weight among the slices that are left, at most
    /// [`Setup::longest`].
    Share(u32),
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
    /// Operand seeds of the tables, in order.
    pub seeds: Vec<u64>,
    /// Where the unit's row of table seeds goes on after the last of them.
    pub next_seed: Option<u64>,
    /// A case beyond the tables is added if one is ready.
    pub fresh: bool,
    /// The second cpu, for a kernel of two; nobody else may be using it.
    pub partner: Option<Cpu>,
    /// Who else is busy, how hard, and after what.
    pub setting: Setting,
    /// How long, rest included.
    pub span: Span,
    /// Made-up faults; only in a drill.
    pub faults: Vec<Fault>,
}

/// A cpu with its work.
#[derive(Clone, Debug)]
pub struct Track {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Its slices in order.
    pub slices: Vec<Spec>,
}

/// A part of the job that ends for all cpus together; cpus without a track rest meanwhile.
#[derive(Clone, Debug)]
pub struct Phase {
    /// Its weight in the time that is left, seconds by plan.
    pub seconds: f64,
    /// Work for confirmations may be put between its slices; otherwise it waits until the phase has ended, because
    /// the condition speaks of what every cpu does.
    pub open: bool,
    /// It goes on past its time until everything in it was run, at the cost of later phases.
    pub whole: bool,
    /// The cpus with their work.
    pub tracks: Vec<Track>,
}

/// A tested cpu.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Post {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
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
    /// The tested cpus.
    pub posts: Vec<Post>,
    /// Their work, phase by phase.
    pub phases: Vec<Phase>,
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

    /// A case beyond the tables for `cpu`, with words that another core computed; only if one is ready.
    fn fresh(&mut self, _kernel: &'static str, _size: Size, _cpu: Cpu) -> Option<(Seed, Vec<u64>)> {
        None
    }

    /// Where a footprint lies when `cpu` works under `setting`, if that is known.
    fn level(&self, _size: Size, _cpu: Cpu, _setting: Setting) -> Option<Level> {
        None
    }
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
    /// A sensor of this cpu reads this many °C, above the limit: no work until it has cooled.
    Hot(Cpu, f64),
    /// It has cooled to this many °C.
    Cooled(Cpu, f64),
    /// The system has taken this cpu away.
    TakenAway(Cpu, String),
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
    /// Its second cpu, whose opinion counts as little.
    pub with: Option<Cpu>,
    /// Expected words, number of outputs folded, and the worker's fold, by case.
    pub cases: Vec<(Arc<Vec<u64>>, u64, u64)>,
}

/// What the supervisor answers with; carried out in order.
#[derive(Debug)]
#[expect(clippy::large_enum_variant, reason = "a few hundred bytes, moved a few times a slice")]
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
    /// Work for two cpus that the judge asked for cannot be done.
    CannotRun(Request),
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
