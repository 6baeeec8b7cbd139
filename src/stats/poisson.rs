//! Events in exposure: intervals for a rate. The unit of the rate is one over the unit of the exposure.

use super::interval::{Interval, StatsError, check_exposure, ln_error};
use super::law::{CountLaw, HALF, Poisson, Tail, WHOLE};
use std::f64::consts::LN_2;

/// Two-sided exact interval for the rate of events per unit of exposure.
///
/// # Errors
/// Exposure not positive and finite, or a confidence outside (0, 1).
///
/// Source: F. Garwood, Biometrika 28 (1936).
pub fn garwood(events: u64, exposure: f64, confidence: f64) -> Result<Interval, StatsError> {
    two_sided(events, exposure, confidence, WHOLE)
}

/// One-sided exact upper limit for the rate of events per unit of exposure.
///
/// # Errors
/// As [`garwood`].
///
/// Source: F. Garwood, Biometrika 28 (1936).
pub fn garwood_upper(events: u64, exposure: f64, confidence: f64) -> Result<f64, StatsError> {
    check_exposure(exposure)?;
    Ok(upper_mean(events, WHOLE, ln_error(confidence)?) / exposure)
}

/// One-sided exact lower limit for the rate of events per unit of exposure.
///
/// # Errors
/// As [`garwood`].
///
/// Source: F. Garwood, Biometrika 28 (1936).
pub fn garwood_lower(events: u64, exposure: f64, confidence: f64) -> Result<f64, StatsError> {
    check_exposure(exposure)?;
    Ok(lower_mean(events, WHOLE, ln_error(confidence)?) / exposure)
}

/// Two-sided mid-P interval for the rate of events per unit of exposure.
///
/// # Errors
/// As [`garwood`].
///
/// Source: G. R. Cohen & S.-Y. Yang, Statistics in Medicine 13 (1994), from memory.
pub fn mid_p_rate(events: u64, exposure: f64, confidence: f64) -> Result<Interval, StatsError> {
    two_sided(events, exposure, confidence, HALF)
}

/// The probability of `events` or more where `mean` (0 or more) are expected; 1 for none, and where the mean is no
/// number or infinite.
///
/// Source: the upper tail of the Poisson law.
#[must_use]
pub fn poisson_at_least(events: u64, mean: f64) -> f64 {
    if events == 0 || !mean.is_finite() {
        return 1.0;
    }
    if mean <= 0.0 { 0.0 } else { Poisson { mean }.ln_tail(Tail::Upper, events as f64, WHOLE).exp().min(1.0) }
}

fn two_sided(events: u64, exposure: f64, confidence: f64, weight: f64) -> Result<Interval, StatsError> {
    check_exposure(exposure)?;
    let ln_side = ln_error(confidence)? - LN_2;
    Ok(Interval {
        estimate: events as f64 / exposure,
        lower: lower_mean(events, weight, ln_side) / exposure,
        upper: upper_mean(events, weight, ln_side) / exposure,
        confidence,
    })
}

/// Upper limit for the expected number of events.
pub(super) fn upper_mean(events: u64, weight: f64, ln_alpha: f64) -> f64 {
    if events == 0 {
        // weight exp(−mean) = alpha
        return (weight.ln() - ln_alpha).max(0.0);
    }
    Poisson::mean_where(Tail::Lower, events as f64, weight, ln_alpha)
}

/// Lower limit for the expected number of events.
pub(super) fn lower_mean(events: u64, weight: f64, ln_alpha: f64) -> f64 {
    if events == 0 { 0.0 } else { Poisson::mean_where(Tail::Upper, events as f64, weight, ln_alpha) }
}
