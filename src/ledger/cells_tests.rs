//! What counts and what is left out, on a history made by hand.

use super::*;
use crate::event::{Confirmation, How, NoticedBy, Surroundings};

fn opened(job_id: u64, job: Job, host: &str, part: &str) -> Event {
    Event::Opened(Opened {
        job_id,
        job,
        wall_ms: 0,
        budget_s: 1.0,
        seed: 1,
        host: host.into(),
        part: part.into(),
        virtualised: false,
        program: "0".into(),
        golden: "0".into(),
        cpus: vec![Cpu(0)],
    })
}

fn slice(job_id: u64, number: u64) -> Slice {
    Slice {
        job_id,
        slice: number,
        job: Job::Window,
        purpose: Purpose::Plan,
        cpu: Cpu(3),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        condition: "solo".into(),
        wall_ms: 1_000 * number,
        span_ns: 500_000_000,
        busy_ns: 400_000_000,
        cases: 2,
        runs: 100,
        operations: 7_000,
        unit: "fma".into(),
        mismatches: 0,
        mismatch_ms: None,
        fold: FoldCheck::Right,
        checked_on: Some(Cpu(0)),
        void: None,
        surroundings: Surroundings::default(),
        partner: None,
        next_seed: None,
        steps: None,
        counters: Vec::new(),
    }
}

fn mismatch(job_id: u64, number: u64) -> Mismatch {
    Mismatch {
        job_id,
        job: Job::Window,
        slice: number,
        purpose: Purpose::Plan,
        cpu: Cpu(3),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        seed: Some(1),
        size: 0,
        condition: "solo".into(),
        wall_ms: 1_000 * number,
        run: 1,
        noticed_by: NoticedBy::Comparison,
        wrong_words: 1,
        words: vec![],
        previous_kernel: None,
        neighbours: vec![],
        surroundings: Surroundings::default(),
        partner: None,
    }
}

fn lost(job_id: u64, job: Job) -> Event {
    Event::Lost(Lost {
        job_id,
        job,
        slice: 1,
        cpu: Cpu(3),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        condition: "solo".into(),
        wall_ms: 5,
        how: How::Signal(4),
        partner: None,
    })
}

fn finding(job_id: u64, job: Job) -> Event {
    Event::Finding(Box::new(Finding {
        job_id,
        job,
        cpu: Cpu(3),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        seed: Some(1),
        size: 0,
        condition: "solo".into(),
        wall_ms: 5,
        confirmed: true,
        confirmation: Confirmation::Repeated,
        mismatches: 1,
        first: None,
        recomputed_on: vec![],
        suspect: vec![],
        controls: vec![],
        counters: vec![],
        lacking: vec![],
        statement: "x".into(),
        partner: None,
    }))
}

fn tally(scope: Scope, events: &[Event]) -> Tally {
    let mut tally = Tally::new(scope);
    events.iter().for_each(|event| tally.add(event));
    tally
}

#[test]
fn only_planned_slices_of_windows_count() {
    let bad = |f: &dyn Fn(&mut Slice)| {
        let mut s = Slice { mismatches: 9, ..slice(1, 5) };
        f(&mut s);
        Event::Slice(s)
    };
    let tally = tally(
        Scope::default(),
        &[
            opened(1, Job::Window, "h", "p"),
            opened(2, Job::Drill, "h", "p"),
            Event::Slice(slice(1, 1)),
            Event::Slice(Slice { cpu: Cpu(7), ..slice(1, 2) }),
            bad(&|s| s.purpose = Purpose::Suspect),
            bad(&|s| s.purpose = Purpose::Control),
            bad(&|s| s.void = Some("moved".into())),
            bad(&|s| s.job = Job::Drill),
            // says window, but its job is a drill
            bad(&|s| s.job_id = 2),
            bad(&|s| s.job_id = 3),
            Event::Mismatch(Mismatch { job: Job::Drill, ..mismatch(2, 9) }),
            lost(2, Job::Drill),
            finding(2, Job::Drill),
            lost(1, Job::Window),
            finding(1, Job::Window),
        ],
    );
    assert_eq!(tally.cells.len(), 1, "two siblings are one core");
    let cell = tally.cells.values().next().unwrap();
    assert_eq!((cell.slices, cell.runs, cell.busy_ns, cell.mismatches), (2, 200, 800_000_000, 0));
    assert_eq!(cell.cpus, BTreeSet::from([Cpu(3), Cpu(7)]));
    assert_eq!((cell.first_ms, cell.last_ms), (1_000, 2_500));
    let three = &tally.cpus[&Cpu(3)];
    assert_eq!((three.all.runs, three.lost.len(), three.findings.len()), (100, 1, 1));
    assert_eq!(tally.last_covered(Cpu(3), "fma.chain64", "avx2"), Some(1_500));
    assert_eq!(tally.last_covered(Cpu(7), "fma.chain64", "avx2"), Some(2_500));
    assert_eq!(tally.last_covered(Cpu(3), "fma.chain64", "portable"), None);
    let cover = tally.covers.values().next().unwrap();
    assert_eq!((cover.operations, cover.unit.as_str()), (7_000, "fma"));
    let expected = LeftOut { drill: 5, no_opening: 1, other_scope: 0, confirmation: 2, void: 1, unknown: 0 };
    assert_eq!(tally.left_out, expected);
}

