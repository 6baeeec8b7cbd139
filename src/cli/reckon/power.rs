//! `reckon power`.

use clap::Args;

use super::{exposure, per_hour, tell};
use crate::cli::args::Output;
use crate::cli::quantity;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::power::{self, Apart, Below, Noticing, Once, Within};
use crate::report::reckon::{Exposure, Rate};

/// Expected events of a comparison up to which its power is summed.
const MOST_EVENTS: f64 = 1e6;

/// First rate over second, level, power and split up to which lengths are worked out at once.
const CLOSEST: f64 = 1.1;
const LEAST_LEVEL: f64 = 1e-4;
const MOST_POWER: f64 = 0.9999;
const SPLITS: std::ops::RangeInclusive<f64> = 0.1..=100.0;

/// `reckon power`.
#[derive(Clone, Debug, Args)]
pub struct PowerArgs {
    #[command(flatten)]
    what: What,
    /// With --first: the rate that it is to be told from
    #[arg(long, value_name = "RATE", requires = "first", value_parser = quantity::rate, allow_hyphen_values = true)]
    second: Option<Rate>,
    /// With --below: the rate in truth, 0 for one that never fails
    #[arg(long = "true", value_name = "RATE", requires = "below", value_parser = true_rate, allow_hyphen_values = true)]
    true_rate: Option<f64>,
    /// With --rate or --below: probability of success
    #[arg(long, value_name = "SHARE", conflicts_with = "first", value_parser = quantity::share, allow_hyphen_values = true)]
    probability: Option<f64>,
    /// With --rate or --first: what would so many hours notice?
    #[arg(long, value_name = "TIME", conflicts_with = "below", value_parser = quantity::hours, allow_hyphen_values = true)]
    hours: Option<f64>,
    /// With --rate: what would so many runs notice?
    #[arg(long, value_name = "COUNT", requires = "rate", conflicts_with = "hours", value_parser = quantity::some, allow_hyphen_values = true)]
    runs: Option<u64>,
    /// With --first: risk of seeing a difference where there is none [default: 5%]
    #[arg(long, value_name = "SHARE", requires = "first", value_parser = quantity::share, allow_hyphen_values = true)]
    level: Option<f64>,
    /// With --first: probability of seeing the difference that there is [default: 90%]
    #[arg(long, value_name = "SHARE", requires = "first", conflicts_with = "hours", value_parser = quantity::share, allow_hyphen_values = true)]
    power: Option<f64>,
    /// With --first: hours of the second for one of the first [default: 1]
    #[arg(long, value_name = "RATIO", requires = "first", value_parser = quantity::positive, allow_hyphen_values = true)]
    split: Option<f64>,
    /// With --below: confidence of the bound [default: 95%]
    #[arg(long, value_name = "SHARE", requires = "below", value_parser = quantity::share, allow_hyphen_values = true)]
    confidence: Option<f64>,
    #[command(flatten)]
    output: Output,
}

#[derive(Clone, Debug, Args)]
#[group(required = true, multiple = false)]
struct What {
    /// See this rate, or probability per run, at least once
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    rate: Option<Rate>,
    /// Tell this rate from a lower one, --second
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    first: Option<Rate>,
    /// Show that a rate is below this
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    below: Option<Rate>,
}

fn true_rate(text: &str) -> Result<f64, String> {
    match quantity::number(text) {
        Ok(0.0) => Ok(0.0),
        _ => match quantity::rate(text)? {
            Rate::PerHour(rate) => Ok(rate),
            Rate::PerRun(_) => Err("not a rate per hour; write 1/5000h, 0.0002/h or 0".to_owned()),
        },
    }
}

pub fn run(args: &PowerArgs) -> Result<Exit, Error> {
    match args.what {
        What { rate: Some(rate), .. } => see(args, rate),
        What { first: Some(first), .. } => tell_apart(args, first),
        What { below: Some(below), .. } => show_below(args, below),
        _ => Err(Error::Usage("--rate, --first, --below: give one of them".to_owned())),
    }
}

fn see(args: &PowerArgs, rate: Rate) -> Result<Exit, Error> {
    let over = args.hours.is_some() || args.runs.is_some();
    match (args.probability, over) {
        (Some(probability), false) => tell(&args.output, "--rate", power::once(Once { rate, probability })),
        (None, true) => {
            let exposure = exposure(args.runs, args.hours)?;
            match (rate, exposure) {
                (Rate::PerHour(_), Exposure::Hours(_)) | (Rate::PerRun(_), Exposure::Runs(_)) => {
                    tell(&args.output, "--rate", power::within(Within { rate, exposure }))
                }
                (Rate::PerHour(_), Exposure::Runs(_)) => Err(Error::Usage(
                    "--runs: --rate is per hour; give --hours, or --rate per run such as 1e-9".to_owned(),
                )),
                (Rate::PerRun(_), Exposure::Hours(_)) => Err(Error::Usage(
                    "--hours: --rate is per run; give --runs, or --rate per hour such as 1/500h".to_owned(),
                )),
            }
        }
        _ => Err(Error::Usage("--rate: give either --probability, or --hours or --runs, beside it".to_owned())),
    }
}

fn tell_apart(args: &PowerArgs, first: Rate) -> Result<Exit, Error> {
    let Some(second) = args.second else {
        return Err(Error::Usage("--first: give the lower rate beside it as --second".to_owned()));
    };
    let (first, second) = (per_hour("--first", first)?, per_hour("--second", second)?);
    if first <= second {
        return Err(Error::Usage("--first: not above --second; give the higher rate as --first".to_owned()));
    }
    let (level, split, power) = (args.level.unwrap_or(0.05), args.split.unwrap_or(1.0), args.power.unwrap_or(0.9));
    let refuse = |why: String| Err(Error::Usage(why));
    if level < LEAST_LEVEL {
        return refuse("--level: below 0.01 %, the least that is worked out; give a higher risk".to_owned());
    }
    if !SPLITS.contains(&split) {
        return refuse("--split: not from 0.1 to 100; give hours of the second for one of the first".to_owned());
    }
    if args.hours.is_none() && first < CLOSEST * second {
        return refuse(format!("--first: less than {CLOSEST} times --second, too close; give rates further apart"));
    }
    if power > MOST_POWER {
        return refuse("--power: above 99.99 %, the most that is worked out; give less".to_owned());
    }
    let options = "--first, --second";
    match args.hours {
        Some(hours) if (first + second * split) * hours > MOST_EVENTS => {
            Err(Error::Usage(format!("--hours: more than {MOST_EVENTS} events would come; give fewer hours")))
        }
        Some(hours) => tell(&args.output, options, power::noticing(Noticing { first, second, hours, split, level })),
        None => tell(&args.output, options, power::apart(Apart { first, second, split, level, power })),
    }
}

fn show_below(args: &PowerArgs, below: Rate) -> Result<Exit, Error> {
    let below = per_hour("--below", below)?;
    let Some(true_rate) = args.true_rate else {
        return Err(Error::Usage(
            "--below: give the rate that is expected in truth beside it as --true, 0 for none".to_owned(),
        ));
    };
    if true_rate >= below {
        return Err(Error::Usage("--true: not below --below, so no test can show it; give a lower rate".to_owned()));
    }
    let confidence = args.confidence.unwrap_or(0.95);
    let probability = args.probability.unwrap_or(0.9);
    tell(&args.output, "--below, --true", power::below(Below { below, true_rate, confidence, probability }))
}
