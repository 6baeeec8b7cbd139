//! What can be said on the command line. Options that several commands have mean the same everywhere.

use std::path::PathBuf;
use std::time::Duration;

use clap::{Args, Parser, Subcommand, ValueEnum};

use super::reckon::ReckonCommand;
use super::when::Moment;
use crate::host::Cpu;
use crate::ledger::groups::Dimension;

/// Said wherever work is started.
const CAUTION: &str = "\
CAUTION: this loads the tested cores fully. Heat, power draw and wear can harm a machine and those near it: check \
cooling and supply first, follow the local electrical and safety rules and the maker's procedures, and set --max-temp. \
A clear result is a bound on a rate of wrong results; it is no safety certificate.

Exit codes: 0 clear, 10 watch, 20 withdraw, 2 usage, 3 could not do the job.";

/// Finds CPU cores that compute wrongly, and says how rare their wrong answers are.
#[derive(Debug, Parser)]
#[command(name = "proofhouse", version, about, after_help = CAUTION, arg_required_else_help = true)]
pub struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Say what this host is: cores, siblings, kernels and their variants, sensors, what cannot be read and why
    Survey(SurveyArgs),
    /// Test every core within a time budget, keep the evidence, give a verdict with its bound
    #[command(after_help = CAUTION)]
    Window(WindowArgs),
    /// Rehearse: put made-up faults through the whole chain and prove that they are noticed on the right core
    #[command(after_help = CAUTION)]
    Drill(DrillArgs),
    /// Look into a ledger
    #[command(subcommand)]
    Ledger(LedgerCommand),
    /// Reckon by hand: intervals, bounds, comparisons, sequential plans, power, each with its source
    #[command(subcommand)]
    Reckon(ReckonCommand),
    /// One worker; started by the other commands
    #[command(hide = true)]
    Worker {
        /// The cpu to hold on to
        #[arg(long)]
        cpu: u32,
        /// The memory node to take memory from
        #[arg(long)]
        node: Option<u32>,
    },
}

/// How results are written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// For people
    Text,
    /// One JSON document that names its schema
    Json,
}

/// Options of every command that gives a result.
#[derive(Clone, Debug, Args)]
pub struct Output {
    /// How the result is written on standard output
    #[arg(long, value_enum, default_value = "text")]
    pub format: Format,
}

/// Which cores and kernels.
#[derive(Clone, Debug, Args)]
pub struct Choice {
    /// Cpus to test, e.g. 0-3,8; all that this process may use if left out
    #[arg(long, value_name = "LIST")]
    pub cpus: Option<String>,
    /// Kernels to run, by glob, e.g. 'fma.*'; may be given several times
    #[arg(long, value_name = "GLOB")]
    pub kernels: Vec<String>,
    /// Variants to run, by name: portable, avx2, avx512, neon; may be given several times
    #[arg(long, value_name = "NAME")]
    pub variants: Vec<String>,
}

/// Where the evidence is kept.
#[derive(Clone, Debug, Args)]
pub struct LedgerPlace {
    /// Ledger folder; if left out /var/lib/proofhouse/ledger for root, else the user's state folder
    #[arg(long, value_name = "FOLDER")]
    pub ledger: Option<PathBuf>,
}

/// `survey`.
#[derive(Clone, Debug, Args)]
pub struct SurveyArgs {
    /// Output
    #[command(flatten)]
    pub output: Output,
    /// Choice
    #[command(flatten)]
    pub choice: Choice,
    /// Run every golden case once with every variant that can run here, and say what differs
    #[arg(long)]
    pub recheck: bool,
    /// Read the host's files below this folder instead of /
    #[arg(long, value_name = "FOLDER", default_value = "/")]
    pub root: PathBuf,
}

/// `window`.
#[derive(Clone, Debug, Args)]
pub struct WindowArgs {
    /// Time that all of it may take, e.g. 90s, 10m, 1h30m
    #[arg(long, value_parser = parse_budget)]
    pub budget: Duration,
    /// Choice
    #[command(flatten)]
    pub choice: Choice,
    /// Ledger
    #[command(flatten)]
    pub place: LedgerPlace,
    /// Seed of order and choice; drawn from the clock if left out
    #[arg(long)]
    pub seed: Option<u64>,
    /// Read the host's files below this folder instead of /, e.g. where a container sees them
    #[arg(long, value_name = "FOLDER", default_value = "/")]
    pub root: PathBuf,
    /// Print what the window would do, and do nothing
    #[arg(long)]
    pub explain: bool,
    /// Pause a cpu while its sensor reads more, in °C
    #[arg(long, value_name = "CELSIUS", value_parser = parse_celsius)]
    pub max_temp: Option<f64>,
    /// Confidence of intervals and bounds
    #[arg(long, default_value = "95%", value_parser = parse_confidence)]
    pub confidence: f64,
    /// Output
    #[command(flatten)]
    pub output: Output,
}

/// `drill`.
#[derive(Clone, Debug, Args)]
pub struct DrillArgs {
    /// How many faults to rehearse
    #[arg(long, default_value_t = 20, value_parser = clap::value_parser!(u32).range(1..=100_000))]
    pub faults: u32,
    /// Choice
    #[command(flatten)]
    pub choice: Choice,
    /// Ledger
    #[command(flatten)]
    pub place: LedgerPlace,
    /// Seed of order and choice; drawn from the clock if left out
    #[arg(long)]
    pub seed: Option<u64>,
    /// Output
    #[command(flatten)]
    pub output: Output,
}

