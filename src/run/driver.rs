//! The driver does what the supervisor says: processes, pipes, signals, the clock. It decides nothing.

use std::collections::BTreeMap;
use std::io;
use std::path::PathBuf;
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::time::{Duration, Instant, SystemTime, UNIX_EPOCH};

use super::checker::{self, Seat};
use super::child::{Child, Heard};
use super::protocol::Received;
use super::spec::{Action, FoldTask, Input, Now, Opinion, Request, Setup, Truth};
use super::supervisor::Supervisor;
use crate::event::{Ending, Event, How, Surroundings};
use crate::host::Cpu;

/// The side that keeps records and judges; the driver hands it every event and takes its requests back.
pub trait Director {
    /// Keeps an event. An error means that nothing can be kept any more.
    fn record(&mut self, event: Event) -> Result<Vec<Request>, String>;
    /// Called often; `slices_left` and `progress` (0 to 1) are for people.
    fn poll(&mut self, at: Duration, progress: f64, slices_left: usize) -> Result<Vec<Request>, String>;
    /// Work for two cpus that was asked for and cannot be done.
    fn cannot_run(&mut self, request: &Request) -> Vec<Request>;
    /// What the host has to say since the last call: cpus that have become too hot or cool, or were taken away.
    fn watch(&mut self) -> Vec<Input>;
    /// The memory node of a cpu, if its memory is to come from there.
    fn node(&self, cpu: Cpu) -> Option<u32>;
    /// Readings of a cpu, if the host has any.
    fn surroundings(&mut self, cpu: Cpu) -> Surroundings;
}

/// How a job went, as far as the driver knows.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Outcome {
    /// Why it ended.
    pub ending: Ending,
    /// How long it took.
    pub wall: Duration,
    /// Why the records could not be kept, if so.
    pub disk: Option<String>,
}

enum News {
    Heard(Heard),
    Opinion(Opinion),
    Interrupt,
}

/// Longest time without a look at the children and the judge.
const LOOK_EVERY: Duration = Duration::from_millis(20);

/// Host clock in Unix milliseconds.
pub fn unix_ms() -> u64 {
    SystemTime::now().duration_since(UNIX_EPOCH).map_or(0, |d| d.as_millis() as u64)
}

struct Driver<'a> {
    start: Instant,
    program: PathBuf,
    children: BTreeMap<Cpu, Child>,
    generation: u64,
    hear: Sender<Heard>,
    checks: Sender<FoldTask>,
    director: &'a mut dyn Director,
    supervisor: Supervisor,
    ending: Option<Ending>,
    disk: Option<String>,
}

/// Runs a job to its end. `start` is when its budget began; `seats` are all cpus that may give second opinions.
pub fn run(
    start: Instant,
    setup: Setup,
    truth: Box<dyn Truth>,
    seats: Vec<Seat>,
    director: &mut dyn Director,
) -> io::Result<Outcome> {
    let program = std::env::current_exe()?;
    let (give, news) = channel();
    let (hear, heard) = channel::<Heard>();
    let forward = give.clone();
    std::thread::spawn(move || heard.into_iter().all(|h| forward.send(News::Heard(h)).is_ok()));
    let opinions = give.clone();
    let checks = checker::start(seats, move |opinion| opinions.send(News::Opinion(opinion)).is_ok());
    let mut signals = signal_hook::iterator::Signals::new([libc::SIGINT, libc::SIGTERM, libc::SIGHUP])?;
    let signals_handle = signals.handle();
    std::thread::spawn(move || signals.forever().all(|_| give.send(News::Interrupt).is_ok()));

    let supervisor = Supervisor::new(setup, truth);
    let mut driver = Driver {
        start,
        program,
        children: BTreeMap::new(),
        generation: 0,
        hear,
        checks,
        director,
        supervisor,
        ending: None,
        disk: None,
    };
    let now = driver.now(None);
    let first = driver.supervisor.begin(now);
    driver.carry_out(first);
    while driver.ending.is_none() {
        let wait = driver.supervisor.next_deadline().saturating_sub(driver.start.elapsed()).min(LOOK_EVERY);
        match news.recv_timeout(wait.max(Duration::from_micros(200))) {
            Ok(first) => {
                driver.take(first);
                while driver.ending.is_none()
                    && let Ok(more) = news.try_recv()
                {
                    driver.take(more);
                }
            }
            Err(RecvTimeoutError::Timeout) => {}
            Err(RecvTimeoutError::Disconnected) => break,
        }
        driver.look();
    }
    for (_, child) in std::mem::take(&mut driver.children) {
        child.kill();
    }
    signals_handle.close();
    let ending = driver.ending.unwrap_or(Ending::Failed);
    Ok(Outcome { ending, wall: driver.start.elapsed(), disk: driver.disk })
}

