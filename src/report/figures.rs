//! Counts and times to rates with their intervals. Which interval is chosen, and why, stands in `stats::choice`.

use serde::Serialize;

use crate::ledger::Cell;
use crate::stats::{self, Choice, Counted, Interval, Method, Stated};

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

fn rate(stated: &Stated) -> Rate {
    let method = match stated.method {
        Method::Bound => "Garwood, one-sided",
        Method::Exact => "Garwood, two-sided",
        Method::Robust => "cluster-robust (Korn-Graubard), two-sided",
        Method::LowerOnly => "lower limit of the episodes (Garwood); no upper limit",
    };
    Rate { interval: stated.interval, method }
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

/// The bound per busy hour that silence gives: Garwood, one-sided. None for no exposure.
pub fn silent(busy_ns: u128, confidence: f64) -> Option<Rate> {
    let upper = stats::garwood_upper(0, busy_ns as f64 / HOUR_NS, confidence).ok()?;
    Some(bound(upper, confidence, "Garwood, one-sided"))
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
    /// Episodes per busy hour, where there were any.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub episodes_per_hour: Option<Rate>,
    /// What the statement counts: `mismatches`, or `episodes` where too little is known of their clusters.
    pub counted: Counted,
    /// The probability that chance alone would scatter mismatches over time like this; present where it is small.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub clustering: Option<f64>,
}

impl Figures {
    /// The figures of `cell`; mismatches closer together than `gap_ms` are one episode.
    pub fn of(cell: &Cell, confidence: f64, gap_ms: u64) -> Figures {
        let wrong = cell.wrong();
        let mut figures = Figures {
            runs: u64::try_from(cell.runs).unwrap_or(u64::MAX),
            busy_s: cell.busy_ns as f64 / 1e9,
            mismatches: u64::try_from(wrong).unwrap_or(u64::MAX),
            episodes: 0,
            per_run: per_run(wrong, cell.runs, confidence),
            per_hour: None,
            episodes_per_hour: None,
            counted: Counted::Mismatches,
            clustering: None,
        };
        if wrong == 0 {
            figures.per_hour = silent(cell.busy_ns, confidence);
            return figures;
        }
        figures.episodes = cell.episodes(gap_ms).len() as u64;
        if let Ok(choice) = cell.scatter(gap_ms).choose(confidence) {
            figures.take(&choice, cell);
        }
        figures
    }

    fn take(&mut self, choice: &Choice, cell: &Cell) {
        self.counted = choice.counted;
        self.clustering = choice.clustering;
        self.per_hour = Some(rate(&choice.mismatches));
        self.episodes_per_hour = choice.episodes.as_ref().map(rate);
        // runs that fail in clusters are no independent trials: the interval per hour in the unit of runs
        if choice.mismatches.method != Method::Exact && cell.runs > 0 {
            let hours_a_run = cell.busy_ns as f64 / HOUR_NS / cell.runs as f64;
            let of_hour = rate(&choice.mismatches);
            let mut interval = of_hour.interval.scaled(hours_a_run);
            if interval.upper.is_finite() {
                interval.upper = interval.upper.min(1.0);
            }
            self.per_run = Some(Rate { interval, ..of_hour });
        }
    }

    /// The rate that the statement speaks of.
    pub fn stated(&self) -> Option<&Rate> {
        match self.counted {
            Counted::Mismatches => self.per_hour.as_ref(),
            Counted::Episodes => self.episodes_per_hour.as_ref(),
        }
    }

    /// The stated rate as a table shows it; episodes are marked as such.
    pub fn column(&self) -> String {
        let Some(rate) = self.stated() else { return "unknown".to_owned() };
        let i = &rate.interval;
        if self.mismatches == 0 {
            return format!("< {}", short(i.upper));
        }
        let unit = if self.counted == Counted::Episodes { " episodes" } else { "" };
        format!("{} ({} to {}){unit}", short(i.estimate), short(i.lower), short(i.upper))
    }

    /// The statement that these figures support, without an opinion on health.
    pub fn statement(&self) -> String {
        let Some(rate) = self.stated() else { return "nothing was run, so nothing is known".to_owned() };
        let percent = percent(rate.interval.confidence);
        let upper = short(rate.interval.upper);
        if self.mismatches == 0 {
            return format!("fewer than {upper} wrong per hour of this work at this condition ({percent})");
        }
        let (estimate, lower) = (short(rate.interval.estimate), short(rate.interval.lower));
        match self.counted {
            Counted::Mismatches => {
                let note = match (rate.method.starts_with("cluster"), self.clustering) {
                    (false, _) => "",
                    (true, Some(_)) => "; wrong answers cluster, and the limits allow for it",
                    (true, None) => "; the limits allow for clusters",
                };
                format!(
                    "{estimate} wrong per hour of this work at this condition, {lower} to {upper} ({percent}){note}"
                )
            }
            Counted::Episodes => {
                let (n, plural) = (self.episodes, if self.episodes == 1 { "" } else { "s" });
                let cluster = match self.clustering {
                    Some(_) => "; wrong answers cluster, so episodes are counted",
                    None => "",
                };
                format!(
                    "{n} episode{plural} of wrong answers: {estimate} per hour of this work at this condition, {lower} to \
                     {upper} ({percent}){cluster}"
                )
            }
        }
    }
}

/// Said where a figure speaks of several kernels or conditions together.
pub const MIX: &str = "A figure for several kernels or conditions together speaks of that mix, each part weighted by its \
busy time; it bounds no part of it, and a part that was run little may hide a high rate.";

/// A confidence as people write it.
pub fn percent(confidence: f64) -> String {
    let text = format!("{:.7}", confidence * 100.0);
    format!("{} %", text.trim_end_matches('0').trim_end_matches('.'))
}

/// A number with three digits that count.
pub fn short(value: f64) -> String {
    if value == f64::INFINITY {
        "no limit".to_owned()
    } else if value == 0.0 {
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
        let rate = silent(3_600_000_000_000, 0.95).unwrap();
        assert!((rate.interval.upper - 2.995_732_273_553_991).abs() < 1e-9);
        assert_eq!(rate.interval.estimate, 0.0);
        assert!(silent(0, 0.95).is_none());
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
