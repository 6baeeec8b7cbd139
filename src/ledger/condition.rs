//! How a ledger ends: whole, with a torn tail, or broken.

use std::fmt;

use serde::{Serialize, Serializer};

use crate::ledger::digest::Digest;
use crate::ledger::names;

/// How the text of a remark starts that names torn tails. Part of the format: never change it.
pub const TORN_PREFIX: &str = "torn tail kept: ";

/// Bytes at the end of a segment that are no complete line. They stay where they are.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct Torn {
    /// Number of the segment.
    pub segment: u32,
    /// Offset of the first torn byte in the segment.
    pub at: u64,
    /// How many bytes, up to the end of the segment.
    pub bytes: u64,
    /// Over those bytes.
    pub sha256: Digest,
}

impl fmt::Display for Torn {
    /// Part of the format: `segment-000001.jsonl@512+37 sha256:…`. Never change it.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}@{}+{} sha256:{}", names::segment(self.segment), self.at, self.bytes, self.sha256)
    }
}

/// The start of the text of the remark that names exactly `tails`, up to its semicolon. Part of the format.
pub fn naming(tails: &[Torn]) -> String {
    let list: Vec<String> = tails.iter().map(Torn::to_string).collect();
    format!("{TORN_PREFIX}{};", list.join(", "))
}

/// What reading all of a ledger came to.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(tag = "state", rename_all = "snake_case")]
pub enum Condition {
    /// Every byte of every segment is accounted for.
    Clean,
    /// The last lines are whole; after them stand bytes of a line that was never finished: the writer or the
    /// machine ended in the middle of it, or a writer is at work just now. Nothing synced is missing.
    TornTail {
        /// Usually one; more when a start after the first one was cut off as well.
        tails: Vec<Torn>,
    },
    /// From here on nothing can be relied on.
    Broken {
        /// The number of the line that should stand here.
        seq: u64,
        /// The segment.
        segment: u32,
        /// Offset in the segment.
        at: u64,
        /// What is wrong with it.
        #[serde(serialize_with = "in_words")]
        because: Because,
    },
}

fn in_words<S: Serializer>(because: &Because, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.collect_str(because)
}

impl fmt::Display for Condition {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Condition::Clean => f.write_str("clean"),
            Condition::TornTail { tails } => {
                let list: Vec<String> = tails
                    .iter()
                    .map(|t| format!("{} bytes in {} from byte {}", t.bytes, names::segment(t.segment), t.at))
                    .collect();
                write!(f, "torn tail: {}", list.join(", "))
            }
            Condition::Broken { seq, segment, at, because } => {
                write!(f, "broken at seq {seq} ({}, byte {at}): {because}", names::segment(*segment))
            }
        }
    }
}

/// Why a ledger is broken.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Because {
    /// Not the byte layout of a line.
    #[error("the line does not have the layout of a ledger line ({0})")]
    Layout(&'static str),
    /// Longer than any line that is written.
    #[error("the line is longer than {max} bytes", max = names::LINE_BYTES)]
    LineTooLong,
    /// Written by another version.
    #[error("the line is of version {0}, this program reads version {known}", known = names::LINE_VERSION)]
    Version(u64),
    /// The body is not the one that was hashed.
    #[error("the body does not have the hash that the line states")]
    BodyHash,
    /// A line is missing, twice there, or out of order.
    #[error("the line says that it is seq {0}")]
    Seq(u64),
    /// Not the successor of the line before it.
    #[error("the line does not follow from the line before it (its prev is another hash)")]
    Chain,
    /// The hash fits, but the record cannot be understood.
    #[error("the record cannot be understood: {0}")]
    Record(String),
    /// A torn tail that the next line does not name.
    #[error("the line follows a torn tail that it does not name")]
    TailNotNamed,
    /// A torn tail is named that is not there.
    #[error("the line names a torn tail that is no longer there")]
    TailGone,
    /// A number is missing in the row of segments.
    #[error("the segment is missing while later ones are there")]
    SegmentMissing,
    /// Longer than any segment that is written.
    #[error("the segment is longer than {max} bytes", max = names::SEGMENT_BYTES_READ)]
    SegmentTooLong,
    /// The operating system gave an error.
    #[error("the segment cannot be read: {0}")]
    Unreadable(String),
}
