//! Budget, topology, history and seed to phases of slices. Pure: the same input gives the same plan.
//!
//! First a sweep: every cpu has every unit (kernel × variant × size) once, in an order of its own, and every kernel for two
//! cpus in both roles. A window too short for it takes what a cpu has not had for longest, and the next window goes
//! on from there. The rest of the budget goes by value: most of it to further work of every cpu at full pace, a small part,
//! bounded by the idle time that it costs, to the other settings, and some to further pairs of cpus.

mod history;
mod pairs;
mod settings;
mod site;
mod slots;
mod units;
mod value;

use std::time::Duration;

use kernels::Variant;
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

pub use history::{Done, History, Ran};
pub use settings::{Offer, plain};
pub use site::{Seat, Share, Site};
pub use units::{Skipped, Unit, available};

use crate::condition::{Before, Condition, Setting};
use crate::host::Cpu;
use settings::{SHORTEST, groups};
use slots::Board;

/// The longest slice, so that a loss or a move voids little and an end comes soon.
pub const LONGEST_SLICE: Duration = Duration::from_secs(2);
/// Longest phase of the plain setting: confirmations for two cpus wait until it ends.
const LONGEST_PHASE: f64 = 30.0;
/// Part of a budget that a sweep may take, and the longest slice in it.
const SWEEP_PART: f64 = 0.3;
const SWEEP_SLICE: f64 = 0.5;
/// Part of all core time that may be idle for the sake of settings.
pub const IDLE_PART: f64 = 0.015;
/// Part of a budget that goes to further pairs, and to heated slices.
const PAIRS_PART: f64 = 0.04;
const HEATED_PART: f64 = 0.03;
/// Seconds that changing from one phase to the next takes.
const CHANGE: f64 = 0.002;

/// One planned slice.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Planned {
    /// What.
    pub unit: Unit,
    /// The second cpu of a kernel for two.
    pub partner: Option<Cpu>,
    /// Operand seeds of the table in order.
    pub seeds: Vec<u64>,
    /// Where the unit's row of seeds goes on after them.
    pub next_seed: u64,
    /// A case beyond the table may be added.
    pub fresh: bool,
    /// Weight of its length among the slices of its track.
    pub share: u32,
}

/// A part of the window that ends for all cpus together.
#[derive(Clone, Debug, PartialEq)]
pub struct Phase {
    /// What it is for.
    pub aim: Aim,
    /// Under which setting its slices run.
    pub setting: Setting,
    /// How long, by plan.
    pub seconds: f64,
    /// Everybody is busy at full pace, so that work for confirmations may be put in.
    pub open: bool,
    /// Slices by cpu, in order; the other cpus rest.
    pub tracks: Vec<(Cpu, Vec<Planned>)>,
}

/// What a phase is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Aim {
    /// Every unit once.
    Sweep,
    /// What is worth most.
    Value,
    /// A setting other than the plain one.
    Setting,
    /// Kernels for two cpus.
    Pairs,
    /// Heats the cores for the phase behind it.
    Heating,
}

impl Aim {
    /// In a word.
    pub fn name(self) -> &'static str {
        match self {
            Aim::Sweep => "sweep",
            Aim::Value => "value",
            Aim::Setting => "setting",
            Aim::Pairs => "pairs",
            Aim::Heating => "heating",
        }
    }
}

/// What all the cells of this host are, and how long windows like this one take to cover them.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Grid {
    /// Cells: cpu × unit × setting, and ordered pairs of cpus × unit.
    pub cells: u64,
    /// Those that no window has covered yet.
    pub uncovered: u64,
    /// Windows like this one in which every cell is covered at least once, this one among them.
    pub windows: u64,
}

/// What each cpu is to do.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// In order.
    pub phases: Vec<Phase>,
    /// Whether every cpu has every unit.
    pub sweep: bool,
    /// Units that a cpu leaves out because the window is too short for the sweep.
    pub left_out: usize,
    /// The whole grid.
    pub grid: Grid,
    /// Settings that this window has phases of.
    pub settings: Vec<Setting>,
}

/// What a plan is made from.
pub struct Brief<'a> {
    /// The tested cpus.
    pub site: &'a Site,
    /// What can be run.
    pub units: &'a [Unit],
    /// What was run.
    pub history: &'a History,
    /// Time for all of it.
    pub budget: Duration,
    /// Host clock, Unix milliseconds.
    pub now_ms: u64,
    /// Seed of order and choice.
    pub seed: u64,
    /// Number of table seeds of a unit; they are 0, 1, 2 …
    pub seeds: &'a dyn Fn(&Unit) -> u64,
}

