//! Stop as early as the evidence allows: sequential plans between a rate that is good and one that is bad, and the
//! exact risks of any such plan.
//! Source: A. Wald, Sequential Analysis (1947); B. Epstein & M. Sobel, Ann. Math. Statist. 26 (1955).

use super::interval::{StatsError, check_open_probability, check_positive};
use super::walk::Walk;
use serde::{Deserialize, Serialize};

/// A truncated plan on events in exposure. The unit of exposure is the caller's.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SequentialPlan {
    /// `accept_at[k]`: accept when the exposure reaches this with k events. Never falls with k.
    pub accept_at: Vec<f64>,
    /// `reject_at[k]`: reject when event number k comes at or before this exposure; `None` if k events never reject.
    /// As long as `accept_at` plus one; the last entry, event number `accept_at.len()`, is the truncation.
    pub reject_at: Vec<Option<f64>>,
}

/// What a plan does at one true rate.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct OperatingPoint {
    /// Probability of accepting.
    pub accept: f64,
    /// Probability of rejecting.
    pub reject: f64,
    /// Mean exposure until the decision.
    pub expected_exposure: f64,
}

/// The parallel lines of Wald's test, on mismatches among runs: accept below `slope` n − `accept`, reject above
/// `slope` n + `reject`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct RunLines {
    /// Mismatches per run.
    pub slope: f64,
    /// Distance of the acceptance line, in mismatches.
    pub accept: f64,
    /// Distance of the rejection line, in mismatches.
    pub reject: f64,
}

impl RunLines {
    /// Lines between a good probability per run and a bad one, for the risks `alpha` of rejecting the good and `beta`
    /// of accepting the bad.
    ///
    /// # Errors
    /// Probabilities or risks outside (0, 1), or `bad` not above `good`.
    ///
    /// Source: A. Wald (1947); NIST/SEMATECH e-Handbook 6.2.6.
    pub fn wald(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<Self, StatsError> {
        check_open_probability("good probability", good)?;
        check_open_probability("bad probability", bad)?;
        let (to_accept, to_reject) = wald_bounds(alpha, beta)?;
        check_positive("bad minus good probability", bad - good, "a bad probability above the good one")?;
        let per_good_run = (-good).ln_1p() - (-bad).ln_1p();
        let per_mismatch = (bad / good).ln() + per_good_run;
        Ok(Self {
            slope: per_good_run / per_mismatch,
            accept: to_accept / per_mismatch,
            reject: to_reject / per_mismatch,
        })
    }

    /// The largest number of mismatches that accepts after `runs` runs, if any does.
    #[must_use]
    pub fn acceptance_number(&self, runs: u64) -> Option<u64> {
        let line = (self.slope * runs as f64 - self.accept).floor();
        (line >= 0.0).then_some(line as u64)
    }

    /// The least number of mismatches that rejects after `runs` runs, if so many are possible.
    #[must_use]
    pub fn rejection_number(&self, runs: u64) -> Option<u64> {
        let line = (self.slope * runs as f64 + self.reject).ceil();
        (line <= runs as f64).then_some(line as u64)
    }
}

impl SequentialPlan {
    /// Wald's plan between a good rate and a bad one (same unit, one over the exposure), truncated: event number
    /// `most_events` rejects, and the exposure half-way between the two lines at that number accepts.
    /// Truncation changes the risks: ask [`SequentialPlan::at_rate`] for the true ones.
    ///
    /// # Errors
    /// Rates not positive and finite, `bad` not above `good`, risks outside (0, 1), or `most_events` = 0.
    pub fn wald(good: f64, bad: f64, alpha: f64, beta: f64, most_events: usize) -> Result<Self, StatsError> {
        check_positive("good rate", good, "a rate that should pass")?;
        check_positive("bad rate", bad, "a rate that should fail")?;
        check_positive("bad minus good rate", bad - good, "a bad rate above the good one")?;
        check_positive("number of events at the end", most_events as f64, "at least 1")?;
        let (to_accept, to_reject) = wald_bounds(alpha, beta)?;
        let slope = (bad / good).ln() / (bad - good);
        let (first_accept, reject_offset) = (to_accept / (bad - good), to_reject / (bad - good));
        // half-way between the lines at the truncation
        let end = slope * most_events as f64 + 0.5 * (first_accept - reject_offset);
        let end = end.max(first_accept);
        let accept_at = (0..most_events).map(|k| (slope * k as f64 + first_accept).min(end)).collect();
        let reject_at = (0..=most_events)
            .map(|k| match slope * k as f64 - reject_offset {
                _ if k == most_events => Some(end),
                time if k > 0 && time > 0.0 => Some(time.min(end)),
                _ => None,
            })
            .collect();
        Ok(Self { accept_at, reject_at })
    }

