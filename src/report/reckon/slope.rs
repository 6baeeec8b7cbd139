//! `reckon slope`: how a rate goes with temperature. `reckon ratio`: a ratio of sums over units that are not alike.

use serde::Serialize;

use super::{Method, Reckoned, counted, limit, range};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, Interval, JackknifeRatio, LogLinear, Reading, StatsError};

/// Sources of the method, for `--help`.
pub const SLOPE_SOURCES: &str = "\
Sources: log-linear Poisson rate by maximum likelihood P. McCullagh & J. A. Nelder, Generalized Linear Models (1989), \
ch. 6; that the log of a processor's error rate can be linear in its temperature S. Wang et al., SOSP 2023.";

/// Sources of the method, for `--help`.
pub const RATIO_SOURCES: &str = "\
Sources: jackknife of a ratio B. Efron & R. J. Tibshirani, An Introduction to the Bootstrap (1993), ch. 10 and 11; \
Student's t for its limits J. W. Tukey, Ann. Math. Statist. 29 (1958), from memory.";

/// What was asked about temperatures.
#[derive(Clone, Debug, Serialize)]
pub struct Readings {
    /// Events, hours and °C.
    pub readings: Vec<At>,
    /// Where the rate is wanted, °C.
    pub at: Option<f64>,
    /// Confidence.
    pub confidence: f64,
}

/// One reading.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct At {
    /// Events.
    pub events: u64,
    /// Hours.
    pub hours: f64,
    /// Temperature.
    pub celsius: f64,
}

/// The line.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Slope {
    /// Of ln rate per °C.
    #[serde(flatten)]
    interval: Interval,
    factor_per_ten_celsius: Interval,
    mean_celsius: f64,
    per_hour_at_mean: Interval,
    dispersion: f64,
    widened: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    per_hour_at: Option<Interval>,
}

/// Reckons the line.
///
/// # Errors
/// What the calculators refuse: fewer than three readings, no spread in temperature, all events at one end.
pub fn slope(inputs: Readings) -> Result<Reckoned<Readings, Slope>, StatsError> {
    let points: Vec<Reading> =
        inputs.readings.iter().map(|r| Reading { events: r.events, exposure: r.hours, at: r.celsius }).collect();
    let line: LogLinear = stats::log_linear(&points, inputs.confidence)?;
    let wanted = inputs.at.map(|at| line.rate_at(at)).transpose()?;
    let level = percent(inputs.confidence);
    let factor = &line.factor_per_ten;
    let held = if factor.lower > 1.0 {
        "the rate rises with temperature"
    } else if factor.upper < 1.0 {
        "the rate falls with temperature"
    } else {
        "no dependence on temperature is shown"
    };
    let statement = format!(
        "{} in {}: ten degrees more make the rate {} times as high, {} ({level}); {held}.",
        counted(line.events, "event"),
        counted(line.readings as u64, "reading"),
        limit(factor.estimate),
        range(factor)
    );
    let mut table = Table::new(&["at °C", "events", "hours", "seen per hour", "line per hour", "from", "to"]);
    let mut sorted = inputs.readings.clone();
    sorted.sort_by(|a, b| a.celsius.total_cmp(&b.celsius));
    for r in &sorted {
        let fit = line.rate_at(r.celsius)?;
        let seen = r.events as f64 / r.hours;
        let numbers = [seen, fit.estimate, fit.lower, fit.upper].map(limit);
        table.row([r.celsius.to_string(), r.events.to_string(), short(r.hours)].into_iter().chain(numbers));
    }
    let mut figures = table.text();
    if let (Some(at), Some(rate)) = (inputs.at, &wanted) {
        figures.push_str(&format!("\nAt {at} °C: {} per hour, {} ({level})\n", limit(rate.estimate), range(rate)));
    }
    figures.push_str(&format!("\nScatter about the line: {} times what chance makes", short(line.dispersion)));
    figures.push_str(if line.widened { "; the limits are widened by it\n" } else { "\n" });
    let answer = Slope {
        interval: line.slope,
        factor_per_ten_celsius: line.factor_per_ten,
        mean_celsius: line.at_mean,
        per_hour_at_mean: line.rate_at_mean,
        dispersion: line.dispersion,
        widened: line.widened,
        per_hour_at: wanted,
    };
    Ok(Reckoned::new("slope", inputs, answer, SLOPE, statement, figures))
}

/// What was asked about units.
#[derive(Clone, Debug, Serialize)]
pub struct Pairs {
    /// What is counted and what it is counted in, by unit.
    pub pairs: Vec<(f64, f64)>,
    /// Confidence.
    pub confidence: f64,
}

/// The ratio.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Ratio {
    #[serde(flatten)]
    interval: Interval,
    standard_error: f64,
    bias: f64,
    units: usize,
}

/// Reckons the ratio of sums.
///
/// # Errors
/// What the calculators refuse: fewer than two pairs.
pub fn ratio(inputs: Pairs) -> Result<Reckoned<Pairs, Ratio>, StatsError> {
    let jackknife: JackknifeRatio = stats::jackknife_ratio(&inputs.pairs)?;
    let interval = jackknife.interval(inputs.confidence)?;
    let JackknifeRatio { bias, standard_error, units, .. } = jackknife;
    let mut statement = format!(
        "Ratio of the sums over {}: {}, {} ({}).",
        counted(units as u64, "unit"),
        short(interval.estimate),
        range(&interval),
        percent(inputs.confidence)
    );
    if standard_error == 0.0 {
        statement.push_str(" Every unit has the same ratio, so this method sees no error at all and bounds nothing.");
    }
    let figures = format!("Standard error {}, bias {} (not taken off)\n", short(standard_error), short(bias));
    let answer = Ratio { interval, standard_error, bias, units };
    Ok(Reckoned::new("ratio", inputs, answer, RATIO, statement, figures))
}

const SLOPE: Method = Method {
    name: "log-linear Poisson rate by maximum likelihood; limits normal on the scale of ln rate",
    source: "P. McCullagh & J. A. Nelder, Generalized Linear Models (1989), ch. 6",
    assumption: "\
ln rate is a straight line over these temperatures and nothing else changed along with them; limits are too narrow \
below some ten events, and outside of the readings the line is a guess",
};

const RATIO: Method = Method {
    name: "jackknife over units, limits by Student's t",
    source: "B. Efron & R. J. Tibshirani, An Introduction to the Bootstrap (1993), ch. 10 and 11; J. W. Tukey (1958)",
    assumption: "\
units are independent and there are at least some ten of them, none with most of the events; with few events use \
`reckon interval`",
};