/// `ledger …`.
#[derive(Clone, Debug, Subcommand)]
pub enum LedgerCommand {
    /// What was run and seen, with bounds: by core, kernel and so on, by episode, as a timeline, by wrong bits
    Show(ShowArgs),
    /// Check the hash chain from end to end
    Verify(LedgerArgs),
    /// The grid of this host: what was covered when and for how long, and what is overdue
    Coverage(CoverageArgs),
}

/// `ledger coverage`.
#[derive(Clone, Debug, Args)]
pub struct CoverageArgs {
    /// Ledger
    #[command(flatten)]
    pub place: LedgerPlace,
    /// Choice
    #[command(flatten)]
    pub choice: Choice,
    /// A cell that was not covered for so long is overdue
    #[arg(long, default_value = "30d", value_parser = parse_gap)]
    pub overdue: Duration,
    /// Windows are planned with this budget: it decides which conditions they have room for
    #[arg(long, default_value = "10m", value_parser = parse_budget)]
    pub budget: Duration,
    /// Output
    #[command(flatten)]
    pub output: Output,
}

/// `ledger verify`, and part of `ledger show`.
#[derive(Clone, Debug, Args)]
pub struct LedgerArgs {
    /// Ledger
    #[command(flatten)]
    pub place: LedgerPlace,
    /// Output
    #[command(flatten)]
    pub output: Output,
    /// Confidence of intervals and bounds
    #[arg(long, default_value = "95%", value_parser = parse_confidence)]
    pub confidence: f64,
    /// Mismatches of one cell closer together than this are one episode
    #[arg(long, default_value = "60s", value_parser = parse_gap)]
    pub gap: Duration,
}

/// `ledger show`.
#[derive(Clone, Debug, Args)]
pub struct ShowArgs {
    /// What `verify` knows too
    #[command(flatten)]
    pub ledger: LedgerArgs,
    /// Show sums by cpu, core, kernel, family, condition, day or cell; may be given several times. Without it and the
    /// options below: by cpu, and the cells with something wrong
    #[arg(long, value_name = "WHAT", value_parser = super::when::parse_dimension)]
    pub by: Vec<Dimension>,
    /// Only this cpu, alone or with another one
    #[arg(long, value_name = "N")]
    pub cpu: Option<u32>,
    /// Only these kernels, by glob, e.g. 'fma.*'; may be given several times
    #[arg(long = "kernel", value_name = "GLOB", value_parser = super::when::parse_glob)]
    pub kernels: Vec<glob::Pattern>,
    /// Only from then on: a day or time by UTC, e.g. 2025-03-01 or 2025-03-01T06:30:00Z, or so long ago, e.g. 7d
    #[arg(long, value_name = "WHEN", value_parser = super::when::parse_moment)]
    pub since: Option<Moment>,
    /// Only before then; a day counts whole
    #[arg(long, value_name = "WHEN", value_parser = super::when::parse_moment)]
    pub until: Option<Moment>,
    /// List the episodes: begin, end, cpu, kernels, wrong outputs
    #[arg(long)]
    pub episodes: bool,
    /// A cpu's history job by job, and when it was last shown clear; without --cpu of every cpu with more than clean slices
    #[arg(long)]
    pub timeline: bool,
    /// Which bits, lanes and operands were wrong, and what that suggests
    #[arg(long)]
    pub words: bool,
}

/// Longest budget; longer jobs are several windows.
const LONGEST_BUDGET: Duration = Duration::from_secs(7 * 24 * 3600);
/// Shortest budget in which a worker starts, works and reports.
const SHORTEST_BUDGET: Duration = Duration::from_secs(1);

fn parse_time(text: &str) -> Result<Duration, String> {
    let remedy = "write a number with a unit, e.g. 90s, 10m, 1h30m";
    if text.chars().all(|c| c.is_ascii_digit()) && !text.is_empty() {
        return Err(format!("no unit; {remedy}"));
    }
    humantime::parse_duration(text).map_err(|why| format!("{why}; {remedy}"))
}

fn parse_budget(text: &str) -> Result<Duration, String> {
    let budget = parse_time(text)?;
    if budget > LONGEST_BUDGET {
        return Err("longer than 7 days; run several windows, the ledger carries coverage on".to_owned());
    }
    if budget < SHORTEST_BUDGET {
        return Err("shorter than 1s, in which nothing can be shown; give at least 1s".to_owned());
    }
    Ok(budget)
}

fn parse_gap(text: &str) -> Result<Duration, String> {
    parse_time(text)
}

fn parse_celsius(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(c) if (20.0..=150.0).contains(&c) => Ok(c),
        _ => Err("not a temperature from 20 to 150 °C".to_owned()),
    }
}

fn parse_confidence(text: &str) -> Result<f64, String> {
    let (number, percent) = text.strip_suffix('%').map_or((text, false), |n| (n, true));
    let value: f64 = number.trim().parse().map_err(|_| "not a number; write 95% or 0.95".to_owned())?;
    let value = if percent { value / 100.0 } else { value };
    if (0.5..=0.999_999_999).contains(&value) {
        Ok(value)
    } else {
        Err("not from 50% to 99.9999999%; write 95% or 0.95".to_owned())
    }
}

/// Checks a list of variant names.
pub fn parse_variants(names: &[String]) -> Result<Vec<kernels::Variant>, String> {
    let known: Vec<&str> = kernels::Variant::ALL.iter().map(|v| v.name()).collect();
    names
        .iter()
        .map(|n| {
            kernels::Variant::parse(n)
                .ok_or_else(|| format!("--variants {n}: no such variant; known are {}", known.join(", ")))
        })
        .collect()
}

/// The cpu of a hidden worker.
pub fn worker_cpu(cpu: u32) -> Cpu {
    Cpu(cpu)
}
