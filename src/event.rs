//! What happened: owned, serialisable events. The runner emits them, the ledger keeps them, reports consume them;
//! a ledger replayed goes through the same reports as a window that has just ended.
//!
//! Times: `wall_ms` is the host's clock in Unix milliseconds, a label for people and for clustering into episodes;
//! exposure is always `busy_ns`, processor time of the pinned thread inside kernels.

use std::fmt;

use serde::{Deserialize, Serialize};

use crate::host::Cpu;

/// Seeds from here on are beyond every table: their cases were made for one job, live, and are never used again.
pub const FRESH_FROM: u64 = 1 << 47;

/// One line of a ledger, without the envelope.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum Event {
    /// A window, drill or other job began.
    Opened(Opened),
    /// Cores are about to be given work; on disk before the work starts.
    Intent(Intent),
    /// A slice ended.
    Slice(Slice),
    /// A wrong output, with its evidence.
    Mismatch(Mismatch),
    /// A worker died, hung, or was stopped.
    Lost(Lost),
    /// A statement about a core, after confirmation.
    Finding(Box<Finding>),
    /// Something that a reader of the evidence has to know.
    Remark(Remark),
    /// The job ended.
    Closed(Closed),
}

/// Which job a record belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Job {
    /// A maintenance window: its records count.
    Window,
    /// A rehearsal with made-up faults: its records never count.
    Drill,
}

/// The beginning of a job.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Opened {
    /// Names the job in all its records; unique within a ledger.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Host clock.
    pub wall_ms: u64,
    /// Budget in seconds.
    pub budget_s: f64,
    /// Seed of order and choice.
    pub seed: u64,
    /// Key of the host, with the source that it rests on.
    pub host: String,
    /// Identity of the CPU parts.
    pub part: String,
    /// Whether a hypervisor was seen: then a cpu number is no physical core.
    pub virtualised: bool,
    /// Program version.
    pub program: String,
    /// Digest over all golden tables.
    pub golden: String,
    /// The cpus that are to be tested.
    pub cpus: Vec<Cpu>,
}

/// What one core is about to do.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Assignment {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Slice number within the job.
    pub slice: u64,
    /// Why.
    #[serde(default)]
    pub purpose: Purpose,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Condition in words.
    pub condition: String,
    /// The second cpu of a kernel for two.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
}

/// The promise of work, on disk before the work starts.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Intent {
    /// The job.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Host clock.
    pub wall_ms: u64,
    /// Each core that starts work now.
    pub assignments: Vec<Assignment>,
}

/// Why a slice was run.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Purpose {
    /// Part of the plan; counts in rates.
    #[default]
    Plan,
    /// Re-run of a failing case on the core it failed on; chosen because it failed, so never in rates.
    Suspect,
    /// The same case on another core, interleaved.
    Control,
}

/// Whether the fold of all outputs was checked on another core.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum FoldCheck {
    /// Equal to the fold of the golden outputs, apart from the runs that were reported as mismatches.
    Right,
    /// Not equal: outputs were wrong that the core itself did not report.
    Wrong,
    /// No other core could check it.
    NotChecked,
}

/// Readings beside a record; `None` where the host does not tell.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct Surroundings {
    /// °C.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub celsius: Option<f64>,
    /// kHz.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub khz: Option<u64>,
}

/// Whether a line about a counter that rose speaks of memory: then a wrong output need not be a core's doing.
pub fn tells_of_memory(counter: &str) -> bool {
    counter.contains("memory errors at ")
}

