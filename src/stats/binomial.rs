//! Mismatches among runs: intervals for the probability of a mismatch per run, and the exact test.

use super::interval::{Interval, StatsError, check_probability, check_runs, ln_error};
use super::law::{Binomial, CountLaw, HALF, Tail, WHOLE};
use std::f64::consts::{LN_2, SQRT_2};

/// Two-sided exact interval for the probability of a mismatch per run, (1 − confidence) / 2 at each end.
///
/// # Errors
/// No runs, more mismatches than runs, or a confidence outside (0, 1).
///
/// Source: C. J. Clopper & E. S. Pearson, Biometrika 26 (1934).
pub fn clopper_pearson(mismatches: u64, runs: u64, confidence: f64) -> Result<Interval, StatsError> {
    two_sided(mismatches, runs, confidence, WHOLE)
}

/// One-sided exact upper limit for the probability of a mismatch per run.
///
/// # Errors
/// As [`clopper_pearson`].
///
/// Source: C. J. Clopper & E. S. Pearson, Biometrika 26 (1934).
pub fn clopper_pearson_upper(mismatches: u64, runs: u64, confidence: f64) -> Result<f64, StatsError> {
    check_runs(mismatches, runs)?;
    Ok(upper(mismatches, runs, WHOLE, ln_error(confidence)?))
}

/// One-sided exact lower limit for the probability of a mismatch per run.
///
/// # Errors
/// As [`clopper_pearson`].
///
/// Source: C. J. Clopper & E. S. Pearson, Biometrika 26 (1934).
pub fn clopper_pearson_lower(mismatches: u64, runs: u64, confidence: f64) -> Result<f64, StatsError> {
    check_runs(mismatches, runs)?;
    Ok(lower(mismatches, runs, WHOLE, ln_error(confidence)?))
}

/// Two-sided mid-P interval for the probability of a mismatch per run: shorter than the exact one, and right on
/// average instead of at least.
///
/// # Errors
/// As [`clopper_pearson`].
///
/// Source: H. O. Lancaster, JASA 56 (1961); G. Berry & P. Armitage, The Statistician 44 (1995).
pub fn mid_p(mismatches: u64, runs: u64, confidence: f64) -> Result<Interval, StatsError> {
    two_sided(mismatches, runs, confidence, HALF)
}

/// Two-sided score interval for the probability of a mismatch per run: approximate.
///
/// # Errors
/// As [`clopper_pearson`].
///
/// Source: E. B. Wilson, JASA 22 (1927); the lower limit with its difference of near-equals multiplied out.
pub fn wilson(mismatches: u64, runs: u64, confidence: f64) -> Result<Interval, StatsError> {
    check_runs(mismatches, runs)?;
    ln_error(confidence)?;
    let (x, n) = (mismatches as f64, runs as f64);
    let z = SQRT_2 * statrs::function::erf::erfc_inv(1.0 - confidence);
    let reach = |x: f64| x + 0.5 * z * z + z * (x * ((n - x) / n) + 0.25 * z * z).sqrt();
    let upper = if mismatches == runs { 1.0 } else { reach(x) / (n + z * z) };
    let lower = if mismatches == 0 { 0.0 } else { (x / reach(x)) * (x / n) };
    Ok(Interval { estimate: x / n, lower, upper, confidence })
}

/// Two-sided exact test that the probability of a mismatch per run is `p0`: the p-value, summed over all counts that
/// are no more probable than the one seen.
///
/// # Errors
/// No runs, more mismatches than runs, or `p0` outside [0, 1].
///
/// Source: W. J. Conover, Practical Nonparametric Statistics, ch. 3; ties within a relative 1e-7 count as equal.
pub fn exact_test(mismatches: u64, runs: u64, p0: f64) -> Result<f64, StatsError> {
    check_runs(mismatches, runs)?;
    check_probability("null probability", p0)?;
    if p0 == 0.0 || p0 == 1.0 {
        let sure = if p0 == 0.0 { 0 } else { runs };
        return Ok(if mismatches == sure { 1.0 } else { 0.0 });
    }
    let law = Binomial { n: runs as f64, p: p0, q: 1.0 - p0 };
    Ok(law.as_unlikely(mismatches as f64, (0.0, runs as f64)))
}

fn two_sided(mismatches: u64, runs: u64, confidence: f64, weight: f64) -> Result<Interval, StatsError> {
    check_runs(mismatches, runs)?;
    let ln_side = ln_error(confidence)? - LN_2;
    Ok(Interval {
        estimate: mismatches as f64 / runs as f64,
        lower: lower(mismatches, runs, weight, ln_side),
        upper: upper(mismatches, runs, weight, ln_side),
        confidence,
    })
}

fn upper(mismatches: u64, runs: u64, weight: f64, ln_alpha: f64) -> f64 {
    let (x, n) = (mismatches as f64, runs as f64);
    if mismatches == runs {
        return 1.0;
    }
    if mismatches == 0 {
        // weight (1 − p)^n = alpha
        return (-((ln_alpha - weight.ln()).min(0.0) / n).exp_m1()).max(0.0);
    }
    Binomial::at_ln_odds(n, Binomial::ln_odds_where(Tail::Lower, x, n, weight, ln_alpha)).p
}

fn lower(mismatches: u64, runs: u64, weight: f64, ln_alpha: f64) -> f64 {
    let (x, n) = (mismatches as f64, runs as f64);
    if mismatches == 0 {
        return 0.0;
    }
    if mismatches == runs {
        // weight p^n = alpha
        return ((ln_alpha - weight.ln()).min(0.0) / n).exp();
    }
    Binomial::at_ln_odds(n, Binomial::ln_odds_where(Tail::Upper, x, n, weight, ln_alpha)).p
}
