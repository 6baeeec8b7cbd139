//! Whole windows in microseconds: the supervisor as it ships, over a simulated clock and simulated workers that are
//! right, wrong, blind, crash, hang, babble, are moved or stopped at random instants. A failing seed replays for ever.

use std::cmp::Reverse;
use std::collections::{BTreeMap, BTreeSet, BinaryHeap};
use std::time::Duration;

use kernels::compare::{Fold, digest};
use kernels::{Case, Size, Variant};
use proofhouse::condition::Setting;
use proofhouse::event::{Ending, Event, How, Job, Purpose, Surroundings};
use proofhouse::host::Cpu;
use proofhouse::run::pinning::Place;
use proofhouse::run::protocol::{CaseReport, Message, Order, PartnerReport, SliceOrder, SliceReport, WrongOutput};
use proofhouse::run::spec::{
    Action, FoldTask, Input, Now, Opinion, Phase, Post, Pulse, Request, Setup, Span, Spec, Track, Truth,
};
use proofhouse::run::supervisor::Supervisor;
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

const BUDGET: Duration = Duration::from_secs(20);
const KERNEL: &str = "integer.multiply";

struct Words;

impl Truth for Words {
    fn expected(&self, case: &Case) -> Option<Vec<u64>> {
        Some(vec![case.seed.0, 2, 3])
    }
}

/// What a simulated worker does with a slice.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Deed {
    Right,
    Wrong,
    Blind,
    Crash,
    Hang,
    Babble,
    Moved,
    Stop,
    Starve,
    ForeignReport,
}

struct World {
    rng: ChaCha12Rng,
    at: Duration,
    supervisor: Supervisor,
    // time, tie-break, what; old generations' news are dropped as the driver drops them
    queue: BinaryHeap<Reverse<(Duration, u64, u64, NewsKey)>>,
    news: BTreeMap<u64, (Cpu, Input)>,
    ticks: u64,
    generation: BTreeMap<Cpu, u64>,
    worker_free: BTreeMap<Cpu, Duration>,
    events: Vec<Event>,
    ended: Option<(Ending, Duration)>,
    deeds: BTreeMap<Deed, u64>,
    faulty: BTreeSet<Cpu>,
    disk_fails_at: Option<Duration>,
    disk_failed: bool,
    halted: BTreeMap<Cpu, u64>,
    pulses: BTreeMap<Cpu, Pulse>,
    /// Cpus whose worker says nothing any more.
    silent: BTreeSet<Cpu>,
    /// Moments at which the whole machine stands still for some seconds.
    freezes: Vec<Duration>,
    /// When the last of them ended.
    thawed: Duration,
    /// Requests for pairs that the supervisor gave back.
    could_not: Vec<Cpu>,
    /// Slices that each cpu was ordered and has not ended, with their orders' partner and whether they were planned.
    at_work: BTreeMap<Cpu, BTreeMap<u64, (Option<Cpu>, bool)>>,
    /// Purpose of each slice, from its intent.
    planned: BTreeMap<u64, bool>,
    /// Cpus that are too hot, or gone.
    hot: BTreeSet<Cpu>,
    gone: BTreeSet<Cpu>,
    /// What the host will say, and when.
    host_says: Vec<(Duration, Input)>,
    /// Whether the judge asks for legs.
    judge: bool,
    /// Names of rules that were broken; empty at the end.
    broken: Vec<String>,
    legs: u64,
    paired: u64,
}

type NewsKey = (u32, u64);

impl World {
    fn now(&self) -> Now {
        Now {
            at: self.at,
            wall_ms: 1_000_000 + self.at.as_millis() as u64,
            surroundings: Surroundings::default(),
            pulse: None,
        }
    }

    fn chance(&mut self, one_in: u64) -> bool {
        self.rng.next_u64().is_multiple_of(one_in)
    }

    fn schedule(&mut self, after: Duration, cpu: Cpu, input: Input) {
        self.ticks += 1;
        let generation = self.generation.get(&cpu).copied().unwrap_or(0);
        self.queue.push(Reverse((self.at + after, self.ticks, 0, (cpu.0, generation))));
        self.news.insert(self.ticks, (cpu, input));
    }

