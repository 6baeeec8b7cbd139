//! `reckon slope` and `reckon ratio`.

use clap::Args;

use super::{Confident, tell};
use crate::cli::args::Output;
use crate::cli::{lists, quantity};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::slope::{self, At, Pairs, Readings};

/// Readings that are taken at once.
const MOST_READINGS: usize = 2_000;
/// Pairs that are taken at once.
const MOST_PAIRS: usize = 50_000;

/// `reckon slope`.
#[derive(Clone, Debug, Args)]
pub struct SlopeArgs {
    /// Events, time and temperature of each reading: 3/10h@61,0/12h@55
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    readings: String,
    /// Say the rate at this temperature, in °C
    #[arg(long, value_name = "CELSIUS", value_parser = quantity::celsius, allow_hyphen_values = true)]
    at: Option<f64>,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

pub fn slope(args: &SlopeArgs) -> Result<Exit, Error> {
    let readings = lists::list("--readings", &args.readings, MOST_READINGS, quantity::reading)?;
    let readings = readings.into_iter().map(|(events, hours, celsius)| At { events, hours, celsius }).collect();
    let inputs = Readings { readings, at: args.at, confidence: args.confident.confidence };
    tell(&args.output, "--readings", slope::slope(inputs))
}

/// `reckon ratio`.
#[derive(Clone, Debug, Args)]
pub struct RatioArgs {
    /// What was counted and in how much, by unit: 3/10,4/20
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    pairs: String,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

pub fn ratio(args: &RatioArgs) -> Result<Exit, Error> {
    let pairs = lists::list("--pairs", &args.pairs, MOST_PAIRS, quantity::pair)?;
    tell(&args.output, "--pairs", slope::ratio(Pairs { pairs, confidence: args.confident.confidence }))
}
