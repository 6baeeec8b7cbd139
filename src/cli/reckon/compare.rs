//! `reckon compare`.

use clap::Args;

use super::{Confident, tell};
use crate::cli::args::Output;
use crate::cli::quantity;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::Observation;
use crate::report::reckon::compare::{Inputs, reckon};

/// `reckon compare`.
#[derive(Clone, Debug, Args)]
pub struct CompareArgs {
    /// The one, e.g. the suspect: 5/100h or 5/1000000 (runs)
    #[arg(long, value_name = "EVENTS/EXPOSURE", value_parser = quantity::observation, allow_hyphen_values = true)]
    first: Observation,
    /// The other, e.g. its controls, in the same unit
    #[arg(long, value_name = "EVENTS/EXPOSURE", value_parser = quantity::observation, allow_hyphen_values = true)]
    second: Observation,
    /// Ratio of first to second that is put to the test
    #[arg(long, value_name = "NUMBER", default_value = "1", value_parser = quantity::positive, allow_hyphen_values = true)]
    ratio: f64,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

pub fn run(args: &CompareArgs) -> Result<Exit, Error> {
    let CompareArgs { first, second, ratio, confident: Confident { confidence }, .. } = *args;
    if first.exposure.unit() != second.exposure.unit() {
        let (one, other) = (first.exposure.unit(), second.exposure.unit());
        return Err(Error::Usage(format!(
            "--first, --second: one is per {one}, the other per {other}; give both in time (5/100h) or both in runs (5/1000000)"
        )));
    }
    tell(&args.output, "--first, --second", reckon(Inputs { first, second, ratio, confidence }))
}
