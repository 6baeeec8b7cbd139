//! `reckon zero`.

use clap::Args;

use super::{Confident, tell};
use crate::cli::args::Output;
use crate::cli::quantity;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::zero::{Proved, Setting, Wanted, needed, proved};
use crate::report::reckon::{Exposure, Rate};

/// `reckon zero`.
#[derive(Clone, Debug, Args)]
pub struct ZeroArgs {
    #[command(flatten)]
    what: What,
    /// Failures in it, or failures that the test to come may have
    #[arg(long, value_name = "COUNT", default_value = "0", value_parser = quantity::count, allow_hyphen_values = true)]
    failures: u64,
    /// Devices on test at once, each for the same time
    #[arg(long, value_name = "COUNT", value_parser = quantity::some, allow_hyphen_values = true)]
    devices: Option<u64>,
    /// Hours of use that an hour of test stands for
    #[arg(long, value_name = "FACTOR", value_parser = quantity::positive, allow_hyphen_values = true)]
    acceleration: Option<f64>,
    #[command(flatten)]
    confident: Confident,
    #[command(flatten)]
    output: Output,
}

#[derive(Clone, Debug, Args)]
#[group(required = true, multiple = false)]
struct What {
    /// What do so many runs prove?
    #[arg(long, value_name = "COUNT", value_parser = quantity::some, allow_hyphen_values = true)]
    runs: Option<u64>,
    /// What do so many hours prove? Of each device, if there are several
    #[arg(long, value_name = "TIME", value_parser = quantity::hours, allow_hyphen_values = true)]
    hours: Option<f64>,
    /// How much proves a rate, or a probability per run, below this?
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    below: Option<Rate>,
    /// How much proves a mean time between failures above this?
    #[arg(long, value_name = "TIME", value_parser = quantity::hours, allow_hyphen_values = true)]
    mtbf: Option<f64>,
    /// How much proves fewer failures in 10^9 device-hours than this?
    #[arg(long, value_name = "NUMBER", value_parser = quantity::positive, allow_hyphen_values = true)]
    fit: Option<f64>,
}

pub fn run(args: &ZeroArgs) -> Result<Exit, Error> {
    let What { runs, hours, below, mtbf, fit } = args.what;
    let ZeroArgs { failures, confident: Confident { confidence }, .. } = *args;
    let setting = Setting { devices: args.devices.unwrap_or(1), acceleration: args.acceleration.unwrap_or(1.0) };
    let below = below.or(mtbf.map(|time| Rate::PerHour(1.0 / time))).or(fit.map(|fit| Rate::PerHour(fit * 1e-9)));
    if runs.is_some() || matches!(below, Some(Rate::PerRun(_))) {
        for (option, given) in [("--devices", args.devices.is_some()), ("--acceleration", args.acceleration.is_some())]
        {
            if given {
                return Err(Error::Usage(format!("{option}: is for hours; give the runs of all devices together")));
            }
        }
    }
    if let Some(runs) = runs.filter(|runs| failures > *runs) {
        return Err(Error::Usage(format!("--failures: {failures} in {runs} runs; count at most one a run")));
    }
    match (runs.map(Exposure::Runs).or(hours.map(Exposure::Hours)), below) {
        (Some(exposure), _) => {
            tell(&args.output, "--failures", proved(Proved { exposure, setting, failures, confidence }))
        }
        (None, Some(below)) => tell(&args.output, "--below", needed(Wanted { below, failures, setting, confidence })),
        (None, None) => Err(Error::Usage("--runs, --hours, --below, --mtbf, --fit: give one of them".to_owned())),
    }
}
