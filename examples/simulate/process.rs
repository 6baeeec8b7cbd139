//! When a made-up core is wrong: steadily, in bursts, or more in some windows than in others.

use proofhouse::ledger::episodes::{BadSlice, episodes};
use proofhouse::stats::{Clusters, Scatter};
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, Exp, Exp1, Gamma, Geometric, Uniform};

/// Seconds between one window and the next.
const APART: f64 = 86_400.0;
/// Length of a window, seconds.
pub const WINDOW: f64 = 600.0;
/// Mean time between the mismatches of one burst, seconds.
const WITHIN: f64 = 1.0;

/// Slices of one second each in a window, evenly spread.
#[derive(Clone, Copy, Debug)]
pub struct Layout {
    pub windows: u64,
    pub slices: u64,
}

impl Layout {
    pub fn exposure(&self) -> f64 {
        (self.windows * self.slices) as f64
    }

    /// The slice that is under way at this time of a window, if one is.
    fn slice_at(&self, time: f64) -> Option<u64> {
        let pitch = WINDOW / self.slices as f64;
        let slice = (time / pitch).floor();
        ((0.0..WINDOW).contains(&time) && time - slice * pitch < 1.0).then_some(slice as u64)
    }
}

/// How a core is wrong.
#[derive(Clone, Copy, Debug)]
pub enum Kind {
    /// Independently at one rate.
    Steady,
    /// In bursts with this mean number of mismatches (geometric), a second apart.
    Bursts(f64),
    /// Independently within a window, at a rate that differs from window to window (gamma law of this shape).
    Drifting(f64),
}

impl Kind {
    /// Mismatches per occasion.
    pub fn size(self) -> f64 {
        if let Kind::Bursts(mean) = self { mean } else { 1.0 }
    }
}

pub fn generator(seed: u64, scenario: u64, replicate: u64) -> ChaCha8Rng {
    let mut key = [0u8; 32];
    for (slot, word) in key.chunks_mut(8).zip([seed, scenario, replicate]) {
        slot.copy_from_slice(&word.to_le_bytes());
    }
    ChaCha8Rng::from_seed(key)
}

/// Plays all windows. `occasions` is the expected number of bursts (or of mismatches, where they are independent) in the
/// tested time of all windows together.
pub fn play(layout: Layout, kind: Kind, occasions: f64, rng: &mut ChaCha8Rng) -> Scatter {
    let per_second = occasions / layout.exposure();
    let mut bad: Vec<BadSlice> = Vec::new();
    for window in 0..layout.windows {
        let rate = match kind {
            Kind::Drifting(shape) => per_second * Gamma::new(shape, 1.0 / shape).expect("a shape").sample(rng),
            _ => per_second,
        };
        for (slice, times) in mismatches(layout, kind, rate, rng) {
            let origin = window as f64 * APART;
            let clock = |t: f64| ((origin + t) * 1000.0) as u64;
            bad.push(BadSlice {
                job_id: window,
                slice,
                first_ms: clock(times[0]),
                last_ms: clock(times[times.len() - 1]),
                runs: 1000,
                busy_ns: 1_000_000_000,
                mismatches: times.len() as u64,
                fold_wrong: false,
            });
        }
    }
    history(layout, &bad)
}

/// Times of the mismatches that fall into slices of one window, by slice.
fn mismatches(layout: Layout, kind: Kind, rate: f64, rng: &mut ChaCha8Rng) -> Vec<(u64, Vec<f64>)> {
    let mut times = Vec::new();
    if rate <= 0.0 {
        return Vec::new();
    }
    let gap = Exp::new(rate).expect("a rate");
    match kind {
        Kind::Steady | Kind::Drifting(_) => {
            // busy time only: what falls between the slices is nobody's
            let mut at = gap.sample(rng);
            let pitch = WINDOW / layout.slices as f64;
            while at < layout.slices as f64 {
                times.push(at.floor() * pitch + at.fract().min(0.999_999));
                at += gap.sample(rng);
            }
        }
        Kind::Bursts(mean) => {
            // bursts that began before the window reach into it
            let more = Geometric::new(1.0 / mean).expect("a mean");
            let mut begin = -40.0 * mean * WITHIN + gap.sample(rng);
            while begin < WINDOW {
                let mut at = begin + Uniform::new(0.0, WITHIN).expect("a range").sample(rng);
                for _ in 0..=more.sample(rng) {
                    times.push(at);
                    let pause: f64 = Exp1.sample(rng);
                    at += WITHIN * pause;
                }
                begin += gap.sample(rng);
            }
            times.sort_by(f64::total_cmp);
        }
    }
    let mut found: Vec<(u64, Vec<f64>)> = Vec::new();
    for time in times {
        let Some(slice) = layout.slice_at(time) else { continue };
        match found.last_mut() {
            Some((last, times)) if *last == slice => times.push(time),
            _ => found.push((slice, vec![time])),
        }
    }
    found
}

fn history(layout: Layout, bad: &[BadSlice]) -> Scatter {
    let window_ms = (APART * 1000.0) as u64;
    let grouped = |of: &dyn Fn(&BadSlice) -> u64| {
        let mut groups: Vec<(u64, u64)> = Vec::new();
        for slice in bad {
            match groups.last_mut() {
                Some((group, events)) if *group == of(slice) => *events += slice.mismatches,
                _ => groups.push((of(slice), slice.mismatches)),
            }
        }
        groups
    };
    let mut by_window: Vec<(u64, u64)> = Vec::new();
    for episode in episodes(bad, 60_000) {
        match by_window.last_mut() {
            Some((window, events)) if *window == episode.first_ms / window_ms => *events += 1,
            _ => by_window.push((episode.first_ms / window_ms, 1)),
        }
    }
    let clusters = |number: u64, hit: &[(u64, u64)]| {
        let length = layout.exposure() / number as f64;
        Clusters {
            number,
            exposure: layout.exposure(),
            squares: number as f64 * length * length,
            hit: hit.iter().map(|(_, events)| (*events, length)).collect(),
        }
    };
    let minutes = layout.windows * layout.slices.min(WINDOW as u64 / 60);
    Scatter {
        slices: clusters(layout.windows * layout.slices, &grouped(&|s| s.job_id * layout.slices + s.slice)),
        minutes: clusters(minutes, &grouped(&|s| s.first_ms / 60_000)),
        spells: clusters(minutes / 2, &grouped(&|s| s.first_ms / 120_000)),
        windows: clusters(layout.windows, &grouped(&|s| s.job_id)),
        episodes: clusters(layout.windows, &by_window),
    }
}
