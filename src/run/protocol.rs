//! What supervisor and worker say to each other: one JSON document a line over the worker's standard input and output.
//!
//! A line is at most [`LONGEST_LINE`] bytes; anything longer, or that is no valid message, is babble and ends the worker.

use std::io::{self, BufRead, Write};

use serde::{Deserialize, Serialize};

use super::fault::Fault;
use super::pinning::Place;
use crate::condition::Pace;
use crate::host::Cpu;

/// Longest line of the protocol in bytes: 64 cases of 256 words in hexadecimal are 262,144.
pub const LONGEST_LINE: usize = 1 << 20;

/// To a worker.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Order {
    /// Work for some time.
    Slice(SliceOrder),
    /// End the slice under way early and answer later orders with nothing done, up to and including slice `upto`.
    Halt {
        /// The last slice that is given up.
        upto: u64,
    },
}

/// One slice of work.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SliceOrder {
    /// Slice number within the job.
    pub slice: u64,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Footprint in KiB.
    pub size: u32,
    /// How long, in nanoseconds, rest included.
    pub span_ns: u64,
    /// Nothing is done for so long first, in nanoseconds.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub rest_ns: u64,
    /// How hard.
    #[serde(default, skip_serializing_if = "is_full")]
    pub pace: Pace,
    /// The second cpu, for a kernel of two.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
    /// Cases in the order in which they are run, each for an equal part of the span.
    pub cases: Vec<CaseOrder>,
    /// Made-up faults; only in a drill.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub faults: Vec<Fault>,
}

fn is_zero(number: &u64) -> bool {
    *number == 0
}

fn is_full(pace: &Pace) -> bool {
    *pace == Pace::FULL
}

/// One case with its right answer.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct CaseOrder {
    /// Operand seed.
    pub seed: u64,
    /// Expected words in hexadecimal.
    pub expected: String,
}

/// From a worker.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Message {
    /// Started and pinned.
    Ready {
        /// Where it is.
        place: Place,
        /// What could not be had, if anything: memory of the cpu's own node.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        lacking: Option<String>,
    },
    /// A slice has begun.
    Begun {
        /// Slice number.
        slice: u64,
    },
    /// An output was wrong.
    Wrong(WrongOutput),
    /// A slice has ended.
    Ended(SliceReport),
    /// The worker cannot be held on its cpu any more: that was taken offline, or out of what the process may use.
    Unpinned {
        /// Why.
        why: String,
    },
    /// A slice could not be run; no statement about the core.
    Refused {
        /// Slice number.
        slice: u64,
        /// Why.
        why: String,
    },
}

/// A wrong output, first words in full.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct WrongOutput {
    /// Slice number.
    pub slice: u64,
    /// Operand seed.
    pub seed: u64,
    /// Number of the run within the case.
    pub run: u64,
    /// Host clock, Unix milliseconds.
    pub wall_ms: u64,
    /// Words that differ.
    pub wrong_words: u64,
    /// Index, expected and actual of the first that differ.
    pub first: Vec<(u64, u64, u64)>,
    /// Where the worker was when it saw it.
    pub place: Place,
}

/// What a slice came to.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SliceReport {
    /// Slice number.
    pub slice: u64,
    /// Wall length in nanoseconds, preparation included.
    pub span_ns: u64,
    /// Processor time inside kernels in nanoseconds, comparison and fold included.
    pub busy_ns: u64,
    /// Each case in the order in which it was run.
    pub cases: Vec<CaseReport>,
    /// Host clock of the first and the last wrong output.
    pub wrong_ms: Option<(u64, u64)>,
    /// Where the worker was before and after.
    pub places: (Place, Place),
    /// The same of the second cpu's thread, and its processor time in nanoseconds.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub partner: Option<PartnerReport>,
    /// Steps begun, and how many of them within 20 µs of their time.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub steps: Option<(u64, u64)>,
}

/// What the second cpu's thread says of itself.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct PartnerReport {
    /// Where it was before and after.
    pub places: (Place, Place),
    /// Processor time inside the kernel in nanoseconds.
    pub busy_ns: u64,
}

/// What one case came to.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct CaseReport {
    /// Operand seed.
    pub seed: u64,
    /// Runs.
    pub runs: u64,
    /// Runs whose output the worker found wrong.
    pub wrong: u64,
    /// Fold over the outputs that the worker found right.
    pub fold: u64,
}

/// The arguments with which a worker is started: which cpu it is to hold itself on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct WorkerArgs {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Memory node to take memory from.
    pub node: Option<u32>,
}

/// Writes one message and flushes.
pub fn send<T: Serialize>(to: &mut impl Write, message: &T) -> io::Result<()> {
    let mut line = serde_json::to_vec(message)?;
    line.push(b'\n');
    to.write_all(&line)?;
    to.flush()
}

/// What came over the pipe.
#[derive(Debug)]
pub enum Received<T> {
    /// A message.
    Message(T),
    /// Something else; the first characters of it, escaped.
    Babble(String),
    /// The other side is gone.
    End,
}

/// Reads one message; never more than [`LONGEST_LINE`] bytes are kept.
pub fn receive<T: for<'de> Deserialize<'de>>(from: &mut impl BufRead) -> Received<T> {
    let mut line = Vec::new();
    let limit = LONGEST_LINE as u64 + 1;
    match io::Read::take(&mut *from, limit).read_until(b'\n', &mut line) {
        Ok(0) | Err(_) => return Received::End,
        Ok(_) => {}
    }
    let babble = |line: &[u8]| {
        let text: String = String::from_utf8_lossy(line).chars().take(60).collect();
        Received::Babble(text.escape_debug().to_string())
    };
    if line.last() != Some(&b'\n') {
        // a line cut off by the sender's death says nothing; a line that is too long is babble
        return if line.len() as u64 == limit { babble(&line) } else { Received::End };
    }
    match serde_json::from_slice(&line) {
        Ok(message) => Received::Message(message),
        Err(_) => babble(&line),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn babble_and_ends_are_told_apart() {
        let mut good = Vec::new();
        send(&mut good, &Message::Begun { slice: 7 }).unwrap();
        assert!(matches!(receive::<Message>(&mut good.as_slice()), Received::Message(Message::Begun { slice: 7 })));
        assert!(matches!(receive::<Message>(&mut &b"\x1b[31mhello\n"[..]), Received::Babble(t) if !t.contains('\x1b')));
        assert!(matches!(receive::<Message>(&mut &b"{\"begun\":{\"sl"[..]), Received::End));
        assert!(matches!(receive::<Message>(&mut &b""[..]), Received::End));
        let endless = vec![b'x'; LONGEST_LINE + 10];
        assert!(matches!(receive::<Message>(&mut endless.as_slice()), Received::Babble(_)));
    }
}
