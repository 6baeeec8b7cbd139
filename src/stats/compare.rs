//! Two rates against each other, by the binomial law that the first count follows given the sum of both.
//! Source: J. Przyborowski & H. Wilenski, Biometrika 31 (1940); E. L. Lehmann, Testing Statistical Hypotheses, 4.5.

use super::interval::{Interval, StatsError, check_exposure, check_positive, ln_error};
use super::law::{Binomial, CountLaw, HALF, Tail, WHOLE};
use serde::{Deserialize, Serialize};
use std::f64::consts::LN_2;

/// P-values of the conditional test that the first rate is `ratio` times the second.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct RateTest {
    /// Against "the first rate is higher than that".
    pub p_greater: f64,
    /// The same by the mid-P convention.
    pub p_greater_mid: f64,
    /// Against "the first rate is lower than that".
    pub p_less: f64,
    /// The same by the mid-P convention.
    pub p_less_mid: f64,
    /// Two-sided, summed over all splits that are no more probable than the one seen.
    pub p_two_sided: f64,
}

/// A count and the exposure in which it was collected. Both sides of a comparison use the same unit.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Observed {
    /// Events.
    pub events: u64,
    /// Exposure, > 0.
    pub exposure: f64,
}

/// Conditional exact test that the first rate is `ratio` times the second (1: equal rates).
///
/// # Errors
/// An exposure or the ratio not positive and finite. Without any events every p-value is 1 (one-sided mid-P: ½).
pub fn compare_rates(first: Observed, second: Observed, ratio: f64) -> Result<RateTest, StatsError> {
    check_exposure(first.exposure)?;
    check_exposure(second.exposure)?;
    check_positive("ratio", ratio, "1 to test for equal rates")?;
    let (x, n) = (first.events as f64, first.events as f64 + second.events as f64);
    if n == 0.0 {
        return Ok(RateTest { p_greater: 1.0, p_greater_mid: 0.5, p_less: 1.0, p_less_mid: 0.5, p_two_sided: 1.0 });
    }
    let odds = first.exposure / second.exposure * ratio;
    let law = Binomial { n, p: odds / (1.0 + odds), q: 1.0 / (1.0 + odds) };
    let tail = |tail, weight| law.ln_tail(tail, x, weight).exp().min(1.0);
    Ok(RateTest {
        p_greater: tail(Tail::Upper, WHOLE),
        p_greater_mid: tail(Tail::Upper, HALF),
        p_less: tail(Tail::Lower, WHOLE),
        p_less_mid: tail(Tail::Lower, HALF),
        p_two_sided: law.as_unlikely(x, (0.0, n)),
    })
}

/// Two-sided exact interval for the first rate over the second: the Clopper–Pearson limits of the first count's share,
/// turned into a ratio. Infinite at the top if the second count is zero.
///
/// # Errors
/// An exposure not positive and finite, a confidence outside (0, 1), or no events on either side.
pub fn rate_ratio(first: Observed, second: Observed, confidence: f64) -> Result<Interval, StatsError> {
    check_exposure(first.exposure)?;
    check_exposure(second.exposure)?;
    let ln_side = ln_error(confidence)? - LN_2;
    let (x, y) = (first.events as f64, second.events as f64);
    if x + y == 0.0 {
        return Err(StatsError::NoEvents("the ratio of two rates"));
    }
    let exposures = second.exposure / first.exposure;
    let n = x + y;
    let odds = |tail| Binomial::ln_odds_where(tail, x, n, WHOLE, ln_side).exp();
    // with all events on one side the limits are closed: p^n = alpha or (1 − p)^n = alpha
    let lower = match (first.events, second.events) {
        (0, _) => 0.0,
        (_, 0) => 1.0 / (-ln_side / n).exp_m1(),
        _ => odds(Tail::Upper),
    };
    let upper = match (first.events, second.events) {
        (_, 0) => f64::INFINITY,
        (0, _) => (-ln_side / n).exp_m1(),
        _ => odds(Tail::Lower),
    };
    Ok(Interval { estimate: x / y * exposures, lower: lower * exposures, upper: upper * exposures, confidence })
}
