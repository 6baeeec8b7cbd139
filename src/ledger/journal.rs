//! Writing a ledger.
//!
//! - [`Journal::append`] chains an event to the last one and buffers its line; [`Journal::sync`] puts everything on
//!   stable storage. [`must_sync`] says after which events that has to happen before work goes on; [`Journal::record`]
//!   does both. What was synced survives the end of the process and, as far as the disk keeps its word, of the machine.
//! - Every line is read back, by the decoder that readers use, before it is buffered: an event that would not come
//!   back as it went in (a number that is not finite, or a core that garbles what it copies) is refused, not written.
//! - After the first failed write or sync the journal is dead: what reached the disk is unknown from then on (a second
//!   fsync may succeed without the data of the first), so every later call gives the same error. The next start reads
//!   what is really there.
//! - A segment is synced before the next one begins, so a later line is never on disk without the ones before it.

use std::fs::File;
use std::path::Path;

use crate::event::{Event, Lost, Remark};
use crate::ledger::condition::{Condition, TORN_PREFIX, Torn, naming};
use crate::ledger::digest::Digest;
use crate::ledger::disk::{Disk, Segments};
use crate::ledger::error::Error;
use crate::ledger::folder;
use crate::ledger::intents::OpenIntents;
use crate::ledger::names::{LINE_BYTES, SEGMENT_BYTES};
use crate::ledger::record::{self, Record};
use crate::ledger::recover::{Entry, Head, Reader, Summary};

/// Buffered lines are handed to the operating system when they are this long together.
const BUFFER_BYTES: usize = 64 << 10;

/// Whether an event has to be on stable storage before the work that it speaks of goes on.
pub fn must_sync(event: &Event) -> bool {
    match event {
        Event::Intent(_) | Event::Mismatch(_) | Event::Lost(_) | Event::Finding(_) | Event::Closed(_) => true,
        // the intent that follows carries an opening with it; a slice that is lost leaves its intent open
        Event::Opened(_) | Event::Slice(_) | Event::Remark(_) => false,
    }
}

/// What a start found.
#[derive(Clone, Debug)]
pub struct Opening {
    /// Whether the ledger was made just now.
    pub created: bool,
    /// The ledger as it was found, before anything was appended.
    pub found: Summary,
    /// Torn tails that this start found, left in place and named in a remark.
    pub salvaged: Vec<Torn>,
    /// Cores that had work when an earlier job was cut off. To be appended by the job that starts now: once they are
    /// on record no later start gives them again.
    pub abandoned: Vec<Lost>,
    /// A job number that no job of this ledger has.
    pub next_job: u64,
}

/// The one writer of a ledger.
pub struct Journal {
    disk: Box<dyn Disk>,
    buffer: Vec<u8>,
    segment: u32,
    /// Bytes of the current segment, buffered ones included.
    length: u64,
    next_seq: u64,
    prev: Digest,
    failed: Option<Error>,
    /// Held until the journal is dropped.
    _lock: Option<folder::Lock>,
}

impl Journal {
    /// Makes a ledger at `path`, or goes on in the one that is there. `wall_ms` is the host clock.
    pub fn open(path: &Path, wall_ms: u64) -> Result<(Journal, Opening), Error> {
        Journal::open_reading(path, wall_ms, |_| {})
    }

    /// Like [`Journal::open`]; `each` sees every line that is on record already, so that history is read only once.
    pub fn open_reading(path: &Path, wall_ms: u64, mut each: impl FnMut(&Entry)) -> Result<(Journal, Opening), Error> {
        let (lock, _, created) = folder::take(path, wall_ms)?;
        let mut reader = Reader::open(path)?;
        let mut intents = OpenIntents::default();
        for entry in reader.by_ref() {
            if let Record::Event(event) = &entry.record {
                intents.add(event);
            }
            each(&entry);
        }
        let found = reader.finish();
        if let Some(error) = Error::refusing(path, &found.condition) {
            return Err(error);
        }
        let salvaged = match &found.condition {
            Condition::TornTail { tails } => tails.clone(),
            _ => Vec::new(),
        };
        let (next_seq, prev) = found.head.map_or((0, found.marker.sha256), |head| (head.seq + 1, head.sha256));
        let mut disk = Segments::new(path);
        let resumed = if found.segments == 0 { Ok(0) } else { disk.resume(found.segments) };
        let length = resumed.map_err(|e| Error::io(disk.place(), "go on in", e))?;
        for torn in &salvaged {
            // named by hash from now on: what was read has to be what is on disk
            let place = folder::segment_path(path, torn.segment);
            File::open(&place).and_then(|f| f.sync_all()).map_err(|e| Error::io(&place, "sync", e))?;
        }
        let mut journal = Journal::on(Box::new(disk), found.segments, length, next_seq, prev);
        journal._lock = Some(lock);
        if found.segments == 0 || !salvaged.is_empty() {
            journal.begin()?;
        }
        if !salvaged.is_empty() {
            journal.name(&salvaged, wall_ms)?;
        }
        let opening =
            Opening { created, salvaged, abandoned: intents.abandoned(), next_job: intents.next_job(), found };
        Ok((journal, opening))
    }

