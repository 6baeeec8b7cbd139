//! The calculators as documents and as text: what was asked, the answer, a sentence to quote, the method with its
//! source, and what the answer rests on.

pub mod compare;
pub mod family;
pub mod interval;
pub mod power;
pub mod sequential;
pub mod shrink;
pub mod slope;
pub mod spread;
pub mod zero;

use serde::Serialize;

use super::figures::short;
use super::text::folded;
use crate::stats::Interval;

/// In what events were counted.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Exposure {
    /// Hours of exposure, summed over all that were exposed.
    Hours(f64),
    /// Runs.
    Runs(u64),
}

/// How often, per unit of exposure.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Rate {
    /// Events per hour.
    PerHour(f64),
    /// Probability of an event per run.
    PerRun(f64),
}

/// Events in their exposure.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Observation {
    /// Events.
    pub events: u64,
    /// Exposure.
    #[serde(flatten)]
    pub exposure: Exposure,
}

impl Exposure {
    /// The number alone, in hours or runs.
    pub fn amount(self) -> f64 {
        match self {
            Exposure::Hours(hours) => hours,
            Exposure::Runs(runs) => runs as f64,
        }
    }

    /// One unit of it, as in "per hour".
    pub fn unit(self) -> &'static str {
        match self {
            Exposure::Hours(_) => "hour",
            Exposure::Runs(_) => "run",
        }
    }

    /// As people say it.
    pub fn words(self) -> String {
        match self {
            Exposure::Hours(1.0) => "1 hour".to_owned(),
            Exposure::Hours(hours) => format!("{} hours", short(hours)),
            Exposure::Runs(runs) if runs >= MANY => format!("{} runs", short(runs as f64)),
            Exposure::Runs(runs) => counted(runs, "run"),
        }
    }
}

/// Counts from here on are hard to read by their digits.
const MANY: u64 = 10_000_000;

impl Rate {
    /// The number alone, per hour or per run.
    pub fn amount(self) -> f64 {
        match self {
            Rate::PerHour(rate) | Rate::PerRun(rate) => rate,
        }
    }

    /// As people say it: "a rate below 1 in 500 hours".
    pub fn words(self) -> String {
        match self {
            Rate::PerHour(rate) if rate < 1.0 => format!("1 in {} hours", short(1.0 / rate)),
            Rate::PerHour(rate) => format!("{} per hour", short(rate)),
            Rate::PerRun(rate) => format!("{} per run", short(rate)),
        }
    }

    /// How often something is wrong: "wrong once in 500 hours".
    pub fn often(self) -> String {
        match self {
            Rate::PerHour(rate) if rate < 1.0 => format!("once in {} hours", short(1.0 / rate)),
            Rate::PerHour(rate) => format!("{} times per hour", short(rate)),
            Rate::PerRun(rate) => format!("with probability {} per run", short(rate)),
        }
    }
}

impl Observation {
    /// As people say it.
    pub fn words(self) -> String {
        format!("{} in {}", counted(self.events, "event"), self.exposure.words())
    }
}

/// What a calculator answers: `inputs` echoed, `answer` under its own names.
#[derive(Clone, Debug, Serialize)]
pub struct Reckoned<I, A> {
    schema: String,
    statement: String,
    #[serde(flatten)]
    answer: A,
    inputs: I,
    method: &'static str,
    source: &'static str,
    assumption: &'static str,
    /// What stands between the statement and the method in the text.
    #[serde(skip)]
    figures: String,
}

/// How an answer was made.
#[derive(Clone, Copy, Debug)]
pub struct Method {
    /// Its name.
    pub name: &'static str,
    /// Who published it.
    pub source: &'static str,
    /// What has to be so for the answer to hold.
    pub assumption: &'static str,
}

impl<I: Serialize, A: Serialize> Reckoned<I, A> {
    /// The document `proofhouse/reckon-<name>/1`.
    fn new(name: &str, inputs: I, answer: A, method: Method, statement: String, figures: String) -> Reckoned<I, A> {
        Reckoned {
            schema: format!("proofhouse/reckon-{name}/1"),
            statement,
            answer,
            inputs,
            method: method.name,
            source: method.source,
            assumption: method.assumption,
            figures,
        }
    }

    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = prose(&self.statement);
        out.push('\n');
        if !self.figures.is_empty() {
            out.push('\n');
            out.push_str(self.figures.trim_end());
            out.push('\n');
        }
        out.push('\n');
        for (what, text) in [("Method", self.method), ("Source", self.source), ("Holds if", self.assumption)] {
            out.push_str(&prose(&format!("{what}: {text}")));
            out.push('\n');
        }
        out
    }
}

