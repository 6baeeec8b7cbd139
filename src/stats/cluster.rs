//! Events that come in clusters carry less information than their number says: the design effect, and what is left.
//! A cluster is whatever may share a cause: a slice, an episode, a host.

use super::interval::{Interval, StatsError, check_exposure, check_runs, ln_error};
use super::law::{CountLaw, Poisson, Tail, WHOLE, normal_reach, student_reach};
use serde::{Deserialize, Serialize};
use std::f64::consts::LN_2;

/// A probability per run from clusters of runs.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ClusteredShare {
    /// Mismatches per run over all clusters.
    pub estimate: f64,
    /// Its standard error, from the scatter between clusters.
    pub standard_error: f64,
    /// Variance over what independent runs would have; above 1 where failures cluster.
    pub design_effect: f64,
    /// Runs in all clusters.
    pub runs: u64,
    /// Mismatches in all clusters.
    pub mismatches: u64,
}

/// Test that groups of clusters share one probability per run.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ClusteredTest {
    /// Pearson's χ² as if the runs were independent.
    pub chi_square_naive: f64,
    /// χ² of the counts divided by their design effects.
    pub chi_square: f64,
    /// Groups − 1.
    pub degrees: usize,
    /// Probability of such a χ² or a larger one if all groups share one probability.
    pub p_value: f64,
}

/// Share of mismatches among the runs of clusters `(mismatches, runs)`, with a standard error that allows for clustering.
///
/// # Errors
/// Fewer than two clusters, a cluster without runs or with more mismatches than runs, or a share of exactly 0 or 1.
///
/// Source: J. N. K. Rao & A. J. Scott, Biometrics 48 (1992).
pub fn clustered_share(clusters: &[(u64, u64)]) -> Result<ClusteredShare, StatsError> {
    let number = clusters.len();
    if number < 2 {
        return Err(StatsError::TooFew { name: "clusters", given: number, needed: 2 });
    }
    clusters.iter().try_for_each(|&(y, n)| check_runs(y, n))?;
    let (mismatches, runs) = clusters.iter().fold((0, 0), |(all, n), cluster| (all + cluster.0, n + cluster.1));
    if mismatches == 0 || mismatches == runs {
        return Err(StatsError::NoEvents("the scatter between clusters"));
    }
    let (estimate, all) = (mismatches as f64 / runs as f64, runs as f64);
    let squares: f64 = clusters.iter().map(|&(y, n)| (y as f64 - n as f64 * estimate).powi(2)).sum();
    let variance = number as f64 / (number - 1) as f64 * squares / (all * all);
    let design_effect = variance * all / (estimate * (1.0 - estimate));
    Ok(ClusteredShare { estimate, standard_error: variance.sqrt(), design_effect, runs, mismatches })
}

/// Test that several groups, each with its own clusters, share one probability per run. Approximate.
///
/// # Errors
/// Fewer than two groups, or as [`clustered_share`] for one of them, or a group without any scatter.
///
/// Source: J. N. K. Rao & A. J. Scott, Biometrics 48 (1992).
pub fn compare_clustered(groups: &[ClusteredShare]) -> Result<ClusteredTest, StatsError> {
    if groups.len() < 2 {
        return Err(StatsError::TooFew { name: "groups", given: groups.len(), needed: 2 });
    }
    groups.iter().try_for_each(|group| check_exposure(group.design_effect))?;
    let chi_square_by = |divisor: fn(&ClusteredShare) -> f64| {
        let parts = || groups.iter().map(|g| (g.mismatches as f64 / divisor(g), g.runs as f64 / divisor(g)));
        let (y, n) = parts().fold((0.0, 0.0), |(y, n), part| (y + part.0, n + part.1));
        let p = y / n;
        parts().map(|(y, n)| (y - n * p).powi(2) / (n * p * (1.0 - p))).sum::<f64>()
    };
    let (chi_square_naive, chi_square) = (chi_square_by(|_| 1.0), chi_square_by(|group| group.design_effect));
    let degrees = groups.len() - 1;
    let p_value = Poisson::chi_square_above(degrees as f64, chi_square);
    Ok(ClusteredTest { chi_square_naive, chi_square, degrees, p_value })
}

/// Expected counts below this are the end of the search for a limit, and no limit.
const LEAST: f64 = 1e-304;

/// Counts by cluster, where clusters without events are only summed: that is all a rate and its scatter need of them.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Clusters {
    /// Clusters in all.
    pub number: u64,
    /// Exposure of all of them.
    pub exposure: f64,
    /// Sum of the squares of all exposures.
    pub squares: f64,
    /// Events and exposure of each cluster that has events.
    pub hit: Vec<(u64, f64)>,
}

impl Clusters {
    /// From every cluster's `(events, exposure)`.
    ///
    /// # Errors
    /// An exposure that is not positive and finite.
    pub fn of(clusters: &[(u64, f64)]) -> Result<Self, StatsError> {
        clusters.iter().try_for_each(|&(_, exposure)| check_exposure(exposure))?;
        let sum = |part: fn(f64) -> f64| clusters.iter().map(|&(_, t)| part(t)).sum();
        let hit = clusters.iter().copied().filter(|(events, _)| *events > 0).collect();
        Ok(Self { number: clusters.len() as u64, exposure: sum(|t| t), squares: sum(|t| t * t), hit })
    }

