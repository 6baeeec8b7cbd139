//! `reckon power`: how long a test has to be to notice something, or what it would notice.

use serde::Serialize;

use super::{Exposure, Method, Rate, Reckoned, at_least, chance, counted, hours_at_least, whole};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: to see a rate once, the Poisson law at zero and the success-run theorem n = ln(1 - P) / ln(1 - p); to tell two \
rates apart, the exact power of the conditional test, E. L. Lehmann, Testing Statistical Hypotheses, 4.5; to show a rate \
below a bound, the demonstration plans of NIST/SEMATECH e-Handbook 8.3.1.1 with the Poisson law at the true rate.";

/// See a rate at least once.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Once {
    /// The true rate.
    pub rate: Rate,
    /// With this probability.
    pub probability: f64,
}

/// How much it takes.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Takes {
    #[serde(flatten)]
    exposure: Exposure,
    probability: f64,
}

/// The exposure in which a rate shows itself at least once.
///
/// # Errors
/// What the calculators refuse.
pub fn once(inputs: Once) -> Result<Reckoned<Once, Takes>, StatsError> {
    let Once { rate, probability } = inputs;
    let need = |probability| match rate {
        Rate::PerHour(rate) => Ok(Exposure::Hours(stats::exposure_to_detect(rate, probability)?)),
        Rate::PerRun(p) => Ok(Exposure::Runs(stats::success_runs(p, probability)?)),
    };
    let exposure = need(probability)?;
    let statement = format!(
        "A core that is wrong {} is seen at least once in {} with probability {}.",
        rate.often(),
        reached(exposure),
        percent(probability)
    );
    let mut table = Table::new(&["probability", if exposure.unit() == "hour" { "hours" } else { "runs" }]);
    for probability in [0.5, 0.8, 0.9, 0.95, 0.99, 0.999] {
        let amount = match need(probability) {
            Ok(Exposure::Hours(hours)) => at_least(hours),
            Ok(Exposure::Runs(runs)) => whole(runs),
            // beyond what counts can hold
            Err(_) => "-".to_owned(),
        };
        table.row([percent(probability), amount]);
    }
    Ok(Reckoned::new("power", inputs, Takes { exposure, probability }, ONCE, statement, table.text()))
}

fn reached(exposure: Exposure) -> String {
    match exposure {
        Exposure::Hours(hours) => hours_at_least(hours),
        Exposure::Runs(runs) => counted(runs, "run"),
    }
}

/// See a rate within an exposure.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Within {
    /// The true rate.
    pub rate: Rate,
    /// The exposure.
    #[serde(flatten)]
    pub exposure: Exposure,
}

/// How likely it is.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Chance {
    probability: f64,
}

/// The probability that a rate shows itself at least once in an exposure of the same unit.
///
/// # Errors
/// What the calculators refuse.
pub fn within(inputs: Within) -> Result<Reckoned<Within, Chance>, StatsError> {
    let per_exposure = match inputs.rate {
        Rate::PerHour(rate) => rate,
        // (1 - p)^n = exp(n ln(1 - p)): the same law with another name for the rate
        Rate::PerRun(p) => -(-p).ln_1p(),
    };
    let probability = stats::detection_probability(per_exposure, inputs.exposure.amount())?;
    let statement = format!(
        "A core that is wrong {} is seen at least once in {} with probability {}.",
        inputs.rate.often(),
        inputs.exposure.words(),
        chance(probability)
    );
    Ok(Reckoned::new("power", inputs, Chance { probability }, ONCE, statement, String::new()))
}

/// Tell two rates apart.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Apart {
    /// The higher rate, per hour.
    pub first: f64,
    /// The lower rate, per hour.
    pub second: f64,
    /// Exposure of the second over that of the first.
    pub split: f64,
    /// Risk of seeing a difference where there is none.
    pub level: f64,
    /// Probability of seeing the one there is.
    pub power: f64,
}

/// How much it takes.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct ApartTakes {
    first_hours: f64,
    second_hours: f64,
    power: f64,
    expected_events: f64,
}

