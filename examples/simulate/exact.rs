//! Coverage of the exact intervals and bounds where counts are independent, over rates and exposures: simulated, and
//! for the Poisson ones also summed over the law itself.

use crate::process::generator;
use proofhouse::stats;
use rand_distr::{Binomial, Distribution, Poisson};
use rayon::prelude::*;

/// Share of the error probability by which a simulated coverage may fall short: 94.5 % where 95 % are promised.
const SLACK: f64 = 0.1;

type Method = fn(u64, u64, f64) -> Option<(f64, f64)>;

/// Plays the grid; whether every point keeps its promise.
pub fn run(replicates: u64, seed: u64) -> bool {
    println!(
        "{replicates} counts a point, seed {seed}. Exact methods are accepted from 94.5 % at 95 %, and as far below"
    );
    println!("another confidence; mid-P and Wilson promise 95 % on average only and are shown.");
    println!("{:<34}{:>7} {:>10} {:>9} {:>9}", "method", "points", "confidence", "least", "mean");
    let per_run: [(&str, bool, Method); 5] = [
        ("Clopper-Pearson, two-sided", true, |x, n, c| {
            stats::clopper_pearson(x, n, c).ok().map(|i| (i.lower, i.upper))
        }),
        ("Clopper-Pearson, upper", true, |x, n, c| stats::clopper_pearson_upper(x, n, c).ok().map(|u| (0.0, u))),
        ("Clopper-Pearson, lower", true, |x, n, c| stats::clopper_pearson_lower(x, n, c).ok().map(|l| (l, 1.0))),
        ("mid-P per run", false, |x, n, c| stats::mid_p(x, n, c).ok().map(|i| (i.lower, i.upper))),
        ("Wilson", false, |x, n, c| stats::wilson(x, n, c).ok().map(|i| (i.lower, i.upper))),
    ];
    // exposure of one: the rate is the expected count
    let per_hour: [(&str, bool, Method); 4] = [
        ("Garwood, two-sided", true, |x, _, c| stats::garwood(x, 1.0, c).ok().map(|i| (i.lower, i.upper))),
        ("Garwood, upper", true, |x, _, c| stats::garwood_upper(x, 1.0, c).ok().map(|u| (0.0, u))),
        ("Garwood, lower", true, |x, _, c| stats::garwood_lower(x, 1.0, c).ok().map(|l| (l, f64::INFINITY))),
        ("mid-P per hour", false, |x, _, c| stats::mid_p_rate(x, 1.0, c).ok().map(|i| (i.lower, i.upper))),
    ];
    let means = [0.05, 0.2, 0.5, 1.0, 2.0, 3.0, 5.0, 10.0, 30.0, 100.0, 1000.0];
    let mut kept = true;
    for confidence in [0.8, 0.95, 0.999] {
        for (name, exact, method) in per_run {
            let runs = [20u64, 1000, 1_000_000, 1_000_000_000_000];
            let points: Vec<(u64, f64)> = runs
                .iter()
                .flat_map(|&n| means.iter().map(move |m| (n, m / n as f64)))
                .filter(|(_, p)| *p < 1.0)
                .collect();
            let draw = |at: usize, rng: &mut _| Binomial::new(points[at].0, points[at].1).expect("a law").sample(rng);
            let shares = cover(points.len(), replicates, seed, |at, rng| {
                let (n, p) = points[at];
                method(draw(at, rng), n, confidence).is_some_and(|(l, u)| l <= p && p <= u)
            });
            kept &= line(name, exact, confidence, &shares, Some(replicates));
        }
        for (name, exact, method) in per_hour {
            let shares = cover(means.len(), replicates, seed, |at, rng| {
                let count: f64 = Poisson::new(means[at]).expect("a law").sample(rng);
                method(count as u64, 0, confidence).is_some_and(|(l, u)| l <= means[at] && means[at] <= u)
            });
            kept &= line(name, exact, confidence, &shares, Some(replicates));
            // the same without chance: the probabilities of the counts whose interval covers
            let summed: Vec<f64> = means.iter().map(|&mean| summed(mean, confidence, method)).collect();
            kept &= line(&format!("{name}, summed"), exact, confidence, &summed, None);
        }
    }
    kept
}

fn cover(
    points: usize,
    replicates: u64,
    seed: u64,
    covered: impl Fn(usize, &mut rand_chacha::ChaCha8Rng) -> bool + Sync,
) -> Vec<f64> {
    let share = |at: usize| {
        let mut rng = generator(seed, at as u64, u64::MAX);
        (0..replicates).filter(|_| covered(at, &mut rng)).count() as f64 / replicates as f64
    };
    (0..points).into_par_iter().map(share).collect()
}

fn summed(mean: f64, confidence: f64, method: Method) -> f64 {
    let (mut point, mut sum) = ((-mean).exp(), 0.0);
    if point == 0.0 {
        return f64::NAN;
    }
    for x in 0..(mean + 12.0 * mean.sqrt() + 40.0) as u64 {
        if x > 0 {
            point *= mean / x as f64;
        }
        if method(x, 0, confidence).is_some_and(|(l, u)| l <= mean && mean <= u) {
            sum += point;
        }
    }
    sum
}

/// `replicates`: how many counts a point rests on; none where it is summed, and then the method has to keep its
/// confidence itself.
fn line(name: &str, exact: bool, confidence: f64, shares: &[f64], replicates: Option<u64>) -> bool {
    let known: Vec<f64> = shares.iter().copied().filter(|s| !s.is_nan()).collect();
    let least = known.iter().copied().fold(1.0, f64::min);
    let mean = known.iter().sum::<f64>() / known.len() as f64;
    // 94.5 % at 95 %, as far below on the scale of the error elsewhere; more only where chance alone takes more
    let chance = |n: u64| 4.5 * (confidence * (1.0 - confidence) / n as f64).sqrt();
    let slack =
        replicates.map_or(1e-9, |n| ((1.0 - confidence) * SLACK).max(if confidence > 0.95 { chance(n) } else { 0.0 }));
    let holds = !exact || least >= confidence - slack;
    println!(
        "{name:<34}{:>7} {confidence:>10} {least:>9.5} {mean:>9.5}{}",
        known.len(),
        if holds { "" } else { "  TOO LOW" }
    );
    holds
}
