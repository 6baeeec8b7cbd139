//! Confirmation of what two cpus did wrong together: which of them is named, and when nobody is.

use proofhouse::event::{Confirmation, Event, Finding, FoldCheck, Job, Mismatch, NoticedBy, Partner, Purpose, Slice};
use proofhouse::event::{Surroundings, WrongWord};
use proofhouse::host::Cpu;
use proofhouse::judge::confirm::{Confirmer, Counters, Want};

struct Quiet;

impl Counters for Quiet {
    fn risen(&self) -> Vec<String> {
        Vec::new()
    }
}

fn slice(cpu: Cpu, partner: Option<Cpu>, purpose: Purpose, wrong: u64) -> Slice {
    Slice {
        job_id: 1,
        slice: 1,
        job: Job::Window,
        purpose,
        cpu,
        core: cpu.0,
        kernel: "integer.multiply".into(),
        variant: "portable".into(),
        condition: "all steady 100% in-pair 9KiB".into(),
        wall_ms: 1,
        span_ns: 1,
        busy_ns: 1,
        cases: 1,
        runs: 1000,
        operations: 1,
        unit: "multiply".into(),
        mismatches: wrong,
        mismatch_ms: None,
        fold: FoldCheck::Right,
        checked_on: None,
        void: None,
        surroundings: Surroundings::default(),
        partner: partner.map(|cpu| Partner { cpu, core: cpu.0, busy_ns: 1 }),
        next_seed: None,
        steps: None,
        counters: Vec::new(),
    }
}

/// Plays a confirmation on `cpus` cores in which runs are wrong whenever one of `faulty` takes part, `again` or only
/// the first time.
fn play(cpus: u32, first: u32, second: u32, faulty: &[u32], again: bool) -> Finding {
    let seats: Vec<(Cpu, u32)> = (0..cpus).map(|c| (Cpu(c), c)).collect();
    let workers = seats.iter().map(|(c, _)| *c).collect();
    let mut confirmer = Confirmer::new(1, Job::Window, seats, workers);
    let words = vec![5u64; 4];
    let golden = |_: &kernels::Case| Some(words.clone());
    let counters = || -> Box<dyn Counters> { Box::new(Quiet) };
    let event = Event::Mismatch(Mismatch {
        job_id: 1,
        job: Job::Window,
        slice: 1,
        purpose: Purpose::Plan,
        cpu: Cpu(first),
        core: first,
        kernel: "integer.multiply".into(),
        variant: "portable".into(),
        seed: Some(3),
        size: 9,
        condition: "all steady 100% in-pair 9KiB".into(),
        wall_ms: 1,
        run: 1,
        noticed_by: NoticedBy::Comparison,
        wrong_words: 1,
        words: vec![WrongWord::new(3, 5, 4)],
        partner: Some(Cpu(second)),
        previous_kernel: None,
        neighbours: Vec::new(),
        surroundings: Surroundings::default(),
    });
    let mut wants = confirmer.consider(&event, golden, counters);
    let mut findings = Vec::new();
    while let Some(want) = (!wants.is_empty()).then(|| wants.remove(0)) {
        match want {
            Want::Recompute { ticket, cpus, .. } => {
                for cpu in cpus {
                    assert!(cpu != Cpu(first) && cpu != Cpu(second), "nobody may speak for itself");
                    confirmer.recomputed(ticket, cpu, Ok(words.clone()));
                }
            }
            Want::Leg { cpu, partner, purpose, .. } => {
                let there = |f: &&u32| cpu == Cpu(**f) || partner == Some(Cpu(**f));
                let wrong = if again && faulty.iter().any(|f| there(&f)) { 7 } else { 0 };
                let event = Event::Slice(slice(cpu, partner, purpose, wrong));
                wants.extend(confirmer.consider(&event, golden, counters));
            }
        }
        findings.extend(confirmer.completed(2));
    }
    findings.extend(confirmer.close("the end", 3));
    assert_eq!(findings.len(), 1);
    findings.remove(0)
}

#[test]
fn the_one_of_a_pair_that_fails_with_a_third_is_named() {
    for (first, second, faulty) in [(0, 1, 0), (0, 1, 1), (2, 5, 5), (5, 2, 5), (3, 0, 0)] {
        let finding = play(6, first, second, &[faulty], true);
        assert_eq!(finding.confirmation, Confirmation::Repeated, "{}", finding.statement);
        assert_eq!((finding.cpu, finding.core), (Cpu(faulty), faulty), "{}", finding.statement);
        assert!(finding.confirmed && finding.partner.is_some());
        assert!(finding.statement.contains(&format!("cpu {faulty}")), "{}", finding.statement);
        // word 3 of 4 is the second cpu's view
        assert!(finding.statement.contains(&format!("first seen by cpu {second}")), "{}", finding.statement);
    }
}

#[test]
fn two_cores_alone_cannot_be_told_apart_and_convict_nobody() {
    let finding = play(2, 0, 1, &[1], true);
    assert!(!finding.confirmed);
    // nobody else is there to recompute either
    assert_eq!(finding.confirmation, Confirmation::Incomplete, "{}", finding.statement);
    assert!(finding.lacking.iter().any(|l| l.contains("cannot be told apart")), "{:?}", finding.lacking);
}

#[test]
fn both_wrong_or_only_together_wrong_convicts_nobody() {
    let both = play(6, 0, 1, &[0, 1], true);
    assert_eq!((both.confirmation, both.confirmed), (Confirmation::Shared, false), "{}", both.statement);
    let once = play(6, 0, 1, &[1], false);
    assert_eq!((once.confirmation, once.confirmed), (Confirmation::Once, false), "{}", once.statement);
}