    fn on(disk: Box<dyn Disk>, segment: u32, length: u64, next_seq: u64, prev: Digest) -> Journal {
        Journal { disk, buffer: Vec::new(), segment, length, next_seq, prev, failed: None, _lock: None }
    }

    /// Chains the event to the last one and buffers its line. Returns its number.
    pub fn append(&mut self, event: &Event) -> Result<u64, Error> {
        self.alive()?;
        match event {
            Event::Remark(remark) if remark.text.starts_with(TORN_PREFIX) => {
                Err(self.unrecordable(event, "only a start may say of a torn tail that it was kept".into()))
            }
            event => self.chain(event),
        }
    }

    /// [`Journal::append`], and [`Journal::sync`] if the event needs it.
    pub fn record(&mut self, event: &Event) -> Result<u64, Error> {
        let seq = self.append(event)?;
        if must_sync(event) {
            self.sync()?;
        }
        Ok(seq)
    }

    /// Returns when everything appended so far is on stable storage.
    pub fn sync(&mut self) -> Result<(), Error> {
        self.flush()?;
        let done = self.disk.sync();
        self.or_die("sync", done)
    }

    /// The last line appended, synced or not.
    pub fn head(&self) -> Option<Head> {
        self.next_seq.checked_sub(1).map(|seq| Head { seq, sha256: self.prev })
    }

    fn chain(&mut self, event: &Event) -> Result<u64, Error> {
        let body = serde_json::to_vec(event).map_err(|e| self.unrecordable(event, e.to_string()))?;
        if body.len() > LINE_BYTES {
            return Err(self.unrecordable(event, format!("it is longer than {LINE_BYTES} bytes")));
        }
        let mut line = record::encode(self.next_seq, self.prev, &body);
        let back = record::decode(&line).map_err(|because| self.unrecordable(event, because.to_string()))?;
        if !matches!(&back.record, Record::Event(read) if read == event) || back.prev != self.prev {
            return Err(self.unrecordable(event, "read back, it is another one".into()));
        }
        line.push(b'\n');
        if self.length > 0 && self.length + line.len() as u64 > SEGMENT_BYTES {
            self.sync()?;
            self.begin()?;
        }
        self.buffer.extend_from_slice(&line);
        self.length += line.len() as u64;
        (self.next_seq, self.prev) = (back.seq + 1, back.hash);
        if self.buffer.len() >= BUFFER_BYTES {
            self.flush()?;
        }
        Ok(back.seq)
    }

    /// The remark that lets readers accept the torn tails before it.
    fn name(&mut self, salvaged: &[Torn], wall_ms: u64) -> Result<(), Error> {
        let text = format!(
            "{} an earlier writer was cut off there before it had synced these bytes; all lines before them are whole",
            naming(salvaged)
        );
        self.chain(&Event::Remark(Remark { job_id: 0, wall_ms, text }))?;
        self.sync()
    }

    fn begin(&mut self) -> Result<(), Error> {
        let done = self.disk.begin(self.segment + 1);
        self.or_die("begin", done)?;
        self.segment += 1;
        self.length = 0;
        Ok(())
    }

    fn flush(&mut self) -> Result<(), Error> {
        self.alive()?;
        if self.buffer.is_empty() {
            return Ok(());
        }
        let done = self.disk.append(&self.buffer);
        self.buffer.clear();
        self.or_die("append to", done)
    }

    fn alive(&self) -> Result<(), Error> {
        self.failed.clone().map_or(Ok(()), Err)
    }

    fn or_die(&mut self, doing: &'static str, done: std::io::Result<()>) -> Result<(), Error> {
        done.map_err(|error| {
            let error = Error::io(self.disk.place(), doing, error);
            self.failed = Some(error.clone());
            error
        })
    }

    fn unrecordable(&self, event: &Event, because: String) -> Error {
        Error::Unrecordable { path: self.disk.place().into(), kind: record::kind(event), because }
    }
}

impl Drop for Journal {
    /// Hands over what is buffered; whoever needs it on disk has called [`Journal::sync`] and seen its answer.
    fn drop(&mut self) {
        let _unsynced = self.flush();
    }
}

#[cfg(test)]
#[path = "journal_tests.rs"]
mod tests;
