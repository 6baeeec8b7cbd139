//! Which interval when. Decided by the counts alone, and said.
//!
//! | the counts | what is stated | interval |
//! |---|---|---|
//! | nothing seen | an upper bound of the rate at which wrong answers begin | Garwood, one-sided |
//! | [`ENOUGH`] minutes or windows have events | mismatches per exposure | cluster-robust: Garwood's, widened by their scatter |
//! | that many slices have, and scatter as chance would have it | mismatches per exposure | Garwood, exact |
//! | fewer | episodes per exposure | Garwood, exact, on episodes |
//! | the same, and episodes scatter over windows | episodes per exposure | cluster-robust, by window |
//!
//! Beside episodes the number of mismatches has Garwood's interval where it scatters as chance would have it, and
//! otherwise a lower limit only, that of the episodes: the size of a burst that has not been seen is bounded by nothing.
//! One or two mismatches cannot show whether they cluster: played over made-up cores, that number beside the statement
//! covers 90 % at least where 95 % are asked for, the statement itself 93 % (`scripts/simulate-statistics intervals`).
//!
//! All of these speak of the rate in the time that was tested. How a core does in other windows, when it is warmer or
//! older, follows from no interval.

use super::cluster::Clusters;
use super::interval::{Interval, StatsError};
use super::poisson::{garwood, garwood_lower, garwood_upper};
use serde::{Deserialize, Serialize};

/// Counts are taken to cluster where chance would scatter them so in at most this share of all cases. Liberal: to
/// allow for scatter where there is none costs some width, the other error costs truth.
pub const LEVEL: f64 = 0.2;

/// Clusters with events from which on the scatter between them is known well enough for an interval.
pub const ENOUGH: usize = 10;

/// Clusters from which on a scatter between them can be told at all.
const FEWEST: u64 = 5;

/// Mismatches by slice, by minute of the clock and by window, and episodes by window. Exposures in one unit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Scatter {
    /// Mismatches by slice.
    pub slices: Clusters,
    /// Mismatches by minute: bursts reach over slices that follow each other.
    pub minutes: Clusters,
    /// Mismatches by two minutes: so do they over minutes.
    pub spells: Clusters,
    /// Mismatches by window.
    pub windows: Clusters,
    /// Episodes by window.
    pub episodes: Clusters,
}

/// What a rate counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Counted {
    /// Wrong answers, each for itself.
    Mismatches,
    /// Occasions: wrong answers with no longer gap between them than the one asked for.
    Episodes,
}

/// How an interval was made.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Method {
    /// Nothing was seen.
    #[serde(rename = "Garwood, one-sided")]
    Bound,
    /// Independent events.
    #[serde(rename = "Garwood, two-sided")]
    Exact,
    /// Events that cluster.
    #[serde(rename = "cluster-robust (Korn-Graubard), two-sided")]
    Robust,
    /// Too few clusters: the lower limit of the episodes, and no upper one.
    #[serde(rename = "lower limit of the episodes (Garwood), no upper limit")]
    LowerOnly,
}

/// An interval and how it was made.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Stated {
    /// Estimate, limits, confidence.
    #[serde(flatten)]
    pub interval: Interval,
    /// How.
    pub method: Method,
}

/// The intervals that a cell's counts support.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Choice {
    /// What the statement counts.
    pub counted: Counted,
    /// The rate of that, per unit of exposure.
    pub stated: Stated,
    /// The rate of mismatches, whatever is counted.
    pub mismatches: Stated,
    /// The rate of episodes, where there were any.
    pub episodes: Option<Stated>,
    /// The probability that chance alone scatters mismatches like this; present where they cluster.
    pub clustering: Option<f64>,
}

impl Scatter {
    /// Chooses.
    ///
    /// # Errors
    /// Exposure not positive and finite, or a confidence outside (0, 1).
    pub fn choose(&self, confidence: f64) -> Result<Choice, StatsError> {
        let (events, exposure) = (self.slices.events(), self.slices.exposure);
        if events == 0.0 {
            let upper = garwood_upper(0, exposure, confidence)?;
            let interval = Interval { estimate: 0.0, lower: 0.0, upper, confidence };
            let stated = Stated { interval, method: Method::Bound };
            let counted = Counted::Mismatches;
            return Ok(Choice { counted, stated, mismatches: stated, episodes: None, clustering: None });
        }
        let exact = |events: f64| -> Result<Stated, StatsError> {
            Ok(Stated { interval: garwood(events as u64, exposure, confidence)?, method: Method::Exact })
        };
        let wandering = self.episodes.number >= FEWEST && self.episodes.chance_of_scatter() <= LEVEL;
        let of_episodes = if wandering {
            Stated { interval: self.episodes.rate(confidence)?, method: Method::Robust }
        } else {
            exact(self.episodes.events())?
        };
        let levels = [&self.slices, &self.minutes, &self.spells, &self.windows];
        let chance = levels.into_iter().map(Clusters::chance_of_scatter).fold(1.0, f64::min);
        let clustering = (chance <= LEVEL).then_some(chance);
        let mismatches = if self.minutes.hit.len().max(self.windows.hit.len()) >= ENOUGH {
            self.widest(confidence)?
        } else if chance > LEVEL {
            exact(events)?
        } else {
            let lower = garwood_lower(self.episodes.events() as u64, exposure, 0.5 + 0.5 * confidence)?;
            let interval = Interval { estimate: events / exposure, lower, upper: f64::INFINITY, confidence };
            Stated { interval, method: Method::LowerOnly }
        };
        let many = levels.into_iter().any(|clusters| clusters.hit.len() >= ENOUGH);
        let counted =
            if many && mismatches.method != Method::LowerOnly { Counted::Mismatches } else { Counted::Episodes };
        let stated = if counted == Counted::Mismatches { mismatches } else { of_episodes };
        Ok(Choice { counted, stated, mismatches, episodes: Some(of_episodes), clustering })
    }