/// An aggregate over the runs of one slice.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Slice {
    /// The job.
    pub job_id: u64,
    /// Slice number within the job.
    pub slice: u64,
    /// What kind of job: a drill's slices never count.
    pub job: Job,
    /// Why it was run.
    pub purpose: Purpose,
    /// Logical cpu that was ordered and, unless void, used.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Condition in words.
    pub condition: String,
    /// Host clock at the start.
    pub wall_ms: u64,
    /// Wall length of the slice in nanoseconds of the monotonic clock.
    pub span_ns: u64,
    /// Processor time inside kernels, comparison and fold included.
    pub busy_ns: u64,
    /// Different cases run.
    pub cases: u64,
    /// Runs.
    pub runs: u64,
    /// Operations, in the kernel's unit.
    pub operations: u64,
    /// The kernel's unit.
    pub unit: String,
    /// Runs whose output was wrong.
    pub mismatches: u64,
    /// Host clock of the first and the last mismatch.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub mismatch_ms: Option<(u64, u64)>,
    /// The second opinion on all outputs.
    pub fold: FoldCheck,
    /// The cpu that gave the second opinion.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub checked_on: Option<Cpu>,
    /// Why nothing can be concluded from this slice, if so.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub void: Option<String>,
    /// Readings at the end of the slice.
    #[serde(default)]
    pub surroundings: Surroundings,
    /// The second cpu of a kernel for two, and its processor time in nanoseconds.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Partner>,
    /// Where the unit's row of table seeds goes on after this slice.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub next_seed: Option<u64>,
    /// Steps of a stepped pace, and how many of them began within 20 µs of their time.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub steps: Option<(u64, u64)>,
    /// Machine-check, memory-error and throttling counters that rose meanwhile.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub counters: Vec<String>,
}

/// The second cpu of a slice.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Partner {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Processor time inside the kernel.
    pub busy_ns: u64,
}

/// One wrong word.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct WrongWord {
    /// Index among the output words.
    pub index: u64,
    /// The golden word, hexadecimal.
    pub expected: String,
    /// The word that the core gave, hexadecimal.
    pub actual: String,
    /// Exclusive or of the two, hexadecimal.
    pub xor: String,
    /// actual − expected, decimal.
    pub difference: String,
}

impl WrongWord {
    /// The difference between two words at `index`.
    pub fn new(index: usize, expected: u64, actual: u64) -> WrongWord {
        WrongWord {
            index: index as u64,
            expected: format!("{expected:016x}"),
            actual: format!("{actual:016x}"),
            xor: format!("{:016x}", expected ^ actual),
            difference: (i128::from(actual) - i128::from(expected)).to_string(),
        }
    }
}

/// How a wrong output was noticed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum NoticedBy {
    /// The worker's own word-for-word comparison.
    Comparison,
    /// The fold, checked on another core: the worker's comparison had let it pass.
    Fold,
}

/// A wrong output with its evidence.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Mismatch {
    /// The job.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Slice number within the job.
    pub slice: u64,
    /// Why the slice was run: repeats for confirmation are no news.
    pub purpose: Purpose,
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Operand seed; absent where only the fold of many cases is known to be wrong.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub seed: Option<u64>,
    /// Footprint in KiB.
    pub size: u32,
    /// Condition in words.
    pub condition: String,
    /// Host clock.
    pub wall_ms: u64,
    /// Number of the run within its case.
    pub run: u64,
    /// How it was noticed.
    pub noticed_by: NoticedBy,
    /// Words that differ.
    pub wrong_words: u64,
    /// The first words that differ.
    pub words: Vec<WrongWord>,
    /// The second cpu of a kernel for two; output words from the middle on are its view.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
    /// Kernel that ran on this core before, if any.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub previous_kernel: Option<String>,
    /// What the other tested cpus were doing.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub neighbours: Vec<(Cpu, String)>,
    /// Readings at that time.
    #[serde(default)]
    pub surroundings: Surroundings,
}

/// How a worker was lost.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum How {
    /// Ended by a signal (number).
    Signal(i32),
    /// Ended by itself with this status while it had work.
    Exit(i32),
    /// Gave no answer by its deadline.
    Hung,
    /// Stopped by a signal from outside and left so until its deadline.
    Stopped,
    /// Gave no answer by its deadline, but was kept from running by others on the machine.
    Starved,
    /// Sent something that is no message of the protocol.
    Babbled(String),
    /// Could not be started.
    NotStarted(String),
    /// Could not be pinned, or ran elsewhere.
    NotPinned(String),
    /// The machine or the program ended before the slice did; found by the next start.
    Abandoned,
}