    fn here(cpu: Cpu) -> Place {
        Place { cpu, mask: vec![cpu] }
    }

    fn work(&mut self, cpu: Cpu, order: SliceOrder) {
        if self.silent.contains(&cpu) {
            return;
        }
        let free = self.worker_free.get(&cpu).copied().unwrap_or(self.at).max(self.at);
        let wait = free - self.at + Duration::from_micros(100);
        let span = Duration::from_nanos(order.span_ns);
        let deed = match (self.faulty.contains(&cpu), self.rng.next_u64() % 12) {
            (false, _) => Deed::Right,
            (true, 0) => Deed::Crash,
            (true, 1) => Deed::Hang,
            (true, 2) => Deed::Babble,
            (true, 3) => Deed::Moved,
            (true, 4) => Deed::Stop,
            (true, 5) => Deed::ForeignReport,
            (true, 10) => Deed::Starve,
            (true, 6 | 7) => Deed::Blind,
            (true, 8 | 9) => Deed::Wrong,
            (true, _) => Deed::Right,
        };
        *self.deeds.entry(deed).or_default() += 1;
        self.schedule(wait, cpu, Input::Said(cpu, Message::Begun { slice: order.slice }));
        if matches!(deed, Deed::Crash | Deed::Hang | Deed::Stop | Deed::Starve) {
            self.silent.insert(cpu);
        }
        let middle = wait + span / 2;
        let place = if deed == Deed::Moved { World::here(Cpu(cpu.0 + 1)) } else { World::here(cpu) };
        match deed {
            Deed::Crash => return self.schedule(middle, cpu, Input::Gone(cpu, How::Signal(11))),
            Deed::Hang | Deed::Starve => {
                // the pulse that the system would show: asleep, or runnable without having run
                self.pulses.insert(cpu, Pulse { waiting: deed == Deed::Starve, busy: Duration::from_millis(1) });
                return;
            }
            Deed::Stop => return self.schedule(middle, cpu, Input::Stopped(cpu, true)),
            Deed::Babble => self.schedule(middle, cpu, Input::Babbled(cpu, "?".into())),
            Deed::Wrong | Deed::Moved => {
                let wrong = WrongOutput {
                    slice: order.slice,
                    seed: order.cases[0].seed,
                    run: 3,
                    wall_ms: 1_000_000,
                    wrong_words: 1,
                    first: vec![(0, 1, 9)],
                    place: place.clone(),
                };
                self.schedule(middle, cpu, Input::Said(cpu, Message::Wrong(wrong)));
            }
            _ => {}
        }
        let cases = order
            .cases
            .iter()
            .map(|c| {
                let wrong = u64::from(matches!(deed, Deed::Wrong | Deed::Moved) && c.seed == order.cases[0].seed);
                let mut fold = Fold::default();
                fold.push_digest(digest(&[c.seed, 2, 3]), 100 - wrong);
                if deed == Deed::Blind {
                    fold.0 ^= 1;
                }
                let seed = if deed == Deed::ForeignReport { c.seed + 1000 } else { c.seed };
                CaseReport { seed, runs: 100, wrong, fold: fold.0 }
            })
            .collect();
        let report = SliceReport {
            slice: order.slice,
            span_ns: order.span_ns,
            busy_ns: order.span_ns * 99 / 100,
            cases,
            wrong_ms: (deed == Deed::Wrong).then_some((1_000_000, 1_000_000)),
            places: (World::here(cpu), place.clone()),
            partner: order.partner.map(|p| PartnerReport { places: (World::here(p), World::here(p)), busy_ns: 1000 }),
            steps: None,
        };
        self.worker_free.insert(cpu, self.at + wait + span);
        self.schedule(wait + span, cpu, Input::Said(cpu, Message::Ended(report)));
    }

    fn opinion(task: &FoldTask) -> Opinion {
        let wrong = task
            .cases
            .iter()
            .enumerate()
            .filter(|(_, (expected, outputs, fold))| {
                let mut right = Fold::default();
                right.push_digest(digest(expected), *outputs);
                right.0 != *fold
            })
            .map(|(i, _)| i)
            .collect();
        Opinion { slice: task.slice, of: task.of, on: Some(Cpu(99)), wrong, remark: None }
    }

