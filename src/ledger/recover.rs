//! Reading a ledger: the lines that can be relied on, in order, and then what the ledger came to.
//!
//! A line is handed out if its own bytes are in order (`record`), its number is the next one, and its `prev` is the
//! hash of the line before it, across segments. The first line for which this does not hold ends the reading.
//!
//! Torn tails (`scan`) are never cut off. A start that finds some leaves them where they are and begins a new
//! segment with a remark whose text starts with `torn tail kept: ` and names each of them by segment, offset, length
//! and SHA-256. So, walking the ledger:
//! - a torn tail with no line after it, in any later segment, is [`Condition::TornTail`]: the next start will name it;
//! - torn tails followed by a line are accepted if that line is the remark that names exactly these;
//! - followed by any other line, or named and not there (any more), the ledger is broken.
//!
//! What the chain cannot show: lines cut off at the very end leave a shorter, clean ledger. Whoever needs to know
//! compares the head (number and hash of the last line) with the one that a report or certificate quotes.

use std::collections::{BTreeMap, VecDeque};
use std::path::{Path, PathBuf};

use rayon::prelude::*;
use serde::Serialize;

use crate::event::{Event, Remark};
use crate::ledger::condition::{Because, Condition, TORN_PREFIX, Torn, naming};
use crate::ledger::digest::Digest;
use crate::ledger::error::Error;
use crate::ledger::folder::{self, Marker};
use crate::ledger::record::{Record, wall_ms};
use crate::ledger::scan::{End, Placed, Scanned, scan_file};

/// Segments that are looked through at once: a bound on memory, not on processors.
const AT_ONCE: usize = 8;

/// A line that can be relied on.
#[derive(Clone, Debug, PartialEq)]
pub struct Entry {
    /// Its number.
    pub seq: u64,
    /// Its segment.
    pub segment: u32,
    /// Offset of its first byte in the segment.
    pub at: u64,
    /// Hash of the line.
    pub hash: Digest,
    /// What it says.
    pub record: Record,
}

/// The last line.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct Head {
    /// Its number.
    pub seq: u64,
    /// Hash over its bytes without the newline.
    pub sha256: Digest,
}

/// What reading all of a ledger came to.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Summary {
    /// The ledger's marker.
    pub marker: Marker,
    /// Lines that can be relied on.
    pub lines: u64,
    /// Segments in the folder.
    pub segments: u32,
    /// The last such line.
    pub head: Option<Head>,
    /// How it ends.
    pub condition: Condition,
    /// Earliest host clock on record, Unix milliseconds.
    pub first_ms: Option<u64>,
    /// Latest host clock on record.
    pub last_ms: Option<u64>,
    /// Torn tails of earlier writers, named and kept.
    pub kept_tails: Vec<Torn>,
    /// Lines of kinds that this program does not know.
    pub unknown: BTreeMap<String, u64>,
}

/// Iterator over the lines of a ledger that can be relied on.
pub struct Reader {
    path: PathBuf,
    /// Segments not yet looked at: those that are there, and a number above the last good one where one is missing.
    todo: VecDeque<u32>,
    ready: VecDeque<Scanned>,
    lines: std::vec::IntoIter<Placed>,
    segment: u32,
    end: Option<End>,
    /// Torn tails since the last line.
    tails: Vec<Torn>,
    next_seq: u64,
    prev: Digest,
    done: bool,
    summary: Summary,
}

impl Reader {
    /// Begins to read; takes no lock, so a ledger can be read while it is written.
    pub fn open(path: &Path) -> Result<Reader, Error> {
        let marker = folder::marker(path)?;
        let segments = folder::segments(path)?;
        let summary = Summary {
            lines: 0,
            segments: segments.len() as u32,
            head: None,
            condition: Condition::Clean,
            first_ms: None,
            last_ms: None,
            kept_tails: Vec::new(),
            unknown: BTreeMap::new(),
            marker,
        };
        Ok(Reader {
            path: path.into(),
            todo: segments.into(),
            ready: VecDeque::new(),
            lines: Vec::new().into_iter(),
            segment: 0,
            end: None,
            tails: Vec::new(),
            next_seq: 0,
            prev: summary.marker.sha256,
            done: false,
            summary,
        })
    }

