//! What earlier windows did, as far as a plan has to know it.

use rustc_hash::{FxHashMap as HashMap, FxHashSet as HashSet};

use super::Unit;
use crate::condition::{Condition, Setting};
use crate::host::Cpu;

/// What is on record about one cell on one cpu.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Done {
    /// When it last ended, Unix milliseconds; 0: never.
    pub last_ms: u64,
    /// Processor time inside kernels, nanoseconds.
    pub busy_ns: u64,
}

/// One slice that counts.
#[derive(Clone, Copy, Debug)]
pub struct Ran {
    /// Logical cpu.
    pub cpu: Cpu,
    /// The second cpu of a kernel for two.
    pub partner: Option<Cpu>,
    /// What.
    pub unit: Unit,
    /// Under which condition.
    pub condition: Condition,
    /// When it ended, Unix milliseconds.
    pub end_ms: u64,
    /// Processor time inside the kernel, nanoseconds.
    pub busy_ns: u64,
    /// Wrong outputs.
    pub mismatches: u64,
    /// Where the unit's row of table seeds goes on.
    pub next_seed: Option<u64>,
}

/// A unit or a setting that the record knows, as a small number: a plan asks for hundreds of thousands of cells.
type Known = u32;

/// The record of earlier windows on this host and part.
#[derive(Clone, Debug, Default)]
pub struct History {
    units: HashMap<Unit, Known>,
    settings: HashMap<Setting, Known>,
    cells: HashMap<(Cpu, Known, Known), Done>,
    pairs: HashMap<(Cpu, Cpu, Known), Done>,
    seeds: HashMap<(Cpu, Known), u64>,
    wrong: HashSet<(Cpu, &'static str)>,
}

impl History {
    /// Takes a slice in.
    pub fn add(&mut self, ran: &Ran) {
        let next = self.units.len() as Known;
        let unit = *self.units.entry(ran.unit).or_insert(next);
        let next = self.settings.len() as Known;
        let setting = *self.settings.entry(ran.condition.setting).or_insert(next);
        let put = |done: &mut Done| {
            done.last_ms = done.last_ms.max(ran.end_ms);
            done.busy_ns = done.busy_ns.saturating_add(ran.busy_ns);
        };
        match ran.partner {
            Some(partner) => put(self.pairs.entry((ran.cpu, partner, unit)).or_default()),
            None => put(self.cells.entry((ran.cpu, unit, setting)).or_default()),
        }
        if let Some(next) = ran.next_seed {
            let seed = self.seeds.entry((ran.cpu, unit)).or_default();
            *seed = (*seed).max(next);
        }
        if ran.mismatches > 0 {
            self.wrong.extend([Some(ran.cpu), ran.partner].into_iter().flatten().map(|cpu| (cpu, ran.unit.kernel)));
        }
    }

    /// What was done of one unit under one setting, to be asked by cpu.
    pub fn of(&self, unit: Unit, setting: Setting) -> impl Fn(Cpu) -> Done + '_ {
        let known = self.units.get(&unit).copied().zip(self.settings.get(&setting).copied());
        move |cpu| known.and_then(|(u, s)| self.cells.get(&(cpu, u, s))).copied().unwrap_or_default()
    }

    /// What ordered pairs of cpus did of one unit.
    pub fn together(&self, unit: Unit) -> impl Fn(Cpu, Cpu) -> Done + '_ {
        let known = self.units.get(&unit).copied();
        move |first, second| known.and_then(|u| self.pairs.get(&(first, second, u))).copied().unwrap_or_default()
    }

    /// What was done of a cell.
    pub fn done(&self, cpu: Cpu, unit: Unit, setting: Setting) -> Done {
        self.of(unit, setting)(cpu)
    }

    /// What an ordered pair of cpus did of a unit.
    pub fn done_together(&self, first: Cpu, second: Cpu, unit: Unit) -> Done {
        self.together(unit)(first, second)
    }

    /// Whether this cpu ever gave a wrong output in this kernel.
    pub fn was_wrong(&self, cpu: Cpu, kernel: &str) -> bool {
        // few cpus ever are: a scan of a short list
        self.wrong.iter().any(|(c, k)| *c == cpu && *k == kernel)
    }

    /// Whether any cpu ever was.
    pub fn any_wrong(&self) -> bool {
        !self.wrong.is_empty()
    }

    /// Table seeds of the unit that were used on this cpu, in all windows together.
    pub fn seeds_used(&self, cpu: Cpu, unit: Unit) -> u64 {
        self.units.get(&unit).and_then(|u| self.seeds.get(&(cpu, *u))).copied().unwrap_or(0)
    }
}