    fn carry_out(&mut self, actions: Vec<Action>) {
        for action in actions {
            match action {
                Action::Start(cpu) => {
                    self.at_work.remove(&cpu);
                    *self.generation.entry(cpu).or_default() += 1;
                    self.worker_free.remove(&cpu);
                    self.silent.remove(&cpu);
                    let ready = Input::Said(cpu, Message::Ready { place: World::here(cpu), lacking: None });
                    self.schedule(Duration::from_millis(2), cpu, ready);
                }
                Action::Order(..) | Action::Record(_) if self.disk_failed => {}
                Action::Order(cpu, Order::Slice(order)) => {
                    self.ordered(cpu, &order);
                    self.work(cpu, order);
                }
                Action::Order(cpu, Order::Halt { upto }) => {
                    self.halted.insert(cpu, upto);
                }
                Action::Feel(cpu) => {
                    let input = Input::Felt(cpu, self.pulses.get(&cpu).copied());
                    let now = self.now();
                    let more = self.supervisor.feed(now, input);
                    self.carry_out(more);
                }
                Action::Kill(cpu) => {
                    self.at_work.remove(&cpu);
                    *self.generation.entry(cpu).or_default() += 1;
                }
                Action::Check(task) => {
                    let of = task.of;
                    self.schedule(Duration::from_micros(300), of, Input::Checked(World::opinion(&task)));
                }
                Action::Record(event) => {
                    if self.disk_fails_at.is_some_and(|at| self.at >= at) {
                        self.disk_failed = true;
                        let now = self.now();
                        let more = self.supervisor.feed(now, Input::DiskFailed);
                        self.carry_out(more);
                    } else {
                        if let Event::Intent(i) = &event {
                            self.planned.extend(i.assignments.iter().map(|a| (a.slice, a.purpose == Purpose::Plan)));
                        }
                        let asks = match &event {
                            Event::Mismatch(m) if self.judge && m.purpose == Purpose::Plan => Some((m.cpu, m.partner)),
                            _ => None,
                        };
                        self.events.push(event);
                        if let Some((cpu, partner)) = asks {
                            self.ask(cpu, partner);
                        }
                    }
                }
                Action::CannotRun(request) => self.could_not.push(request.cpu),
                Action::Finish(ending) => self.ended = Some((ending, self.at)),
            }
        }
    }

    /// What must hold whenever an order goes out.
    fn ordered(&mut self, cpu: Cpu, order: &SliceOrder) {
        let planned = self.planned.get(&order.slice).copied().unwrap_or(true);
        let busy = |c: Cpu| self.at_work.get(&c).is_some_and(|w| !w.is_empty());
        let mut broken = Vec::new();
        if self.hot.contains(&cpu) || self.gone.contains(&cpu) {
            broken.push(format!("cpu {cpu} got an order while it was too hot or gone"));
        }
        if let Some(partner) = order.partner {
            self.paired += 1;
            if busy(partner) || self.gone.contains(&partner) {
                broken.push(format!("cpu {partner} was to be a partner while it was busy or gone"));
            }
        }
        let lent = self.at_work.values().flat_map(BTreeMap::values).any(|(p, _)| *p == Some(cpu));
        if lent {
            broken.push(format!("cpu {cpu} got an order while it was a partner"));
        }
        self.legs += u64::from(!planned);
        self.broken.extend(broken);
        self.at_work.entry(cpu).or_default().insert(order.slice, (order.partner, planned));
    }

    /// The judge asks for one leg on the suspect and one on another cpu, or with another partner.
    fn ask(&mut self, cpu: Cpu, partner: Option<Cpu>) {
        let other = self.generation.keys().copied().find(|c| *c != cpu && Some(*c) != partner);
        let leg = |cpu: Cpu, partner: Option<Cpu>, purpose| Request {
            cpu,
            spec: Spec { purpose, partner, span: Span::Fixed(Duration::from_millis(200)), ..spec(77) },
        };
        let mut wanted = vec![leg(cpu, partner, Purpose::Suspect)];
        if let Some(other) = other {
            wanted.push(match partner {
                Some(_) => leg(cpu, Some(other), Purpose::Control),
                None => leg(other, None, Purpose::Control),
            });
        }
        let now = self.now();
        let more = self.supervisor.feed(now, Input::Wanted(wanted));
        self.carry_out(more);
    }