    /// Reads what is left and says what it came to.
    pub fn finish(mut self) -> Summary {
        self.by_ref().for_each(drop);
        self.summary
    }

    fn broken(&mut self, segment: u32, at: u64, because: Because) {
        self.summary.condition = Condition::Broken { seq: self.next_seq, segment, at, because };
        self.done = true;
    }

    /// Goes on to the next segment, or comes to the end.
    fn turn_page(&mut self) {
        match self.end.take() {
            None | Some(End::Whole) => {}
            Some(End::Torn(torn)) => self.tails.push(torn),
            Some(End::Bad(at, because)) => return self.broken(self.segment, at, because),
        }
        if self.ready.is_empty() {
            let batch: Vec<u32> = self.todo.drain(..AT_ONCE.min(self.todo.len())).collect();
            let path = &self.path;
            self.ready = batch.into_par_iter().map(|n| scan_file(path, n)).collect::<Vec<_>>().into();
        }
        match self.ready.pop_front() {
            Some(scanned) if scanned.segment != self.segment + 1 => {
                self.broken(self.segment + 1, 0, Because::SegmentMissing);
            }
            Some(scanned) => {
                self.segment = scanned.segment;
                self.lines = scanned.lines.into_iter();
                self.end = Some(scanned.end);
            }
            None => {
                if !self.tails.is_empty() {
                    self.summary.condition = Condition::TornTail { tails: std::mem::take(&mut self.tails) };
                }
                self.done = true;
            }
        }
    }

    /// Whether the line may stand here.
    fn follows(&mut self, placed: &Placed) -> Result<(), Because> {
        if placed.line.seq != self.next_seq {
            return Err(Because::Seq(placed.line.seq));
        }
        if placed.line.prev != self.prev {
            return Err(Because::Chain);
        }
        let text = match &placed.line.record {
            Record::Event(Event::Remark(Remark { text, .. })) if text.starts_with(TORN_PREFIX) => Some(text),
            _ => None,
        };
        match (text, self.tails.is_empty()) {
            (None, true) => Ok(()),
            (Some(_), true) => Err(Because::TailGone),
            (Some(text), false) if text.starts_with(&naming(&self.tails)) => {
                self.summary.kept_tails.append(&mut self.tails);
                Ok(())
            }
            (_, false) => Err(Because::TailNotNamed),
        }
    }

    fn count(&mut self, entry: &Entry) {
        self.summary.lines += 1;
        self.summary.head = Some(Head { seq: entry.seq, sha256: entry.hash });
        match &entry.record {
            Record::Event(event) => {
                let now = wall_ms(event);
                self.summary.first_ms = Some(self.summary.first_ms.map_or(now, |t| t.min(now)));
                self.summary.last_ms = Some(self.summary.last_ms.map_or(now, |t| t.max(now)));
            }
            Record::Unknown { kind } => *self.summary.unknown.entry(kind.clone()).or_default() += 1,
        }
    }
}

impl Iterator for Reader {
    type Item = Entry;

    fn next(&mut self) -> Option<Entry> {
        while !self.done {
            let Some(placed) = self.lines.next() else {
                self.turn_page();
                continue;
            };
            if let Err(because) = self.follows(&placed) {
                self.broken(self.segment, placed.at, because);
                break;
            }
            let Placed { at, line } = placed;
            (self.next_seq, self.prev) = (line.seq + 1, line.hash);
            let entry = Entry { seq: line.seq, segment: self.segment, at, hash: line.hash, record: line.record };
            self.count(&entry);
            return Some(entry);
        }
        None
    }
}

/// Reads all of the ledger at `path` and says what it came to.
pub fn verify(path: &Path) -> Result<Summary, Error> {
    Ok(Reader::open(path)?.finish())
}
