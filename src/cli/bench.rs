//! The director of a job: keeps every event in the ledger, hands it to the judge and to the report, and turns what
//! the judge wants into work. Here the layers meet.

use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use kernels::Case;

use super::sample::words_on;
use crate::event::{Event, Purpose, Remark, Surroundings};
use crate::host::{Counters, Cpu, Host, Root, Sensors};
use crate::judge::confirm::{Confirmer, Counters as Watch, Want};
use crate::ledger::Journal;
use crate::run::checker::Seat;
use crate::run::driver::{Director, unix_ms};
use crate::run::fault::Fault;
use crate::run::spec::{Request, Span, Spec, Truth};

/// Golden words from the embedded tables.
pub struct Tables;

impl Truth for Tables {
    fn expected(&self, case: &Case) -> Option<Vec<u64>> {
        golden::table::expected(case).map(<[u64]>::to_vec)
    }
}

struct Watched {
    root: Root,
    before: Counters,
}

impl Watch for Watched {
    fn risen(&self) -> Vec<String> {
        let changes = self.before.until(&Counters::read(&self.root));
        changes.iter().filter(|c| c.is_error()).map(ToString::to_string).collect()
    }
}

/// What a drill adds to the legs of a confirmation, so that a made-up fault stays as long as a real one would.
pub type Remembered = Box<dyn Fn(Cpu, &str) -> Vec<Fault>>;

/// See the file's head.
pub struct Bench {
    /// The ledger's writer.
    pub journal: Journal,
    /// Everything that happened goes here as well.
    pub listener: Box<dyn FnMut(&Event)>,
    /// Faults of a drill.
    pub remembered: Remembered,
    job_id: u64,
    confirmer: Confirmer,
    sensors: Sensors,
    root: Root,
    cpus: Vec<Cpu>,
    hottest: Option<f64>,
    stop: bool,
    looked: Instant,
    answers: (Sender<Answer>, Receiver<Answer>),
    bar: ProgressBar,
    announced: u64,
    /// Slices that ended and are on record.
    pub slices: u64,
}

type Answer = (usize, Cpu, Result<Vec<u64>, String>);

impl Bench {
    /// For one job. `all` may recompute, `tested` have workers; `hottest` in °C ends the job.
    pub fn new(
        host: &Host,
        journal: Journal,
        confirmer: Confirmer,
        job_id: u64,
        tested: &[Seat],
        hottest: Option<f64>,
    ) -> Bench {
        Bench {
            journal,
            listener: Box::new(|_| {}),
            remembered: Box::new(|_, _| Vec::new()),
            job_id,
            confirmer,
            sensors: host.sensors.clone(),
            root: host.root.clone(),
            cpus: tested.iter().map(|(cpu, _)| *cpu).collect(),
            hottest,
            stop: false,
            looked: Instant::now(),
            answers: channel(),
            bar: ProgressBar::hidden(),
            announced: 0,
            slices: 0,
        }
    }

    /// Shows a bar with the time left, if standard error is a terminal.
    pub fn show_progress(&mut self, budget: Duration) {
        let bar = ProgressBar::with_draw_target(Some(budget.as_millis() as u64), ProgressDrawTarget::stderr());
        if let Ok(style) = ProgressStyle::with_template("{bar:40} {msg}") {
            bar.set_style(style);
        }
        self.bar = bar;
    }

    /// Takes the bar away.
    pub fn hide_progress(&self) {
        self.bar.finish_and_clear();
    }

    /// Keeps an event without anything following from it.
    pub fn keep(&mut self, event: &Event) -> Result<(), String> {
        self.journal.record(event).map_err(|why| why.to_string())?;
        self.slices += u64::from(matches!(event, Event::Slice(_)));
        (self.listener)(event);
        Ok(())
    }

    /// Keeps a remark.
    pub fn remark(&mut self, text: String) -> Result<(), String> {
        self.keep(&Event::Remark(Remark { job_id: self.job_id, wall_ms: unix_ms(), text }))
    }