    fn play(&mut self) {
        let now = self.now();
        let first = self.supervisor.begin(now);
        self.carry_out(first);
        let interrupt = self.chance(10).then(|| Duration::from_millis(self.rng.next_u64() % 20_000));
        let mut interrupted = false;
        for _ in 0..1_000_000 {
            if self.ended.is_some() {
                return;
            }
            let next = self.queue.peek().map_or(Duration::MAX, |Reverse((at, ..))| *at);
            let wait = self.supervisor.next_deadline().min(next).min(self.at + Duration::from_millis(20));
            self.at = wait.max(self.at);
            if let Some(i) = self.freezes.iter().position(|f| *f <= self.at) {
                // everything due meanwhile comes late; nobody is to blame
                self.freezes.swap_remove(i);
                self.at += Duration::from_millis(500 + self.rng.next_u64() % 4000);
                self.thawed = self.at;
                let late: Vec<_> = self
                    .queue
                    .drain()
                    .map(|Reverse((at, t, z, k))| Reverse((at.max(self.at) + Duration::from_millis(1), t, z, k)))
                    .collect();
                self.queue.extend(late);
                self.ticks += 1;
                let now = self.now();
                let actions = self.supervisor.feed(now, Input::Tick);
                self.carry_out(actions);
                continue;
            }
            if let Some(at) = interrupt
                && !interrupted
                && self.at >= at
            {
                interrupted = true;
                let now = self.now();
                let actions = self.supervisor.feed(now, Input::Interrupt);
                self.carry_out(actions);
                continue;
            }
            if let Some(i) = self.host_says.iter().position(|(at, _)| *at <= self.at) {
                let (_, input) = self.host_says.swap_remove(i);
                match &input {
                    Input::Hot(cpu, _) => drop(self.hot.insert(*cpu)),
                    Input::Cooled(cpu, _) => drop(self.hot.remove(cpu)),
                    Input::TakenAway(cpu, _) => drop(self.gone.insert(*cpu)),
                    _ => {}
                }
                let now = self.now();
                let actions = self.supervisor.feed(now, input);
                self.carry_out(actions);
                continue;
            }
            let input = match self.queue.peek() {
                Some(Reverse((at, tick, _, (cpu, generation)))) if *at <= self.at => {
                    let (tick, cpu, generation) = (*tick, Cpu(*cpu), *generation);
                    self.queue.pop();
                    let (_, input) = self.news.remove(&tick).unwrap();
                    let current = self.generation.get(&cpu).copied().unwrap_or(0);
                    if generation != current && !matches!(input, Input::Checked(_)) {
                        continue;
                    }
                    match &input {
                        Input::Said(_, Message::Ended(r)) => {
                            self.at_work.entry(cpu).or_default().remove(&r.slice);
                        }
                        Input::Gone(..) | Input::Babbled(..) => drop(self.at_work.remove(&cpu)),
                        _ => {}
                    }
                    input
                }
                _ => Input::Tick,
            };
            let now = self.now();
            let actions = self.supervisor.feed(now, input);
            self.carry_out(actions);
        }
        panic!(
            "the window never ended: at {:?}, next deadline {:?}, {} slices left, {} news",
            self.at,
            self.supervisor.next_deadline(),
            self.supervisor.slices_left(),
            self.queue.len()
        );
    }
}

