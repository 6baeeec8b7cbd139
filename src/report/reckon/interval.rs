//! `reckon interval`: how often, from what was seen.

use serde::Serialize;

use super::{Exposure, Method, Observation, Reckoned, limit, prose, range};
use crate::report::figures::{percent, short};
use crate::stats::{self, Interval, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: exact per run C. J. Clopper & E. S. Pearson, Biometrika 26 (1934); exact per hour F. Garwood, Biometrika 28 \
(1936); mid-P H. O. Lancaster, JASA 56 (1961), for rates G. R. Cohen & S.-Y. Yang, Statistics in Medicine 13 (1994); \
score E. B. Wilson, JASA 22 (1927); time between events NIST/SEMATECH e-Handbook 8.4.5.1.";

/// How limits are chosen.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Limits {
    /// At least the confidence, always
    Exact,
    /// The confidence on average; shorter
    MidP,
    /// Approximate; runs only
    Score,
}

/// Which limit alone.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Side {
    /// "no more than"
    Upper,
    /// "no less than"
    Lower,
}

/// What was asked.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Inputs {
    /// What was seen.
    #[serde(flatten)]
    pub seen: Observation,
    /// Confidence.
    pub confidence: f64,
    /// Method.
    pub method: Limits,
    /// One limit alone.
    pub one_sided: Option<Side>,
}

/// The answer.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Answer {
    #[serde(flatten)]
    interval: Interval,
    unit: &'static str,
    /// Exposure per event, the other way round.
    #[serde(skip_serializing_if = "Option::is_none")]
    hours_between: Option<Interval>,
}

/// Reckons.
///
/// # Errors
/// What the calculators refuse.
pub fn reckon(inputs: Inputs) -> Result<Reckoned<Inputs, Answer>, StatsError> {
    let Inputs { seen, confidence, one_sided, .. } = inputs;
    let interval = match one_sided {
        None => two_sided(inputs, confidence)?,
        Some(side) => alone(inputs, side)?,
    };
    let unit = seen.exposure.unit();
    let level = percent(confidence);
    let statement = match one_sided {
        None => format!("{}: {} per {unit}, {} ({level}).", seen.words(), short(interval.estimate), range(&interval)),
        Some(Side::Upper) => format!("{}: no more than {} per {unit} ({level}).", seen.words(), limit(interval.upper)),
        Some(Side::Lower) => format!("{}: no less than {} per {unit} ({level}).", seen.words(), short(interval.lower)),
    };
    let hours_between = matches!(seen.exposure, Exposure::Hours(_)).then(|| reciprocal(&interval));
    let mut figures = match (seen.exposure, seen.events) {
        (_, 0) => String::new(),
        (Exposure::Hours(_), _) => between(&reciprocal(&interval), "Hours from event to event"),
        (Exposure::Runs(_), _) => between(&reciprocal(&interval), "Runs from event to event"),
    };
    if seen.events == 0 && one_sided.is_none() {
        figures.push_str(&prose(
            "Nothing was seen, so only the upper limit says anything; the one-sided bound is tighter, see `reckon zero`.",
        ));
    }
    let answer = Answer { interval, unit: if unit == "hour" { "per hour" } else { "per run" }, hours_between };
    Ok(Reckoned::new("interval", inputs, answer, method(&inputs), statement, figures))
}

fn between(time: &Interval, what: &str) -> String {
    let estimate = short(time.estimate);
    match (time.lower > 0.0, time.upper.is_finite()) {
        (true, true) => format!("{what}: {estimate}, {} to {}", short(time.lower), short(time.upper)),
        (true, false) => format!("{what}: {estimate}, {} or more", short(time.lower)),
        (false, _) => format!("{what}: {estimate}, {} or fewer", limit(time.upper)),
    }
}

fn reciprocal(rate: &Interval) -> Interval {
    Interval { estimate: 1.0 / rate.estimate, lower: 1.0 / rate.upper, upper: 1.0 / rate.lower, ..*rate }
}

