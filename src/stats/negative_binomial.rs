//! A mean rate where the rate itself differs from cluster to cluster: counts with a negative binomial law.
//!
//! The rates of the clusters are taken as drawn from a gamma law, so a count of mean m has the variance m + m²/shape.
//! The likelihood is written through the binomial point probability, and its derivative by the shape through
//! ln(1 + u) − u, because both lose every digit to subtraction where the shape is large and the law nearly Poisson.
//!
//! With few clusters that have events at all the upper limit runs far off, and rightly: one more cluster of that kind
//! could hold most of the events. The work grows with the number of clusters: about a second for ten thousand.
//! Source: J. F. Lawless, Canadian Journal of Statistics 15 (1987); the limits by D. R. Cox & D. V. Hinkley, Theoretical
//! Statistics (1974), 9.3.

use super::interval::{Interval, StatsError, check_exposure, ln_error};
use super::law::{Binomial, CountLaw, normal_reach};
use super::numerics::{ln_1p_minus, poisson_deviance, root};
use serde::{Deserialize, Serialize};

/// A mean rate with allowance for clusters that differ.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct NegativeBinomial {
    /// Mean rate per unit of exposure.
    pub rate: Interval,
    /// Shape of the gamma law of the clusters' rates; the smaller, the more they differ. `None` where the counts
    /// scatter no more than one common rate would make them.
    pub shape: Option<f64>,
}

/// ln of the shapes that are looked at. At the upper end the law is Poisson's to the last digit.
const LN_SHAPES: (f64, f64) = (-100.0, 36.0);
/// ln of the shape from which on maxima are looked for one by one.
const USUAL_FROM: f64 = -8.0;
/// ln of the rate, over the estimate, up to which limits are looked for. Beyond, they are 0 or infinite.
const FARTHEST: f64 = 600.0;

/// Mean rate and shape of greatest likelihood from clusters `(events, exposure)`, with the profile likelihood interval
/// of the rate. Where the counts scatter no more than chance, that of the Poisson law.
///
/// # Errors
/// Fewer than two clusters, an exposure that is not positive and finite, or a confidence outside (0, 1).
pub fn negative_binomial_rate(clusters: &[(u64, f64)], confidence: f64) -> Result<NegativeBinomial, StatsError> {
    let ln_error = ln_error(confidence)?;
    if clusters.len() < 2 {
        return Err(StatsError::TooFew { name: "clusters", given: clusters.len(), needed: 2 });
    }
    clusters.iter().try_for_each(|&(_, exposure)| check_exposure(exposure))?;
    let counts = Counts::of(clusters)?;
    // half the χ² with one degree of freedom: how far the log likelihood may fall
    let fall = 0.5 * normal_reach(ln_error).powi(2);
    if counts.events == 0.0 {
        let rate = Interval { estimate: 0.0, lower: 0.0, upper: fall / counts.exposure, confidence };
        return Ok(NegativeBinomial { rate, shape: None });
    }
    let Some(shape) = counts.shape() else {
        return Ok(NegativeBinomial { rate: counts.poisson(fall, confidence), shape: None });
    };
    let estimate = counts.rate_for(shape);
    let floor = counts.ln_likelihood(estimate, shape) - fall;
    let excess = |ln_ratio: f64| {
        let rate = estimate * ln_ratio.exp();
        counts.ln_likelihood(rate, counts.shape_for(rate)) - floor
    };
    let step = (2.0 * fall * (1.0 / counts.events + 1.0 / (shape * clusters.len() as f64))).sqrt();
    let limit = |rising: bool, range: (f64, f64)| {
        let start = if rising { range.1 } else { range.0 };
        estimate * root(excess, rising, start, step, range).exp()
    };
    let upper = limit(false, (0.0, FARTHEST));
    let upper = if upper >= estimate * FARTHEST.exp() { f64::INFINITY } else { upper };
    let rate = Interval { estimate, lower: limit(true, (-FARTHEST, 0.0)), upper, confidence };
    Ok(NegativeBinomial { rate, shape: Some(shape) })
}

struct Counts {
    /// Events and exposure of each cluster.
    cells: Vec<(f64, f64)>,
    events: f64,
    exposure: f64,
}

impl Counts {
    fn of(clusters: &[(u64, f64)]) -> Result<Self, StatsError> {
        let cells: Vec<(f64, f64)> = clusters.iter().map(|&(events, exposure)| (events as f64, exposure)).collect();
        let (events, exposure) = cells.iter().fold((0.0, 0.0), |(events, all), (x, t)| (events + x, all + t));
        check_exposure(exposure)?;
        Ok(Self { cells, events, exposure })
    }

    /// The shape of greatest likelihood, each shape with the rate that goes with it, if it beats the Poisson law.
    fn shape(&self) -> Option<f64> {
        let score = |shape: f64| self.shape_score(self.rate_for(shape), shape);
        let best = best_shape(score, |shape| self.ln_likelihood(self.rate_for(shape), shape));
        (best < LN_SHAPES.1.exp()).then_some(best)
    }

