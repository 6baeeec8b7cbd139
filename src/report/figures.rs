//! Counts and times to rates with their intervals: exact ones, and a one-sided bound where nothing was seen.

use serde::Serialize;

use crate::ledger::Cell;
use crate::stats::{self, Interval};

/// Nanoseconds in an hour.
const HOUR_NS: f64 = 3.6e12;

/// A rate with its interval and how that was made.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Rate {
    /// Estimate, lower, upper, confidence.
    #[serde(flatten)]
    pub interval: Interval,
    /// Name of the method.
    pub method: &'static str,
}

/// Probability of a wrong output per run: Clopper–Pearson; one-sided upper bound where nothing was seen. None for no
/// runs.
pub fn per_run(mismatches: u128, runs: u128, confidence: f64) -> Option<Rate> {
    let runs = u64::try_from(runs).ok().filter(|r| *r > 0)?;
    let mismatches = u64::try_from(mismatches).ok()?.min(runs);
    if mismatches == 0 {
        let upper = stats::clopper_pearson_upper(0, runs, confidence).ok()?;
        return Some(bound(upper, confidence, "Clopper-Pearson, one-sided"));
    }
    let interval = stats::clopper_pearson(mismatches, runs, confidence).ok()?;
    Some(Rate { interval, method: "Clopper-Pearson, two-sided" })
}

/// Events per busy hour: Garwood; one-sided upper bound where nothing was seen. None for no exposure.
pub fn per_hour(events: u128, busy_ns: u128, confidence: f64) -> Option<Rate> {
    let events = u64::try_from(events).ok()?;
    if busy_ns == 0 {
        return None;
    }
    let hours = busy_ns as f64 / HOUR_NS;
    if events == 0 {
        let upper = stats::garwood_upper(0, hours, confidence).ok()?;
        return Some(bound(upper, confidence, "Garwood, one-sided"));
    }
    let interval = stats::garwood(events, hours, confidence).ok()?;
    Some(Rate { interval, method: "Garwood, two-sided" })
}

fn bound(upper: f64, confidence: f64, method: &'static str) -> Rate {
    Rate { interval: Interval { estimate: 0.0, lower: 0.0, upper, confidence }, method }
}

/// Counts, exposure and rates of a cell or of several together.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Figures {
    /// Runs.
    pub runs: u64,
    /// Processor time inside kernels, seconds.
    pub busy_s: f64,
    /// Wrong outputs.
    pub mismatches: u64,
    /// Clusters of wrong outputs.
    pub episodes: u64,
    /// Wrong outputs per run.
    pub per_run: Option<Rate>,
    /// Wrong outputs per busy hour.
    pub per_hour: Option<Rate>,
    /// Episodes per busy hour, where there were mismatches: mismatches within an episode are not independent.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub episodes_per_hour: Option<Rate>,
}

impl Figures {
    /// The figures of `cell`; mismatches closer together than `gap_ms` are one episode.
    pub fn of(cell: &Cell, confidence: f64, gap_ms: u64) -> Figures {
        let episodes = cell.episodes(gap_ms).len() as u64;
        Figures {
            runs: u64::try_from(cell.runs).unwrap_or(u64::MAX),
            busy_s: cell.busy_ns as f64 / 1e9,
            mismatches: u64::try_from(cell.mismatches).unwrap_or(u64::MAX),
            episodes,
            per_run: per_run(cell.mismatches, cell.runs, confidence),
            per_hour: per_hour(cell.mismatches, cell.busy_ns, confidence),
            episodes_per_hour: (episodes > 0)
                .then(|| per_hour(u128::from(episodes), cell.busy_ns, confidence))
                .flatten(),
        }
    }

    /// The statement that these figures support, without an opinion on health.
    pub fn statement(&self) -> String {
        let Some(rate) = &self.per_hour else { return "nothing was run, so nothing is known".to_owned() };
        let percent = percent(rate.interval.confidence);
        if self.mismatches == 0 {
            format!(
                "fewer than {} wrong per hour of this work at this condition ({percent})",
                short(rate.interval.upper)
            )
        } else {
            let (lower, upper) = (short(rate.interval.lower), short(rate.interval.upper));
            format!(
                "{} wrong per hour of this work at this condition, {lower} to {upper} ({percent})",
                short(rate.interval.estimate)
            )
        }
    }
}

/// A confidence as people write it.
pub fn percent(confidence: f64) -> String {
    let text = format!("{:.7}", confidence * 100.0);
    format!("{} %", text.trim_end_matches('0').trim_end_matches('.'))
}

/// A number with three digits that count.
pub fn short(value: f64) -> String {
    if value == 0.0 {
        "0".to_owned()
    } else if !(1e-3..1e6).contains(&value.abs()) {
        format!("{value:.2e}")
    } else {
        let digits = (2 - value.abs().log10().floor() as i32).max(0) as usize;
        format!("{value:.digits$}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Rule of three, Hanley & Lippman-Hand 1983: 95 % upper rate of zero events in one hour is 3.0 per hour.
    #[test]
    fn nothing_seen_gives_the_one_sided_bound() {
        let rate = per_hour(0, 3_600_000_000_000, 0.95).unwrap();
        assert!((rate.interval.upper - 2.995_732_273_553_991).abs() < 1e-9);
        assert_eq!(rate.interval.estimate, 0.0);
        assert!(per_hour(0, 0, 0.95).is_none());
        assert!(per_run(0, 0, 0.95).is_none());
    }

    #[test]
    fn numbers_for_people_keep_three_digits() {
        let cases =
            [(0.0, "0"), (1234.5, "1234"), (3.0, "3.00"), (0.0712, "0.0712"), (2.5e-7, "2.50e-7"), (64.04, "64.0")];
        for (value, text) in cases {
            assert_eq!(short(value), text);
        }
        assert_eq!(percent(0.95), "95 %");
        assert_eq!(percent(0.999), "99.9 %");
    }
}