    /// Findings for confirmations that the job's end cut off.
    pub fn close(&mut self, why: &str) -> Result<(), String> {
        for finding in self.confirmer.close(why, unix_ms()) {
            self.keep(&Event::Finding(Box::new(finding)))?;
        }
        Ok(())
    }

    fn work(&mut self, wants: Vec<Want>) -> Vec<Request> {
        let mut requests = Vec::new();
        for want in wants {
            match want {
                Want::Leg { cpu, purpose, case, variant, span } => {
                    let faults = match purpose {
                        Purpose::Suspect => (self.remembered)(cpu, case.kernel),
                        _ => Vec::new(),
                    };
                    let spec = Spec {
                        purpose,
                        kernel: case.kernel,
                        variant,
                        size: case.size,
                        seeds: vec![case.seed.0],
                        span: Span::Fixed(span),
                        faults,
                    };
                    requests.push(Request { cpu, spec });
                }
                Want::Recompute { ticket, case, cpus } => {
                    for cpu in cpus {
                        let answer = self.answers.0.clone();
                        std::thread::spawn(move || answer.send((ticket, cpu, words_on(cpu, &case))));
                    }
                }
            }
        }
        requests
    }

    fn temperatures(&mut self) -> Result<(), String> {
        let Some(limit) = self.hottest else { return Ok(()) };
        if self.stop || self.looked.elapsed() < Duration::from_millis(500) {
            return Ok(());
        }
        self.looked = Instant::now();
        let hot =
            self.cpus.iter().find_map(|&cpu| self.sensors.read(cpu).celsius.filter(|c| *c > limit).map(|c| (cpu, c)));
        if let Some((cpu, celsius)) = hot {
            self.stop = true;
            self.remark(format!("ended early: {celsius:.1} °C at cpu {cpu}, --max-temp is {limit:.1} °C"))?;
        }
        Ok(())
    }
}

impl Director for Bench {
    fn record(&mut self, event: Event) -> Result<Vec<Request>, String> {
        self.keep(&event)?;
        let golden = |case: &Case| golden::table::expected(case).map(<[u64]>::to_vec);
        let root = self.root.clone();
        let counters =
            move || -> Box<dyn Watch> { Box::new(Watched { before: Counters::read(&root), root: root.clone() }) };
        let wants = self.confirmer.consider(&event, golden, counters);
        if let Event::Mismatch(m) = &event
            && self.announced < 20
        {
            self.announced += 1;
            self.bar.println(format!("mismatch: cpu {} in {} {}", m.cpu, m.kernel, m.variant));
        }
        Ok(self.work(wants))
    }

    fn poll(&mut self, at: Duration, progress: f64, slices_left: usize) -> Result<Vec<Request>, String> {
        while let Ok((ticket, cpu, words)) = self.answers.1.try_recv() {
            self.confirmer.recomputed(ticket, cpu, words);
        }
        for finding in self.confirmer.completed(unix_ms()) {
            self.bar.println(format!("finding: {}", finding.statement));
            self.keep(&Event::Finding(Box::new(finding)))?;
        }
        self.temperatures()?;
        if !self.bar.is_hidden() {
            let length = self.bar.length().unwrap_or(0) as f64;
            self.bar.set_position((progress * length) as u64);
            let left = if progress > 0.0 { (at.as_secs_f64() * (1.0 - progress) / progress) as u64 } else { 0 };
            self.bar.set_message(format!("{}:{:02} left, {slices_left} slices to go", left / 60, left % 60));
        }
        Ok(Vec::new())
    }

    fn surroundings(&mut self, cpu: Cpu) -> Surroundings {
        let readings = self.sensors.read(cpu);
        Surroundings { celsius: readings.celsius, khz: readings.frequency_khz }
    }

    fn stop(&self) -> bool {
        self.stop
    }
}
