//! Made-up ledgers, written through the journal.

use std::path::Path;

use proofhouse::event::{
    Closed, Confirmation, Ending, Event, Finding, FoldCheck, Job, Leg, Mismatch, NoticedBy, Opened, Purpose, Remark,
    Slice, Surroundings, WrongWord,
};
use proofhouse::host::Cpu;
use proofhouse::ledger::Journal;

/// 2025-03-01 00:00:00 UTC, by `date -u -d @1740787200`.
pub const MARCH: u64 = 1_740_787_200_000;
pub const DAY: u64 = 86_400_000;

/// A ledger under construction.
pub struct Made {
    journal: Journal,
    pub job_id: u64,
    job: Job,
    slice: u64,
    pub now: u64,
}

impl Made {
    pub fn at(path: &str) -> Made {
        let (journal, _) = Journal::open(Path::new(path), 1).unwrap();
        Made { journal, job_id: 0, job: Job::Window, slice: 0, now: MARCH }
    }

    pub fn keep(&mut self, event: Event) {
        self.journal.append(&event).unwrap();
    }

    pub fn open(&mut self, job: Job, now: u64) {
        (self.job_id, self.job, self.now) = (self.job_id + 1, job, now);
        let opened = Opened {
            job_id: self.job_id,
            job,
            wall_ms: now,
            budget_s: 60.0,
            seed: 1,
            host: "h".into(),
            part: "p".into(),
            virtualised: false,
            program: "0".into(),
            golden: "0".into(),
            cpus: vec![Cpu(0), Cpu(1), Cpu(2)],
        };
        self.keep(Event::Opened(opened));
    }

    pub fn close(&mut self, verdict: &str) {
        let closed = Closed {
            job_id: self.job_id,
            job: self.job,
            wall_ms: self.now,
            wall_s: 60.0,
            ending: Ending::Budget,
            verdict: verdict.into(),
            slices: self.slice,
        };
        self.keep(Event::Closed(closed));
        self.journal.sync().unwrap();
    }

    /// A slice of two busy seconds with its mismatches.
    pub fn slice(&mut self, cpu: u32, kernel: &str, setting: &str, wrong: &[Mismatch]) {
        self.slice_with(cpu, kernel, setting, wrong, |_| {});
    }

    pub fn slice_with(
        &mut self,
        cpu: u32,
        kernel: &str,
        setting: &str,
        wrong: &[Mismatch],
        change: impl FnOnce(&mut Slice),
    ) {
        self.slice += 1;
        let condition = format!("{setting} l1 {}KiB", size(kernel));
        let mut slice = Slice {
            job_id: self.job_id,
            slice: self.slice,
            job: self.job,
            purpose: Purpose::Plan,
            cpu: Cpu(cpu),
            core: cpu / 2,
            kernel: kernel.into(),
            variant: "avx2".into(),
            condition: condition.clone(),
            wall_ms: self.now,
            span_ns: 2_000_000_000,
            busy_ns: 2_000_000_000,
            cases: 4,
            runs: 1000,
            operations: 1,
            unit: "flop".into(),
            mismatches: wrong.len() as u64,
            mismatch_ms: (!wrong.is_empty()).then_some((self.now + 100, self.now + 1_100)),
            fold: FoldCheck::Right,
            checked_on: Some(Cpu(0)),
            void: None,
            surroundings: Surroundings { celsius: Some(60.0), khz: None },
            partner: None,
            next_seed: None,
            steps: None,
            counters: Vec::new(),
        };
        change(&mut slice);
        for m in wrong {
            let m = Mismatch {
                job_id: self.job_id,
                job: self.job,
                slice: self.slice,
                purpose: slice.purpose,
                cpu: slice.cpu,
                core: slice.core,
                condition: slice.condition.clone(),
                wall_ms: self.now + 100,
                partner: slice.partner.map(|p| p.cpu),
                ..m.clone()
            };
            self.keep(Event::Mismatch(m));
        }
        self.keep(Event::Slice(slice));
        self.now += 2_000;
    }
}