    /// The widest of the cluster-robust intervals over slices, minutes, spells and windows: bursts may be as long as any
    /// of them. Bursts about as long as a spell still tie spells together; what the scatter would be over longer ones
    /// follows from its growth from minutes to spells, as the error of a block mean falls with one over its length
    /// (L. F. Richardson's extrapolation; block means: B. Schmeiser, Operations Research 30, 1982; from memory). The second
    /// level costs a degree of freedom.
    fn widest(&self, confidence: f64) -> Result<Stated, StatsError> {
        let events = self.slices.events();
        let exact = garwood(events as u64, self.slices.exposure, confidence)?;
        let mut stated = Stated { interval: exact, method: Method::Exact };
        let longer = 2.0 * self.spells.design_effect() - self.minutes.design_effect();
        let levels = [&self.slices, &self.minutes, &self.spells, &self.windows];
        let effects = levels.into_iter().map(|clusters| (clusters, clusters.design_effect(), 1));
        for (clusters, effect, spent) in effects.chain([(&self.spells, longer, 2)]) {
            if clusters.number >= FEWEST && effect > 1.0 {
                let interval = clusters.rate_scattered(effect, clusters.number as usize - spent, confidence)?;
                if interval.upper > stated.interval.upper {
                    stated = Stated { interval, method: Method::Robust };
                }
            }
        }
        Ok(stated)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Counts of slices of one hour each, sixty to a window; minutes and spells are slices here.
    fn scatter(slices: &[u64], windows: usize, episodes: &[u64]) -> Scatter {
        let clusters =
            |counts: &[u64], hours: f64| Clusters::of(&counts.iter().map(|&x| (x, hours)).collect::<Vec<_>>()).unwrap();
        let each = slices.len() / windows;
        let sums: Vec<u64> = slices.chunks(each).map(|chunk| chunk.iter().sum()).collect();
        Scatter {
            slices: clusters(slices, 1.0),
            minutes: clusters(slices, 1.0),
            spells: clusters(slices, 1.0),
            windows: clusters(&sums, each as f64),
            episodes: clusters(episodes, each as f64),
        }
    }

    #[test]
    fn silence_is_bounded_by_the_rule_of_three() {
        let choice = scatter(&[0; 10], 1, &[0]).choose(0.95).unwrap();
        assert_eq!((choice.stated.method, choice.episodes), (Method::Bound, None));
        // −ln 0.05 = 2.996, J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983)
        assert!((choice.stated.interval.upper - 0.299_573_227).abs() < 1e-9);
    }

    #[test]
    fn even_counts_have_the_exact_interval_and_many_of_them_are_counted_as_mismatches() {
        let choice = scatter(&[1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1], 1, &[12]).choose(0.95).unwrap();
        assert_eq!(choice.counted, Counted::Mismatches);
        assert_eq!((choice.stated.method, choice.clustering), (Method::Exact, None));
        assert_eq!(choice.stated.interval, garwood(12, 12.0, 0.95).unwrap());
    }

    #[test]
    fn a_single_burst_is_one_episode_and_its_size_has_no_upper_limit() {
        let mut counts = [0; 100];
        counts[40] = 50;
        let choice = scatter(&counts, 1, &[1]).choose(0.95).unwrap();
        assert_eq!(choice.counted, Counted::Episodes);
        assert!(choice.clustering.unwrap() < 1e-9);
        assert_eq!(choice.stated.interval, garwood(1, 100.0, 0.95).unwrap());
        assert_eq!(choice.mismatches.method, Method::LowerOnly);
        assert_eq!(choice.mismatches.interval.upper, f64::INFINITY);
        assert_eq!(choice.mismatches.interval.lower, choice.stated.interval.lower);
    }

    #[test]
    fn many_bursts_widen_the_interval_and_never_narrow_it() {
        let counts: Vec<u64> = (0..100).map(|n| if n % 5 == 0 { 10 } else { 0 }).collect();
        let choice = scatter(&counts, 1, &[20]).choose(0.95).unwrap();
        let plain = garwood(200, 100.0, 0.95).unwrap();
        assert_eq!((choice.counted, choice.stated.method), (Counted::Mismatches, Method::Robust));
        let i = choice.stated.interval;
        assert!(i.lower < plain.lower && i.upper > plain.upper);
        // variance over mean is 100 / 99 · (20 · 8² + 80 · 2²) / 200 = 8.08: about √8.08 = 2.84 times as wide
        let factor = (i.upper - i.lower) / (plain.upper - plain.lower);
        assert!((2.7..3.2).contains(&factor), "{factor}");
    }

    #[test]
    fn what_cannot_be_chosen_from_is_refused() {
        assert!(Scatter::default().choose(0.95).is_err());
        assert!(scatter(&[1, 2], 1, &[1]).choose(1.0).is_err());
        assert!(scatter(&[0, 0], 1, &[0]).choose(f64::NAN).is_err());
    }
}