fn two_sided(inputs: Inputs, confidence: f64) -> Result<Interval, StatsError> {
    let events = inputs.seen.events;
    match (inputs.seen.exposure, inputs.method) {
        (Exposure::Runs(runs), Limits::Exact) => stats::clopper_pearson(events, runs, confidence),
        (Exposure::Runs(runs), Limits::MidP) => stats::mid_p(events, runs, confidence),
        (Exposure::Runs(runs), Limits::Score) => stats::wilson(events, runs, confidence),
        (Exposure::Hours(hours), Limits::MidP) => stats::mid_p_rate(events, hours, confidence),
        (Exposure::Hours(hours), _) => stats::garwood(events, hours, confidence),
    }
}

fn alone(inputs: Inputs, side: Side) -> Result<Interval, StatsError> {
    let Observation { events, exposure } = inputs.seen;
    let most = if matches!(exposure, Exposure::Runs(_)) { 1.0 } else { f64::INFINITY };
    let estimate = events as f64 / exposure.amount();
    let confidence = inputs.confidence;
    let limit = match (inputs.method, exposure, side) {
        (Limits::Exact, Exposure::Runs(n), Side::Upper) => stats::clopper_pearson_upper(events, n, confidence)?,
        (Limits::Exact, Exposure::Runs(n), Side::Lower) => stats::clopper_pearson_lower(events, n, confidence)?,
        (Limits::Exact, Exposure::Hours(t), Side::Upper) => stats::garwood_upper(events, t, confidence)?,
        (Limits::Exact, Exposure::Hours(t), Side::Lower) => stats::garwood_lower(events, t, confidence)?,
        // limits with equal tails: one of the two-sided ones is the one-sided one at half the error
        (_, _, side) => {
            let both = two_sided(inputs, 2.0 * confidence - 1.0)?;
            if side == Side::Upper { both.upper } else { both.lower }
        }
    };
    Ok(match side {
        Side::Upper => Interval { estimate, lower: 0.0, upper: limit, confidence },
        Side::Lower => Interval { estimate, lower: limit, upper: most, confidence },
    })
}

fn method(inputs: &Inputs) -> Method {
    let one = inputs.one_sided.is_some();
    let per_run = matches!(inputs.seen.exposure, Exposure::Runs(_));
    let (name, source) = match (per_run, inputs.method, one) {
        (true, Limits::Exact, false) => {
            ("Clopper-Pearson, exact, two-sided", "C. J. Clopper & E. S. Pearson, Biometrika 26 (1934)")
        }
        (true, Limits::Exact, true) => {
            ("Clopper-Pearson, exact, one-sided", "C. J. Clopper & E. S. Pearson, Biometrika 26 (1934)")
        }
        (true, Limits::MidP, false) => ("mid-P, two-sided", MID_P),
        (true, Limits::MidP, true) => ("mid-P, one-sided", MID_P),
        (true, Limits::Score, false) => ("Wilson score, approximate, two-sided", "E. B. Wilson, JASA 22 (1927)"),
        (true, Limits::Score, true) => ("Wilson score, approximate, one-sided", "E. B. Wilson, JASA 22 (1927)"),
        (false, Limits::MidP, false) => ("mid-P for rates, two-sided", MID_P_RATE),
        (false, Limits::MidP, true) => ("mid-P for rates, one-sided", MID_P_RATE),
        (false, _, false) => ("Garwood, exact, two-sided", "F. Garwood, Biometrika 28 (1936)"),
        (false, _, true) => ("Garwood, exact, one-sided", "F. Garwood, Biometrika 28 (1936)"),
    };
    Method { name, source, assumption: INDEPENDENT }
}

const MID_P: &str = "H. O. Lancaster, JASA 56 (1961); G. Berry & P. Armitage, The Statistician 44 (1995)";
const MID_P_RATE: &str = "G. R. Cohen & S.-Y. Yang, Statistics in Medicine 13 (1994), from memory";

/// The assumption of all that counts events.
pub(super) const INDEPENDENT: &str = "\
events come independently at one constant rate; failures that cluster make it too narrow, see `reckon spread` and \
`reckon episodes`";
