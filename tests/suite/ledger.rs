//! Ledgers: written, read, damaged on purpose, cut off, salvaged.

mod damage;
mod fixtures;
mod process;
mod refusals;
mod roundtrip;

use std::fs;
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU32, Ordering};

use proofhouse::event::{
    Assignment, Closed, Ending, Event, FoldCheck, How, Intent, Job, Lost, Mismatch, NoticedBy, Opened, Purpose, Remark,
    Slice, Surroundings, WrongWord,
};
use proofhouse::host::Cpu;
use proofhouse::ledger::{Journal, Reader, Record, Summary};

/// A folder of its own for each test, removed at the end.
struct Scratch(PathBuf);

impl Scratch {
    fn new() -> Scratch {
        static NEXT: AtomicU32 = AtomicU32::new(0);
        let number = NEXT.fetch_add(1, Ordering::Relaxed);
        // in memory where there is such a folder: these tests sync thousands of times
        let memory = Path::new("/dev/shm");
        let base = if memory.is_dir() { memory.to_path_buf() } else { std::env::temp_dir() };
        let path = base.join(format!("proofhouse-suite-{}-{number}", std::process::id()));
        fs::create_dir_all(&path).unwrap();
        Scratch(path)
    }

    fn at(&self, name: &str) -> PathBuf {
        self.0.join(name)
    }
}

impl Drop for Scratch {
    fn drop(&mut self) {
        let _left_behind = fs::remove_dir_all(&self.0);
    }
}

fn data(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/ledgers").join(name)
}

fn copy(from: &Path, to: &Path) {
    fs::create_dir_all(to).unwrap();
    for entry in fs::read_dir(from).unwrap() {
        let entry = entry.unwrap();
        fs::copy(entry.path(), to.join(entry.file_name())).unwrap();
    }
}

fn opened(job_id: u64) -> Event {
    Event::Opened(Opened {
        job_id,
        job: Job::Window,
        wall_ms: 1_000,
        budget_s: 0.1 + 0.2,
        seed: u64::MAX,
        host: "host \"key\"\n".into(),
        part: "part µ".into(),
        virtualised: true,
        program: "0.1.0".into(),
        golden: "00".into(),
        cpus: vec![Cpu(0), Cpu(1)],
    })
}

fn intent(job_id: u64, slices: &[u64]) -> Event {
    let assignments = slices.iter().map(|&slice| Assignment {
        cpu: Cpu(slice as u32 % 2),
        core: 0,
        slice,
        purpose: Purpose::Plan,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        condition: "solo".into(),
        partner: None,
    });
    Event::Intent(Intent { job_id, job: Job::Window, wall_ms: 2_000, assignments: assignments.collect() })
}

fn slice(job_id: u64, number: u64) -> Slice {
    Slice {
        job_id,
        slice: number,
        job: Job::Window,
        purpose: Purpose::Plan,
        cpu: Cpu(number as u32 % 2),
        core: 0,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        condition: "solo".into(),
        wall_ms: 3_000 + number,
        span_ns: 1_000_000_000,
        busy_ns: 990_000_000,
        cases: 8,
        runs: 100_000,
        operations: 12_800_000,
        unit: "fma".into(),
        mismatches: 0,
        mismatch_ms: None,
        fold: FoldCheck::Right,
        checked_on: Some(Cpu(0)),
        void: None,
        surroundings: Surroundings { celsius: Some(61.3), khz: None },
        partner: None,
        next_seed: None,
        steps: None,
        counters: Vec::new(),
    }
}

fn mismatch(job_id: u64, number: u64) -> Event {
    Event::Mismatch(Mismatch {
        job_id,
        job: Job::Window,
        slice: number,
        purpose: Purpose::Plan,
        cpu: Cpu(number as u32 % 2),
        core: 0,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        seed: None,
        size: 0,
        condition: "solo".into(),
        wall_ms: 3_000 + number,
        run: 12,
        noticed_by: NoticedBy::Fold,
        wrong_words: 1,
        words: vec![WrongWord::new(3, u64::MAX, 0)],
        previous_kernel: Some("cipher.aes".into()),
        neighbours: vec![(Cpu(0), "idle".into())],
        surroundings: Surroundings::default(),
        partner: None,
    })
}

fn lost(job_id: u64, number: u64) -> Event {
    Event::Lost(Lost {
        job_id,
        job: Job::Window,
        slice: number,
        cpu: Cpu(number as u32 % 2),
        core: 0,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        condition: "solo".into(),
        wall_ms: 4_000,
        how: How::Babbled("\u{0}\u{7f}\u{2028}".into()),
        partner: None,
    })
}

fn remark(text: &str) -> Event {
    Event::Remark(Remark { job_id: 1, wall_ms: 5_000, text: text.into() })
}

fn closed(job_id: u64) -> Event {
    Event::Closed(Closed {
        job_id,
        job: Job::Window,
        wall_ms: 6_000,
        wall_s: 599.999_999_999,
        ending: Ending::Budget,
        verdict: "clear".into(),
        slices: 3,
    })
}

/// A short history with every way of answering an intent.
fn history() -> Vec<Event> {
    vec![
        opened(1),
        intent(1, &[1, 2, 3]),
        mismatch(1, 1),
        Event::Slice(Slice { mismatches: 1, mismatch_ms: Some((3_001, 3_002)), ..slice(1, 1) }),
        Event::Slice(slice(1, 2)),
        lost(1, 3),
        closed(1),
    ]
}

/// Writes events to the ledger at `path` and syncs them.
fn write(path: &Path, events: &[Event]) -> Summary {
    let (mut journal, opening) = Journal::open(path, 7_000).unwrap();
    for event in events {
        journal.record(event).unwrap();
    }
    journal.sync().unwrap();
    opening.found
}

/// All events that can be relied on, and what reading came to.
fn read(path: &Path) -> (Vec<Event>, Summary) {
    let mut reader = Reader::open(path).unwrap();
    let events = reader.by_ref().filter_map(|entry| match entry.record {
        Record::Event(event) => Some(event),
        Record::Unknown { .. } => None,
    });
    (events.collect(), reader.finish())
}
