//! The settings that a host allows, and what each costs.
//!
//! What asks for them: Wang et al., SOSP 2023 (one core failed only while others were busy; rates follow temperature,
//! some below 59 °C not at all); Hochschild et al., HotOS 2021 (rates vary with frequency, voltage, temperature; a lower
//! frequency sometimes raises them); Reddi et al., MICRO 2010, Kim et al., MICRO 2012, Bertran et al., MICRO 2014 (voltage
//! droop follows the stimulus's frequency, its step, and its alignment across cores).

use std::time::Duration;

use super::Site;
use crate::condition::{Arrangement, Before, Pace, Setting};

/// Seconds of the shortest slice at full pace.
pub const SHORTEST: f64 = 0.025;
/// The same where most other cpus rest meanwhile.
const LONELY: f64 = 0.015;
/// How long a core rests before a cool start.
const REST_MS: u16 = 300;

/// A setting that this host allows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Offer {
    /// The setting.
    pub setting: Setting,
    /// Seconds of one slice.
    pub slice: f64,
    /// Part of the tested cpus' time that is idle while it is under way.
    pub idle: f64,
}

/// The plain setting: every cpu at full pace, which on a host of one cpu is that one alone.
pub fn plain(site: &Site) -> Setting {
    let arrangement = if site.seats.len() > 1 { Arrangement::All } else { Arrangement::Solo };
    Setting { arrangement, ..Setting::PLAIN }
}

/// How long a core is heated in a window of this length; not at all in a short one.
pub fn heating(budget: Duration) -> Option<u16> {
    match budget.as_secs() {
        0..60 => None,
        60..300 => Some(3),
        _ => Some(10),
    }
}

/// Every setting but the plain one that `site` allows in a window of `budget`.
pub fn others(site: &Site, budget: Duration) -> Vec<Offer> {
    let plain = plain(site);
    let cpus = site.seats.len() as f64;
    let cores = site.cores();
    let threads = cores.iter().map(|(_, cpus)| cpus.len()).max().unwrap_or(1);
    let paces: &[(Pace, f64)] = &[
        (Pace::Steady { percent: 75 }, 0.1),
        (Pace::Steady { percent: 50 }, 0.1),
        (Pace::Steady { percent: 20 }, 0.1),
        (Pace::Steady { percent: 5 }, 0.2),
        (Pace::Burst { on_us: 10, off_us: 10 }, 0.05),
        (Pace::Burst { on_us: 100, off_us: 100 }, 0.05),
        (Pace::Burst { on_us: 1000, off_us: 1000 }, 0.05),
        (Pace::Burst { on_us: 10_000, off_us: 10_000 }, 0.1),
        (Pace::Burst { on_us: 100_000, off_us: 100_000 }, 0.4),
        (Pace::Burst { on_us: 1000, off_us: 20_000 }, 0.1),
        (Pace::Step { period_us: 2000, dithered: false }, 0.1),
        (Pace::Step { period_us: 2000, dithered: true }, 0.1),
    ];
    let mut list: Vec<Offer> = paces
        .iter()
        .map(|&(pace, slice)| Offer { setting: Setting { pace, ..plain }, slice, idle: 1.0 - pace.duty() })
        .collect();
    if cpus > 1.0 {
        let solo = Setting { arrangement: Arrangement::Solo, ..plain };
        list.push(Offer { setting: solo, slice: LONELY, idle: 1.0 - 1.0 / cpus });
    }
    // with one core only, or one thread a core, these are other words for what is there already
    if cores.len() > 1 && threads > 1 {
        let siblings = Setting { arrangement: Arrangement::Siblings, ..plain };
        list.push(Offer { setting: siblings, slice: LONELY, idle: 1.0 - threads as f64 / cpus });
        let neighbours = Setting { arrangement: Arrangement::Neighbours, ..plain };
        list.push(Offer { setting: neighbours, slice: SHORTEST, idle: 1.0 - cores.len() as f64 / cpus });
    }
    let rest = f64::from(REST_MS) / 1000.0;
    let rested = Setting { before: Before::Rested(REST_MS), ..plain };
    list.push(Offer { setting: rested, slice: rest + 0.05, idle: rest / (rest + 0.05) });
    if let Some(seconds) = heating(budget) {
        let heated = Setting { before: Before::Heated(seconds), ..plain };
        list.push(Offer { setting: heated, slice: 0.1, idle: 0.0 });
    }
    list
}

/// Groups of seats that work at the same time under an arrangement; each group is a phase of its own.
pub fn groups(site: &Site, arrangement: Arrangement) -> Vec<Vec<usize>> {
    let cores = site.cores();
    match arrangement {
        Arrangement::All => vec![(0..site.seats.len()).collect()],
        Arrangement::Solo => (0..site.seats.len()).map(|i| vec![i]).collect(),
        Arrangement::Siblings => cores.into_iter().map(|(_, cpus)| cpus).filter(|cpus| cpus.len() > 1).collect(),
        Arrangement::Neighbours => {
            let threads = cores.iter().map(|(_, cpus)| cpus.len()).max().unwrap_or(1);
            (0..threads).map(|t| cores.iter().filter_map(|(_, cpus)| cpus.get(t).copied()).collect()).collect()
        }
    }
}
