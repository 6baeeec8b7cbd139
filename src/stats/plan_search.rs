//! Plans that keep their promise: the risks asked for are bounds on the exact ones.
//!
//! Wald's lines promise the risks only of a test that may go on for ever, and only about; the tables of MIL-HDBK-781A
//! cut them off and print what the risks then are. Here the cut is searched for: lines a little further apart than
//! Wald's, the end placed so that the risk of accepting the bad rate is used up, and the least number of events at which
//! the risk of rejecting the good one is kept as well.
//! Source: B. Epstein & M. Sobel, Ann. Math. Statist. 26 (1955) for the truncated plan; the search is our own.

use super::interval::{StatsError, check_open_probability, check_positive};
use super::law::WHOLE;
use super::numerics::root;
use super::poisson::{lower_mean, upper_mean};
use super::sequential::{SequentialPlan, wald_bounds};
use super::walk::Walk;

/// Events up to which a plan is worked out.
const MOST_EVENTS: usize = 20_000;

/// The bad rate over the good one from which on plans are worked out.
const LEAST_RATIO: f64 = 1.05;

impl SequentialPlan {
    /// A plan between a good rate and a bad one (same unit, one over the exposure) whose exact risks are at most `alpha`
    /// (of rejecting the good rate) and `beta` (of accepting the bad one): Wald's, drawn a little wider and cut off at
    /// the least number of events at which that holds.
    ///
    /// # Errors
    /// Rates not positive and finite, `bad` less than 1.05 times `good`, risks outside (0, 0.5), or a plan of more than
    /// 20,000 events.
    pub fn with_risks(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<Self, StatsError> {
        check_rates(good, bad, alpha, beta)?;
        Self::with_share(good, bad, alpha, beta, SHARE)
    }

    /// The same with Wald's lines drawn for this share of both risks.
    fn with_share(good: f64, bad: f64, alpha: f64, beta: f64, share: f64) -> Result<Self, StatsError> {
        let lines = Lines::between(good, bad, share * alpha, share * beta)?;
        let mut search = Search { lines, alpha, beta, good: Track::new(good), bad: Track::new(bad) };
        let too_close = StatsError::TooClose { low: good, high: bad, most: MOST_EVENTS as u64 };
        let (mut no, mut step) = (0, 1);
        while search.end(no + step).is_none() {
            (no, step) = (no + step, 2 * step);
            if no + step > MOST_EVENTS {
                return Err(too_close);
            }
        }
        let mut yes = no + step;
        while yes - no > 1 {
            let middle = no + (yes - no) / 2;
            if search.end(middle).is_some() { yes = middle } else { no = middle }
        }
        for events in yes..=MOST_EVENTS {
            let Some(end) = search.end(events) else { continue };
            let plan = search.lines.plan(events, end);
            if plan.at_rate(good)?.reject <= alpha && plan.at_rate(bad)?.accept <= beta {
                return Ok(plan);
            }
        }
        Err(too_close)
    }

    /// The shortest plan that only counts and whose exact risks are at most `alpha` and `beta`; see
    /// [`SequentialPlan::with_risks`].
    ///
    /// # Errors
    /// As [`SequentialPlan::with_risks`].
    ///
    /// Source: MIL-HDBK-781A, fixed-duration plans, from memory. Its rows are rounded, and some exceed a risk by a little.
    pub fn fixed_with_risks(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<Self, StatsError> {
        check_rates(good, bad, alpha, beta)?;
        // accepting with fewer than `number`: long enough to catch the bad rate, not so long that it hits the good one
        let spans = |number: usize| {
            let needed = upper_mean(number as u64 - 1, WHOLE, beta.ln()) / bad * (1.0 + ROUNDING);
            (needed, lower_mean(number as u64, WHOLE, alpha.ln()) / good)
        };
        let fits = |number: usize| spans(number).0 <= spans(number).1;
        let (mut no, mut yes) = (0, 1);
        while !fits(yes) {
            (no, yes) = (yes, 2 * yes);
            if no > MOST_EVENTS {
                return Err(StatsError::TooClose { low: good, high: bad, most: MOST_EVENTS as u64 });
            }
        }
        while yes - no > 1 {
            let middle = no + (yes - no) / 2;
            if fits(middle) { yes = middle } else { no = middle }
        }
        Self::fixed(spans(yes).0, yes)
    }
}

/// The share of both risks that the lines are drawn for; the rest is for the cut.
const SHARE: f64 = 0.8;

/// Room for the rounding of an exact risk.
const ROUNDING: f64 = 1e-13;

fn check_rates(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<(), StatsError> {
    check_positive("good rate", good, "a rate that should pass")?;
    check_positive("bad rate", bad, "a rate that should fail")?;
    check_positive("bad minus good rate", bad - good, "a bad rate above the good one")?;
    for (name, risk) in [("risk alpha", alpha), ("risk beta", beta)] {
        check_open_probability(name, risk)?;
        if risk >= 0.5 {
            return Err(StatsError::OutOfRange { name, value: risk, remedy: "less than a half, such as 0.1" });
        }
    }
    let ratio = bad / good;
    if ratio < LEAST_RATIO {
        let remedy = "a bad rate of at least 1.05 times the good one";
        return Err(StatsError::OutOfRange { name: "bad over good rate", value: ratio, remedy });
    }
    Ok(())
}

/// Wald's lines: accept at slope · k + up, reject at slope · k − down.
#[derive(Clone, Copy)]
struct Lines {
    slope: f64,
    up: f64,
    down: f64,
}

impl Lines {
    fn between(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<Self, StatsError> {
        let (up, down) = wald_bounds(alpha, beta)?;
        let gap = bad - good;
        Ok(Self { slope: (gap / good).ln_1p() / gap, up: up / gap, down: down / gap })
    }

    fn accept(&self, k: usize) -> f64 {
        self.slope * k as f64 + self.up
    }

    fn reject(&self, k: usize) -> f64 {
        self.slope * k as f64 - self.down
    }

    /// The plan in which event number `events` rejects in any case and `end` accepts.
    fn plan(&self, events: usize, end: f64) -> SequentialPlan {
        let reject = |k: usize| match self.reject(k) {
            _ if k == events => Some(end),
            time if k > 0 && time > 0.0 => Some(time.min(end)),
            _ => None,
        };
        SequentialPlan {
            accept_at: (0..events).map(|k| self.accept(k).min(end)).collect(),
            reject_at: (0..=events).map(reject).collect(),
        }
    }
}

/// The walk between endless lines, remembered where each reject number begins to matter.
struct Track {
    walk: Walk,
    rejecting: usize,
    accepting: usize,
    /// `seen[k]`: where the reject line of event number k is crossed.
    seen: Vec<Walk>,
}

impl Track {
    fn new(rate: f64) -> Self {
        Self { walk: Walk::new(rate), rejecting: 1, accepting: 0, seen: vec![Walk::new(rate)] }
    }

    /// The state up to which a plan that ends with event number `events` is the same as the endless one.
    fn until(&mut self, lines: &Lines, events: usize) -> &Walk {
        while self.seen.len() <= events {
            let cut = lines.reject(self.seen.len());
            while cut > 0.0 && lines.accept(self.accepting) < cut {
                self.walk.forward(lines.accept(self.accepting), self.rejecting);
                self.accepting += 1;
                self.walk.accept_below(self.accepting);
            }
            if cut > 0.0 {
                self.walk.forward(cut, self.rejecting);
            }
            self.rejecting = self.seen.len() + 1;
            self.seen.push(self.walk.clone());
        }
        &self.seen[events]
    }
}

struct Search {
    lines: Lines,
    alpha: f64,
    beta: f64,
    good: Track,
    bad: Track,
}

impl Search {
    /// The exposure at which a plan that ends with event number `events` has to end so that both risks are kept.
    fn end(&mut self, events: usize) -> Option<f64> {
        let Self { lines, alpha, beta, good, bad } = self;
        let mut walk = bad.until(lines, events).clone();
        // the later the end, the less of the bad rate is accepted
        let end = loop {
            let k = walk.first();
            if k >= events {
                return None;
            }
            let line = lines.accept(k);
            if walk.ended_at(line, events).0 <= *beta {
                let excess = |end: f64| walk.ended_at(end, events).0 - *beta;
                let from = walk.now();
                break root(excess, false, line, 0.5 * (line - from), (from, line)) * (1.0 + ROUNDING);
            }
            walk.forward(line, events);
            walk.accept_below(k + 1);
        };
        let mut walk = good.until(lines, events).clone();
        while walk.first() < events && lines.accept(walk.first()) < end {
            let k = walk.first();
            walk.forward(lines.accept(k), events);
            walk.accept_below(k + 1);
        }
        (end > 0.0 && walk.ended_at(end, events).1 <= *alpha).then_some(end)
    }
}
