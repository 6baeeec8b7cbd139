//! What a test of a given length can be expected to notice.

use super::conditional::{Saw, Share, reach};
use super::interval::{StatsError, check_exposure, check_open_probability, check_positive, ln_error};
use super::law::{CountLaw, Poisson, Tail, WHOLE, normal_reach};
use super::numerics::root;
use super::zero_failure::test_length_factor;
use serde::{Deserialize, Serialize};

/// Probability of at least one event in `exposure` at a true `rate`: 1 − exp(−rate · exposure).
///
/// # Errors
/// Rate or exposure not positive and finite.
///
/// Source: the Poisson law at zero.
pub fn detection_probability(rate: f64, exposure: f64) -> Result<f64, StatsError> {
    check_positive("rate", rate, "the true rate to be noticed")?;
    check_exposure(exposure)?;
    Ok(-(-rate * exposure).exp_m1())
}

/// The exposure in which a true `rate` shows itself at least once with `probability`: −ln(1 − probability) / rate.
///
/// # Errors
/// Rate not positive and finite, or a probability outside (0, 1).
///
/// Source: the Poisson law at zero.
pub fn exposure_to_detect(rate: f64, probability: f64) -> Result<f64, StatsError> {
    check_positive("rate", rate, "the true rate to be noticed")?;
    check_open_probability("probability", probability)?;
    Ok(-(-probability).ln_1p() / rate)
}

/// Power of the one-sided conditional test that the first rate is higher (`compare_rates(…).p_greater ≤ level`) where
/// `first` and `second` events are expected in exposures of `first_exposure` and `second_exposure`.
///
/// # Errors
/// An expectation or exposure not positive and finite, or a level outside (0, 1).
///
/// Source: the exact sum over the total count, each with its own critical count (E. L. Lehmann, Testing Statistical
/// Hypotheses, 4.5), resolved down to a power of 1e-15. The work grows with the square root of the expected total.
pub fn comparison_power(
    (first, first_exposure): (f64, f64),
    (second, second_exposure): (f64, f64),
    level: f64,
) -> Result<f64, StatsError> {
    for (expected, exposure) in [(first, first_exposure), (second, second_exposure)] {
        check_positive("expected number of events", expected, "the true rate times the exposure")?;
        check_exposure(exposure)?;
    }
    check_open_probability("level", level)?;
    let truth = Share::of(first, second);
    let (least, most) = reach(first + second);
    let mut saw = Saw::new(Share::of(first_exposure, second_exposure), truth, level, least);
    saw.extend(most);
    Ok(saw.power(first + second).min(1.0))
}

/// Expected events, on both sides together, up to which a comparison is worked out.
const MOST_EVENTS: f64 = 4e6;

/// The second exposure over the first up to which a comparison is worked out.
const MOST_RATIO: f64 = 1e4;

/// The exposure of the first side from which on the one-sided conditional test that the first rate is higher
/// (`compare_rates(…).p_greater ≤ level`) has at least this `power`, where the second side has `exposure_ratio` times
/// that exposure; unit: one over the unit of the rates. A second rate of 0 is a control that never fails.
///
/// Counts are whole, so the exact power is a saw: it may touch `power` earlier and fall below it again. The answer is
/// the last such crossing: a little less exposure has not quite the power, any longer one has it.
///
/// # Errors
/// Rates or the exposure ratio not positive and finite (second rate: negative), a first rate not above the second, a
/// ratio above 10,000, a level or power outside (0, 1), or rates so close that more than four million events would be
/// needed.
///
/// Source: the exact power of [`comparison_power`]; the normal approximation is only where the search starts.
pub fn exposure_to_compare(
    first_rate: f64,
    second_rate: f64,
    exposure_ratio: f64,
    level: f64,
    power: f64,
) -> Result<f64, StatsError> {
    check_positive("first rate", first_rate, "the higher rate, such as 2 per hour")?;
    if second_rate != 0.0 {
        check_positive("second rate", second_rate, "the lower rate, or 0 for a side that never fails")?;
    }
    check_positive("first minus second rate", first_rate - second_rate, "a first rate above the second")?;
    check_positive("exposure ratio", exposure_ratio, "the second exposure over the first, 1 if both are equal")?;
    if exposure_ratio > MOST_RATIO {
        let remedy = "a second exposure of at most 10,000 times the first";
        return Err(StatsError::OutOfRange { name: "exposure ratio", value: exposure_ratio, remedy });
    }
    check_open_probability("level", level)?;
    check_open_probability("power", power)?;
    let per_exposure = exposure_ratio.mul_add(second_rate, first_rate);
    check_positive("sum of the rates", per_exposure, "rates within the range of a double")?;
    let (equal, truth) = (Share::of(1.0, exposure_ratio), Share::of(first_rate, exposure_ratio * second_rate));
    let start = normal_guess(equal, truth, level, power);
    let too_close = StatsError::TooClose { low: second_rate, high: first_rate, most: MOST_EVENTS as u64 };
    if start.is_nan() || start > MOST_EVENTS {
        return Err(too_close);
    }
    let mut margin = 20.0 * start.sqrt() + 100.0;
    loop {
        let mut saw = Saw::new(equal, truth, level, (start - margin).max(0.0).floor());
        // up to a mean total from which on the power stays above ...
        let mut enough = start;
        while !stays_above(&mut saw, enough, power) {
            enough += 0.5 * enough.sqrt() + 0.5;
            if enough > MOST_EVENTS {
                return Err(too_close);
            }
        }
        // ... and down again to where it last was below
        while reach(enough).0 >= saw.least() {
            let next = enough - (enough.sqrt() / 16.0).min(0.25 * enough);
            let excess = |mean: f64| saw.power(mean) - power;
            if excess(next) < 0.0 {
                return Ok(root(excess, true, next, enough - next, (next, enough)) / per_exposure);
            }
            enough = next;
        }
        margin *= 4.0;
    }
}