/// Plans a window.
pub fn plan(brief: &Brief) -> Plan {
    let mut board = Board::new(brief);
    let total = brief.budget.as_secs_f64();
    let (singles, together) = (board.singles.len(), board.together.len());
    // both roles of every kernel for two
    let slots = singles + 2 * together;
    let fitting = (total / SHORTEST) as usize;
    let cells = board.cells();
    let uncovered = board.uncovered();
    if slots == 0 || fitting < slots {
        let kept = fitting.max(1);
        let pairs = (kept * 2 * together / slots.max(1)) / 2 * 2;
        let mut phases = Vec::new();
        board.sweep(kept - pairs, total * (kept - pairs) as f64 / kept as f64, &mut phases);
        board.next_round(pairs / 2, total * pairs as f64 / kept as f64, Aim::Sweep, &mut phases);
        let left_out = slots.saturating_sub(kept);
        let sweeps = (slots as u64).div_ceil(kept as u64);
        return Plan {
            phases,
            sweep: left_out == 0,
            left_out,
            // other settings come only when a window has room beyond a sweep
            grid: Grid { cells, uncovered, windows: if board.others.is_empty() { sweeps } else { 0 } },
            settings: vec![board.plain],
        };
    }
    let slice = (SWEEP_PART * total / slots as f64).clamp(SHORTEST, SWEEP_SLICE);
    let mut first = Vec::new();
    board.sweep(singles, slice * singles as f64, &mut first);
    board.next_round(together, slice * 2.0 * together as f64, Aim::Sweep, &mut first);

    let mut later: Vec<Vec<Phase>> = Vec::new();
    let (granted, windows) = board.grant(IDLE_PART * total, HEATED_PART * total);
    for (offer, slots) in &granted {
        later.extend(board.special(*offer, *slots, total));
    }
    let mut rounds = Vec::new();
    let each = SHORTEST * 2.0 * together as f64;
    let most = if together == 0 { 0 } else { (PAIRS_PART * total / each) as usize };
    let most = most.min(pairs::rounds(brief.site.seats.len()).saturating_sub(1));
    for _ in 0..most {
        let mut round = Vec::new();
        board.next_round(together, each, Aim::Pairs, &mut round);
        rounds.push(round);
    }
    let pair_windows = (pairs::rounds(brief.site.seats.len()) as u64).div_ceil(1 + most as u64);
    later.extend(rounds);

    let spent: f64 = first.iter().chain(later.iter().flatten()).map(|p| p.seconds + CHANGE).sum();
    later.extend(board.value((total - spent).max(0.0)).into_iter().map(|phase| vec![phase]));
    slots::shuffle(&mut later, &mut board.rng);
    first.extend(later.into_iter().flatten());
    let mut settings: Vec<Setting> = first.iter().map(|p| p.setting).collect();
    settings.sort_unstable();
    settings.dedup();
    Plan {
        phases: first,
        sweep: true,
        left_out: 0,
        grid: Grid { cells, uncovered, windows: windows.max(if together == 0 { 1 } else { pair_windows }) },
        settings,
    }
}

impl Plan {
    /// Slices of all cpus together.
    pub fn slices(&self) -> usize {
        self.phases.iter().flat_map(|p| &p.tracks).map(|(_, slices)| slices.len()).sum()
    }

    /// How often each cpu has every unit in the plain setting, at least.
    pub fn rounds(&self) -> u32 {
        u32::from(self.sweep)
    }
}

/// One cell of a host's grid.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct GridCell {
    /// Logical cpu.
    pub cpu: Cpu,
    /// The second cpu of a kernel for two.
    pub partner: Option<Cpu>,
    /// What.
    pub unit: Unit,
    /// Under which setting.
    pub setting: Setting,
}

/// Every cell that windows of `budget` cover on this host, given enough of them.
pub fn cells(site: &Site, units: &[Unit], budget: Duration) -> Vec<GridCell> {
    let plain = plain(site);
    let others = settings::others(site, budget);
    let mut cells = Vec::new();
    for seat in &site.seats {
        for &unit in units {
            let Some(kernel) = kernels::catalogue::find(unit.kernel) else { continue };
            let cell = GridCell { cpu: seat.cpu, partner: None, unit, setting: plain };
            if kernel.cpus() == 2 {
                let others = site.seats.iter().filter(|o| o.cpu != seat.cpu);
                cells.extend(others.map(|o| GridCell { partner: Some(o.cpu), ..cell }));
                continue;
            }
            cells.push(cell);
            if kernel.sizes().first() == Some(&unit.size) {
                cells.extend(others.iter().map(|o| GridCell { setting: o.setting, ..cell }));
            }
        }
    }
    cells
}

/// A record's words to what a plan speaks of.
pub fn unit_of(kernel: &str, variant: &str, condition: &str) -> Option<(Unit, Condition)> {
    let condition: Condition = condition.parse().ok()?;
    let kernel = kernels::catalogue::find(kernel)?;
    let unit = Unit { kernel: kernel.id(), variant: Variant::parse(variant)?, size: kernels::Size(condition.kib) };
    Some((unit, condition))
}

/// A generator for one purpose of a window's seed.
fn stream(seed: u64, number: u64) -> ChaCha12Rng {
    let mut rng = ChaCha12Rng::seed_from_u64(seed);
    rng.set_stream(number);
    rng
}

/// A number below `n`, by the remainder: the bias at these lengths is below 2⁻⁵⁰.
pub(super) fn below(rng: &mut impl Rng, n: usize) -> usize {
    (rng.next_u64() % n.max(1) as u64) as usize
}

/// Whether slices of this setting come right after a heating.
fn heated(setting: Setting) -> Option<u16> {
    match setting.before {
        Before::Heated(seconds) => Some(seconds),
        _ => None,
    }
}

#[cfg(test)]
#[path = "plan_tests.rs"]
mod tests;
