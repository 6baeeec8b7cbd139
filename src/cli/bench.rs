//! The director of a job: keeps every event in the ledger, hands it to the judge and to the report, and turns what
//! the judge wants into work. Here the layers meet.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use kernels::{Case, Seed, Size};

use super::live::Keeper;
use super::rises::Rises;
use super::sample::words_on;
use crate::condition::{Arrangement, Setting};
use crate::event::{Confirmation, Event, Finding, Mismatch, Purpose, Remark, Surroundings};
use crate::host::{Counters, Cpu, Host, Root, Sensors, affinity};
use crate::judge::confirm::{Confirmer, Counters as Watch, Want};
use crate::ledger::Journal;
use crate::run::checker::Seat;
use crate::run::driver::{Director, unix_ms};
use crate::run::fault::Fault;
use crate::run::spec::{Input, Request, Span, Spec};

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
    nodes: BTreeMap<Cpu, u32>,
    cpus: Vec<Cpu>,
    live: Option<Arc<Keeper>>,
    hottest: Option<f64>,
    hot: BTreeSet<Cpu>,
    gone: BTreeSet<Cpu>,
    looked: Instant,
    rises: Rises,
    answers: (Sender<Answer>, Receiver<Answer>),
    bar: ProgressBar,
    announced: u64,
    /// Slices that ended and are on record.
    pub slices: u64,
}

/// Temperatures and the list of cpus are looked at so often.
const WATCH_EVERY: Duration = Duration::from_millis(500);
/// A cpu goes on when it is cooler than the limit by this much, in °C.
const COOLED_BY: f64 = 5.0;

fn several_nodes(host: &Host) -> bool {
    let nodes: BTreeSet<u32> = host.topology.cpus.values().filter_map(|place| place.node.get()).collect();
    nodes.len() > 1
}

type Answer = (usize, Cpu, Result<Vec<u64>, String>);

impl Bench {
    /// For one job. `tested` have workers; a cpu hotter than `hottest` °C pauses.
    pub fn new(
        host: &Host,
        journal: Journal,
        confirmer: Confirmer,
        job_id: u64,
        tested: &[Seat],
        hottest: Option<f64>,
        live: Option<Arc<Keeper>>,
    ) -> Bench {
        Bench {
            journal,
            listener: Box::new(|_| {}),
            remembered: Box::new(|_, _| Vec::new()),
            job_id,
            confirmer,
            sensors: host.sensors.clone(),
            root: host.root.clone(),
            // one node needs no asking for
            nodes: if several_nodes(host) {
                tested.iter().filter_map(|(cpu, _)| Some((*cpu, host.topology.cpus.get(cpu)?.node.get()?))).collect()
            } else {
                BTreeMap::new()
            },
            cpus: tested.iter().map(|(cpu, _)| *cpu).collect(),
            live,
            hottest,
            hot: BTreeSet::new(),
            gone: BTreeSet::new(),
            looked: Instant::now(),
            rises: Rises::new(&host.root, &host.sensors),
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

    fn maker(&self, finding: &Finding) -> Option<Cpu> {
        let kernel = kernels::catalogue::find(&finding.kernel)?.id();
        self.live.as_ref()?.maker(&Case { kernel, seed: Seed(finding.seed?), size: Size(finding.size) })
    }

    fn case_of(&self, m: &Mismatch) -> Option<Case> {
        let kernel = kernels::catalogue::find(&m.kernel)?.id();
        Some(Case { kernel, seed: Seed(m.seed?), size: Size(m.size) })
    }

    fn work(&mut self, wants: Vec<Want>) -> Vec<Request> {
        let mut requests = Vec::new();
        for want in wants {
            match want {
                Want::Leg { cpu, partner, purpose, case, variant, span } => {
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
                        next_seed: None,
                        fresh: false,
                        partner,
                        setting: Setting { arrangement: self.arrangement(partner), ..Setting::PLAIN },
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

    /// Who else is busy during a leg: everybody, if there is anybody.
    fn arrangement(&self, partner: Option<Cpu>) -> Arrangement {
        if partner.is_none() && self.cpus.len() == 1 { Arrangement::Solo } else { Arrangement::All }
    }

    fn golden(&self, case: &Case) -> Option<Vec<u64>> {
        let table = golden::table::expected(case).map(<[u64]>::to_vec);
        table.or_else(|| self.live.as_ref()?.known(case))
    }

    fn temperatures(&mut self) -> Vec<Input> {
        let Some(limit) = self.hottest else { return Vec::new() };
        let mut news = Vec::new();
        for &cpu in &self.cpus {
            let Some(celsius) = self.sensors.read(cpu).celsius else { continue };
            if celsius > limit && self.hot.insert(cpu) {
                news.push(Input::Hot(cpu, celsius));
            } else if celsius < limit - COOLED_BY && self.hot.remove(&cpu) {
                news.push(Input::Cooled(cpu, celsius));
            }
        }
        news
    }

    /// Cpus that were switched off, or taken out of what this process may use.
    fn taken_away(&mut self) -> Vec<Input> {
        let online = self.root.cpus("sys/devices/system/cpu/online").ok();
        // the thread that asks is never pinned, so its mask is the process's
        let allowed = affinity::mask().ok();
        let mut news = Vec::new();
        for &cpu in &self.cpus {
            let why = match (&online, &allowed) {
                (Some(online), _) if !online.contains(cpu) => "it went offline",
                (_, Some(allowed)) if !allowed.contains(cpu) => "this process may no longer use it",
                _ => continue,
            };
            if self.gone.insert(cpu) {
                news.push(Input::TakenAway(cpu, why.to_owned()));
            }
        }
        news
    }
}

impl Director for Bench {
    fn record(&mut self, mut event: Event) -> Result<Vec<Request>, String> {
        if let Event::Slice(slice) = &mut event {
            slice.counters = self.rises.during(slice);
        }
        self.keep(&event)?;
        let words = match &event {
            Event::Mismatch(m) => self.case_of(m).and_then(|case| Some((case, self.golden(&case)?))),
            _ => None,
        };
        let golden = |case: &Case| words.as_ref().filter(|(c, _)| c == case).map(|(_, w)| w.clone());
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
            if finding.confirmation == Confirmation::Refuted
                && let Some(maker) = self.maker(&finding)
            {
                self.remark(format!(
                    "the expected words of {} seed {} were computed live on cpu {maker}, and other cpus compute others: \
                     look at cpu {maker}",
                    finding.kernel,
                    finding.seed.unwrap_or(0)
                ))?;
            }
            self.keep(&Event::Finding(Box::new(finding)))?;
        }
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

    fn cannot_run(&mut self, request: &Request) -> Vec<Request> {
        let why = format!("cpus {} and its partner could not be run together", request.cpu);
        let wants = self.confirmer.cannot_run(request.cpu, request.spec.kernel, &why);
        self.work(wants)
    }

    fn watch(&mut self) -> Vec<Input> {
        if self.looked.elapsed() < WATCH_EVERY {
            return Vec::new();
        }
        self.looked = Instant::now();
        let mut news = self.temperatures();
        news.extend(self.taken_away());
        news
    }

    fn node(&self, cpu: Cpu) -> Option<u32> {
        self.nodes.get(&cpu).copied()
    }
}
