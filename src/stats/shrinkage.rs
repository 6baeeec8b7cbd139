//! Many cells with few events each: the gamma law from which their rates seem to come, and each rate pulled towards it.

use super::interval::{Interval, StatsError, check_exposure, check_positive, ln_error};
use super::law::{Poisson, Tail, WHOLE};
use super::numerics::root;
use serde::{Deserialize, Serialize};
use statrs::function::gamma::digamma;
use std::f64::consts::LN_2;

/// A gamma law of rates: mean shape / rate. `rate` has the unit of the exposure.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct GammaPrior {
    /// Shape, > 0; the smaller, the more the rates differ from cell to cell.
    pub shape: f64,
    /// Rate parameter, > 0: the exposure that the prior is worth.
    pub rate: f64,
}

/// Shapes from here on scatter no more than one part in a thousand: the cells share one rate.
const ALIKE: f64 = 1e6;

impl GammaPrior {
    /// Fits the law to counts with exposures by maximum likelihood of the negative binomial law that the counts follow.
    ///
    /// # Errors
    /// Fewer than two counts, lists of different lengths, an exposure that is not positive and finite, no events, or
    /// counts that scatter no more than one common rate would make them ([`StatsError::OneRate`]).
    ///
    /// Source: D. P. Gaver & I. G. O'Muircheartaigh, Technometrics 29 (1987).
    pub fn fit(counts: &[u64], exposures: &[f64]) -> Result<Self, StatsError> {
        if counts.len() != exposures.len() {
            return Err(StatsError::Lengths { counts: counts.len(), exposures: exposures.len() });
        }
        if counts.len() < 2 {
            return Err(StatsError::TooFew { name: "counts", given: counts.len(), needed: 2 });
        }
        exposures.iter().try_for_each(|&exposure| check_exposure(exposure))?;
        let cells: Vec<(f64, f64)> = counts.iter().zip(exposures).map(|(&x, &t)| (x as f64, t)).collect();
        let (events, exposure) = cells.iter().fold((0.0, 0.0), |(events, all), (x, t)| (events + x, all + t));
        if events == 0.0 {
            return Err(StatsError::NoEvents("the spread of the rates"));
        }
        // both derivatives of the likelihood vanish; for a given shape the one by the rate falls throughout
        let rate_for = |shape: f64| {
            let score = |ln_rate: f64| {
                let rate = ln_rate.exp();
                cells.iter().map(|(x, t)| (shape * t - x * rate) / (rate + t)).sum::<f64>()
            };
            root(score, false, (shape * exposure / events).ln(), 0.5, (-700.0, 700.0)).exp()
        };
        let score = |ln_shape: f64| {
            let shape = ln_shape.exp();
            let rate = rate_for(shape);
            let own = digamma(shape);
            let part =
                |(x, t): &(f64, f64)| (if *x == 0.0 { 0.0 } else { digamma(shape + x) - own }) - (t / rate).ln_1p();
            cells.iter().map(part).sum::<f64>()
        };
        let shape = root(score, false, 0.0, 1.0, (-50.0, ALIKE.ln())).exp();
        if shape >= ALIKE * 0.999 { Err(StatsError::OneRate) } else { Ok(Self { shape, rate: rate_for(shape) }) }
    }

    /// The rate of a cell with `events` in `exposure` (0 or more), given the prior: posterior mean and the credible
    /// interval with equal tails; unit: one over the unit of the exposure.
    ///
    /// # Errors
    /// Prior parameters not positive and finite, exposure negative or not finite, or a confidence outside (0, 1).
    ///
    /// Source: the conjugate update, NIST/SEMATECH e-Handbook 8.4.6.
    pub fn posterior(&self, events: u64, exposure: f64, confidence: f64) -> Result<Interval, StatsError> {
        check_positive("prior shape", self.shape, "a fitted or chosen shape")?;
        check_positive("prior rate", self.rate, "a fitted or chosen rate")?;
        if exposure != 0.0 {
            check_exposure(exposure)?;
        }
        let ln_side = ln_error(confidence)? - LN_2;
        let (shape, rate) = (self.shape + events as f64, self.rate + exposure);
        // P(Gamma(shape) ≤ y) is the upper tail of a Poisson law of mean y at `shape`
        let quantile = |ln_below: f64| Poisson::mean_where(Tail::Upper, shape, WHOLE, ln_below) / rate;
        let upper = quantile((-ln_side.exp()).ln_1p());
        Ok(Interval { estimate: shape / rate, lower: quantile(ln_side), upper, confidence })
    }
}