#[test]
fn other_hosts_and_parts_are_left_out() {
    let events = [
        opened(1, Job::Window, "h", "p"),
        opened(2, Job::Window, "h", "q"),
        opened(3, Job::Window, "i", "p"),
        Event::Slice(slice(1, 1)),
        Event::Slice(slice(2, 1)),
        Event::Slice(slice(3, 1)),
    ];
    for (host, part, job_id, runs) in [
        (None, None, None, 300),
        (Some("h"), None, None, 200),
        (Some("h"), Some("q"), None, 100),
        (None, Some("p"), None, 200),
        (None, None, Some(2), 100),
        (Some("i"), Some("q"), None, 0),
    ] {
        let scope = Scope { host: host.map(Into::into), part: part.map(Into::into), job_id };
        let tally = tally(scope, &events);
        let sum: u128 = tally.cells.values().map(|c| c.runs).sum();
        assert_eq!(sum, runs, "{host:?} {part:?} {job_id:?}");
        assert_eq!(u128::from(tally.left_out.other_scope), 3 - runs / 100);
        assert_eq!(tally.hosts.len(), 3);
    }
}

#[test]
fn sums_pass_64_bits() {
    let huge = Slice { runs: u64::MAX, busy_ns: u64::MAX, operations: u64::MAX, wall_ms: u64::MAX, ..slice(1, 1) };
    let mut events = vec![opened(1, Job::Window, "h", "p")];
    events.extend((0..3).map(|_| Event::Slice(huge.clone())));
    let tally = tally(Scope::default(), &events);
    let cell = tally.cells.values().next().unwrap();
    assert_eq!((cell.runs, cell.busy_ns), (3 * u128::from(u64::MAX), 3 * u128::from(u64::MAX)));
    assert_eq!(tally.covers.values().next().unwrap().operations, 3 * u128::from(u64::MAX));
}

#[test]
fn mismatches_are_timed_and_a_wrong_fold_is_never_clean() {
    let with = |number, mismatch_ms| Event::Slice(Slice { mismatches: 4, mismatch_ms, ..slice(1, number) });
    let tally = tally(
        Scope::default(),
        &[
            opened(1, Job::Window, "h", "p"),
            with(1, Some((1_100, 1_200))),
            with(2, Some((2_100, 2_100))),
            Event::Slice(slice(1, 3)),
            Event::Slice(Slice { fold: FoldCheck::Wrong, ..slice(1, 100) }),
            Event::Slice(Slice { fold: FoldCheck::NotChecked, ..slice(1, 101) }),
        ],
    );
    let cell = tally.cells.values().next().unwrap();
    assert_eq!((cell.mismatches, cell.fold_wrong, cell.fold_unchecked, cell.bad.len()), (8, 1, 1, 3));
    let found: Vec<_> = cell.episodes(60_000).iter().map(|e| (e.first_ms, e.last_ms, e.mismatches)).collect();
    assert_eq!(found, [(1_100, 2_100, 8), (100_000, 100_500, 0)]);
    assert_eq!(tally.cpus[&Cpu(3)].all.episodes(800).len(), 3);
}

