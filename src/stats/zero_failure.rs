//! What silence proves, and how long silence has to last: zero (or few) failures.

use super::binomial::clopper_pearson_upper;
use super::interval::{Interval, StatsError, check_exposure, check_open_probability, check_positive, ln_error};
use super::law::{Binomial, CountLaw, Tail, WHOLE};
use super::poisson::{garwood, garwood_upper, upper_mean};

/// Inputs are meant as decimals: a confidence of 0.9 is not quite 1 − 0.1 in binary, and a run count that hits the
/// requirement exactly must not be rounded up for that.
const DECIMAL: f64 = 1e-12;

/// Counts up to here are exact as a double.
const MOST_RUNS: f64 = 9_007_199_254_740_992.0;

/// Upper limit for the probability of a mismatch per run after `runs` runs without one: 1 − (1 − confidence)^(1/runs).
///
/// # Errors
/// No runs, or a confidence outside (0, 1).
///
/// Source: the Clopper–Pearson limit at zero; J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983).
pub fn upper_per_run(runs: u64, confidence: f64) -> Result<f64, StatsError> {
    clopper_pearson_upper(0, runs, confidence)
}

/// Upper limit for the rate after `exposure` without an event: −ln(1 − confidence) / exposure.
///
/// # Errors
/// Exposure not positive and finite, or a confidence outside (0, 1).
///
/// Source: the Garwood limit at zero (F. Garwood, Biometrika 28, 1936).
pub fn upper_rate(exposure: f64, confidence: f64) -> Result<f64, StatsError> {
    garwood_upper(0, exposure, confidence)
}

/// The rule of three: 3 / exposure (runs or time), the back-of-envelope 95 % upper limit after zero events.
///
/// # Errors
/// Exposure not positive and finite.
///
/// Source: J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983); 3 stands for −ln 0.05 = 2.996.
pub fn rule_of_three(exposure: f64) -> Result<f64, StatsError> {
    check_exposure(exposure)?;
    Ok(3.0 / exposure)
}

/// How many mean times between failures a test must last to prove that mean with at most `failures` failures.
///
/// # Errors
/// A confidence outside (0, 1).
///
/// Source: NIST/SEMATECH e-Handbook 8.3.1.1 (½ χ² with 2 failures + 2 degrees of freedom).
pub fn test_length_factor(failures: u64, confidence: f64) -> Result<f64, StatsError> {
    Ok(upper_mean(failures, WHOLE, ln_error(confidence)?))
}

/// The exposure needed, with at most `failures` failures in it, to prove a rate below `rate_below`; unit: one over
/// the unit of the rate (a rate per hour gives hours).
///
/// # Errors
/// Rate not positive and finite, or a confidence outside (0, 1).
///
/// Source: NIST/SEMATECH e-Handbook 8.3.1.1.
pub fn exposure_needed(rate_below: f64, failures: u64, confidence: f64) -> Result<f64, StatsError> {
    check_positive("rate", rate_below, "the rate to stay below, such as 0.002 per hour")?;
    Ok(test_length_factor(failures, confidence)? / rate_below)
}

/// The least number of runs without a mismatch that proves a probability per run below `probability_below`.
///
/// # Errors
/// Probability or confidence outside (0, 1), or an answer beyond 2^53.
///
/// Source: the success-run theorem, n = ln(1 − confidence) / ln(reliability), with reliability = 1 − probability.
pub fn success_runs(probability_below: f64, confidence: f64) -> Result<u64, StatsError> {
    check_open_probability("probability", probability_below)?;
    let runs = (ln_error(confidence)? / (-probability_below).ln_1p() * (1.0 - DECIMAL)).ceil().max(1.0);
    if runs <= MOST_RUNS { Ok(runs as u64) } else { Err(StatsError::BeyondCounts) }
}

/// The least number of runs that, with at most `mismatches` mismatches, proves a probability per run below
/// `probability_below`: the least n with P(X ≤ mismatches) ≤ 1 − confidence.
///
/// # Errors
/// Probability or confidence outside (0, 1), or an answer beyond 2^53.
///
/// Source: binomial demonstration plans; N. R. Mann, R. E. Schafer & N. D. Singpurwalla, Methods for Statistical
/// Analysis of Reliability and Life Data (1974), from memory.
pub fn demonstration_runs(probability_below: f64, mismatches: u64, confidence: f64) -> Result<u64, StatsError> {
    check_open_probability("probability", probability_below)?;
    let limit = ln_error(confidence)? * (1.0 - DECIMAL);
    let (p, q, k) = (probability_below, 1.0 - probability_below, mismatches as f64);
    let enough = |n: f64| Binomial { n, p, q }.ln_tail(Tail::Lower, k, WHOLE) <= limit;
    let mut too_few = k;
    let mut plenty = k + 1.0;
    while !enough(plenty) {
        (too_few, plenty) = (plenty, 2.0 * plenty);
        if plenty > MOST_RUNS {
            return Err(StatsError::BeyondCounts);
        }
    }
    while plenty - too_few > 1.0 {
        let middle = (0.5 * (too_few + plenty)).floor();
        if enough(middle) { plenty = middle } else { too_few = middle }
    }
    Ok(plenty as u64)
}

/// Two-sided interval for the mean time between failures of a test that was stopped at a fixed time; unit of
/// `total_time`. Without failures estimate and upper limit are infinite.
///
/// # Errors
/// Time not positive and finite, or a confidence outside (0, 1).
///
/// Source: NIST/SEMATECH e-Handbook 8.4.5.1; the reciprocals of the Garwood limits.
pub fn mtbf(total_time: f64, failures: u64, confidence: f64) -> Result<Interval, StatsError> {
    let rate = garwood(failures, total_time, confidence)?;
    Ok(Interval { estimate: 1.0 / rate.estimate, lower: 1.0 / rate.upper, upper: 1.0 / rate.lower, confidence })
}

/// Upper limit for the failure rate in failures per 10^9 device-hours; `hours` are hours per device, and
/// `acceleration` says how many hours of use one hour of test stands for (1 if none).
///
/// # Errors
/// Devices, hours or acceleration not positive and finite, or a confidence outside (0, 1).
///
/// Source: JEDEC JESD85, from memory.
pub fn fit_rate(
    failures: u64,
    devices: f64,
    hours: f64,
    acceleration: f64,
    confidence: f64,
) -> Result<f64, StatsError> {
    check_positive("devices", devices, "the number of devices on test")?;
    check_positive("hours", hours, "the hours that each device was on test")?;
    check_positive("acceleration", acceleration, "1 if the test was not accelerated")?;
    Ok(1e9 * garwood_upper(failures, devices * hours * acceleration, confidence)?)
}
