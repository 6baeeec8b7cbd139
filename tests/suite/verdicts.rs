//! From the events of windows to verdicts, and what stands beside them: what would settle a mismatch, and the evidence.

use proofhouse::event::{
    Confirmation, Ending, Event, Finding, FoldCheck, How, Job, Leg, Lost, Opened, Purpose, Slice, Surroundings,
};
use proofhouse::host::Cpu;
use proofhouse::judge::verdict::Verdict;
use proofhouse::ledger::{Scope, Tally};
use proofhouse::report::gathering::{Before, Frame, Gathering, GridReport};
use proofhouse::report::window::WindowReport;

const KERNEL: &str = "fma.chain64";
const SUSPECT: Cpu = Cpu(1);

fn opened(job_id: u64) -> Opened {
    Opened {
        job_id,
        job: Job::Window,
        wall_ms: job_id * 86_400_000,
        budget_s: 600.0,
        seed: 1,
        host: "h".to_owned(),
        part: "p".to_owned(),
        virtualised: false,
        program: "0".to_owned(),
        golden: "0".to_owned(),
        cpus: vec![Cpu(0), SUSPECT],
    }
}

fn slice(job_id: u64, number: u64, cpu: Cpu, seconds: f64, mismatches: u64) -> Slice {
    Slice {
        job_id,
        slice: number,
        job: Job::Window,
        purpose: Purpose::Plan,
        cpu,
        core: cpu.0,
        kernel: KERNEL.to_owned(),
        variant: "avx2".to_owned(),
        condition: "all steady 100% 21KiB".to_owned(),
        wall_ms: job_id * 86_400_000 + number * 1000,
        span_ns: (seconds * 1e9) as u64,
        busy_ns: (seconds * 1e9) as u64,
        cases: 1,
        runs: (seconds * 1e5) as u64,
        operations: 1,
        unit: "run".to_owned(),
        mismatches,
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

fn finding(job_id: u64, confirmation: Confirmation) -> Event {
    let leg = |cpu, runs, mismatches| Leg { cpu, partner: None, runs, mismatches };
    Event::Finding(Box::new(Finding {
        job_id,
        job: Job::Window,
        cpu: SUSPECT,
        core: SUSPECT.0,
        kernel: KERNEL.to_owned(),
        variant: "avx2".to_owned(),
        seed: Some(3),
        size: 21,
        condition: "all steady 100% 21KiB".to_owned(),
        wall_ms: 1,
        confirmed: confirmation == Confirmation::Repeated,
        confirmation,
        mismatches: 1,
        first: None,
        partner: None,
        recomputed_on: vec![Cpu(0)],
        suspect: vec![leg(SUSPECT, 9000, u64::from(confirmation == Confirmation::Repeated) * 7)],
        controls: vec![leg(Cpu(0), 8000, 0)],
        counters: Vec::new(),
        lacking: Vec::new(),
        statement: "a finding".to_owned(),
    }))
}

/// Plays one window on a record and adds it to the record.
fn window(past: &mut Tally, job_id: u64, events: &[Event]) -> WindowReport {
    let opened = opened(job_id);
    let before = [Cpu(0), SUSPECT].map(|cpu| (cpu, Before::of(past, cpu)));
    let frame = Frame {
        confidence: 0.95,
        gap_ms: 60_000,
        cpus: vec![(Cpu(0), 0), (SUSPECT, 1)],
        before: before.into(),
        rounds: 1,
        left_out: 0,
        grid: GridReport::default(),
        skipped: Vec::new(),
        ledger: "ledger".to_owned(),
    };
    past.add(&Event::Opened(opened.clone()));
    let mut gathering = Gathering::new(opened);
    for event in events {
        past.add(event);
        gathering.add(event);
    }
    assert_eq!(gathering.verdict(&frame), gathering.report(&frame, 600.0, Ending::Budget).verdict);
    gathering.report(&frame, 600.0, Ending::Budget)
}

fn clean(job_id: u64, seconds: f64) -> Vec<Event> {
    [Cpu(0), SUSPECT].map(|cpu| Event::Slice(slice(job_id, u64::from(cpu.0), cpu, seconds, 0))).to_vec()
}

#[test]
fn a_single_mismatch_is_watched_until_enough_silence_and_a_second_one_withdraws() {
    let mut past = Tally::new(Scope::default());
    window(&mut past, 1, &clean(1, 20.0));
    let mut events = clean(2, 20.0);
    events.push(Event::Slice(slice(2, 9, SUSPECT, 10.0, 1)));
    events.push(finding(2, Confirmation::Once));
    let report = window(&mut past, 2, &events);
    let core = &report.cores[1];
    assert_eq!(
        (report.verdict, core.verdict, report.cores[0].verdict),
        (Verdict::Watch, Verdict::Watch, Verdict::Clear)
    );
    // the mismatch took 20 + 20 + 10 s to show: three times that, to −ln 0.05 = 2.996
    let settle = &core.settle[0];
    assert!((settle.hours_needed * 3600.0 - 149.787).abs() < 1e-2, "{settle:?}");
    assert!((settle.silence - 0.05).abs() < 1e-9 && settle.withdraw_at == 2 && settle.windows == 1);
    assert!(core.evidence.iter().any(|line| line.contains("one-off upsets")), "{:?}", core.evidence);
    assert!(report.text().contains("to settle fma.chain64 avx2"), "{}", report.text());

    // a clean window that is too short for it does not clear the core, and says so
    let report = window(&mut past, 3, &clean(3, 100.0));
    assert_eq!(report.cores[1].verdict, Verdict::Watch);
    assert!(report.cores[1].because.contains("enough silence"));
    assert!((report.cores[1].settle[0].hours_done * 3600.0 - 100.0).abs() < 1e-6);
    // the next one does
    let report = window(&mut past, 4, &clean(4, 60.0));
    assert_eq!(report.cores[1].verdict, Verdict::Clear);

    // what was seen stays on record: the second mismatch convicts
    let mut events = clean(5, 60.0);
    events.push(Event::Slice(slice(5, 9, SUSPECT, 10.0, 1)));
    events.push(finding(5, Confirmation::Once));
    let report = window(&mut past, 5, &events);
    assert_eq!(report.cores[1].verdict, Verdict::Withdraw);
    assert!(report.cores[1].evidence[0].starts_with("wrong in 2 slices"), "{:?}", report.cores[1].evidence);
}

#[test]
fn a_confirmed_mismatch_withdraws_unless_memory_errors_came_with_it() {
    let play = |counters: &[&str]| {
        let mut wrong = slice(1, 9, SUSPECT, 10.0, 4);
        wrong.counters = counters.iter().map(ToString::to_string).collect();
        let mut events = clean(1, 30.0);
        events.extend([Event::Slice(wrong), finding(1, Confirmation::Repeated)]);
        window(&mut Tally::new(Scope::default()), 1, &events)
    };
    let report = play(&[]);
    assert_eq!(report.cores[1].verdict, Verdict::Withdraw);
    let evidence = report.cores[1].evidence.join("\n");
    assert!(evidence.contains("wrong in 7 of 9000 further runs here, in 0 of 8000 on controls"), "{evidence}");
    assert!(evidence.contains("in the same kernels the other cpus were wrong in 0 slices"), "{evidence}");
    // a machine check on the core does not excuse it
    assert_eq!(play(&["MCE interrupts on cpu 1: 1 more"]).cores[1].verdict, Verdict::Withdraw);
    let report = play(&["corrected memory errors at mc0: 3 more"]);
    assert_eq!(report.cores[1].verdict, Verdict::Watch);
    assert!(report.cores[1].evidence.iter().any(|line| line.contains("memory is not excluded")));
}

#[test]
fn a_worker_lost_with_two_cpus_at_work_is_held_against_both_unless_one_is_convicted() {
    let lost = Event::Lost(Lost {
        job_id: 1,
        job: Job::Window,
        slice: 20,
        cpu: SUSPECT,
        core: SUSPECT.0,
        kernel: "sync.counter".to_owned(),
        variant: "portable".to_owned(),
        condition: "all steady 100% in-pair 1KiB".to_owned(),
        wall_ms: 1,
        how: How::Signal(11),
        partner: Some(Cpu(0)),
    });
    let mut events = clean(1, 30.0);
    events.push(lost);
    let verdicts = |report: &WindowReport| report.cores.iter().map(|c| c.verdict).collect::<Vec<_>>();
    let report = window(&mut Tally::new(Scope::default()), 1, &events);
    assert_eq!(verdicts(&report), [Verdict::Watch, Verdict::Watch]);
    events.extend([Event::Slice(slice(1, 9, SUSPECT, 10.0, 4)), finding(1, Confirmation::Repeated)]);
    let report = window(&mut Tally::new(Scope::default()), 1, &events);
    assert_eq!(verdicts(&report), [Verdict::Clear, Verdict::Withdraw]);
}

#[test]
fn memory_counters_are_known_by_their_words() {
    use proofhouse::event::tells_of_memory;
    use proofhouse::host::Counter;
    let place = || "mc0".to_owned();
    assert!(tells_of_memory(&Counter::Corrected { place: place() }.to_string()));
    assert!(tells_of_memory(&Counter::Uncorrected { place: place() }.to_string()));
    assert!(!tells_of_memory("MCE interrupts on cpu 1: 1 more"));
}

#[test]
fn a_clear_core_has_its_bound_and_that_of_its_least_tested_kernel() {
    let mut events = clean(1, 3600.0);
    let mut short = slice(1, 9, SUSPECT, 36.0, 0);
    short.kernel = "integer.carry".to_owned();
    events.push(Event::Slice(short));
    let report = window(&mut Tally::new(Scope::default()), 1, &events);
    let core = &report.cores[1];
    assert_eq!(core.verdict, Verdict::Clear);
    let weakest = core.weakest.as_ref().unwrap();
    // rule of three, J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983): 2.996 in 0.01 hours
    assert!(weakest.kernel == "integer.carry" && (weakest.per_hour.interval.upper - 299.573).abs() < 1e-2);
    assert!(core.statement.starts_with("fewer than 2.97 wrong per hour"), "{}", core.statement);
    assert!(report.text().contains("speaks of that mix"));
    assert!(core.evidence.is_empty() && core.settle.is_empty());
}

#[test]
fn a_burst_is_one_episode_and_its_mismatches_have_no_upper_limit() {
    let mut events = clean(1, 30.0);
    events.extend((0..30).map(|n| Event::Slice(slice(1, 10 + 100 * n, SUSPECT, 20.0, if n == 7 { 500 } else { 0 }))));
    events.push(finding(1, Confirmation::Once));
    let report = window(&mut Tally::new(Scope::default()), 1, &events);
    let core = &report.cores[1];
    assert!(core.statement.starts_with("1 episode of wrong answers"), "{}", core.statement);
    assert!(core.statement.contains("wrong answers cluster"));
    let json = serde_json::to_value(&report).unwrap();
    let core = &json["cores"][1];
    assert_eq!(core["counted"], "episodes");
    assert!(core["per_hour"]["upper"].is_null() && core["per_run"]["upper"].is_null());
    assert!(core["episodes_per_hour"]["upper"].is_number() && core["clustering"].as_f64().unwrap() < 1e-6);
}