fn world(seed: u64) -> World {
    let mut rng = ChaCha12Rng::seed_from_u64(seed);
    let cpus = 1 + (rng.next_u64() % 6) as u32;
    let phases = (0..1 + rng.next_u64() % 5)
        .map(|_| {
            let pairs = cpus > 1 && rng.next_u64().is_multiple_of(3);
            let open = !pairs && rng.next_u64().is_multiple_of(2);
            let rests = rng.next_u64() as u32 % cpus;
            let tracks = (0..cpus)
                // in a pair phase every other cpu is a partner; in a closed one a cpu rests
                .filter(|c| if pairs { c % 2 == 0 && c + 1 < cpus } else { open || cpus == 1 || *c != rests })
                .map(|c| {
                    let partner = pairs.then_some(Cpu(c + 1));
                    Track { cpu: Cpu(c), slices: (0..8).map(|n| Spec { partner, ..spec(n) }).collect() }
                })
                .collect();
            let whole = rng.next_u64().is_multiple_of(2);
            Phase { seconds: 1.0 + (rng.next_u64() % 5) as f64, open, whole, tracks }
        })
        .collect();
    let setup = Setup {
        job_id: 1,
        job: Job::Window,
        budget: BUDGET,
        longest: Duration::from_secs(2),
        grace: Duration::from_secs(1),
        losses_borne: 8,
        posts: (0..cpus).map(|c| Post { cpu: Cpu(c), core: c }).collect(),
        phases,
    };
    let mut host_says = Vec::new();
    if rng.next_u64().is_multiple_of(4) {
        let cpu = Cpu(rng.next_u64() as u32 % cpus);
        let at = Duration::from_millis(rng.next_u64() % 15_000);
        host_says.push((at, Input::Hot(cpu, 91.0)));
        if rng.next_u64().is_multiple_of(2) {
            host_says.push((at + Duration::from_millis(1 + rng.next_u64() % 5000), Input::Cooled(cpu, 80.0)));
        }
    }
    if rng.next_u64().is_multiple_of(6) {
        let cpu = Cpu(rng.next_u64() as u32 % cpus);
        let at = Duration::from_millis(rng.next_u64() % 15_000);
        host_says.push((at, Input::TakenAway(cpu, "it went offline".into())));
    }
    let judge = rng.next_u64().is_multiple_of(2);
    let faulty = if rng.next_u64().is_multiple_of(2) {
        BTreeSet::from([Cpu(rng.next_u64() as u32 % cpus)])
    } else {
        BTreeSet::new()
    };
    let disk_fails_at = rng.next_u64().is_multiple_of(12).then(|| Duration::from_millis(rng.next_u64() % 25_000));
    let freezes = (0..rng.next_u64() % 3).map(|_| Duration::from_millis(rng.next_u64() % 18_000)).collect();
    World {
        rng,
        at: Duration::ZERO,
        supervisor: Supervisor::new(setup, Box::new(Words)),
        queue: BinaryHeap::new(),
        news: BTreeMap::new(),
        ticks: 0,
        generation: BTreeMap::new(),
        worker_free: BTreeMap::new(),
        events: Vec::new(),
        ended: None,
        deeds: BTreeMap::new(),
        faulty,
        disk_fails_at,
        disk_failed: false,
        halted: BTreeMap::new(),
        pulses: BTreeMap::new(),
        silent: BTreeSet::new(),
        freezes,
        thawed: Duration::ZERO,
        could_not: Vec::new(),
        at_work: BTreeMap::new(),
        planned: BTreeMap::new(),
        hot: BTreeSet::new(),
        gone: BTreeSet::new(),
        host_says,
        judge,
        broken: Vec::new(),
        legs: 0,
        paired: 0,
    }
}

fn spec(n: u64) -> Spec {
    Spec {
        purpose: Purpose::Plan,
        kernel: KERNEL,
        variant: Variant::Portable,
        size: Size(9),
        seeds: vec![n, n + 1],
        next_seed: None,
        fresh: false,
        partner: None,
        setting: Setting::PLAIN,
        span: Span::Share(4),
        faults: Vec::new(),
    }
}