/// Whether the power is at least `power` at this mean total and at every larger one.
///
/// The mean over the totals, divided by the weight of the last total whose power is too small: what lies beyond that
/// total only gains weight as the mean grows, what is missing before it only loses. So if the one makes up for the
/// other once, it does for ever.
fn stays_above(saw: &mut Saw, mean: f64, power: f64) -> bool {
    // a tooth is as long as it takes for one more expected event
    let tooth = 1.0 / saw.equal().p();
    saw.extend(reach(mean).1 + 3.0 * tooth + 3.0);
    match saw.last_below(power) {
        Some(last) if last + 2.0 * tooth + 2.0 > saw.end() => false,
        last => {
            let last = last.unwrap_or(0.0);
            saw.average(mean, |total, given| if total > last { given - power } else { (given - power).min(0.0) }) >= 0.0
        }
    }
}

/// Total count at which the test has about this power, by the normal approximation of both binomial laws; at least the
/// count at which it can reject at all.
fn normal_guess(equal: Share, truth: Share, level: f64, power: f64) -> f64 {
    let z = |above: f64| {
        if above < 0.5 { normal_reach((2.0 * above).ln()) } else { -normal_reach((2.0 * (1.0 - above)).ln()) }
    };
    let distance = z(level) * equal.variance().sqrt() + z(1.0 - power) * truth.variance().sqrt();
    let normal = (distance.max(0.0) / (truth.p() - equal.p())).powi(2);
    normal.max(level.ln() / equal.p().ln()).max(1.0)
}

/// A test that allows some failures, with what it takes.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ShowBelow {
    /// The exposure; unit: one over the unit of the rates.
    pub exposure: f64,
    /// At most so many failures prove the bound.
    pub failures_allowed: u64,
    /// Probability of no more failures than that at the true rate.
    pub probability: f64,
}

/// Failures up to which a test is worked out.
const MOST_FAILURES: u64 = 1 << 40;

/// The least exposure in which, with as many failures allowed as it takes, a `true_rate` below `bound` shows with at
/// least this `probability` that it is below: the upper limit at `confidence` is then at most `bound`. A true rate of 0
/// needs no failures allowed.
///
/// # Errors
/// Bound not positive and finite, true rate negative or not below the bound, confidence or probability outside (0, 1),
/// or rates so close that more than 2^40 failures would have to be allowed.
///
/// Source: the demonstration plans of NIST/SEMATECH e-Handbook 8.3.1.1 with the Poisson law at the true rate. A longer
/// plan of this kind is the most powerful test of its level (E. L. Lehmann, Testing Statistical Hypotheses, 3.3), so the
/// probability never falls as more failures are allowed.
pub fn exposure_to_show_below(
    bound: f64,
    true_rate: f64,
    confidence: f64,
    probability: f64,
) -> Result<ShowBelow, StatsError> {
    check_positive("bound", bound, "the rate to stay below, such as 0.002 per hour")?;
    if true_rate != 0.0 {
        check_positive("true rate", true_rate, "the rate that is expected, or 0")?;
    }
    check_positive("bound minus true rate", bound - true_rate, "a true rate below the bound")?;
    check_open_probability("probability", probability)?;
    ln_error(confidence)?;
    let plan = |failures_allowed: u64| -> Result<ShowBelow, StatsError> {
        let factor = test_length_factor(failures_allowed, confidence)?;
        let law = Poisson { mean: factor * (true_rate / bound) };
        let probability =
            if law.mean == 0.0 { 1.0 } else { law.ln_tail(Tail::Lower, failures_allowed as f64, WHOLE).exp() };
        Ok(ShowBelow { exposure: factor / bound, failures_allowed, probability })
    };
    let mut found = plan(0)?;
    let (mut no, mut step) = (0, 1);
    if found.probability >= probability {
        return Ok(found);
    }
    loop {
        let yes = no + step;
        found = plan(yes)?;
        if found.probability >= probability {
            break;
        }
        if yes > MOST_FAILURES {
            return Err(StatsError::TooClose { low: true_rate, high: bound, most: MOST_FAILURES });
        }
        (no, step) = (yes, 2 * step);
    }
    while found.failures_allowed - no > 1 {
        let middle = plan(no + (found.failures_allowed - no) / 2)?;
        if middle.probability >= probability { found = middle } else { no = middle.failures_allowed }
    }
    Ok(found)
}