/// The exposure in which two rates are told apart.
///
/// # Errors
/// What the calculators refuse: a first rate not above the second, rates too close.
pub fn apart(inputs: Apart) -> Result<Reckoned<Apart, ApartTakes>, StatsError> {
    let Apart { first, second, split, level, power } = inputs;
    let first_hours = stats::exposure_to_compare(first, second, split, level, power)?;
    let second_hours = first_hours * split;
    let expected_events = first * first_hours + second * second_hours;
    let statement = format!(
        "Telling a rate of {} from one of {} takes {} of the first and {} of the second (one-sided level {}, power {}).",
        Rate::PerHour(first).words(),
        Rate::PerHour(second).words(),
        hours_at_least(first_hours),
        hours_at_least(second_hours),
        percent(level),
        percent(power)
    );
    let figures = format!("Events expected by then, both together: {}\n", short(expected_events));
    let answer = ApartTakes { first_hours, second_hours, power, expected_events };
    Ok(Reckoned::new("power", inputs, answer, APART, statement, figures))
}

/// What a comparison of given length would notice.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Noticing {
    /// The higher rate, per hour.
    pub first: f64,
    /// The lower rate, per hour.
    pub second: f64,
    /// Hours of the first.
    pub hours: f64,
    /// Exposure of the second over that of the first.
    pub split: f64,
    /// Risk of seeing a difference where there is none.
    pub level: f64,
}

/// How likely it is.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Power {
    power: f64,
}

/// The power of a comparison of given length.
///
/// # Errors
/// What the calculators refuse.
pub fn noticing(inputs: Noticing) -> Result<Reckoned<Noticing, Power>, StatsError> {
    let Noticing { first, second, hours: time, split, level } = inputs;
    let sides = ((first * time, time), (second * time * split, time * split));
    let power = stats::comparison_power(sides.0, sides.1, level)?;
    let statement = format!(
        "{} of the first and {} of the second tell a rate of {} from one of {} with probability {} (one-sided level {}).",
        Exposure::Hours(time).words(),
        Exposure::Hours(time * split).words(),
        Rate::PerHour(first).words(),
        Rate::PerHour(second).words(),
        chance(power),
        percent(level)
    );
    Ok(Reckoned::new("power", inputs, Power { power }, APART, statement, String::new()))
}

/// Show a rate below a bound.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Below {
    /// The bound, per hour.
    pub below: f64,
    /// What the rate is in truth, per hour; 0 for one that never fails.
    pub true_rate: f64,
    /// Confidence of the bound.
    pub confidence: f64,
    /// Probability that the test shows it.
    pub probability: f64,
}

/// How much it takes.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct BelowTakes {
    hours: f64,
    failures_allowed: u64,
    /// That the test shows it.
    probability: f64,
}

/// The exposure in which a rate shows itself to be below a bound.
///
/// # Errors
/// What the calculators refuse: a true rate not below the bound.
pub fn below(inputs: Below) -> Result<Reckoned<Below, BelowTakes>, StatsError> {
    let Below { below, true_rate, confidence, probability } = inputs;
    let plan = stats::exposure_to_show_below(below, true_rate, confidence, probability)?;
    let truth = if true_rate == 0.0 { "no failure ever".to_owned() } else { Rate::PerHour(true_rate).words() };
    let statement = format!(
        "{} with at most {} prove a rate below {} ({}); where the truth is {truth}, the test passes with probability {}.",
        hours_at_least(plan.exposure),
        counted(plan.failures_allowed, "failure"),
        Rate::PerHour(below).words(),
        percent(confidence),
        chance(plan.probability)
    );
    let answer =
        BelowTakes { hours: plan.exposure, failures_allowed: plan.failures_allowed, probability: plan.probability };
    Ok(Reckoned::new("power", inputs, answer, BELOW, statement, String::new()))
}

const ONCE: Method = Method {
    name: "1 - exp(-rate x time); for runs 1 - (1 - p)^n",
    source: "the Poisson law at zero; the success-run theorem n = ln(1 - P) / ln(1 - p)",
    assumption: "\
failures come independently at one constant rate; where they cluster, take the rate of episodes (`reckon episodes`), not \
of failures",
};

const APART: Method = Method {
    name: "exact power of the one-sided conditional test",
    source: "E. L. Lehmann, Testing Statistical Hypotheses, 4.5; J. Przyborowski & H. Wilenski, Biometrika 31 (1940)",
    assumption: "events are independent on both sides; where they cluster, take rates of episodes, not of failures",
};

const BELOW: Method = Method {
    name: "demonstration plan with the least exposure: chi-square test length, passing probability by the Poisson law",
    source: "NIST/SEMATECH e-Handbook 8.3.1.1; E. L. Lehmann, Testing Statistical Hypotheses, 3.3",
    assumption: "\
failures come independently at one constant rate, and the number of failures allowed is fixed before the test; to stop \
earlier see `reckon sequential`",
};
