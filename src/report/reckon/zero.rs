//! `reckon zero`: what silence, or nearly silence, proves, and how long it has to last.

use serde::Serialize;

use super::{Exposure, Method, Rate, Reckoned, at_least, counted, hours, hours_at_least, limit, whole};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: bound per run C. J. Clopper & E. S. Pearson, Biometrika 26 (1934), J. A. Hanley & A. Lippman-Hand, JAMA 249 \
(1983); bound per hour F. Garwood, Biometrika 28 (1936); hours needed NIST/SEMATECH e-Handbook 8.3.1.1; runs needed \
the success-run theorem, and N. R. Mann, R. E. Schafer & N. D. Singpurwalla (1974), from memory; FIT JEDEC JESD85, \
from memory.";

/// Exposure on test: what was watched, on how many devices, and how much harder than in use.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Setting {
    /// Devices, each exposed for the same time.
    pub devices: u64,
    /// Hours of use that an hour of test stands for.
    pub acceleration: f64,
}

/// What was asked of a test that is over.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Proved {
    /// What each device was exposed to.
    #[serde(flatten)]
    pub exposure: Exposure,
    /// Setting.
    #[serde(flatten)]
    pub setting: Setting,
    /// Failures in it.
    pub failures: u64,
    /// Confidence.
    pub confidence: f64,
}

/// The bound.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Bound {
    estimate: f64,
    lower: f64,
    upper: f64,
    confidence: f64,
    unit: &'static str,
    /// 3 / exposure, the back-of-envelope form, where nothing failed and 95 % are asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    rule_of_three: Option<f64>,
    /// Mean time between failures, at least, hours.
    #[serde(skip_serializing_if = "Option::is_none")]
    mtbf_hours_at_least: Option<f64>,
    /// Failures in 10^9 device-hours, at most.
    #[serde(skip_serializing_if = "Option::is_none")]
    fit_at_most: Option<f64>,
}

/// What silence proved.
///
/// # Errors
/// What the calculators refuse.
pub fn proved(inputs: Proved) -> Result<Reckoned<Proved, Bound>, StatsError> {
    let Proved { exposure, setting, failures, confidence } = inputs;
    let level = percent(confidence);
    let plain_95 = failures == 0 && (confidence - 0.95).abs() < 1e-12;
    let (bound, statement, figures, method) = match exposure {
        Exposure::Runs(runs) => {
            let upper = stats::clopper_pearson_upper(failures, runs, confidence)?;
            let bound = Bound {
                estimate: failures as f64 / runs as f64,
                lower: 0.0,
                upper,
                confidence,
                unit: "per run",
                rule_of_three: plain_95.then(|| stats::rule_of_three(runs as f64)).transpose()?,
                mtbf_hours_at_least: None,
                fit_at_most: None,
            };
            let statement = format!(
                "{} in {}: a probability below {} per run ({level}), less than 1 in {} runs.",
                counted(failures, "failure"),
                exposure.words(),
                short(upper),
                limit(1.0 / upper)
            );
            (bound, statement, String::new(), PER_RUN)
        }
        Exposure::Hours(each) => {
            let (devices, acceleration) = (setting.devices as f64, setting.acceleration);
            let all = each * devices * acceleration;
            let upper = stats::garwood_upper(failures, all, confidence)?;
            let fit = stats::fit_rate(failures, devices, each, acceleration, confidence)?;
            let bound = Bound {
                estimate: failures as f64 / all,
                lower: 0.0,
                upper,
                confidence,
                unit: "per hour",
                rule_of_three: plain_95.then(|| stats::rule_of_three(all)).transpose()?,
                mtbf_hours_at_least: Some(1.0 / upper),
                fit_at_most: Some(fit),
            };
            let statement = format!(
                "{} in {}{}: fewer than {} per hour ({level}).",
                counted(failures, "failure"),
                Exposure::Hours(all).words(),
                told(setting, each),
                short(upper)
            );
            let figures = format!(
                "Mean time between failures: more than {}\nFailures in 10^9 device-hours (FIT): fewer than {}\n",
                hours(1.0 / upper),
                short(fit)
            );
            (bound, statement, figures, PER_HOUR)
        }
    };
    Ok(Reckoned::new("zero", inputs, bound, method, statement, figures))
}

/// How the hours came about, where that is not plain.
fn told(setting: Setting, each: f64) -> String {
    match (setting.devices, setting.acceleration) {
        (1, 1.0) => String::new(),
        (n, 1.0) => format!(" ({n} devices, {} each)", Exposure::Hours(each).words()),
        (n, a) => {
            format!(
                " of use ({}, {} of test each, {} times harder)",
                counted(n, "device"),
                Exposure::Hours(each).words(),
                short(a)
            )
        }
    }
}

/// What was asked of a test that is to come.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Wanted {
    /// The rate to stay below.
    pub below: Rate,
    /// Failures that the test may have.
    pub failures: u64,
    /// Setting.
    #[serde(flatten)]
    pub setting: Setting,
    /// Confidence.
    pub confidence: f64,
}

