//! `reckon sequential`.

use clap::Args;

use super::{per_hour, tell};
use crate::cli::args::Output;
use crate::cli::quantity;
use crate::error::Error;
use crate::exit_code::Exit;
use crate::report::reckon::Rate;
use crate::report::reckon::sequential::{Inputs, Kind, RunInputs, per_run, reckon};

/// Rates closer together than this take plans of hundreds of events.
const CLOSEST: f64 = 1.3;
/// Risks below this make plans that nobody can wait for.
const LEAST_RISK: f64 = 1e-4;
/// Events of a plan that is given.
const MOST_EVENTS: u64 = 10_000;

/// `reckon sequential`.
#[derive(Clone, Debug, Args)]
pub struct SequentialArgs {
    /// A rate that should pass, e.g. 1/1000h, or a probability per run
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    good: Rate,
    /// A rate that should fail, above it
    #[arg(long, value_name = "RATE", value_parser = quantity::rate, allow_hyphen_values = true)]
    bad: Rate,
    /// Highest risk of rejecting the good
    #[arg(long, value_name = "SHARE", default_value = "5%", value_parser = quantity::share, allow_hyphen_values = true)]
    alpha: f64,
    /// Highest risk of accepting the bad
    #[arg(long, value_name = "SHARE", default_value = "10%", value_parser = quantity::share, allow_hyphen_values = true)]
    beta: f64,
    /// The shortest plan that counts to the end instead
    #[arg(long)]
    fixed: bool,
    /// Length of a fixed plan whose risks are asked
    #[arg(long, value_name = "TIME", requires = "fixed", requires = "reject_at", value_parser = quantity::hours, allow_hyphen_values = true)]
    hours: Option<f64>,
    /// Events at which that plan rejects
    #[arg(long, value_name = "COUNT", requires = "hours", value_parser = quantity::some, allow_hyphen_values = true)]
    reject_at: Option<u64>,
    #[command(flatten)]
    output: Output,
}

pub fn run(args: &SequentialArgs) -> Result<Exit, Error> {
    let SequentialArgs { good, bad, alpha, beta, .. } = *args;
    let refuse = |why: String| Err(Error::Usage(why));
    if bad.amount() <= good.amount() && std::mem::discriminant(&good) == std::mem::discriminant(&bad) {
        return refuse("--bad: not above --good; give the rate that should fail as --bad".to_owned());
    }
    if alpha + beta >= 1.0 {
        return refuse("--alpha, --beta: together 100 % or more, which a coin can do; give e.g. 5% and 10%".to_owned());
    }
    if let (Rate::PerRun(good), Rate::PerRun(bad)) = (good, bad) {
        if args.fixed {
            return refuse("--fixed: is for rates per hour; for runs see `reckon zero --below`".to_owned());
        }
        return tell(&args.output, "--good, --bad", per_run(RunInputs { good, bad, alpha, beta }));
    }
    let (good, bad) = (per_hour("--good", good)?, per_hour("--bad", bad)?);
    let kind = match (args.fixed, args.hours, args.reject_at) {
        (_, Some(hours), Some(reject_at)) if reject_at <= MOST_EVENTS => Kind::Given { hours, reject_at },
        (_, Some(_), Some(_)) => return refuse(format!("--reject-at: more than {MOST_EVENTS} events; give fewer")),
        (true, ..) => Kind::Fixed,
        (false, ..) => Kind::Sequential,
    };
    if !matches!(kind, Kind::Given { .. }) {
        if bad < CLOSEST * good {
            return refuse(format!(
                "--bad: less than {CLOSEST} times --good, which takes hundreds of events to tell; give rates further apart"
            ));
        }
        for (option, risk) in [("--alpha", alpha), ("--beta", beta)] {
            if risk < LEAST_RISK {
                return refuse(format!("{option}: below {} %, the least that plans are made for", 100.0 * LEAST_RISK));
            }
        }
    }
    tell(&args.output, "--good, --bad", reckon(Inputs { good, bad, alpha, beta, kind }))
}
