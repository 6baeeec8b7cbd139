//! `reckon spread` and `reckon episodes`.

use clap::Args;

use super::{Confident, counts, exposures, one_from_input, tell};
use crate::cli::args::Output;
use crate::cli::{lists, quantity};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::spread::{self, Counts, Times};

/// Counts that are taken at once: the likelihood of all is summed some thousand times.
const MOST_COUNTS: usize = 600;
/// Times that are taken at once.
const MOST_TIMES: usize = 20_000;

/// `reckon spread`.
#[derive(Clone, Debug, Args)]
pub struct SpreadArgs {
    /// Events by cluster: one count a day, a core, a host
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    counts: String,
    /// Exposure of each, numbers or times; all alike if left out
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    exposures: Option<String>,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

pub fn spread(args: &SpreadArgs) -> Result<Exit, Error> {
    one_from_input(("--counts", &args.counts), ("--exposures", args.exposures.as_deref()))?;
    let counts = counts(&args.counts, MOST_COUNTS)?;
    let (exposures, unit) = exposures(args.exposures.as_deref(), counts.len(), MOST_COUNTS, "count")?;
    let inputs = Counts { counts, exposures, unit, confidence: args.confident.confidence };
    tell(&args.output, "--counts", spread::spread(inputs))
}

/// `reckon episodes`.
#[derive(Clone, Debug, Args)]
pub struct EpisodesArgs {
    /// When events came, in seconds on any one clock, in any order
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    times: String,
    /// Quiet that ends an episode
    #[arg(long, value_name = "TIME", default_value = "60s", value_parser = quantity::seconds, allow_hyphen_values = true)]
    gap: f64,
    /// Hours in which all that was seen, for the rate of episodes
    #[arg(long, value_name = "TIME", value_parser = quantity::hours, allow_hyphen_values = true)]
    hours: Option<f64>,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

/// Seconds that any clock can mean.
const MOST_SECONDS: f64 = 1e15;

pub fn episodes(args: &EpisodesArgs) -> Result<Exit, Error> {
    let second = |text: &str| match quantity::number(text)? {
        time if time.abs() <= MOST_SECONDS => Ok(time),
        _ => Err(format!("more than {MOST_SECONDS:e} seconds away; give seconds on one clock")),
    };
    let times_s = lists::list("--times", &args.times, MOST_TIMES, second)?;
    let inputs = Times { times_s, gap_s: args.gap, hours: args.hours, confidence: args.confident.confidence };
    tell(&args.output, "--times", spread::episodes(inputs))
}