/// Folded, but not before a percent sign and not at a hyphen.
pub(super) fn prose(text: &str) -> String {
    let (space, hyphen) = ("\u{a0}", "\u{2011}");
    folded(&text.replace(" %", "\u{a0}%").replace('-', hyphen)).replace(space, " ").replace(hyphen, "-")
}

/// A count with its noun.
pub(super) fn counted(number: u64, noun: &str) -> String {
    format!("{} {noun}{}", whole(number), if number == 1 { "" } else { "s" })
}

/// A count to be read and to be copied; in short as well where the digits are many.
pub(super) fn whole(number: u64) -> String {
    if number < MANY { number.to_string() } else { format!("{number} ({})", short(number as f64)) }
}

/// A number to be reached: four digits, never rounded down.
pub(super) fn at_least(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return limit(value);
    }
    let step = 10f64.powi(value.abs().log10().floor() as i32 - 3);
    // what is a whole number of steps but for rounding is not pushed on
    let up = (value / step - 1e-9).ceil() * step;
    if (1e-3..1e7).contains(&up) {
        let digits = usize::try_from(-(step.log10().round() as i32)).unwrap_or(0);
        format!("{up:.digits$}")
    } else {
        format!("{up:.3e}")
    }
}

/// A limit, which there may not be.
pub(super) fn limit(value: f64) -> String {
    if value.is_finite() { short(value) } else { "no limit".to_owned() }
}

/// "lower to upper", or "lower or more" without an upper limit.
pub(super) fn range(interval: &Interval) -> String {
    if interval.upper.is_finite() {
        format!("{} to {}", short(interval.lower), short(interval.upper))
    } else {
        format!("{} or more", short(interval.lower))
    }
}

/// Hours, and days beside them where they are many.
pub(super) fn hours(hours: f64) -> String {
    span(&short(hours), hours)
}

/// Hours to be reached, rounded up.
pub(super) fn hours_at_least(hours: f64) -> String {
    span(&at_least(hours), hours)
}

fn span(text: &str, hours: f64) -> String {
    match hours {
        1.0 => "1 hour".to_owned(),
        h if (72.0..1e6).contains(&h) => format!("{text} hours ({} days)", short(h / 24.0)),
        h if h < 0.1 => format!("{text} hours ({} s)", short(h * 3600.0)),
        _ => format!("{text} hours"),
    }
}

/// A probability as people say it: three digits, in percent down to a hundredth of one. Near 1 it is rounded down, so
/// nothing uncertain is called certain.
pub(super) fn chance(p: f64) -> String {
    match p {
        0.0 => "0".to_owned(),
        p if p < 1e-4 => short(p),
        p if p < 0.999 => format!("{} %", short(three_digits(100.0 * p))),
        p if p < 1.0 => format!("{:.4} %", (1e6 * p).floor().min(999_999.0) / 1e4),
        _ => "100 %".to_owned(),
    }
}

/// Rounded to three digits, so that 9.9999 is written as 10.0 and not as 10.00.
fn three_digits(value: f64) -> f64 {
    let step = 10f64.powi(value.abs().log10().floor() as i32 - 2);
    (value / step).round() * step
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_has_to_be_reached_is_never_rounded_down() {
        let cases = [(1497.866, "1498"), (15.0401, "15.05"), (29.0, "29.00"), (0.0123456, "0.01235"), (3e9, "3.000e9")];
        for (value, text) in cases {
            assert_eq!(at_least(value), text);
        }
        assert_eq!(at_least(f64::INFINITY), "no limit");
        assert_eq!(hours_at_least(1497.866), "1498 hours (62.4 days)");
    }

    #[test]
    fn chances_are_never_called_certain() {
        let cases = [(0.0, "0"), (3.4e-6, "3.40e-6"), (0.036, "3.60 %"), (0.9999966, "99.9996 %"), (1.0, "100 %")];
        for (p, text) in cases {
            assert_eq!(chance(p), text);
        }
        assert_eq!(chance(1.0 - 1e-12), "99.9999 %");
        assert_eq!(chance(0.9983), "99.8 %");
        assert_eq!((chance(0.099_999), chance(0.009_999_9)), ("10.0 %".to_owned(), "1.00 %".to_owned()));
    }

    #[test]
    fn no_limit_is_said_in_words() {
        let open = Interval { estimate: f64::INFINITY, lower: 0.5, upper: f64::INFINITY, confidence: 0.95 };
        assert_eq!(range(&open), "0.500 or more");
        assert_eq!(limit(open.estimate), "no limit");
        assert_eq!((counted(1, "event"), counted(0, "event")), ("1 event".to_owned(), "0 events".to_owned()));
        assert_eq!(whole(2_995_732_274), "2995732274 (3.00e9)");
    }
}
