//! `reckon family`.

use clap::Args;

use super::tell;
use crate::cli::args::Output;
use crate::cli::{lists, quantity};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::family::{Inputs, reckon};

/// Tests that are taken at once: room for sixty kernels on every core of 256.
const MOST_TESTS: usize = 16_384;

/// `reckon family`.
#[derive(Clone, Debug, Args)]
pub struct FamilyArgs {
    /// P-values of all tests that were made
    #[arg(long, value_name = "LIST", allow_hyphen_values = true)]
    p: String,
    /// Level that the whole family keeps
    #[arg(long, value_name = "SHARE", default_value = "5%", value_parser = quantity::share, allow_hyphen_values = true)]
    level: f64,
    #[command(flatten)]
    output: Output,
}

pub fn run(args: &FamilyArgs) -> Result<Exit, Error> {
    let p = lists::list("--p", &args.p, MOST_TESTS, quantity::p_value)?;
    tell(&args.output, "--p", reckon(Inputs { p, level: args.level }))
}
