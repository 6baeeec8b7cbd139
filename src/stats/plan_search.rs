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
use super::sequential::SequentialPlan;
use super::walk::Walk;

/// Events up to which a plan is worked out.
const MOST_EVENTS: usize = 20_000;

/// The bad rate over the good one from which on plans are worked out.
const LEAST_RATIO: f64 = 1.05;

impl SequentialPlan {
    /// A plan between a good rate and a bad one (same unit, one over the exposure) whose exact risks are at most `alpha`
    /// (of rejecting the good rate) and `beta` (of accepting the bad one): Wald's lines, so far apart that without an end
    /// they would keep four fifths of both risks, cut off at the least number of events at which the exact ones are kept.
    /// At either rate it takes in the mean about half of the exposure of [`SequentialPlan::fixed_with_risks`] (a seventh to
    /// five sixths of it), at the longest about 1.2 times as much (with few events up to 1.5). If that plan rejects at the
    /// first event there is nothing to gain, and it is the answer. The search takes well under a second for a plan of
    /// five thousand events, and some ten for the longest.
    ///
    /// # Errors
    /// Rates not positive and finite, `bad` less than 1.05 times `good`, risks below 10⁻⁹ or not below a half, or a plan
    /// of more than 20,000 events.
    pub fn with_risks(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<Self, StatsError> {
        let fixed = Self::fixed_with_risks(good, bad, alpha, beta)?;
        let counting = fixed.accept_at.len();
        if counting == 1 {
            return Ok(fixed);
        }
        let lines = Lines::between(good, bad, SHARE * alpha, SHARE * beta);
        // a plan with much fewer events than one that only counts cannot keep the risks
        let from = counting / 2;
        let mut search = Search { lines, alpha, beta, good: Track::new(good, from), bad: Track::new(bad, from) };
        let (mut no, mut yes) = (from, counting.max(from + 1));
        while search.end(yes).is_none() {
            (no, yes) = (yes, yes + counting / 8 + 1);
            if yes > MOST_EVENTS {
                return Err(too_close(good, bad));
            }
        }
        while yes - no > 1 {
            let middle = no + (yes - no) / 2;
            if search.end(middle).is_some() { yes = middle } else { no = middle }
        }
        // the risks of the plan as it is handed out have the last word
        for events in yes..=MOST_EVENTS {
            let Some(end) = search.end(events) else { continue };
            let plan = search.lines.plan(events, end);
            if plan.at_rate(good)?.reject <= alpha && plan.at_rate(bad)?.accept <= beta {
                return Ok(plan);
            }
        }
        Err(too_close(good, bad))
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
                return Err(too_close(good, bad));
            }
        }
        while yes - no > 1 {
            let middle = no + (yes - no) / 2;
            if fits(middle) { yes = middle } else { no = middle }
        }
        Self::fixed(spans(yes).0, yes)
    }
}

/// The share of both risks that goes to the lines; the rest is for the cut.
const SHARE: f64 = 0.8;

/// Risks from which on plans are worked out.
const LEAST_RISK: f64 = 1e-9;

/// Room for the rounding of an exact risk.
const ROUNDING: f64 = 1e-13;

fn check_rates(good: f64, bad: f64, alpha: f64, beta: f64) -> Result<(), StatsError> {
    check_positive("good rate", good, "a rate that should pass")?;
    check_positive("bad rate", bad, "a rate that should fail")?;
    check_positive("bad minus good rate", bad - good, "a bad rate above the good one")?;
    for (name, risk) in [("risk alpha", alpha), ("risk beta", beta)] {
        check_open_probability(name, risk)?;
        if !(LEAST_RISK..0.5).contains(&risk) {
            let remedy = "a risk from 1e-9 to below a half, such as 0.1";
            return Err(StatsError::OutOfRange { name, value: risk, remedy });
        }
    }
    let ratio = bad / good;
    if ratio < LEAST_RATIO {
        let remedy = "a bad rate of at least 1.05 times the good one";
        return Err(StatsError::OutOfRange { name: "bad over good rate", value: ratio, remedy });
    }
    Ok(())
}

fn too_close(good: f64, bad: f64) -> StatsError {
    StatsError::TooClose { low: good, high: bad, most: MOST_EVENTS as u64 }
}

/// Wald's lines: accept at slope · k + up, reject at slope · k − down.
#[derive(Clone, Copy)]
struct Lines {
    slope: f64,
    up: f64,
    down: f64,
}

impl Lines {
    /// Likelihood ratios of 1 / alpha and beta bound the risks by just these (A. Wald, Sequential Analysis, 3.2);
    /// the usual (1 − beta) / alpha and beta / (1 − alpha) keep only the sum of both.
    fn between(good: f64, bad: f64, alpha: f64, beta: f64) -> Self {
        let gap = bad - good;
        Self { slope: (gap / good).ln_1p() / gap, up: -beta.ln() / gap, down: -alpha.ln() / gap }
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
    /// Where the reject line of event number `from` ends, and of each one after it.
    seen: Vec<Walk>,
    from: usize,
}

impl Track {
    fn new(rate: f64, from: usize) -> Self {
        Self { walk: Walk::new(rate), rejecting: 0, accepting: 0, seen: Vec::new(), from }
    }

    /// The state where the reject line of this event number ends. Up to there a plan that is cut off at any later one
    /// is the same as the endless plan.
    fn until(&mut self, lines: &Lines, events: usize) -> &Walk {
        while self.from + self.seen.len() <= events {
            let cut = lines.reject(self.rejecting);
            if cut > 0.0 {
                while lines.accept(self.accepting) < cut {
                    self.walk.forward(lines.accept(self.accepting), self.rejecting);
                    self.accepting += 1;
                    self.walk.accept_below(self.accepting);
                }
                self.walk.forward(cut, self.rejecting);
            }
            if self.rejecting >= self.from {
                self.seen.push(self.walk.clone());
            }
            self.rejecting += 1;
        }
        &self.seen[events - self.from]
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
        let mut walk = bad.until(lines, events - 1).clone();
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
        let mut walk = good.until(lines, events - 1).clone();
        while walk.first() < events && lines.accept(walk.first()) < end {
            let k = walk.first();
            walk.forward(lines.accept(k), events);
            walk.accept_below(k + 1);
        }
        (end > 0.0 && walk.ended_at(end, events).1 <= *alpha).then_some(end)
    }
}
