//! What every calculator answers with, what it refuses, and the checks of its inputs.

use serde::{Deserialize, Serialize};

/// An estimate with its limits. In JSON an estimate or upper limit of +∞ ("no limit") is `null`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Interval {
    /// The point estimate, in the unit of the calculator (per run, per unit of exposure, a ratio, a time).
    #[serde(with = "unbounded")]
    pub estimate: f64,
    /// Lower limit, same unit.
    pub lower: f64,
    /// Upper limit, same unit.
    #[serde(with = "unbounded")]
    pub upper: f64,
    /// Confidence level of the pair of limits together, in (0, 1).
    pub confidence: f64,
}

impl Interval {
    /// The same interval in another unit: all three numbers times `factor` (> 0), e.g. 3600 from per second to per hour.
    #[must_use]
    pub fn scaled(self, factor: f64) -> Self {
        Self { estimate: self.estimate * factor, lower: self.lower * factor, upper: self.upper * factor, ..self }
    }
}

/// +∞ as `null`, because JSON has no infinity.
mod unbounded {
    use serde::{Deserialize, Deserializer, Serialize, Serializer};

    pub fn serialize<S: Serializer>(value: &f64, to: S) -> Result<S::Ok, S::Error> {
        value.is_finite().then_some(*value).serialize(to)
    }

    pub fn deserialize<'de, D: Deserializer<'de>>(from: D) -> Result<f64, D::Error> {
        Ok(Option::<f64>::deserialize(from)?.unwrap_or(f64::INFINITY))
    }
}

/// Why a calculator gives no answer. Each message names the value and the remedy.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum StatsError {
    /// Confidence outside the open interval (0, 1), or NaN.
    #[error("confidence {0} is not between 0 and 1: give a fraction such as 0.95")]
    Confidence(f64),
    /// A probability outside its range, or NaN.
    #[error("{name} {value} is not a probability: give a number {range}")]
    Probability {
        /// What the value was meant as.
        name: &'static str,
        /// The value given.
        value: f64,
        /// The range that is allowed, in words.
        range: &'static str,
    },
    /// A value that has to be positive and finite is not.
    #[error("{name} {value} is not positive and finite: give {remedy}")]
    NotPositive {
        /// What the value was meant as.
        name: &'static str,
        /// The value given.
        value: f64,
        /// What to give instead.
        remedy: &'static str,
    },
    /// More mismatches than runs.
    #[error("{mismatches} mismatches exceed {runs} runs: count at most one mismatch per run")]
    MoreMismatchesThanRuns {
        /// Mismatches given.
        mismatches: u64,
        /// Runs given.
        runs: u64,
    },
    /// No runs at all.
    #[error("0 runs say nothing about a probability: give at least 1")]
    NoRuns,
    /// The statistic does not exist without events.
    #[error("0 events leave {0} undetermined: collect more exposure or report the zero-failure bound")]
    NoEvents(&'static str),
    /// The counts scatter too little for a law of different rates.
    #[error("the counts scatter no more than one common rate would make them: pool them instead")]
    OneRate,
    /// Too few values.
    #[error("{given} {name} are too few: give at least {needed}")]
    TooFew {
        /// What was given.
        name: &'static str,
        /// How many were given.
        given: usize,
        /// How many are needed.
        needed: usize,
    },
    /// Two lists that belong together differ in length.
    #[error("{counts} counts but {exposures} exposures: give one exposure per count")]
    Lengths {
        /// Number of counts.
        counts: usize,
        /// Number of exposures.
        exposures: usize,
    },
    /// A time that is NaN or infinite.
    #[error("time {0} is not a finite number of seconds: drop or repair that record")]
    Time(f64),
    /// A value that has to be finite is not.
    #[error("{name} {value} is not a finite number: give {remedy}")]
    NotFinite {
        /// What the value was meant as.
        name: &'static str,
        /// The value given.
        value: f64,
        /// What to give instead.
        remedy: &'static str,
    },
    /// A value outside of what the calculator can work with.
    #[error("{name} {value} is out of range: give {remedy}")]
    OutOfRange {
        /// What the value was meant as.
        name: &'static str,
        /// The value given.
        value: f64,
        /// What to give instead.
        remedy: &'static str,
    },
    /// No slope without a spread.
    #[error("every reading is at {0}: a slope needs readings at different values")]
    OneValue(f64),
    /// The likelihood of a slope rises for ever.
    #[error(
        "all {events} events lie at the {end} value, {at}: no finite slope fits best; add readings beyond it, or more exposure elsewhere"
    )]
    NoFiniteSlope {
        /// Number of events.
        events: u64,
        /// `highest` or `lowest`.
        end: &'static str,
        /// The value at which they all lie.
        at: f64,
    },
    /// Two rates that only an endless test could tell apart.
    #[error(
        "rates {low} and {high} are too close: telling them apart takes more than {most} events; choose rates further apart or larger risks"
    )]
    TooClose {
        /// The lower rate.
        low: f64,
        /// The higher rate.
        high: f64,
        /// The number of events up to which plans are worked out.
        most: u64,
    },
    /// The answer is larger than a count can hold exactly.
    #[error("more than 2^53 runs would be needed: allow a higher probability or less confidence")]
    BeyondCounts,
}

/// Checks a confidence level and returns ln(1 − confidence), the log of the error probability for one side.
pub(super) fn ln_error(confidence: f64) -> Result<f64, StatsError> {
    if confidence > 0.0 && confidence < 1.0 {
        Ok((-confidence).ln_1p())
    } else {
        Err(StatsError::Confidence(confidence))
    }
}

pub(super) fn check_runs(mismatches: u64, runs: u64) -> Result<(), StatsError> {
    match runs {
        0 => Err(StatsError::NoRuns),
        _ if mismatches > runs => Err(StatsError::MoreMismatchesThanRuns { mismatches, runs }),
        _ => Ok(()),
    }
}

pub(super) fn check_positive(name: &'static str, value: f64, remedy: &'static str) -> Result<(), StatsError> {
    if value > 0.0 && value.is_finite() { Ok(()) } else { Err(StatsError::NotPositive { name, value, remedy }) }
}

pub(super) fn check_finite(name: &'static str, value: f64, remedy: &'static str) -> Result<(), StatsError> {
    if value.is_finite() { Ok(()) } else { Err(StatsError::NotFinite { name, value, remedy }) }
}

pub(super) fn check_exposure(exposure: f64) -> Result<(), StatsError> {
    check_positive("exposure", exposure, "the busy time or the number of runs that was observed")
}

/// A probability strictly between 0 and 1.
pub(super) fn check_open_probability(name: &'static str, value: f64) -> Result<(), StatsError> {
    let range = "above 0 and below 1";
    if value > 0.0 && value < 1.0 { Ok(()) } else { Err(StatsError::Probability { name, value, range }) }
}

/// A probability from 0 to 1, both included.
pub(super) fn check_probability(name: &'static str, value: f64) -> Result<(), StatsError> {
    let range = "from 0 to 1";
    if (0.0..=1.0).contains(&value) { Ok(()) } else { Err(StatsError::Probability { name, value, range }) }
}
