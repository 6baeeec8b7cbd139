//! Do counts scatter more than chance alone would make them? Failures that cluster do.

use super::interval::{StatsError, check_exposure};
use super::law::Poisson;
use serde::{Deserialize, Serialize};

/// Fisher's dispersion test of counts that should share one rate.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Dispersion {
    /// Number of counts.
    pub cells: usize,
    /// Mean count.
    pub mean: f64,
    /// Sample variance of the counts (divisor cells − 1).
    pub variance: f64,
    /// χ² over its degrees of freedom: 1 where only chance scatters the counts. With equal exposures variance / mean.
    pub index: f64,
    /// Σ (count − expected)² / expected.
    pub chi_square: f64,
    /// cells − 1.
    pub degrees: usize,
    /// Shape k of the negative binomial law by moments, mean² / (variance − mean); small where counts clump, `None` where
    /// they scatter no more than chance.
    pub moment_shape: Option<f64>,
    /// Probability of a χ² this large or larger if only chance scatters the counts.
    pub p_upper: f64,
}

/// Dispersion test of counts from equal exposures.
///
/// # Errors
/// Fewer than two counts, or no events at all.
///
/// Source: R. A. Fisher, Statistical Methods for Research Workers, section 16; approximate while the mean is below 1.
pub fn dispersion(counts: &[u64]) -> Result<Dispersion, StatsError> {
    dispersion_by(counts, |_| 1.0)
}

/// Dispersion test of counts from unequal exposures (one per count, > 0): each count is expected to have its share.
///
/// # Errors
/// Lists of different lengths, fewer than two counts, an exposure that is not positive and finite, or no events.
///
/// Source: R. A. Fisher, Statistical Methods for Research Workers, section 16, with expectations by exposure.
pub fn dispersion_with_exposure(counts: &[u64], exposures: &[f64]) -> Result<Dispersion, StatsError> {
    if counts.len() != exposures.len() {
        return Err(StatsError::Lengths { counts: counts.len(), exposures: exposures.len() });
    }
    exposures.iter().try_for_each(|&exposure| check_exposure(exposure))?;
    dispersion_by(counts, |cell| exposures[cell])
}

fn dispersion_by(counts: &[u64], exposure: impl Fn(usize) -> f64) -> Result<Dispersion, StatsError> {
    let cells = counts.len();
    if cells < 2 {
        return Err(StatsError::TooFew { name: "counts", given: cells, needed: 2 });
    }
    let events: f64 = counts.iter().map(|&count| count as f64).sum();
    if events == 0.0 {
        return Err(StatsError::NoEvents("the dispersion"));
    }
    let degrees = cells - 1;
    let mean = events / cells as f64;
    let variance = counts.iter().map(|&count| (count as f64 - mean).powi(2)).sum::<f64>() / degrees as f64;
    let all: f64 = (0..cells).map(&exposure).sum();
    let chi_square: f64 = counts
        .iter()
        .enumerate()
        .map(|(cell, &count)| {
            let expected = events * (exposure(cell) / all);
            (count as f64 - expected).powi(2) / expected
        })
        .sum();
    let p_upper = Poisson::chi_square_above(degrees as f64, chi_square);
    let index = chi_square / degrees as f64;
    let moment_shape = (variance > mean).then(|| mean * mean / (variance - mean));
    Ok(Dispersion { cells, mean, variance, index, chi_square, degrees, moment_shape, p_upper })
}
