//! `reckon interval`.

use clap::builder::PossibleValue;
use clap::{Args, ValueEnum};

use super::{Confident, exposure, tell};
use crate::cli::args::Output;
use crate::cli::quantity;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::interval::{Inputs, Limits, Side, reckon};
use crate::report::reckon::{Exposure, Observation};

/// `reckon interval`.
#[derive(Clone, Debug, Args)]
pub struct IntervalArgs {
    /// Events seen: wrong results, failures
    #[arg(long, value_name = "COUNT", value_parser = quantity::count, allow_hyphen_values = true)]
    events: u64,
    #[command(flatten)]
    over: Over,
    #[command(flatten)]
    confident: Confident,
    /// How limits are chosen
    #[arg(long, value_enum, default_value = "exact")]
    method: Limits,
    /// Give one limit alone
    #[arg(long, value_enum, value_name = "SIDE")]
    one_sided: Option<Side>,
    #[command(flatten)]
    output: Output,
}

#[derive(Clone, Debug, Args)]
#[group(required = true, multiple = false)]
struct Over {
    /// Runs in which they were seen, at most one event a run
    #[arg(long, value_name = "COUNT", value_parser = quantity::some, allow_hyphen_values = true)]
    runs: Option<u64>,
    /// Hours in which they were seen, summed over all cores
    #[arg(long, value_name = "TIME", value_parser = quantity::hours, allow_hyphen_values = true)]
    hours: Option<f64>,
}

impl ValueEnum for Limits {
    fn value_variants<'a>() -> &'a [Self] {
        &[Limits::Exact, Limits::MidP, Limits::Score]
    }

    fn to_possible_value(&self) -> Option<PossibleValue> {
        Some(match self {
            Limits::Exact => {
                PossibleValue::new("exact").help("Covers at least as often as the confidence says, always")
            }
            Limits::MidP => PossibleValue::new("mid-p").help("Shorter; covers as often as the confidence on average"),
            Limits::Score => PossibleValue::new("score").help("Approximate; for runs"),
        })
    }
}

impl ValueEnum for Side {
    fn value_variants<'a>() -> &'a [Self] {
        &[Side::Upper, Side::Lower]
    }

    fn to_possible_value(&self) -> Option<PossibleValue> {
        Some(match self {
            Side::Upper => PossibleValue::new("upper").help("No more than"),
            Side::Lower => PossibleValue::new("lower").help("No less than"),
        })
    }
}

pub fn run(args: &IntervalArgs) -> Result<Exit, Error> {
    let exposure = exposure(args.over.runs, args.over.hours)?;
    let refuse = |why: String| Err(Error::Usage(why));
    match exposure {
        Exposure::Runs(runs) if args.events > runs => {
            return refuse(format!("--events: {} in {runs} runs; count at most one event a run", args.events));
        }
        Exposure::Hours(_) if args.method == Limits::Score => {
            return refuse("--method score: is for --runs; with --hours take exact or mid-p".to_owned());
        }
        _ => {}
    }
    let confidence = args.confident.confidence;
    if args.one_sided.is_some() && args.method != Limits::Exact && confidence <= 0.5 {
        return refuse(
            "--confidence: one-sided limits of this method need more than 50 %; take --method exact".to_owned(),
        );
    }
    let seen = Observation { events: args.events, exposure };
    let inputs = Inputs { seen, confidence, method: args.method, one_sided: args.one_sided };
    tell(&args.output, "--events", reckon(inputs))
}