/// The first footprint of a kernel of the catalogue, KiB.
pub fn size(kernel: &str) -> u32 {
    kernels::catalogue::find(kernel).unwrap().sizes()[0].0
}

pub fn wrong(kernel: &str, seed: u64, words: &[(usize, u64, u64)]) -> Mismatch {
    Mismatch {
        job_id: 0,
        job: Job::Window,
        slice: 0,
        purpose: Purpose::Plan,
        cpu: Cpu(0),
        core: 0,
        kernel: kernel.into(),
        variant: "avx2".into(),
        seed: Some(seed),
        size: size(kernel),
        condition: String::new(),
        wall_ms: 0,
        run: seed,
        noticed_by: NoticedBy::Comparison,
        wrong_words: words.len() as u64,
        words: words.iter().map(|&(i, e, a)| WrongWord::new(i, e, a)).collect(),
        partner: None,
        previous_kernel: Some("cipher.aes".into()),
        neighbours: Vec::new(),
        surroundings: Surroundings { celsius: Some(71.0), khz: None },
    }
}

/// Words in which only bit 17 of lane 3 of four is ever wrong.
pub fn bit17(kernel: &str, seed: u64) -> Mismatch {
    let expected = 0x3ff0_0000_0000_0000 | (seed * 0x9e37) << 9;
    wrong(kernel, seed, &[(3 + 4 * (seed as usize % 2), expected, expected ^ 1 << 17)])
}

pub const PLAIN: &str = "all steady 100%";

/// Three days: clear, then cpu 2 wrong in one kernel under one condition, then clear again; a drill in between.
pub fn history(path: &str) {
    let mut made = Made::at(path);
    made.open(Job::Window, MARCH);
    for cpu in 0..3 {
        made.slice(cpu, "fma.chain64", PLAIN, &[]);
        made.slice(cpu, "cipher.aes", PLAIN, &[]);
    }
    made.close("clear");
    made.open(Job::Drill, MARCH + DAY / 2);
    made.slice(2, "fma.chain64", PLAIN, &[bit17("fma.chain64", 1)]);
    made.close("clear");
    // the slice begins in the last second of the day before
    made.open(Job::Window, MARCH + 2 * DAY - 1_000);
    made.slice(2, "fma.chain64", PLAIN, &[]);
    for seed in 0..8 {
        made.slice(2, "fma.chain64", "solo burst 10us/100us", &[bit17("fma.chain64", seed)]);
        made.now += 120_000;
    }
    made.slice(0, "fma.chain64", PLAIN, &[]);
    let leg = |runs, mismatches| Leg { cpu: Cpu(2), partner: None, runs, mismatches };
    let finding = Finding {
        job_id: made.job_id,
        job: Job::Window,
        cpu: Cpu(2),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        seed: Some(1),
        size: size("fma.chain64"),
        condition: "solo".into(),
        wall_ms: made.now,
        confirmed: true,
        confirmation: Confirmation::Repeated,
        mismatches: 8,
        first: None,
        partner: None,
        recomputed_on: vec![Cpu(0)],
        suspect: vec![leg(200, 3)],
        controls: vec![],
        counters: vec![],
        lacking: vec![],
        statement: "cpu 2 gave a wrong output in fma.chain64 avx2".into(),
    };
    made.keep(Event::Finding(Box::new(finding)));
    let again = Mismatch { purpose: Purpose::Suspect, ..bit17("fma.chain64", 1) };
    made.slice_with(2, "fma.chain64", PLAIN, &[again], |s| s.purpose = Purpose::Suspect);
    let remark = Remark { job_id: made.job_id, wall_ms: made.now, text: "the fan is loud".into() };
    made.keep(Event::Remark(remark));
    made.close("withdraw");
    made.open(Job::Window, MARCH + 3 * DAY);
    made.slice_with(2, "fma.chain64", PLAIN, &[], |s| s.counters = vec!["core_throttle_count rose by 2".into()]);
    made.close("withdraw");
}