#[test]
fn mismatches_of_a_worker_that_died_are_not_forgotten() {
    let tally = tally(
        Scope::default(),
        &[
            opened(1, Job::Window, "h", "p"),
            Event::Mismatch(mismatch(1, 1)),
            Event::Slice(Slice { mismatches: 1, ..slice(1, 1) }),
            // found by the fold, after the slice
            Event::Slice(Slice { fold: FoldCheck::Wrong, ..slice(1, 2) }),
            Event::Mismatch(Mismatch { noticed_by: NoticedBy::Fold, seed: None, ..mismatch(1, 2) }),
            Event::Slice(Slice { mismatches: 1, purpose: Purpose::Suspect, ..slice(1, 3) }),
            Event::Mismatch(mismatch(1, 3)),
            Event::Mismatch(mismatch(1, 4)),
            Event::Mismatch(mismatch(1, 4)),
            // a repeat that killed its worker: no news
            Event::Mismatch(Mismatch { purpose: Purpose::Suspect, ..mismatch(1, 5) }),
            lost(1, Job::Window),
        ],
    );
    let slices: Vec<u64> = tally.without_slice().map(|m| m.slice).collect();
    assert_eq!(slices, [4, 4]);
}

/// The sums that a cell keeps against the clusters themselves.
#[test]
fn mismatches_are_spread_over_slices_minutes_and_windows_as_they_came() {
    let mut tally = Tally::new(Scope::default());
    // job, start in seconds, busy in seconds, wrong
    let slices =
        [(1, 0, 1, 0), (1, 30, 2, 5), (1, 61, 1, 0), (1, 119, 1, 2), (1, 130, 4, 0), (2, 9000, 1, 1), (3, 9100, 2, 0)];
    for job in 1..=3 {
        tally.add(&opened(job, Job::Window, "h", "p"));
    }
    for (number, &(job, start, busy, wrong)) in slices.iter().enumerate() {
        let mut slice = slice(job, number as u64);
        (slice.wall_ms, slice.busy_ns, slice.mismatches) = (start * 1000, busy * 1_000_000_000, wrong);
        tally.add(&Event::Slice(slice));
    }
    let cell = &tally.cpus[&Cpu(3)].all;
    let scatter = cell.scatter(60_000);
    let group = |of: &dyn Fn(u64, u64) -> u64| {
        let mut groups: Vec<(u64, u64, f64)> = Vec::new();
        for &(job, start, busy, wrong) in &slices {
            let hours = busy as f64 / 3600.0;
            match groups.last_mut().filter(|(id, ..)| *id == of(job, start)) {
                Some((_, events, exposure)) => (*events, *exposure) = (*events + wrong, *exposure + hours),
                None => groups.push((of(job, start), wrong, hours)),
            }
        }
        crate::stats::Clusters::of(&groups.iter().map(|&(_, events, hours)| (events, hours)).collect::<Vec<_>>())
            .unwrap()
    };
    let near = |ours: &crate::stats::Clusters, direct: crate::stats::Clusters| {
        assert_eq!(ours.number, direct.number);
        assert!((ours.exposure - direct.exposure).abs() < 1e-12 && (ours.squares / direct.squares - 1.0).abs() < 1e-12);
        assert_eq!(ours.hit.len(), direct.hit.len());
        for (a, b) in ours.hit.iter().zip(&direct.hit) {
            assert!(a.0 == b.0 && (a.1 - b.1).abs() < 1e-15, "{a:?} {b:?}");
        }
    };
    near(&scatter.slices, group(&|_, start| start));
    near(&scatter.minutes, group(&|_, start| start / 60));
    near(&scatter.spells, group(&|_, start| start / 120));
    near(&scatter.windows, group(&|job, _| job));
    // 30 s and 119 s lie more than a minute apart; the third one is in another window
    assert_eq!(scatter.episodes.hit.iter().map(|(n, _)| *n).collect::<Vec<_>>(), [2, 1]);
    assert_eq!(scatter.episodes.number, 3);
}

#[test]
fn a_fold_that_is_wrong_counts_as_a_wrong_run_of_its_own() {
    let mut tally = Tally::new(Scope::default());
    tally.add(&opened(1, Job::Window, "h", "p"));
    let mut slice = slice(1, 1);
    slice.fold = FoldCheck::Wrong;
    tally.add(&Event::Slice(slice));
    let cell = &tally.cpus[&Cpu(3)].all;
    assert_eq!((cell.mismatches, cell.wrong()), (0, 1));
    assert_eq!(cell.scatter(60_000).slices.events(), 1.0);
}