impl Driver<'_> {
    fn now(&mut self, cpu: Option<Cpu>) -> Now {
        let surroundings = cpu.map_or_else(Surroundings::default, |c| self.director.surroundings(c));
        let pulse = cpu.and_then(|c| self.children.get(&c)).and_then(Child::pulse);
        Now { at: self.start.elapsed(), wall_ms: unix_ms(), surroundings, pulse }
    }

    fn feed(&mut self, cpu: Option<Cpu>, input: Input) {
        let now = self.now(cpu);
        let actions = self.supervisor.feed(now, input);
        self.carry_out(actions);
    }

    fn take(&mut self, news: News) {
        match news {
            News::Interrupt => self.feed(None, Input::Interrupt),
            News::Opinion(opinion) => self.feed(None, Input::Checked(opinion)),
            News::Heard((cpu, generation, received)) => {
                if self.children.get(&cpu).is_none_or(|c| c.generation != generation) {
                    // an earlier worker's last words
                    return;
                }
                match received {
                    Received::Message(message) => self.feed(Some(cpu), Input::Said(cpu, message)),
                    Received::Babble(text) => self.feed(None, Input::Babbled(cpu, text)),
                    Received::End => {
                        if let Some(child) = self.children.remove(&cpu) {
                            let how = child.end();
                            self.feed(None, Input::Gone(cpu, how));
                        }
                    }
                }
            }
        }
    }

    fn look(&mut self) {
        let changes: Vec<(Cpu, bool)> =
            self.children.iter_mut().filter_map(|(cpu, child)| child.look().map(|stopped| (*cpu, stopped))).collect();
        for (cpu, stopped) in changes {
            self.feed(None, Input::Stopped(cpu, stopped));
        }
        let at = self.start.elapsed();
        let progress = self.supervisor.progress(at);
        let wanted = self.director.poll(at, progress, self.supervisor.slices_left());
        self.requests(wanted);
        for input in self.director.watch() {
            self.feed(None, input);
        }
        self.feed(None, Input::Tick);
    }

    fn requests(&mut self, wanted: Result<Vec<Request>, String>) {
        match wanted {
            Ok(requests) if requests.is_empty() => {}
            Ok(requests) => self.feed(None, Input::Wanted(requests)),
            Err(why) => self.fail(why),
        }
    }

    fn fail(&mut self, why: String) {
        if self.disk.is_none() {
            self.disk = Some(why);
            self.feed(None, Input::DiskFailed);
        }
    }

    fn carry_out(&mut self, actions: Vec<Action>) {
        for action in actions {
            match action {
                Action::Start(cpu) => self.start_child(cpu),
                // an order must not go out without its intent on record
                Action::Order(..) | Action::Record(_) if self.disk.is_some() => {}
                Action::Order(cpu, order) => {
                    if let Some(child) = self.children.get(&cpu) {
                        child.order(&order);
                    }
                }
                Action::Feel(cpu) => {
                    let pulse = self.children.get(&cpu).and_then(Child::pulse);
                    self.feed(None, Input::Felt(cpu, pulse));
                }
                Action::Kill(cpu) => {
                    if let Some(child) = self.children.remove(&cpu) {
                        child.kill();
                    }
                }
                Action::Check(task) => {
                    // the checker lives as long as the driver
                    let _ = self.checks.send(task);
                }
                Action::Record(event) => {
                    let wanted = self.director.record(event);
                    self.requests(wanted);
                }
                Action::CannotRun(request) => {
                    let wanted = self.director.cannot_run(&request);
                    self.requests(Ok(wanted));
                }
                Action::Finish(ending) => self.ending = Some(ending),
            }
        }
    }

    fn start_child(&mut self, cpu: Cpu) {
        self.generation += 1;
        let node = self.director.node(cpu);
        match Child::start(&self.program, cpu, node, self.generation, self.hear.clone()) {
            Ok(child) => {
                self.children.insert(cpu, child);
            }
            Err(why) => self.feed(None, Input::Gone(cpu, How::NotStarted(why.to_string()))),
        }
    }
}