    /// Events in all clusters.
    #[must_use]
    pub fn events(&self) -> f64 {
        self.hit.iter().map(|(events, _)| *events as f64).sum()
    }

    /// Variance of the number of events over what independent events would have.
    pub(super) fn design_effect(&self) -> f64 {
        let (number, events) = (self.number as f64, self.events());
        let rate = events / self.exposure;
        let hit: f64 = self.hit.iter().map(|&(x, t)| (x as f64 - rate * t).powi(2) - (rate * t).powi(2)).sum();
        number / (number - 1.0) * (hit + rate * rate * self.squares) / events
    }

    /// The probability that events which come independently at one common rate scatter over the clusters as much as
    /// these do or more; 1 where there are too few events or clusters to scatter.
    ///
    /// With an event a cluster or more on average by Fisher's dispersion test; with fewer, where its χ² has no χ² law,
    /// by the number of pairs of events in one cluster: pairs are nearly Poisson then, and any two of them exactly
    /// uncorrelated where exposures are equal.
    ///
    /// Source: R. A. Fisher, Statistical Methods for Research Workers, section 16; J. B. S. Haldane, Biometrika 29
    /// (1937) for the moments; A. D. Barbour, L. Holst & S. Janson, Poisson Approximation (1992), ch. 6, from memory.
    #[must_use]
    pub fn chance_of_scatter(&self) -> f64 {
        let events = self.events();
        if self.number < 2 || events < 2.0 {
            return 1.0;
        }
        if events >= self.number as f64 {
            // Σ (x − e)² / e with e = n t / T
            let squares: f64 = self.hit.iter().map(|&(x, t)| (x as f64).powi(2) / t).sum();
            let chi_square = squares * self.exposure / events - events;
            return Poisson::chi_square_above((self.number - 1) as f64, chi_square);
        }
        let pairs: f64 = self.hit.iter().map(|&(x, _)| x as f64 * (x as f64 - 1.0) / 2.0).sum();
        if pairs == 0.0 {
            return 1.0;
        }
        let mean = 0.5 * events * (events - 1.0) * self.squares / (self.exposure * self.exposure);
        Poisson { mean }.ln_tail(Tail::Upper, pairs, WHOLE).exp().min(1.0)
    }

    /// Interval for the rate of events per unit of exposure, whatever makes the counts of clusters scatter: the Garwood
    /// limits of the number of events that independent ones would have to have for the same variance, that number made
    /// smaller by Student's law because the variance is itself estimated. Never narrower than Garwood's.
    ///
    /// # Errors
    /// Fewer than two clusters, an exposure that is not positive and finite, or a confidence outside (0, 1).
    ///
    /// Source: E. L. Korn & B. I. Graubard, Survey Methodology 24 (1998), carried from shares to rates; from memory.
    pub fn rate(&self, confidence: f64) -> Result<Interval, StatsError> {
        if self.number < 2 {
            return Err(StatsError::TooFew { name: "clusters", given: self.number as usize, needed: 2 });
        }
        check_exposure(self.exposure)?;
        ln_error(confidence)?;
        if self.hit.is_empty() {
            return super::garwood(0, self.exposure, confidence);
        }
        self.rate_scattered(self.design_effect(), (self.number - 1) as usize, confidence)
    }

    /// The same with a design effect from elsewhere, known to so many degrees of freedom (1 or more). Clusters and
    /// exposure are the caller's to check; there are events.
    pub(super) fn rate_scattered(&self, scatter: f64, degrees: usize, confidence: f64) -> Result<Interval, StatsError> {
        let ln_outside = ln_error(confidence)?;
        let effect = if scatter <= 1.0 {
            1.0
        } else {
            scatter * (student_reach(degrees, ln_outside) / normal_reach(ln_outside)).powi(2)
        };
        let events = self.events();
        let limit = |tail| {
            let mean = Poisson::mean_where(tail, events / effect, WHOLE, ln_outside - LN_2);
            // a thousandth of an event is nearly nothing known: the limit lies below every number that can be written
            if mean < LEAST { 0.0 } else { mean * effect / self.exposure }
        };
        let estimate = events / self.exposure;
        Ok(Interval { estimate, lower: limit(Tail::Upper), upper: limit(Tail::Lower), confidence })
    }
}

/// [`Clusters::rate`] of clusters `(events, exposure)`.
///
/// # Errors
/// As there.
pub fn clustered_rate(clusters: &[(u64, f64)], confidence: f64) -> Result<Interval, StatsError> {
    if clusters.len() < 2 {
        return Err(StatsError::TooFew { name: "clusters", given: clusters.len(), needed: 2 });
    }
    Clusters::of(clusters)?.rate(confidence)
}