/// The exposure that is needed.
#[derive(Clone, Debug, Serialize)]
pub struct Needed {
    #[serde(skip_serializing_if = "Option::is_none")]
    runs: Option<u64>,
    /// Of use, over all devices.
    #[serde(skip_serializing_if = "Option::is_none")]
    hours: Option<f64>,
    /// Of test, for each device.
    #[serde(skip_serializing_if = "Option::is_none")]
    hours_each: Option<f64>,
    confidence: f64,
    /// The same for other numbers of failures.
    by_failures: Vec<ByFailures>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct ByFailures {
    failures: u64,
    #[serde(skip_serializing_if = "Option::is_none")]
    runs: Option<u64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    hours: Option<f64>,
}

/// How long silence has to last.
///
/// # Errors
/// What the calculators refuse.
pub fn needed(inputs: Wanted) -> Result<Reckoned<Wanted, Needed>, StatsError> {
    let Wanted { below, failures, setting, confidence } = inputs;
    let others = [0, 1, 2, 3, 5, 10].into_iter().filter(|k| *k != failures).chain([failures]);
    let mut others: Vec<u64> = others.collect();
    others.sort_unstable();
    let level = percent(confidence);
    let allowed =
        if failures == 0 { "no failure".to_owned() } else { format!("at most {}", counted(failures, "failure")) };
    let (answer, statement, figures, method) = match below {
        Rate::PerRun(p) => {
            let runs_for = |k: u64| {
                if k == 0 { stats::success_runs(p, confidence) } else { stats::demonstration_runs(p, k, confidence) }
            };
            let runs = runs_for(failures)?;
            // a longer list is no reason to refuse: what goes beyond counts is left out
            let rows = others
                .iter()
                .filter_map(|&k| Some(ByFailures { failures: k, runs: Some(runs_for(k).ok()?), hours: None }));
            let rows: Vec<ByFailures> = rows.collect();
            let mut table = Table::new(&["failures allowed", "runs needed"]);
            rows.iter().for_each(|r| table.row([r.failures.to_string(), whole(r.runs.unwrap_or_default())]));
            let statement = format!(
                "{} with {allowed} prove a probability below {} per run ({level}).",
                counted(runs, "run"),
                short(p)
            );
            let answer = Needed { runs: Some(runs), hours: None, hours_each: None, confidence, by_failures: rows };
            (answer, statement, table.text(), RUNS_NEEDED)
        }
        Rate::PerHour(rate) => {
            let all = stats::exposure_needed(rate, failures, confidence)?;
            let share = setting.devices as f64 * setting.acceleration;
            let each = all / share;
            let rows = others.iter().map(|&k| {
                Ok(ByFailures { failures: k, runs: None, hours: Some(stats::exposure_needed(rate, k, confidence)?) })
            });
            let rows: Vec<ByFailures> = rows.collect::<Result<_, StatsError>>()?;
            let plain = share == 1.0;
            let mut table = if plain {
                Table::new(&["failures allowed", "hours needed"])
            } else {
                Table::new(&["failures allowed", "hours of use", "hours of test, each device"])
            };
            for row in &rows {
                let time = row.hours.unwrap_or_default();
                let mut cells = vec![row.failures.to_string(), at_least(time)];
                cells.extend((!plain).then(|| at_least(time / share)));
                table.row(cells);
            }
            let on = if plain {
                String::new()
            } else {
                format!(", which is {} of test on each of {}", hours_at_least(each), counted(setting.devices, "device"))
            };
            let statement =
                format!("{} with {allowed} prove a rate below {} ({level}){on}.", hours_at_least(all), below.words());
            let answer = Needed { runs: None, hours: Some(all), hours_each: Some(each), confidence, by_failures: rows };
            (answer, statement, table.text(), HOURS_NEEDED)
        }
    };
    Ok(Reckoned::new("zero", inputs, answer, method, statement, figures))
}

const PER_RUN: Method = Method {
    name: "Clopper-Pearson, exact, one-sided",
    source: "C. J. Clopper & E. S. Pearson, Biometrika 26 (1934); J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983)",
    assumption: super::interval::INDEPENDENT,
};

const PER_HOUR: Method = Method {
    name: "Garwood, exact, one-sided; FIT is 10^9 times the rate per device-hour",
    source: "F. Garwood, Biometrika 28 (1936); NIST/SEMATECH e-Handbook 8.4.5.1; JEDEC JESD85, from memory",
    assumption: "\
failures come independently at one constant rate, the same on every device, and the acceleration is right; the bound \
speaks of the work and the conditions of the test only",
};

const RUNS_NEEDED: Method = Method {
    name: "success-run theorem; with failures the binomial demonstration plan",
    source: "n = ln(1 - confidence) / ln(1 - p); N. R. Mann, R. E. Schafer & N. D. Singpurwalla (1974), from memory",
    assumption: "\
every run fails with the same probability, independently, and the number of failures allowed was fixed before the test",
};

const HOURS_NEEDED: Method = Method {
    name: "chi-square test length: chi-square quantile with 2 failures + 2 degrees of freedom, over twice the rate",
    source: "NIST/SEMATECH e-Handbook 8.3.1.1",
    assumption: "\
failures come independently at one constant rate, the same on every device, and the number of failures allowed was \
fixed before the test; to stop earlier see `reckon sequential`",
};
