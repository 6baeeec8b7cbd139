//! A rate that rises or falls with a covariate, such as the temperature of the core: ln rate = a + b · at.
//!
//! For a given slope the most likely level has a closed form, and what is left of the likelihood equations is one
//! monotone function of the slope: the mean of `at`, weighted by the fitted counts, has to equal its mean over the
//! events. So the maximum is bracketed instead of iterated for, and it exists just where the events do not all lie at
//! one end. At the mean over the events level and slope are uncorrelated: every limit follows from theirs.
//!
//! The limits are normal approximations on the scale of ln rate, too short below some ten events.
//! Source: P. McCullagh & J. A. Nelder, Generalized Linear Models (2nd ed. 1989), ch. 6; that the log of a processor's
//! error rate can be linear in its temperature: S. Wang et al., SOSP 2023 (6 of 27 faulty parts).

use super::interval::{Interval, StatsError, check_exposure, check_finite, ln_error};
use super::law::{Poisson, normal_reach, student_reach};
use super::numerics::root;
use serde::{Deserialize, Serialize};

/// Events in exposure, all at one value of the covariate.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Reading {
    /// Events.
    pub events: u64,
    /// Exposure, > 0, in any one unit.
    pub exposure: f64,
    /// The covariate, such as degrees Celsius.
    pub at: f64,
}

/// A fitted log-linear rate.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct LogLinear {
    /// Change of ln rate per unit of `at`.
    pub slope: Interval,
    /// The rate over that at an `at` lower by ten: exp(10 · slope).
    pub factor_per_ten: Interval,
    /// Mean of `at` over the events.
    pub at_mean: f64,
    /// The rate there, per unit of exposure.
    pub rate_at_mean: Interval,
    /// Pearson's χ² over its degrees of freedom, readings − 2: 1 where only chance scatters the counts about the line.
    pub dispersion: f64,
    /// Whether the counts scatter about the line more than chance makes them (χ² beyond its 95 % point). Then the
    /// limits are wider by √dispersion, and by Student's t in place of the normal law.
    pub widened: bool,
    /// Number of readings.
    pub readings: usize,
    /// Number of events.
    pub events: u64,
}

/// Scatter beyond this level widens the limits. Common practice, no source.
const LEVEL: f64 = 0.05;

/// Slopes over the range of `at` up to which the maximum is looked for.
const STEEPEST: f64 = 1e15;

/// The most likely log-linear rate, with limits of this confidence (each pair of them on its own).
///
/// # Errors
/// Fewer than three readings or two events, an exposure that is not positive and finite, an `at` that is not finite, a
/// confidence outside (0, 1), readings all at one value, or events that all lie at the highest or the lowest value.
///
/// Source: P. McCullagh & J. A. Nelder, Generalized Linear Models, ch. 6, and 6.2.3 for the scatter.
pub fn log_linear(readings: &[Reading], confidence: f64) -> Result<LogLinear, StatsError> {
    let ln_error = ln_error(confidence)?;
    if readings.len() < 3 {
        return Err(StatsError::TooFew { name: "readings", given: readings.len(), needed: 3 });
    }
    for reading in readings {
        check_exposure(reading.exposure)?;
        check_finite("covariate", reading.at, "the value at which the reading was taken")?;
    }
    let events: u64 = readings.iter().fold(0, |sum: u64, reading| sum.saturating_add(reading.events));
    if events < 2 {
        return Err(StatsError::TooFew { name: "events", given: events as usize, needed: 2 });
    }
    let Line { slope, at_mean, fitted, spread, rate } = Line::fit(readings, events)?;
    let chi_square: f64 = readings.iter().zip(&fitted).map(|(reading, fit)| pearson(reading.events as f64, *fit)).sum();
    check_finite("scatter about the line", chi_square, "readings whose rates lie within the range of a double")?;
    let degrees = readings.len() - 2;
    let dispersion = chi_square / degrees as f64;
    let widened = dispersion > 1.0 && Poisson::chi_square_above(degrees as f64, chi_square) <= LEVEL;
    let errors = if widened { student_reach(degrees, ln_error) * dispersion.sqrt() } else { normal_reach(ln_error) };
    let reach = errors / spread.sqrt();
    let ends = |of: fn(f64) -> f64| Interval {
        estimate: of(slope),
        lower: of(slope - reach),
        upper: of(slope + reach),
        confidence,
    };
    let level = (errors / (events as f64).sqrt()).exp();
    Ok(LogLinear {
        slope: ends(|slope| slope),
        factor_per_ten: ends(|slope| (10.0 * slope).exp()),
        at_mean,
        rate_at_mean: Interval { estimate: rate, lower: rate / level, upper: rate * level, confidence },
        dispersion,
        widened,
        readings: readings.len(),
        events,
    })
}

