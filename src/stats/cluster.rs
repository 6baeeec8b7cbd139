//! Events that come in clusters carry less information than their number says: the design effect, and what is left.
//! A cluster is whatever may share a cause: a slice, an episode, a host.

use super::interval::{Interval, StatsError, check_exposure, check_runs, ln_error};
use super::law::{Poisson, Tail, WHOLE};
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

/// Interval for the rate of events per unit of exposure from clusters `(events, exposure)`: the Garwood limits of the
/// number of events that independent ones would have to have for the same variance. Never narrower than Garwood's.
///
/// # Errors
/// Fewer than two clusters, an exposure that is not positive and finite, or a confidence outside (0, 1).
///
/// Source: E. L. Korn & B. I. Graubard, Survey Methodology 24 (1998), carried from shares to rates; from memory.
pub fn clustered_rate(clusters: &[(u64, f64)], confidence: f64) -> Result<Interval, StatsError> {
    let number = clusters.len();
    if number < 2 {
        return Err(StatsError::TooFew { name: "clusters", given: number, needed: 2 });
    }
    clusters.iter().try_for_each(|&(_, exposure)| check_exposure(exposure))?;
    let ln_side = ln_error(confidence)? - LN_2;
    let (events, exposure) = clusters.iter().fold((0.0, 0.0), |(x, t), cluster| (x + cluster.0 as f64, t + cluster.1));
    let rate = events / exposure;
    if events == 0.0 {
        return super::garwood(0, exposure, confidence);
    }
    let squares: f64 = clusters.iter().map(|&(x, t)| (x as f64 - rate * t).powi(2)).sum();
    let design_effect = (number as f64 / (number - 1) as f64 * squares / events).max(1.0);
    let limit = |tail| Poisson::mean_where(tail, events / design_effect, WHOLE, ln_side) * design_effect / exposure;
    Ok(Interval { estimate: rate, lower: limit(Tail::Upper), upper: limit(Tail::Lower), confidence })
}
