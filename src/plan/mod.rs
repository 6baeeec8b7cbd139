//! Budget, topology, history and seed to slices in order. Pure: the same input gives the same plan.
//!
//! Every cpu gets every unit (kernel × variant × size) once a round, in an order of its own, so that neighbours and
//! predecessors vary. A window too short for one round takes the units that this cpu has not had for longest.

mod units;

use std::collections::HashMap;
use std::time::Duration;

use kernels::{Size, Variant};
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

pub use units::{Skipped, Unit, available};

use crate::host::Cpu;

/// A slice of this length or more is worth its record and its preparation.
pub const SHORTEST_SLICE: Duration = Duration::from_millis(25);
/// The longest slice, so that a loss or a move voids little and an end comes soon.
pub const LONGEST_SLICE: Duration = Duration::from_secs(2);

/// When a cpu last ran a unit, in Unix milliseconds; what is missing was never run.
pub type History = HashMap<(Cpu, Unit), u64>;

/// One planned slice.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Planned {
    /// What.
    pub unit: Unit,
    /// Operand seeds in order.
    pub seeds: Vec<u64>,
}

/// What each cpu is to do.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Plan {
    /// Slices by cpu, in order.
    pub tracks: Vec<(Cpu, Vec<Planned>)>,
    /// How often each cpu has every unit; 0 when the budget is too short for all of them.
    pub rounds: u32,
    /// Units that each cpu leaves out this time.
    pub left_out: usize,
}

/// Plans a window of `budget` for `cpus`; `seeds` gives the golden seeds of a unit.
pub fn plan(
    cpus: &[Cpu],
    units: &[Unit],
    history: &History,
    budget: Duration,
    seed: u64,
    seeds: impl Fn(&Unit) -> Vec<u64>,
) -> Plan {
    let fitting = (budget.as_secs_f64() / SHORTEST_SLICE.as_secs_f64()) as usize;
    let complete = fitting >= units.len();
    let per_round = budget.as_secs_f64() / units.len().max(1) as f64;
    let rounds = if complete { (per_round / LONGEST_SLICE.as_secs_f64()).ceil().max(1.0) as u32 } else { 0 };
    let slice = Duration::from_secs_f64(per_round / f64::from(rounds.max(1))).clamp(SHORTEST_SLICE, LONGEST_SLICE);
    let tracks = cpus
        .iter()
        .map(|&cpu| {
            // one stream a cpu: adding a cpu leaves the others' plans as they were
            let mut rng = ChaCha12Rng::seed_from_u64(seed);
            rng.set_stream(u64::from(cpu.0));
            let mut slices = Vec::new();
            for _ in 0..rounds.max(1) {
                let mut order = units.to_vec();
                shuffle(&mut order, &mut rng);
                if !complete {
                    // stable: units equally long ago stay in random order
                    order.sort_by_key(|unit| history.get(&(cpu, *unit)).copied().unwrap_or(0));
                    order.truncate(fitting);
                }
                for unit in order {
                    let mut all = seeds(&unit);
                    shuffle(&mut all, &mut rng);
                    all.truncate(cases_in(slice, unit.size));
                    slices.push(Planned { unit, seeds: all });
                }
            }
            (cpu, slices)
        })
        .collect();
    Plan { tracks, rounds, left_out: units.len().saturating_sub(fitting) }
}

/// How many cases fit a slice: each is run for 20 ms and more, so that preparing its operands stays below a fiftieth.
fn cases_in(slice: Duration, size: Size) -> usize {
    let dwell_ms = 20.0 + 0.2 * f64::from(size.0);
    ((slice.as_secs_f64() * 1000.0 / dwell_ms) as usize).max(1)
}

/// Fisher–Yates (Durstenfeld 1964); the modulo bias at these lengths is below 2⁻⁵⁰.
fn shuffle<T>(items: &mut [T], rng: &mut impl Rng) {
    for i in (1..items.len()).rev() {
        let j = (rng.next_u64() % (i as u64 + 1)) as usize;
        items.swap(i, j);
    }
}

/// A name for a condition's footprint and a unit in a record.
pub fn unit_of(kernel: &str, variant: &str, condition: &str) -> Option<Unit> {
    let size = condition.rsplit(' ').next()?.strip_suffix("KiB")?.parse().ok()?;
    let kernel = kernels::catalogue::find(kernel)?.id();
    Some(Unit { kernel, variant: Variant::parse(variant)?, size: Size(size) })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn units(count: u32) -> Vec<Unit> {
        (0..count).map(|n| Unit { kernel: "integer.multiply", variant: Variant::Portable, size: Size(n) }).collect()
    }

    fn make(budget: f64, history: &History, seed: u64) -> Plan {
        plan(&[Cpu(0), Cpu(5)], &units(40), history, Duration::from_secs_f64(budget), seed, |_| (0..64).collect())
    }

    #[test]
    fn every_cpu_has_every_unit_in_every_round() {
        for (budget, rounds) in [(1.5, 1), (60.0, 1), (300.0, 4)] {
            let plan = make(budget, &History::new(), 7);
            assert_eq!((plan.rounds, plan.left_out), (rounds, 0), "{budget} s");
            for (_, slices) in &plan.tracks {
                for unit in units(40) {
                    assert_eq!(slices.iter().filter(|s| s.unit == unit).count(), rounds as usize);
                }
                assert!(slices.iter().all(|s| !s.seeds.is_empty()));
            }
        }
    }

    #[test]
    fn same_seed_same_plan_and_cpus_differ() {
        let plan = make(60.0, &History::new(), 7);
        assert_eq!(plan, make(60.0, &History::new(), 7));
        assert_ne!(plan, make(60.0, &History::new(), 8));
        assert_ne!(plan.tracks[0].1, plan.tracks[1].1);
    }

    #[test]
    fn a_short_window_takes_what_waited_longest() {
        let history: History = units(40).into_iter().map(|u| ((Cpu(0), u), 1000 + u64::from(u.size.0))).collect();
        let plan = make(0.25, &history, 7);
        assert_eq!((plan.rounds, plan.left_out), (0, 30));
        let mut sizes: Vec<u32> = plan.tracks[0].1.iter().map(|s| s.unit.size.0).collect();
        sizes.sort_unstable();
        assert_eq!(sizes, (0..10).collect::<Vec<_>>());
    }
}
