//! `reckon spread` and `reckon episodes`: do events cluster, and what is left of their number then?

use serde::Serialize;

use super::{Method, Reckoned, counted, limit, prose, range};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, Dispersion, Episode, Interval, NegativeBinomial, StatsError};

/// Sources of the methods, for `--help`.
pub const SPREAD_SOURCES: &str = "\
Sources: dispersion test R. A. Fisher, Statistical Methods for Research Workers, section 16; Poisson F. Garwood, \
Biometrika 28 (1936); negative binomial J. F. Lawless, Canadian Journal of Statistics 15 (1987), from memory; \
cluster-robust E. L. Korn & B. I. Graubard, Survey Methodology 24 (1998), carried from shares to rates, from memory.";

/// Source of the method, for `--help`.
pub const EPISODES_SOURCE: &str = "\
Source: runs declustering, S. Coles, An Introduction to Statistical Modeling of Extreme Values, 5.3.2; rate F. Garwood, \
Biometrika 28 (1936).";

/// Below this p-value of the dispersion test the plain interval is not believed. Common practice, no source.
const LEVEL: f64 = 0.05;

/// What was asked about counts.
#[derive(Clone, Debug, Serialize)]
pub struct Counts {
    /// Events by cluster.
    pub counts: Vec<u64>,
    /// Exposure by cluster.
    pub exposures: Vec<f64>,
    /// One unit of the exposure.
    pub unit: &'static str,
    /// Confidence.
    pub confidence: f64,
}

/// Three intervals and which one holds.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Spread {
    /// The one that holds.
    #[serde(flatten)]
    interval: Interval,
    holds: Law,
    poisson: Interval,
    negative_binomial: NegativeBinomial,
    cluster_robust: Interval,
    dispersion: Dispersion,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
enum Law {
    Poisson,
    NegativeBinomial,
    ClusterRobust,
}

/// Reckons the scatter of counts.
///
/// # Errors
/// What the calculators refuse: lists of different lengths, fewer than two counts, no events.
pub fn spread(inputs: Counts) -> Result<Reckoned<Counts, Spread>, StatsError> {
    let confidence = inputs.confidence;
    let dispersion = stats::dispersion_with_exposure(&inputs.counts, &inputs.exposures)?;
    let cells: Vec<(u64, f64)> = inputs.counts.iter().copied().zip(inputs.exposures.iter().copied()).collect();
    let (events, exposure) = (inputs.counts.iter().sum(), inputs.exposures.iter().sum());
    let poisson = stats::garwood(events, exposure, confidence)?;
    let negative_binomial = stats::negative_binomial_rate(&cells, confidence)?;
    let cluster_robust = stats::clustered_rate(&cells, confidence)?;
    let width = |i: &Interval| i.upper - i.lower;
    let (holds, interval) = if dispersion.p_upper > LEVEL {
        (Law::Poisson, poisson)
    } else if width(&negative_binomial.rate) >= width(&cluster_robust) {
        (Law::NegativeBinomial, negative_binomial.rate)
    } else {
        (Law::ClusterRobust, cluster_robust)
    };
    let answer = Spread { interval, holds, poisson, negative_binomial, cluster_robust, dispersion };
    let seen = format!("{} in {}", counted(events, "event"), counted(inputs.counts.len() as u64, "count"));
    let scatter = format!("variance {} times that of chance, p {}", short(dispersion.index), short(dispersion.p_upper));
    let verdict = match holds {
        Law::Poisson => {
            format!("no more scatter than chance may make ({scatter}), so the Poisson interval holds")
        }
        Law::NegativeBinomial => format!("events cluster ({scatter}), so the negative binomial interval holds"),
        Law::ClusterRobust => format!("events cluster ({scatter}), so the cluster-robust interval holds"),
    };
    let unit = inputs.unit;
    let (rate, range, level) = (short(interval.estimate), range(&interval), percent(confidence));
    let statement = format!("{seen}: {verdict}: {rate} per {unit}, {range} ({level}).");
    let figures = figures(&answer, unit);
    Ok(Reckoned::new("spread", inputs, answer, SPREAD, statement, figures))
}