    /// The plan that only counts: accept at `exposure` with fewer than `reject_number` events, reject at that many.
    ///
    /// # Errors
    /// Exposure not positive and finite, or a reject number of 0.
    pub fn fixed(exposure: f64, reject_number: usize) -> Result<Self, StatsError> {
        super::interval::check_exposure(exposure)?;
        check_positive("reject number", reject_number as f64, "at least 1")?;
        let mut reject_at = vec![None; reject_number];
        reject_at.push(Some(exposure));
        Ok(Self { accept_at: vec![exposure; reject_number], reject_at })
    }

    /// Exact probabilities and mean exposure of the plan where events come as a Poisson process of this rate.
    ///
    /// The boundaries cut the exposure into stretches on which the set of open counts does not change; over a stretch
    /// the probabilities move on by the Poisson law, and what leaves the set is rejected. The work grows with the number of
    /// entries times the square of the number of counts that are open at once: a tenth of a second for ten thousand
    /// entries a hundred wide.
    ///
    /// # Errors
    /// Rate not positive and finite, or a plan whose lists have the wrong lengths or values.
    pub fn at_rate(&self, rate: f64) -> Result<OperatingPoint, StatsError> {
        check_positive("rate", rate, "events per unit of exposure")?;
        self.check()?;
        let most = self.accept_at.len();
        let mut cuts: Vec<f64> =
            self.accept_at.iter().copied().chain(self.reject_at.iter().flatten().copied()).collect();
        cuts.sort_by(f64::total_cmp);
        cuts.dedup();
        // entries before the first one that rejects at a time or later: as time goes on, only more
        let mut latest = vec![f64::NEG_INFINITY; most + 1];
        for (k, until) in self.reject_at.iter().enumerate() {
            latest[k] = until.unwrap_or(f64::NEG_INFINITY).max(if k == 0 { f64::NEG_INFINITY } else { latest[k - 1] });
        }
        let (mut walk, mut rejecting, mut accepting) = (Walk::new(rate), 0, 0);
        for cut in cuts {
            while rejecting < most && latest[rejecting] < cut {
                rejecting += 1;
            }
            walk.forward(cut, rejecting);
            while accepting < most && self.accept_at[accepting] <= cut {
                accepting += 1;
            }
            walk.accept_below(accepting);
        }
        Ok(OperatingPoint { accept: walk.accept, reject: walk.reject, expected_exposure: walk.exposure })
    }

    /// The exposure after which the plan has decided in any case.
    #[must_use]
    pub fn longest(&self) -> f64 {
        self.accept_at.last().copied().unwrap_or(0.0)
    }

    fn check(&self) -> Result<(), StatsError> {
        let (accepts, rejects) = (self.accept_at.len(), self.reject_at.len());
        if accepts == 0 || rejects != accepts + 1 {
            return Err(StatsError::TooFew { name: "rejection entries", given: rejects, needed: accepts.max(1) + 1 });
        }
        let remedy = "exposures that do not fall from one event to the next, the last rejection at the end";
        let times = self.accept_at.iter().chain(self.reject_at.iter().flatten());
        times.copied().try_for_each(|time| check_positive("boundary", time, remedy))?;
        let end = self.accept_at[accepts - 1];
        match self.accept_at.windows(2).find(|pair| pair[1] < pair[0]) {
            Some(pair) => {
                Err(StatsError::NotPositive { name: "step of the boundary", value: pair[1] - pair[0], remedy })
            }
            None if self.reject_at[accepts].is_none_or(|last| last < end) => {
                Err(StatsError::NotPositive { name: "last rejection", value: 0.0, remedy })
            }
            None => Ok(()),
        }
    }
}

/// ln((1 − alpha) / beta) and ln((1 − beta) / alpha).
fn wald_bounds(alpha: f64, beta: f64) -> Result<(f64, f64), StatsError> {
    check_open_probability("risk alpha", alpha)?;
    check_open_probability("risk beta", beta)?;
    Ok((((1.0 - alpha) / beta).ln(), ((1.0 - beta) / alpha).ln()))
}