    /// The shape of greatest likelihood at a given rate.
    fn shape_for(&self, rate: f64) -> f64 {
        best_shape(|shape| self.shape_score(rate, shape), |shape| self.ln_likelihood(rate, shape))
    }

    /// The rate of greatest likelihood for a given shape.
    fn rate_for(&self, shape: f64) -> f64 {
        let pooled = self.events / self.exposure;
        let score = |ln_ratio: f64| {
            let rate = pooled * ln_ratio.exp();
            self.cells.iter().map(|(x, t)| (x - rate * t) / (1.0 + rate * t / shape)).sum::<f64>()
        };
        pooled * root(score, false, 0.0, 0.125, (-FARTHEST, FARTHEST)).exp()
    }

    /// Derivative of the log likelihood by the shape.
    fn shape_score(&self, rate: f64, shape: f64) -> f64 {
        let part = |(x, t): &(f64, f64)| {
            let (expected, whole) = (rate * t, shape + rate * t);
            let u = (x - expected) / whole;
            // 1 + u = (shape + x) / whole, of which u near −1 has lost the digits
            let log = if u < -0.5 { ((shape + x) / whole).ln() - u } else { ln_1p_minus(u) };
            log + digamma_excess(shape, *x)
        };
        self.cells.iter().map(part).sum()
    }

    fn ln_likelihood(&self, rate: f64, shape: f64) -> f64 {
        let part = |(x, t): &(f64, f64)| {
            let expected = rate * t;
            let law = Binomial { n: shape + x, p: shape / (shape + expected), q: expected / (shape + expected) };
            law.ln_point(shape) - (x / shape).ln_1p()
        };
        self.cells.iter().map(part).sum()
    }

    /// The profile interval of the Poisson law, events > 0.
    fn poisson(&self, fall: f64, confidence: f64) -> Interval {
        let events = self.events;
        let lost = |ln_ratio: f64| {
            let excess = -events * ln_ratio.exp_m1();
            poisson_deviance(events, excess, events * ln_ratio.exp()) - fall
        };
        let step = (2.0 * fall / events).sqrt();
        let estimate = events / self.exposure;
        let lower = estimate * root(lost, false, 0.0, step, (-FARTHEST, 0.0)).exp();
        Interval { estimate, lower, upper: estimate * root(lost, true, 0.0, step, (0.0, FARTHEST)).exp(), confidence }
    }
}

/// The shape at which `value` is greatest, given also its derivative. With unequal exposures there may be several
/// maxima, so all of them are looked at, and the Poisson end where the value rises towards it.
fn best_shape(score: impl Fn(f64) -> f64, value: impl Fn(f64) -> f64) -> f64 {
    let score = |ln_shape: f64| score(ln_shape.exp());
    let mut found = Vec::new();
    let mut before = (LN_SHAPES.0, 1.0);
    let mut at = USUAL_FROM;
    while before.0 < LN_SHAPES.1 {
        let here = (at, score(at));
        if before.1 > 0.0 && here.1 <= 0.0 {
            found.push(root(score, false, here.0, 0.5, (before.0, here.0)).exp());
        }
        (before, at) = (here, (at + 0.5).min(LN_SHAPES.1));
    }
    if before.1 > 0.0 {
        found.push(LN_SHAPES.1.exp());
    }
    match found[..] {
        [only] => only,
        _ => found
            .into_iter()
            .map(|shape| (shape, value(shape)))
            .max_by(|a, b| a.1.total_cmp(&b.1))
            .map_or(1.0, |best| best.0),
    }
}

/// ψ(shape + count) − ψ(shape) − ln((shape + count) / shape), ≥ 0: the first terms of the sum that the difference is,
/// and the asymptotic series from where it is exact (Abramowitz & Stegun 6.3.6 and 6.3.18).
fn digamma_excess(shape: f64, count: f64) -> f64 {
    const SERIES_FROM: f64 = 16.0;
    const SERIES: [f64; 6] = [1.0 / 12.0, -1.0 / 120.0, 1.0 / 252.0, -1.0 / 240.0, 1.0 / 132.0, -691.0 / 32_760.0];
    let (mut sum, mut from) = (0.0, shape);
    let end = shape + count;
    while from < SERIES_FROM && from < end - 0.5 {
        sum += 1.0 / from;
        from += 1.0;
    }
    if from >= end - 0.5 {
        return sum - (count / shape).ln_1p();
    }
    let left = end - from;
    let log = if from == shape { 0.0 } else { -((from - shape) / shape).ln_1p() };
    // x^-2n - y^-2n = (x^-2 - y^-2)(...) would be shorter to write, but the leading term holds all the digits anyway
    let tail = |at: f64| SERIES.iter().rev().fold(0.0, |sum, term| (sum + term) / (at * at));
    sum + log + 0.5 * left / (from * end) + (tail(from) - tail(end))
}
