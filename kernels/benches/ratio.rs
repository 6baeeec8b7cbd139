//! How near each kernel comes to its yardstick, with the checks on: `ratio [KERNEL…]`, run by `scripts/ratio`.
//!
//! Kernel, yardstick and clock are timed in turn, many short bursts each, so that a neighbour or a change of frequency
//! hits all three alike; of each the fastest burst but for the luckiest few counts. Ends with 1 when a target is missed.

mod checked;
mod cycle;
mod yardsticks;

use std::process::ExitCode;
use std::time::{Duration, Instant};

use checked::Checked;
use kernels::isa::{self, Proof};
use kernels::{Kernel, Variant, catalogue};
use yardsticks::Yardstick;

/// Kernel, variant (every one if none is named), least ratio to the yardstick.
const RATIOS: &[(&str, Option<Variant>, f64)] = &[
    ("integer.multiply", None, 0.90),
    ("vector.integer", None, 0.90),
    ("fma.chain32", Some(Variant::Avx2), 0.95),
    ("fma.chain64", Some(Variant::Avx2), 0.95),
    // against the plain instruction; what counts is scripts/ratio-blas, 0.90 of a library's matrix product
    ("fma.matmul32", Some(Variant::Avx2), 0.85),
    ("fma.matmul64", Some(Variant::Avx2), 0.85),
    ("cipher.aes", None, 0.90),
    ("memory.copy", None, 0.90),
    ("memory.stream", None, 0.90),
];

/// Kernel and variant whose yardstick itself has to reach so many units a cycle, on CPUs with two FMA units of 256 bits.
const UNITS_PER_CYCLE: &[(&str, Variant, f64)] = &[("fma.chain64", Variant::Avx2, 14.0)];

/// Short enough to fit between two interruptions, long enough for the timer.
const BURST: Duration = Duration::from_micros(150);
const ROUNDS: usize = 250;
/// More rounds that a measurement below its target gets before it counts.
const EXTENSIONS: usize = 3;

/// Bursts of one contender, in nanoseconds a call.
struct Bursts {
    calls: u32,
    times: Vec<f64>,
}

impl Bursts {
    fn new(mut call: impl FnMut()) -> Bursts {
        let once = (0..5).map(|_| timed(&mut call)).min().unwrap_or_default().max(Duration::from_nanos(20));
        Bursts { calls: (BURST.as_nanos() / once.as_nanos()).clamp(1, 1 << 20) as u32, times: Vec::new() }
    }

    fn burst(&mut self, mut call: impl FnMut()) {
        let calls = self.calls;
        let time = timed(|| (0..calls).for_each(|_| call()));
        self.times.push(time.as_secs_f64() / f64::from(calls));
    }

    /// Seconds a call of the burst that only one in fifty beat.
    fn best(&mut self) -> f64 {
        self.times.sort_by(f64::total_cmp);
        self.times[self.times.len() / 50]
    }
}

fn timed(mut work: impl FnMut()) -> Duration {
    let start = Instant::now();
    work();
    start.elapsed()
}

/// Units a second of the kernel and of its yardstick, and cycles a second.
struct Rates {
    kernel: f64,
    yardstick: f64,
    clock: f64,
}

impl Rates {
    fn ratio(&self) -> f64 {
        self.kernel / self.yardstick
    }
}

/// Measures until `enough` or the last extension.
fn measure(kernel: &dyn Kernel, proof: Proof, bare: &mut Yardstick, enough: impl Fn(&Rates) -> bool) -> Rates {
    let size = kernel.sizes()[0];
    let mut checked = Checked::new(kernel, size, proof);
    let mut run = || {
        std::hint::black_box(checked.run());
    };
    let mut ours = Bursts::new(&mut run);
    let mut theirs = Bursts::new(&mut bare.run);
    let mut clock = Bursts::new(cycle::dependent_adds);
    let mut extensions = 0;
    loop {
        for _ in 0..ROUNDS {
            ours.burst(&mut run);
            theirs.burst(&mut bare.run);
            clock.burst(cycle::dependent_adds);
        }
        let rates = Rates {
            kernel: kernel.work(size).amount as f64 / ours.best(),
            yardstick: bare.units as f64 / theirs.best(),
            clock: cycle::CYCLES as f64 / clock.best(),
        };
        if enough(&rates) || extensions == EXTENSIONS {
            return rates;
        }
        extensions += 1;
    }
}

fn main() -> ExitCode {
    let wanted: Vec<String> = std::env::args().skip(1).filter(|a| !a.starts_with("--")).collect();
    if let Some(unknown) = wanted.iter().find(|w| catalogue::find(w).is_none()) {
        eprintln!("ratio: no kernel {unknown}");
        return ExitCode::from(2);
    }
    let mut bare = yardsticks::all();
    let mut missed = Vec::new();
    println!(
        "{:<17} {:<9} {:<9} {:>11} {:>11} {:>7} {:>7} {:>11} {:>11} {:>6}",
        "kernel", "variant", "unit", "kernel/s", "bare/s", "ratio", "target", "kernel/cyc", "bare/cyc", "GHz"
    );
    for &kernel in catalogue::KERNELS.iter().filter(|k| wanted.is_empty() || wanted.iter().any(|w| w == k.id())) {
        for (variant, proof) in isa::survey(kernel) {
            let Ok(proof) = proof else { continue };
            let id = kernel.id();
            let Some(yardstick) = bare.iter_mut().find(|y| y.kernel == id && y.variant == variant) else {
                println!("{id:<17} {variant:<9} no yardstick");
                continue;
            };
            let applies = |(k, v, _): &&(&str, Option<Variant>, f64)| *k == id && v.is_none_or(|v| v == variant);
            let least = RATIOS.iter().find(applies).map(|target| target.2);
            let peak = UNITS_PER_CYCLE.iter().find(|(k, v, _)| *k == id && *v == variant).map(|target| target.2);
            let reaches = |r: &Rates| {
                least.is_none_or(|least| r.ratio() >= least) && peak.is_none_or(|peak| r.yardstick / r.clock >= peak)
            };
            let rates = measure(kernel, proof, yardstick, reaches);
            println!(
                "{id:<17} {variant:<9} {:<9} {:>11.4e} {:>11.4e} {:>7.3} {:>7} {:>11.3} {:>11.3} {:>6.3}",
                kernel.work(kernel.sizes()[0]).unit,
                rates.kernel,
                rates.yardstick,
                rates.ratio(),
                least.map_or("-".to_owned(), |least| format!("{least:.2}")),
                rates.kernel / rates.clock,
                rates.yardstick / rates.clock,
                rates.clock / 1e9
            );
            if let Some(least) = least.filter(|least| rates.ratio() < *least) {
                missed.push(format!("{id} {variant}: ratio {:.3} below {least}", rates.ratio()));
            }
            if let Some(peak) = peak.filter(|peak| rates.yardstick / rates.clock < *peak) {
                let reached = rates.yardstick / rates.clock;
                missed.push(format!("{id} {variant}: yardstick {reached:.2} units a cycle, below {peak}"));
            }
        }
    }
    for line in &missed {
        eprintln!("ratio: missed: {line}");
    }
    ExitCode::from(u8::from(!missed.is_empty()))
}
