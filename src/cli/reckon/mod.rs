//! `reckon`: every calculator on its own, for whoever plans or judges a test without this program's runner.

mod compare;
mod family;
mod interval;
mod power;
mod sequential;
mod shrink;
mod slope;
mod spread;
mod zero;

use clap::{Args, Subcommand};
use serde::Serialize;

use super::args::{Format, Output};
use super::{lists, quantity, say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::{self, Exposure, Rate, Reckoned};
use crate::stats::StatsError;

/// What every calculator's help ends with: where its formulas are from, and how things are written.
fn notes(sources: &str) -> String {
    format!("{sources}\n\n{NOTATION}")
}

const NOTATION: &str = "\
Write counts as 3, 1_000 or 1e9; times as 12.5h, 90m, 7d; rates as 1/500h or 0.002/h, probabilities per run as 1e-9 or \
1/1000000; lists as 3,0,1 or @FILE or - (standard input), one value or a row of values a line, # begins a comment.";

/// The calculators.
#[derive(Clone, Debug, Subcommand)]
pub enum ReckonCommand {
    /// How often: limits for a probability per run or a rate per hour, from what was seen
    #[command(after_help = notes(reckon::interval::SOURCES))]
    Interval(interval::IntervalArgs),
    /// What silence proves, or how long it has to last to prove a bound
    #[command(after_help = notes(reckon::zero::SOURCES))]
    Zero(zero::ZeroArgs),
    /// Is the first rate higher than the second: exact test and limits of the ratio
    #[command(after_help = notes(reckon::compare::SOURCES))]
    Compare(compare::CompareArgs),
    /// A test that stops as early as the evidence allows, with its exact risks
    #[command(after_help = notes(reckon::sequential::SOURCES))]
    Sequential(sequential::SequentialArgs),
    /// How long a test has to be to notice something, or what it would notice
    #[command(after_help = notes(reckon::power::SOURCES))]
    Power(power::PowerArgs),
    /// Do events cluster, and which limits hold then
    #[command(after_help = notes(reckon::spread::SPREAD_SOURCES))]
    Spread(spread::SpreadArgs),
    /// How many episodes events make that come close together
    #[command(after_help = notes(reckon::spread::EPISODES_SOURCE))]
    Episodes(spread::EpisodesArgs),
    /// Many tests at once: adjusted p-values and what each method promises
    #[command(after_help = notes(reckon::family::SOURCES))]
    Family(family::FamilyArgs),
    /// Many cells with few events: every rate pulled towards what all have in common
    #[command(after_help = notes(reckon::shrink::SOURCES))]
    Shrink(shrink::ShrinkArgs),
    /// How a rate goes with temperature
    #[command(after_help = notes(reckon::slope::SLOPE_SOURCES))]
    Slope(slope::SlopeArgs),
    /// A ratio of sums over units that are not alike
    #[command(after_help = notes(reckon::slope::RATIO_SOURCES))]
    Ratio(slope::RatioArgs),
}

/// Runs one calculator.
pub fn run(command: &ReckonCommand) -> Result<Exit, Error> {
    match command {
        ReckonCommand::Interval(args) => interval::run(args),
        ReckonCommand::Zero(args) => zero::run(args),
        ReckonCommand::Compare(args) => compare::run(args),
        ReckonCommand::Sequential(args) => sequential::run(args),
        ReckonCommand::Power(args) => power::run(args),
        ReckonCommand::Spread(args) => spread::spread(args),
        ReckonCommand::Episodes(args) => spread::episodes(args),
        ReckonCommand::Family(args) => family::run(args),
        ReckonCommand::Shrink(args) => shrink::run(args),
        ReckonCommand::Slope(args) => slope::slope(args),
        ReckonCommand::Ratio(args) => slope::ratio(args),
    }
}

/// Options of every calculator with limits.
#[derive(Clone, Debug, Args)]
struct Confident {
    /// Confidence of the limits, e.g. 95% or 0.95
    #[arg(long, value_name = "SHARE", default_value = "95%", value_parser = quantity::share, allow_hyphen_values = true)]
    confidence: f64,
}

/// The answer on standard output; what a calculator refuses is laid at the door of `options`.
fn tell<I: Serialize, A: Serialize>(
    output: &Output,
    options: &str,
    answer: Result<Reckoned<I, A>, StatsError>,
) -> Result<Exit, Error> {
    let answer = answer.map_err(|why| Error::Usage(format!("{options}: {why}")))?;
    match output.format {
        Format::Text => say(&answer.text())?,
        Format::Json => say_json(&answer)?,
    }
    Ok(Exit::Clear)
}

/// Exactly one of two ways to say how much was watched; clap has seen to it.
fn exposure(runs: Option<u64>, hours: Option<f64>) -> Result<Exposure, Error> {
    match (runs, hours) {
        (Some(runs), None) => Ok(Exposure::Runs(runs)),
        (None, Some(hours)) => Ok(Exposure::Hours(hours)),
        _ => Err(Error::Usage("--runs, --hours: give one of them".to_owned())),
    }
}

/// A rate per hour; anything else is refused in the name of `option`.
fn per_hour(option: &str, rate: Rate) -> Result<f64, Error> {
    match rate {
        Rate::PerHour(rate) => Ok(rate),
        Rate::PerRun(_) => Err(Error::Usage(format!(
            "{option}: a probability per run; only rates per hour are taken here, such as 1/500h or 0.002/h"
        ))),
    }
}

/// Two lists of which at most one can come from standard input.
fn one_from_input(first: (&str, &str), second: (&str, Option<&str>)) -> Result<(), Error> {
    if first.1.trim() == "-" && second.1.is_some_and(|text| text.trim() == "-") {
        let (first, second) = (first.0, second.0);
        return Err(Error::Usage(format!(
            "{first}, {second}: both are - ; put one of them into a file, as in {second} @FILE"
        )));
    }
    Ok(())
}

/// Exposures beside `cells` counts, and the name of one unit; one unit each where none are given.
fn exposures(
    text: Option<&str>,
    counts: usize,
    most: usize,
    alone: &'static str,
) -> Result<(Vec<f64>, &'static str), Error> {
    let Some(text) = text else { return Ok((vec![1.0; counts], alone)) };
    let plain = |entry: &str| match quantity::number(entry) {
        Ok(_) => quantity::positive(entry).map(|value| (value, false)),
        Err(_) => quantity::time(entry).map(|hours| (hours, true)),
    };
    let values = lists::list("--exposures", text, most, plain)?;
    if values.len() != counts {
        let values = values.len();
        return Err(Error::Usage(format!("--exposures: {values} values beside {counts} counts; give one for each")));
    }
    let timed = values.iter().filter(|(_, timed)| *timed).count();
    if timed != 0 && timed != values.len() {
        return Err(Error::Usage("--exposures: some have a unit and some have none; write all alike".to_owned()));
    }
    Ok((values.iter().map(|(value, _)| *value).collect(), if timed > 0 { "hour" } else { "unit" }))
}

/// Counts whose sum is a count as well.
fn counts(text: &str, most: usize) -> Result<Vec<u64>, Error> {
    let counts = lists::list("--counts", text, most, quantity::count)?;
    let sum: u128 = counts.iter().map(|&count| u128::from(count)).sum();
    if sum > 1 << 53 {
        return Err(Error::Usage("--counts: together more than 2^53; give smaller counts".to_owned()));
    }
    Ok(counts)
}
