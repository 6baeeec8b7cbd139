//! `reckon shrink`.

use clap::Args;

use super::{Confident, counts, exposures, one_from_input, tell};
use crate::cli::args::Output;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::shrink::{Inputs, reckon};

/// Cells that are taken at once: the likelihood of all is summed some thousand times.
const MOST_CELLS: usize = 256;

/// `reckon shrink`.
#[derive(Clone, Debug, Args)]
pub struct ShrinkArgs {
    /// Events by cell: one count a core, a kernel, a host
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

pub fn run(args: &ShrinkArgs) -> Result<Exit, Error> {
    one_from_input(("--counts", &args.counts), ("--exposures", args.exposures.as_deref()))?;
    let counts = counts(&args.counts, MOST_CELLS)?;
    let (exposures, unit) = exposures(args.exposures.as_deref(), counts.len(), MOST_CELLS, "cell")?;
    tell(&args.output, "--counts", reckon(Inputs { counts, exposures, unit, confidence: args.confident.confidence }))
}
