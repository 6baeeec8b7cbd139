//! One segment: its lines, and what stands after the last good one.
//!
//! What follows the last good line is *torn* if it can be the work of an append that was cut off:
//! - no `\n` in it: the write ended in the middle of a line; or
//! - a NUL byte in it and no line after it that its own hash confirms: some file systems keep the new length of a
//!   file over a power cut and not the data, and hand out zeros. No line of ours contains a NUL.
//!
//! Anything else is *bad*: a line that was once whole was changed, or bytes were lost from the middle.

use std::io::BufRead;
use std::path::Path;

use crate::ledger::condition::{Because, Torn};
use crate::ledger::digest::Digest;
use crate::ledger::folder;
use crate::ledger::names::SEGMENT_BYTES_READ;
use crate::ledger::record::{self, Line};

/// A line and the offset of its first byte in its segment.
pub struct Placed {
    /// Offset in the segment.
    pub at: u64,
    /// The line.
    pub line: Line,
}

/// What stands after the last good line.
pub enum End {
    /// Nothing.
    Whole,
    /// The work of an append that was cut off.
    Torn(Torn),
    /// Damage at this offset.
    Bad(u64, Because),
}

/// A segment, looked through by itself: whether its lines follow from each other is for the reader to say.
pub struct Scanned {
    /// Its number.
    pub segment: u32,
    /// Its good lines.
    pub lines: Vec<Placed>,
    /// And after them.
    pub end: End,
}

/// Reads and looks through a segment of the ledger at `path`.
pub fn scan_file(path: &Path, segment: u32) -> Scanned {
    let bad = |because| Scanned { segment, lines: Vec::new(), end: End::Bad(0, because) };
    match folder::read_limited(&folder::segment_path(path, segment), SEGMENT_BYTES_READ) {
        Ok(Some(bytes)) => scan(&bytes, segment),
        Ok(None) => bad(Because::SegmentTooLong),
        Err(error) => bad(Because::Unreadable(error.to_string())),
    }
}

fn scan(bytes: &[u8], segment: u32) -> Scanned {
    let mut lines = Vec::new();
    let mut at = 0;
    let end = loop {
        let rest = &bytes[at..];
        if rest.is_empty() {
            break End::Whole;
        }
        let Some(line) = first_line(rest) else {
            break torn(segment, at, rest);
        };
        match record::decode(line) {
            Ok(line) => lines.push(Placed { at: at as u64, line }),
            Err(because) if never_reached_the_disk(rest, &because) => break torn(segment, at, rest),
            Err(because) => break End::Bad(at as u64, because),
        }
        at += line.len() + 1;
    };
    Scanned { segment, lines, end }
}

/// The first line without its newline; `None` if there is no newline. (The search of `BufRead` is a vector one.)
fn first_line(mut bytes: &[u8]) -> Option<&[u8]> {
    let all = bytes;
    let length = bytes.skip_until(b'\n').expect("memory can be read");
    all[..length].strip_suffix(b"\n")
}

fn torn(segment: u32, at: usize, rest: &[u8]) -> End {
    End::Torn(Torn { segment, at: at as u64, bytes: rest.len() as u64, sha256: Digest::of(rest) })
}

/// Zeros in place of data, and nothing good after them.
fn never_reached_the_disk(rest: &[u8], because: &Because) -> bool {
    !matches!(because, Because::Version(_))
        && rest.contains(&0)
        && !rest.split(|&b| b == b'\n').any(record::stands_alone)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::event::{Event, Remark};

    fn line(seq: u64) -> Vec<u8> {
        let event = Event::Remark(Remark { job_id: 1, wall_ms: seq, text: "x".into() });
        let mut line = record::encode(seq, Digest::of(b""), &serde_json::to_vec(&event).unwrap());
        line.push(b'\n');
        line
    }

    fn end_of(parts: &[&[u8]]) -> (usize, End) {
        let scanned = scan(&parts.concat(), 1);
        (scanned.lines.len(), scanned.end)
    }

    #[test]
    fn zeros_at_the_end_are_torn_and_zeros_in_the_middle_are_damage() {
        let (a, b) = (line(0), line(1));
        let zeros = [0u8; 4096];
        assert!(matches!(end_of(&[&a, &b]), (2, End::Whole)));
        assert!(matches!(end_of(&[&a, &zeros]), (1, End::Torn(t)) if t.bytes == 4096 && t.at == a.len() as u64));
        assert!(matches!(end_of(&[&a, &b[..9], &zeros, b"\n"]), (1, End::Torn(_))));
        assert!(matches!(end_of(&[&a, &zeros, b"\n", &b]), (1, End::Bad(..))));
        // even when the last line stands alone only because it has no newline any more
        assert!(matches!(end_of(&[&a, &zeros, b"\n", b.trim_ascii_end()]), (1, End::Bad(..))));
    }

    #[test]
    fn whole_but_wrong_last_line_is_damage_and_not_torn() {
        let (a, mut b) = (line(0), line(1));
        let at = b.len() - 5;
        b[at] ^= 1;
        assert!(matches!(end_of(&[&a, &b]), (1, End::Bad(_, Because::BodyHash))));
        assert!(matches!(end_of(&[&a, &b[..at]]), (1, End::Torn(_))));
        assert!(matches!(end_of(&[&a, b"\n"]), (1, End::Bad(_, Because::Layout(_)))));
    }
}
