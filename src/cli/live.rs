//! Live cases: fresh seeds beyond the tables, their expected words computed by the reference on another core than the one
//! that will run them, in the background and at the lowest priority, so that no core under test waits for them: a slice
//! takes one that is ready, or none. All of them are kept, so that a confirmation knows them.

use std::collections::{BTreeMap, HashMap, VecDeque};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::time::{Duration, Instant};

use kernels::{Case, Seed, Size};

use super::sample::words_on;
use crate::condition::{Level, Setting};
use crate::host::{Cpu, affinity};
use crate::plan::Site;
use crate::run::checker::Seat;
use crate::run::spec::{FRESH_FROM, Truth};

/// Cases of one unit that wait to be used.
const IN_STOCK: usize = 2;
/// All cases of one job; each keeps up to 2 KiB of words.
const MOST: usize = 20_000;
/// A unit whose reference takes longer is left to its table.
const TOO_LONG: Duration = Duration::from_millis(1500);

/// A kernel at one size.
type Work = (&'static str, Size);

struct Ready {
    seed: Seed,
    words: Vec<u64>,
    /// Core that computed it.
    core: u32,
    taken: Vec<Cpu>,
}

#[derive(Default)]
struct Stock {
    ready: BTreeMap<Work, Vec<Ready>>,
    wanted: VecDeque<Work>,
    known: HashMap<Case, (Cpu, Vec<u64>)>,
    slow: Vec<Work>,
}

/// The stock of live cases.
pub struct Live {
    stock: Mutex<Stock>,
    over: AtomicBool,
    seats: Vec<Seat>,
}

impl Live {
    fn stock(&self) -> MutexGuard<'_, Stock> {
        // a thread that panicked while it held the lock left whole entries: they are pushed complete
        self.stock.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Starts the background threads of job `job_id`; they end when the last [`Keeper`] does.
    pub fn start(job_id: u64, seats: &[Seat]) -> Keeper {
        let live = Arc::new(Live { stock: Mutex::default(), over: AtomicBool::new(false), seats: seats.to_vec() });
        let cores: std::collections::BTreeSet<u32> = seats.iter().map(|(_, core)| *core).collect();
        // a case has to come from another core than the one that runs it
        let threads = if cores.len() < 2 { 0 } else { 1 + seats.len() / 32 };
        for thread in 0..threads {
            let live = live.clone();
            std::thread::spawn(move || {
                affinity::step_back();
                live.make(job_id, thread as u64, threads as u64);
            });
        }
        Keeper(live)
    }

    fn make(&self, job_id: u64, thread: u64, threads: u64) {
        // job and number in their own bits: no seed comes twice in a ledger, and all stay exact in every JSON reader
        let base = FRESH_FROM | (job_id & 0x3ff_ffff) << 20;
        let mut number = thread;
        while !self.over.load(Ordering::Relaxed) {
            let next = {
                let mut stock = self.stock();
                if stock.known.len() >= MOST { None } else { stock.wanted.pop_front() }
            };
            let Some(work) = next else {
                std::thread::sleep(Duration::from_millis(20));
                continue;
            };
            if number >= 1 << 20 {
                return;
            }
            let seed = Seed(base | number);
            let (cpu, core) = self.seats[number as usize % self.seats.len()];
            number += threads;
            let case = Case { kernel: work.0, seed, size: work.1 };
            let begun = Instant::now();
            // a cpu that cannot be had now makes no case; the next one is made elsewhere
            let Ok(words) = words_on(cpu, &case) else { continue };
            let mut stock = self.stock();
            if begun.elapsed() > TOO_LONG {
                stock.slow.push(work);
            }
            stock.known.insert(case, (cpu, words.clone()));
            stock.ready.entry(work).or_default().push(Ready { seed, words, core, taken: Vec::new() });
        }
    }

    /// The expected words of a live case of this job.
    pub fn known(&self, case: &Case) -> Option<Vec<u64>> {
        self.stock().known.get(case).map(|(_, words)| words.clone())
    }

    /// The cpu that computed them.
    pub fn maker(&self, case: &Case) -> Option<Cpu> {
        self.stock().known.get(case).map(|(cpu, _)| *cpu)
    }

    fn take(&self, work: Work, cpu: Cpu) -> Option<(Seed, Vec<u64>)> {
        let own = self.seats.iter().find(|(c, _)| *c == cpu).map(|(_, core)| *core);
        let mut stock = self.stock();
        let list = stock.ready.entry(work).or_default();
        // what every cpu but those of its own core has had is used up
        list.retain(|r| r.taken.len() < self.seats.iter().filter(|(_, core)| *core != r.core).count());
        let found = list.iter_mut().find(|r| Some(r.core) != own && !r.taken.contains(&cpu)).map(|ready| {
            ready.taken.push(cpu);
            (ready.seed, ready.words.clone())
        });
        let enough = list.iter().filter(|r| !r.taken.contains(&cpu)).count() >= IN_STOCK;
        if !enough && !stock.slow.contains(&work) && !stock.wanted.contains(&work) {
            stock.wanted.push_back(work);
        }
        found
    }
}

/// Keeps the background threads going.
pub struct Keeper(Arc<Live>);

impl std::ops::Deref for Keeper {
    type Target = Live;

    fn deref(&self) -> &Live {
        &self.0
    }
}

impl Drop for Keeper {
    fn drop(&mut self) {
        self.0.over.store(true, Ordering::Relaxed);
    }
}

/// Golden words from the embedded tables, and live ones.
pub struct Truths {
    /// Live cases, if there are to be any.
    pub live: Option<Arc<Keeper>>,
    /// Where footprints lie.
    pub site: Site,
}

impl Truth for Truths {
    fn expected(&self, case: &Case) -> Option<Vec<u64>> {
        golden::table::expected(case).map(<[u64]>::to_vec).or_else(|| self.live.as_ref()?.known(case))
    }

    fn fresh(&mut self, kernel: &'static str, size: Size, cpu: Cpu) -> Option<(Seed, Vec<u64>)> {
        self.live.as_ref()?.take((kernel, size), cpu)
    }

    fn level(&self, size: Size, cpu: Cpu, setting: Setting) -> Option<Level> {
        self.site.level(size, cpu, setting)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn live_cases_come_from_another_core_and_no_cpu_has_one_twice() {
        let seats: Vec<Seat> = affinity::mask().unwrap().iter().map(|c| (c, c.0)).collect();
        if seats.len() < 2 {
            return;
        }
        let live = Live::start(5, &seats);
        let work = ("integer.divide", Size(6));
        let mut had = std::collections::BTreeSet::new();
        let patience = Instant::now() + Duration::from_secs(60);
        while had.len() < 6 && Instant::now() < patience {
            for &(cpu, core) in &seats {
                if let Some((seed, words)) = live.take(work, cpu) {
                    let case = Case { kernel: work.0, seed, size: work.1 };
                    assert!(had.insert((cpu, seed.0)), "twice on cpu {cpu}: {case}");
                    assert_eq!(golden::reference::words(&case).as_ref(), Some(&words));
                    assert_eq!(live.known(&case), Some(words));
                    assert!(seed.0 >= FRESH_FROM && golden::table::expected(&case).is_none());
                    let makers: Vec<u32> =
                        live.stock().ready[&work].iter().filter(|r| r.seed == seed).map(|r| r.core).collect();
                    assert!(!makers.contains(&core));
                }
            }
            std::thread::sleep(Duration::from_millis(5));
        }
        assert!(had.len() >= 6, "only {} live cases in a minute", had.len());
    }
}
