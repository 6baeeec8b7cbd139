//! Writing what can be read of a damaged ledger to a new folder. The damaged one is not touched.
//!
//! The lines that can be relied on are copied byte for byte, with the marker and with torn tails that were named
//! before: their hashes stay what reports and certificates quote. Then a remark says where they come from and why
//! the rest was left behind.

use std::fs::{self, OpenOptions};
use std::io::{self, Write};
use std::path::Path;

use serde::Serialize;

use crate::event::{Event, Remark};
use crate::ledger::condition::Condition;
use crate::ledger::digest::Digest;
use crate::ledger::error::Error;
use crate::ledger::folder;
use crate::ledger::journal::Journal;
use crate::ledger::names::{self, SEGMENT_BYTES_READ};
use crate::ledger::recover::{Entry, Reader, Summary};

/// What a salvage did.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Salvage {
    /// The ledger that was read.
    pub from: Summary,
    /// The new one.
    pub to: Summary,
}

/// Writes the lines of the ledger at `path` that can be relied on to a new ledger at `target`, which must not exist
/// or be empty. `wall_ms` is the host clock.
pub fn salvage(path: &Path, target: &Path, wall_ms: u64) -> Result<Salvage, Error> {
    let mut reader = Reader::open(path)?;
    let last: Option<Entry> = reader.by_ref().last();
    let from = reader.finish();
    match folder::marker(target) {
        Ok(_) => return Err(Error::Foreign { path: target.into(), found: "it is a ledger already".into() }),
        Err(Error::NoLedger { .. }) => folder::create_folders(target)?,
        Err(error) => return Err(error),
    }
    if let Some(last) = last {
        for segment in 1..last.segment {
            copy(path, target, segment, None)?;
        }
        copy(path, target, last.segment, Some(&last))?;
    }
    // the marker last: what was cut off before it is no ledger
    let marker = path.join(names::MARKER);
    let bytes = fs::read(&marker).map_err(|e| Error::io(&marker, "read", e))?;
    folder::put_marker(target, &bytes)?;
    let (mut journal, opening) = Journal::open(target, wall_ms)?;
    if opening.found.head != from.head || opening.found.condition != Condition::Clean {
        let changed = io::Error::other("it changed while it was read");
        return Err(Error::io(path, "salvage", changed));
    }
    let text = format!("salvaged from {}, which was {}; it holds the rest", path.display(), from.condition);
    journal.append(&Event::Remark(Remark { job_id: 0, wall_ms, text }))?;
    journal.sync()?;
    drop(journal);
    Ok(Salvage { from, to: Reader::open(target)?.finish() })
}

/// Copies a segment, up to and including the line `last` if given.
fn copy(path: &Path, target: &Path, segment: u32, last: Option<&Entry>) -> Result<(), Error> {
    let (source, place) = (folder::segment_path(path, segment), folder::segment_path(target, segment));
    let bytes = folder::read_limited(&source, SEGMENT_BYTES_READ).map_err(|e| Error::io(&source, "read", e))?;
    let bytes = bytes.unwrap_or_default();
    let kept = match last {
        None => &bytes[..],
        Some(last) => {
            let line = bytes.get(last.at as usize..).unwrap_or_default().split_inclusive(|&b| b == b'\n').next();
            let length = line.filter(|line| Digest::of(line.trim_ascii_end()) == last.hash).map_or(0, <[u8]>::len);
            &bytes[..bytes.len().min(last.at as usize + length)]
        }
    };
    let written = OpenOptions::new().write(true).create_new(true).open(&place).and_then(|mut file| {
        file.write_all(kept)?;
        file.sync_all()
    });
    written.map_err(|e| Error::io(&place, "write", e))
}