fn figures(answer: &Spread, unit: &str) -> String {
    let per = format!("per {unit}");
    let mut table = Table::new(&["interval", &per, "from", "to", ""]);
    let rows = [
        ("Poisson, exact", answer.poisson, Law::Poisson),
        ("negative binomial", answer.negative_binomial.rate, Law::NegativeBinomial),
        ("cluster-robust", answer.cluster_robust, Law::ClusterRobust),
    ];
    for (name, i, law) in rows {
        let mark = if law == answer.holds { "holds" } else { "" };
        table.row([name.to_owned(), short(i.estimate), short(i.lower), limit(i.upper), mark.to_owned()]);
    }
    let mut out = table.text();
    if answer.holds == Law::Poisson && answer.dispersion.mean < 1.0 {
        out.push('\n');
        out.push_str(&prose(
            "With fewer than one event a count on average the test sees only gross clustering; it is no proof of none.",
        ));
    }
    out
}

/// What was asked about times.
#[derive(Clone, Debug, Serialize)]
pub struct Times {
    /// Seconds on any one clock.
    pub times_s: Vec<f64>,
    /// Quiet that ends an episode, seconds.
    pub gap_s: f64,
    /// Hours in which all that was seen.
    pub hours: Option<f64>,
    /// Confidence.
    pub confidence: f64,
}

/// Episodes.
#[derive(Clone, Debug, Serialize)]
pub struct Episodes {
    episodes: u64,
    events: u64,
    mean_size: f64,
    list: Vec<Listed>,
    /// Episodes per hour.
    #[serde(skip_serializing_if = "Option::is_none")]
    per_hour: Option<Interval>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct Listed {
    start_s: f64,
    end_s: f64,
    events: u64,
}

/// Reckons episodes.
///
/// # Errors
/// What the calculators refuse.
pub fn episodes(inputs: Times) -> Result<Reckoned<Times, Episodes>, StatsError> {
    let found = stats::episodes(&inputs.times_s, inputs.gap_s)?;
    let (episodes, events) = (found.len() as u64, inputs.times_s.len() as u64);
    let per_hour = inputs.hours.map(|hours| stats::garwood(episodes, hours, inputs.confidence)).transpose()?;
    let listed = |e: &Episode| Listed { start_s: e.start, end_s: e.end, events: e.mismatches };
    let list: Vec<Listed> = found.iter().map(listed).collect();
    let gap = short(inputs.gap_s);
    let mut statement =
        format!("{} in {} (gaps under {gap} s closed)", counted(events, "event"), counted(episodes, "episode"));
    if let Some(rate) = &per_hour {
        let (estimate, range, level) = (short(rate.estimate), range(rate), percent(inputs.confidence));
        statement.push_str(&format!(": {estimate} episodes per hour, {range} ({level})"));
    }
    statement.push('.');
    let mut table = Table::new(&["episode", "first at s", "last at s", "events"]);
    for (number, e) in list.iter().enumerate() {
        table.row([(number + 1).to_string(), e.start_s.to_string(), e.end_s.to_string(), e.events.to_string()]);
    }
    let mean_size = events as f64 / episodes as f64;
    let answer = Episodes { episodes, events, mean_size, list, per_hour };
    Ok(Reckoned::new("episodes", inputs, answer, EPISODES, statement, table.text()))
}

const SPREAD: Method = Method {
    name: "\
Fisher's dispersion test at 5 %; if it finds scatter the wider of the negative binomial and the cluster-robust interval, \
else Garwood's",
    source: "\
R. A. Fisher, Statistical Methods for Research Workers, section 16; J. F. Lawless, Canadian Journal of Statistics 15 \
(1987); E. L. Korn & B. I. Graubard, Survey Methodology 24 (1998)",
    assumption: "\
the counts are independent of each other, such as one a day or one a core; with fewer than about ten of them no interval \
can see the whole scatter, so count episodes as well",
};

const EPISODES: Method = Method {
    name: "runs declustering: an event less than the gap after the one before belongs to the same episode",
    source: "S. Coles, An Introduction to Statistical Modeling of Extreme Values, 5.3.2; F. Garwood, Biometrika 28 (1936)",
    assumption: "\
events within the gap have one cause and episodes have not; try gaps half and twice as long and see whether the number \
of episodes stays",
};