impl fmt::Display for How {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            How::Signal(n) => match nix::sys::signal::Signal::try_from(*n) {
                Ok(s) => write!(f, "ended by {s}"),
                Err(_) => write!(f, "ended by signal {n}"),
            },
            How::Exit(code) => write!(f, "ended by itself with status {code}"),
            How::Hung => f.write_str("gave no answer by its deadline"),
            How::Stopped => f.write_str("stopped from outside until its deadline"),
            How::Starved => f.write_str("kept from running by others until its deadline"),
            How::Babbled(what) => write!(f, "sent no valid message: {what}"),
            How::NotStarted(why) => write!(f, "could not be started: {why}"),
            How::NotPinned(why) => write!(f, "could not be held on its cpu: {why}"),
            How::Abandoned => f.write_str("under way when the program or the machine ended"),
        }
    }
}

/// A worker that was lost while it had work.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Lost {
    /// The job in which it was lost.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Slice number within the job.
    pub slice: u64,
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Condition in words.
    pub condition: String,
    /// Host clock.
    pub wall_ms: u64,
    /// What became of it.
    pub how: How,
    /// The second cpu of a kernel for two.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
}

/// Runs and mismatches of one leg of a confirmation.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Leg {
    /// Where it ran.
    pub cpu: Cpu,
    /// And with whom, for a kernel of two cpus.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
    /// Runs.
    pub runs: u64,
    /// Wrong ones.
    pub mismatches: u64,
}

/// How far a mismatch was confirmed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Confirmation {
    /// Expected words recomputed on other cores and equal; the case failed again on the suspect and never on controls.
    Repeated,
    /// Expected words recomputed and equal, wrong output on record, but it did not fail again here.
    Once,
    /// Controls failed too: the fault is not this core's alone.
    Shared,
    /// Two cores failed together and again so, and no control could tell which of them it was.
    OneOfTwo,
    /// The recomputed words differ from the expected ones: the tool or its tables are wrong, not the core.
    Refuted,
    /// Steps were left out; `lacking` says which and why.
    Incomplete,
}

/// An adjudicated statement about a core.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Finding {
    /// The job.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Seed of the case that was examined; absent where only a fold of many cases is known to be wrong.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub seed: Option<u64>,
    /// Footprint in KiB.
    pub size: u32,
    /// Condition in words.
    pub condition: String,
    /// Host clock.
    pub wall_ms: u64,
    /// True where the wrong output itself is beyond doubt and blame rests on this core.
    pub confirmed: bool,
    /// How far the confirmation went.
    pub confirmation: Confirmation,
    /// Mismatches of this core in this cell when the finding was made, repeats for confirmation left out.
    pub mismatches: u64,
    /// The first wrong word; absent where only the fold is known to be wrong.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub first: Option<WrongWord>,
    /// The other cpu of a pair that failed together.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
    /// Cpus on which the reference recomputed the expected words.
    pub recomputed_on: Vec<Cpu>,
    /// The suspect's legs in order.
    pub suspect: Vec<Leg>,
    /// The controls' legs in order.
    pub controls: Vec<Leg>,
    /// Machine-check and memory-error counters that rose meanwhile.
    pub counters: Vec<String>,
    /// Steps that could not be done, and why.
    pub lacking: Vec<String>,
    /// One sentence for people.
    pub statement: String,
}

/// Something that a reader of the evidence has to know.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Remark {
    /// The job, if any.
    pub job_id: u64,
    /// Host clock.
    pub wall_ms: u64,
    /// In words.
    pub text: String,
}

/// Why a job ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Ending {
    /// The budget was spent.
    Budget,
    /// Everything planned was done.
    Done,
    /// A signal asked for it.
    Signal,
    /// The tool could not go on.
    Failed,
}

/// The end of a job.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Closed {
    /// The job.
    pub job_id: u64,
    /// What kind of job.
    pub job: Job,
    /// Host clock.
    pub wall_ms: u64,
    /// Length in seconds of the monotonic clock.
    pub wall_s: f64,
    /// Why it ended.
    pub ending: Ending,
    /// The host's verdict: `clear`, `watch`, `withdraw` or `untested`.
    pub verdict: String,
    /// Slices that ended.
    pub slices: u64,
}