fn check(world: &World, seed: u64) {
    let (ending, at) = world.ended.unwrap();
    assert!(world.broken.is_empty(), "seed {seed}: {:?}", world.broken);
    // a machine that stands still past the end cannot be answered for
    assert!(at <= BUDGET.max(world.thawed) + Duration::from_millis(500), "seed {seed}: ended at {at:?}");
    let mut intents = BTreeSet::new();
    let mut settled = BTreeMap::new();
    for event in &world.events {
        match event {
            Event::Intent(i) => intents.extend(i.assignments.iter().map(|a| (a.cpu, a.slice))),
            Event::Slice(s) => *settled.entry((s.cpu, s.slice)).or_insert(0) += 1,
            Event::Lost(l) => *settled.entry((l.cpu, l.slice)).or_insert(0) += 1,
            _ => {}
        }
        let accused = match event {
            Event::Mismatch(m) => Some(m.cpu),
            Event::Slice(s) if s.mismatches > 0 && s.void.is_none() => Some(s.cpu),
            Event::Lost(l) => Some(l.cpu),
            _ => None,
        };
        if let Event::Lost(l) = event {
            let deeds = |d| world.deeds.get(&d).copied().unwrap_or(0);
            assert!(l.how != How::Hung || deeds(Deed::Hang) > 0, "seed {seed}: called hung without a hang: {event:?}");
            // where the machine stood still meanwhile, a hang cannot be told from it and is held against nobody
            let frozen = world.thawed > Duration::ZERO && deeds(Deed::Hang) > 0;
            assert!(l.how != How::Starved || deeds(Deed::Starve) > 0 || frozen, "seed {seed}: {event:?}");
        }
        if let Some(cpu) = accused {
            assert!(world.faulty.contains(&cpu), "seed {seed}: healthy cpu {cpu} accused by {event:?}");
        }
        if let Event::Slice(s) = event
            && s.void.is_none()
        {
            assert!(intents.contains(&(s.cpu, s.slice)), "seed {seed}: a slice without its intent on record before");
        }
    }
    if ending != Ending::Failed && !world.disk_failed {
        assert!(settled.values().all(|n| *n == 1), "seed {seed}: a slice settled twice");
        let settled: BTreeSet<_> = settled.into_keys().collect();
        assert_eq!(intents, settled, "seed {seed}: intents and outcomes differ");
        let voids_where_moved =
            world.events.iter().filter(|e| matches!(e, Event::Slice(s) if s.void.is_some() && s.runs > 0));
        assert!(voids_where_moved.count() as u64 <= world.deeds.get(&Deed::Moved).copied().unwrap_or(0));
    }
}

#[test]
fn windows_with_any_fault_at_any_point_keep_their_promises() {
    let mut deeds: BTreeMap<Deed, u64> = BTreeMap::new();
    let mut endings = BTreeSet::new();
    let (mut legs, mut paired, mut hot, mut gone) = (0, 0, 0, 0);
    for seed in 0..2000 {
        let mut world = world(seed);
        world.play();
        check(&world, seed);
        for (deed, n) in &world.deeds {
            *deeds.entry(*deed).or_default() += n;
        }
        legs += world.legs;
        paired += world.paired;
        hot += u64::from(!world.hot.is_empty());
        gone += u64::from(!world.gone.is_empty());
        endings.insert(format!("{:?}", world.ended.unwrap().0));
    }
    for deed in
        [Deed::Wrong, Deed::Blind, Deed::Crash, Deed::Hang, Deed::Babble, Deed::Moved, Deed::Stop, Deed::ForeignReport]
    {
        assert!(deeds.get(&deed).copied().unwrap_or(0) >= 300, "{deed:?} was met too seldom: {deeds:?}");
    }
    assert!(legs >= 300 && paired >= 3000 && hot >= 100 && gone >= 100, "{legs} legs, {paired} pairs, {hot}, {gone}");
    assert_eq!(
        endings.into_iter().collect::<Vec<_>>(),
        ["Budget", "Done", "Failed", "Signal"],
        "kinds of ending that were met"
    );
}

#[test]
fn wrong_and_blind_workers_are_noticed_every_time() {
    for seed in 0..500 {
        let mut world = world(seed);
        world.disk_fails_at = None;
        world.play();
        let mismatches = world.events.iter().filter(|e| matches!(e, Event::Mismatch(_))).count() as u64;
        let done = |deed| world.deeds.get(&deed).copied().unwrap_or(0);
        let ordered = done(Deed::Wrong) + done(Deed::Blind);
        // a slice that was cut off at the end, or that waited behind a lost one, may not have come to it
        let lost: u64 = [Deed::Crash, Deed::Hang, Deed::Babble, Deed::Stop, Deed::Starve, Deed::ForeignReport]
            .into_iter()
            .map(done)
            .sum();
        assert!(mismatches + lost + 2 >= ordered, "seed {seed}: {mismatches} noticed of {ordered}");
    }
}
