//! Coverage of what `stats::Scatter` chooses to state, on steady, bursting and drifting made-up cores, beside that of the plain
//! Poisson interval on the same counts.

use crate::process::{Kind, Layout, WINDOW, generator, play};
use proofhouse::stats::{Counted, Method, garwood};
use rayon::prelude::*;

const CONFIDENCE: f64 = 0.95;
/// Least coverage that is accepted of what is stated.
const LEAST: f64 = 0.93;
/// And of the number of mismatches beside episodes: one or two of them do not tell whether they cluster.
const LEAST_BESIDE: f64 = 0.9;
/// Replicates over which the true rate of episodes is averaged, beside those that are judged.
const TRUTH: u64 = 2;

struct Outcome {
    covered: bool,
    covered_mismatches: bool,
    covered_plain: bool,
    episodes: bool,
    silent: bool,
    unlimited: bool,
}

/// Plays the lines of the grid in whose names `only` occurs; whether every point keeps its promise.
pub fn run(replicates: u64, seed: u64, only: &str) -> bool {
    let layouts = [
        ("1 window, 10 slices", Layout { windows: 1, slices: 10 }),
        ("1 window, back to back", Layout { windows: 1, slices: 600 }),
        ("20 windows, 10 slices", Layout { windows: 20, slices: 10 }),
        ("20 windows, back to back", Layout { windows: 20, slices: 600 }),
        ("60 windows, 10 slices", Layout { windows: 60, slices: 10 }),
    ];
    let kinds = [
        ("steady", Kind::Steady),
        ("bursts of 2", Kind::Bursts(2.0)),
        ("bursts of 5", Kind::Bursts(5.0)),
        ("bursts of 50", Kind::Bursts(50.0)),
        ("drifting, shape 1", Kind::Drifting(1.0)),
        ("drifting, shape 3", Kind::Drifting(3.0)),
    ];
    println!("{replicates} histories a line, seed {seed}, nominal 95 %, accepted from 93 %.");
    println!("mismatches: their number beside episodes, accepted from 90 %.");
    println!("stated: what the automatic choice states; plain: Garwood on mismatches, as if they were independent.");
    println!(
        "{:<26}{:<19}{:>9}  {:>6} {:>10} {:>6} {:>9} {:>7} {:>9}",
        "exposure", "kind", "occasions", "stated", "mismatches", "plain", "episodes", "silent", "unlimited"
    );
    let mut kept = true;
    for (l, (layout_name, layout)) in layouts.into_iter().enumerate() {
        for (k, (kind_name, kind)) in kinds.into_iter().enumerate() {
            if matches!(kind, Kind::Drifting(_)) && layout.windows < 20 {
                continue;
            }
            if !format!("{layout_name} {kind_name}").contains(only) {
                continue;
            }
            // bursts so dense that a window is one burst say nothing that the line before did not
            let dense = |occasions: f64| occasions * kind.size() * WINDOW / layout.slices as f64 > 20_000.0;
            for (m, occasions) in [0.5, 1.0, 2.0, 3.0, 5.0, 10.0, 30.0, 100.0].into_iter().enumerate() {
                if dense(occasions) {
                    continue;
                }
                let scenario = (100 * l + 10 * k + m) as u64;
                let point = point(layout, kind, occasions, scenario, replicates, seed);
                let holds = point[0] >= LEAST && point[1] >= LEAST_BESIDE;
                kept &= holds;
                println!(
                    "{layout_name:<26}{kind_name:<19}{occasions:>9}  {:>6.4} {:>10.4} {:>6.4} {:>9.3} {:>7.3} {:>9.3}{}",
                    point[0],
                    point[1],
                    point[2],
                    point[3],
                    point[4],
                    point[5],
                    if holds { "" } else { "  TOO LOW" }
                );
            }
        }
    }
    kept
}

fn point(layout: Layout, kind: Kind, occasions: f64, scenario: u64, replicates: u64, seed: u64) -> [f64; 6] {
    let exposure = layout.exposure();
    // bursts of the whole window's time, so that the tested part of it holds the expected number
    let rate = occasions * kind.size() / exposure;
    // what an episode is depends on the gap: its true rate is that of many other histories
    let others = (replicates * TRUTH).max((20_000.0 / occasions) as u64);
    let begun: f64 = (0..others)
        .into_par_iter()
        .map(|n| play(layout, kind, occasions, &mut generator(!seed, scenario, n)).episodes.events())
        .sum();
    let episode_rate = begun / others as f64 / exposure;
    let outcomes: Vec<Outcome> = (0..replicates)
        .into_par_iter()
        .map(|n| judge(layout, kind, occasions, (rate, episode_rate), &mut generator(seed, scenario, n)))
        .collect();
    let share = |of: fn(&Outcome) -> bool| outcomes.iter().filter(|o| of(o)).count() as f64 / replicates as f64;
    [
        share(|o| o.covered),
        share(|o| o.covered_mismatches),
        share(|o| o.covered_plain),
        share(|o| o.episodes),
        share(|o| o.silent),
        share(|o| o.unlimited),
    ]
}

fn judge(
    layout: Layout,
    kind: Kind,
    occasions: f64,
    (rate, episode_rate): (f64, f64),
    rng: &mut rand_chacha::ChaCha8Rng,
) -> Outcome {
    let history = play(layout, kind, occasions, rng);
    let choice = history.choose(CONFIDENCE).expect("valid counts");
    let within = |i: proofhouse::stats::Interval, rate: f64| i.lower <= rate && rate <= i.upper;
    let silent = choice.stated.method == Method::Bound;
    // a bound from silence speaks of how often wrong answers begin
    let of_begin = if silent { episode_rate } else { rate };
    let target = if choice.counted == Counted::Episodes { episode_rate } else { of_begin };
    let plain = garwood(history.slices.events() as u64, layout.exposure(), CONFIDENCE).expect("valid counts");
    Outcome {
        covered: within(choice.stated.interval, target),
        covered_mismatches: within(choice.mismatches.interval, of_begin),
        covered_plain: within(plain, rate),
        episodes: choice.counted == Counted::Episodes,
        silent,
        unlimited: choice.mismatches.method == Method::LowerOnly,
    }
}
