//! What a test of a given length can be expected to notice.

use super::interval::{StatsError, check_exposure, check_open_probability, check_positive};
use super::law::{Binomial, CountLaw, Poisson, Tail, WHOLE};

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
    let total = Poisson { mean: first + second };
    let odds = first_exposure / second_exposure;
    let (equal, true_odds) = ((odds / (1.0 + odds), 1.0 / (1.0 + odds)), first / second);
    let reach = 10.0 * total.mean.sqrt() + 40.0;
    let (least, most) = ((total.mean - reach).max(0.0).floor(), (total.mean + reach).ceil());
    let (mut power, mut critical, mut n) = (0.0, 0.0_f64, least);
    while n <= most {
        // the critical count never falls as the total grows; the first one is found by halving, from it on by steps
        let rejects = |k: f64| {
            let law = Binomial { n, p: equal.0, q: equal.1 };
            k > n || law.ln_tail(Tail::Upper, k, WHOLE) <= level.ln()
        };
        if n == least {
            let (mut no, mut yes) = (-1.0, n + 1.0);
            while yes - no > 1.0 {
                let middle = ((no + yes) * 0.5_f64).floor();
                if rejects(middle) { yes = middle } else { no = middle }
            }
            critical = yes;
        }
        while !rejects(critical) {
            critical += 1.0;
        }
        if critical <= n {
            let law = Binomial { n, p: true_odds / (1.0 + true_odds), q: 1.0 / (1.0 + true_odds) };
            power += total.ln_point(n).exp() * law.ln_tail(Tail::Upper, critical, WHOLE).exp();
        }
        n += 1.0;
    }
    Ok(power.min(1.0))
}
