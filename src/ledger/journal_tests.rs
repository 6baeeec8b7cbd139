//! Journals on disks that fail at a chosen call.

use std::io;
use std::sync::{Arc, Mutex};

use super::*;

#[derive(Default)]
struct State {
    segments: Vec<Vec<u8>>,
    synced: Vec<usize>,
    calls: usize,
    fail_at: Option<(usize, io::ErrorKind)>,
}

/// A disk in memory; call number `fail_at` fails, an append after half of its bytes.
#[derive(Clone, Default)]
struct Faulty(Arc<Mutex<State>>);

impl Faulty {
    fn failing(at: usize, kind: io::ErrorKind) -> Faulty {
        let disk = Faulty::default();
        disk.0.lock().unwrap().fail_at = Some((at, kind));
        disk
    }

    fn journal(&self) -> Journal {
        let mut journal = Journal::on(Box::new(self.clone()), 0, 0, 0, Digest::of(b"marker"));
        // a failed begin shows again at the first append
        let _dead = journal.begin();
        journal
    }

    fn call(&self, write: impl FnOnce(&mut State, bool)) -> io::Result<()> {
        let mut state = self.0.lock().unwrap();
        state.calls += 1;
        let fails = state.fail_at.filter(|(at, _)| *at == state.calls);
        write(&mut state, fails.is_some());
        fails.map_or(Ok(()), |(_, kind)| Err(kind.into()))
    }
}

impl Disk for Faulty {
    fn append(&mut self, bytes: &[u8]) -> io::Result<()> {
        self.call(|state, fails| {
            let written = if fails { bytes.len() / 2 } else { bytes.len() };
            state.segments.last_mut().unwrap().extend_from_slice(&bytes[..written]);
        })
    }

    fn sync(&mut self) -> io::Result<()> {
        self.call(|state, fails| {
            if !fails {
                state.synced = state.segments.iter().map(Vec::len).collect();
            }
        })
    }

    fn begin(&mut self, segment: u32) -> io::Result<()> {
        self.call(|state, fails| {
            if !fails {
                assert_eq!(state.segments.len() + 1, segment as usize);
                // never begun before the one before it is on disk
                assert_eq!(state.synced.last().copied().unwrap_or(0), state.segments.last().map_or(0, Vec::len));
                state.segments.push(Vec::new());
            }
        })
    }

    fn place(&self) -> &Path {
        Path::new("a/segment")
    }
}

fn remark(n: u64, length: usize) -> Event {
    Event::Remark(Remark { job_id: n, wall_ms: n, text: "x".repeat(length) })
}

#[test]
fn first_failure_is_the_last_word() {
    // calls: begin, then append and sync for each of three records
    for (kind, starts) in [
        (io::ErrorKind::StorageFull, "no space is left"),
        (io::ErrorKind::ReadOnlyFilesystem, "the file system is read-only"),
        (io::ErrorKind::TimedOut, "timed out"),
    ] {
        for at in 1..=7 {
            let disk = Faulty::failing(at, kind);
            let mut journal = disk.journal();
            let mut acknowledged = 0;
            let mut first = None;
            for n in 0..6 {
                match journal.append(&remark(n, 10)).and_then(|_| journal.sync()) {
                    Ok(()) => acknowledged += 1,
                    Err(error) => {
                        let said = error.to_string();
                        assert!(said.contains(starts) && said.contains("a/segment"), "{said}");
                        assert_eq!(first.get_or_insert(said.clone()), &said, "another error at a later call");
                    }
                }
            }
            assert!(first.is_some());
            drop(journal);
            let state = disk.0.lock().unwrap();
            assert_eq!(state.calls, at, "touched again after it failed");
            let synced = state.synced.first().copied().unwrap_or(0);
            let lines = state.segments.first().map_or(0, |s| s[..synced].iter().filter(|&&b| b == b'\n').count());
            assert_eq!(lines, acknowledged, "acknowledged is what is synced");
        }
    }
}

#[test]
fn what_would_not_come_back_is_refused_and_the_journal_goes_on() {
    let disk = Faulty::default();
    let mut journal = disk.journal();
    let closed = |wall_s| {
        Event::Closed(crate::event::Closed {
            job_id: 1,
            job: crate::event::Job::Window,
            wall_ms: 1,
            wall_s,
            ending: crate::event::Ending::Done,
            verdict: "clear".into(),
            slices: 0,
        })
    };
    for bad in [
        closed(f64::NAN),
        closed(f64::INFINITY),
        remark(1, LINE_BYTES),
        Event::Remark(Remark { job_id: 0, wall_ms: 0, text: format!("{TORN_PREFIX}none;") }),
    ] {
        let error = journal.append(&bad).unwrap_err();
        assert!(matches!(error, Error::Unrecordable { .. }), "{error}");
    }
    assert_eq!(journal.head(), None);
    // values that a parser without exact rounding would change in the last bit
    for (n, wall_s) in [0.1 + 0.2, 1e-7 / 3.0, 6.02214076e23, 5e-324, 123_456.789_012_345_67].into_iter().enumerate() {
        assert_eq!(journal.append(&closed(wall_s)).unwrap(), n as u64);
    }
}

#[test]
fn segments_turn_at_their_size_and_carry_the_chain() {
    let disk = Faulty::default();
    let mut journal = disk.journal();
    for n in 0..20 {
        journal.append(&remark(n, 3 << 20)).unwrap();
    }
    journal.sync().unwrap();
    let head = journal.head().unwrap();
    let state = disk.0.lock().unwrap();
    assert_eq!(state.segments.len(), 4);
    let mut prev = Digest::of(b"marker");
    let mut seq = 0;
    for segment in &state.segments {
        assert!(segment.len() as u64 <= SEGMENT_BYTES);
        for line in segment.strip_suffix(b"\n").unwrap().split(|&b| b == b'\n') {
            let line = record::decode(line).unwrap();
            assert_eq!((line.seq, line.prev), (seq, prev));
            (seq, prev) = (seq + 1, line.hash);
        }
    }
    assert_eq!((seq, prev), (20, head.sha256));
}

#[test]
fn promises_and_evidence_are_synced_at_once() {
    let clean = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/ledgers/clean");
    let disk = Faulty::default();
    let mut journal = disk.journal();
    let mut kinds = std::collections::BTreeSet::new();
    for entry in Reader::open(&clean).unwrap() {
        let Record::Event(event) = entry.record else { continue };
        journal.record(&event).unwrap();
        let kind = record::kind(&event);
        let state = disk.0.lock().unwrap();
        let written = state.segments[0].iter().filter(|&&b| b == b'\n').count() as u64;
        let synced = state.synced.first().copied() == Some(state.segments[0].len())
            && Some(written) == journal.head().map(|h| h.seq + 1);
        assert_eq!(synced, !["opened", "slice", "remark"].contains(&kind), "{kind}");
        kinds.insert(kind);
    }
    assert_eq!(kinds.len(), record::KINDS.len(), "an example of each");
}