impl LogLinear {
    /// The rate that the line gives at this value of the covariate; far outside of the readings a guess.
    ///
    /// # Errors
    /// A value that is not finite.
    pub fn rate_at(&self, at: f64) -> Result<Interval, StatsError> {
        check_finite("covariate", at, "the value at which the rate is wanted")?;
        let away = at - self.at_mean;
        let level = (self.rate_at_mean.upper / self.rate_at_mean.estimate).ln();
        let reach = level.hypot(away * (self.slope.upper - self.slope.estimate));
        let rate = |reach: f64| self.rate_at_mean.estimate * (away * self.slope.estimate + reach).exp();
        let confidence = self.slope.confidence;
        Ok(Interval { estimate: rate(0.0), lower: rate(-reach), upper: rate(reach), confidence })
    }
}

/// The line of greatest likelihood.
struct Line {
    slope: f64,
    at_mean: f64,
    /// Expected events per reading.
    fitted: Vec<f64>,
    /// Σ fitted (at − mean)²: the information about the slope.
    spread: f64,
    /// The rate at the mean.
    rate: f64,
}

impl Line {
    fn fit(readings: &[Reading], events: u64) -> Result<Self, StatsError> {
        let least = readings.iter().map(|reading| reading.at).fold(f64::INFINITY, f64::min);
        let most = readings.iter().map(|reading| reading.at).fold(f64::NEG_INFINITY, f64::max);
        if least == most {
            return Err(StatsError::OneValue(least));
        }
        check_finite("range of the covariate", most - least, "values in a larger unit")?;
        for (end, at) in [("highest", most), ("lowest", least)] {
            if readings.iter().all(|reading| reading.events == 0 || reading.at == at) {
                return Err(StatsError::NoFiniteSlope { events, end, at });
            }
        }
        // distances from the mean in units of the range, by way of the reading with most events: where nearly all events
        // lie at one value the mean lies next to it, and its difference from there keeps the digits that it has lost itself
        let range = most - least;
        let origin = readings.iter().max_by_key(|reading| reading.events).map_or(least, |reading| reading.at);
        let offset = |reading: &Reading| (reading.at - origin) / range;
        let moment: f64 = readings.iter().map(|reading| reading.events as f64 * offset(reading)).sum();
        let mean = moment / events as f64;
        let away: Vec<f64> = readings.iter().map(|reading| offset(reading) - mean).collect();
        let ln_weights = |slope: f64| -> Vec<f64> {
            readings.iter().zip(&away).map(|(reading, away)| reading.exposure.ln() + slope * away).collect()
        };
        // what lies beyond the mean over what lies before it, each from positive terms and both as logarithms
        let excess = |slope: f64| {
            let moments = ln_weights(slope).into_iter().zip(&away);
            let (beyond, before): (Vec<_>, Vec<_>) = moments.partition(|part| *part.1 > 0.0);
            let side = |parts: Vec<(f64, &f64)>| ln_sum(parts.iter().map(|(ln, away)| ln + away.abs().ln()));
            side(beyond) - side(before)
        };
        let slope = root(excess, true, 0.0, 1.0, (-STEEPEST, STEEPEST));
        let logs = ln_weights(slope);
        let ln_total = ln_sum(logs.iter().copied());
        let fitted: Vec<f64> = logs.iter().map(|ln| events as f64 * (ln - ln_total).exp()).collect();
        let spread: f64 = fitted.iter().zip(&away).map(|(fit, away)| fit * away * away).sum();
        Ok(Self {
            slope: slope / range,
            at_mean: mean.mul_add(range, origin),
            fitted,
            spread: spread * range * range,
            rate: events as f64 * (-ln_total).exp(),
        })
    }
}

/// ln Σ exp(term).
fn ln_sum(terms: impl Iterator<Item = f64> + Clone) -> f64 {
    let peak = terms.clone().fold(f64::NEG_INFINITY, f64::max);
    peak + terms.map(|term| (term - peak).exp()).sum::<f64>().ln()
}

/// One reading's part of Pearson's χ².
fn pearson(events: f64, fitted: f64) -> f64 {
    if events == 0.0 { fitted } else { (events - fitted) / fitted * (events - fitted) }
}
