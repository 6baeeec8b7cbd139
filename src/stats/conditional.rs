//! The one-sided conditional test of two rates, seen from before the data: how likely it is to reject.
//!
//! Given a total of n events the first count is binomial, with one share if the rates are equal and another if they are
//! not. The test rejects from a critical count on, which the level sets and which goes up by one every so many n: the
//! power is a saw over n. Between two teeth both tails follow from their neighbours by adding one term.
//! Source: E. L. Lehmann, Testing Statistical Hypotheses, 4.5.

use super::law::{Binomial, CountLaw, Poisson, Tail, WHOLE};

/// A share and its complement, from whoever knows both best.
#[derive(Debug, Clone, Copy)]
pub struct Share {
    p: f64,
    q: f64,
}

impl Share {
    /// The share of the first of two parts, not both 0.
    pub fn of(first: f64, second: f64) -> Self {
        if first > second {
            let odds = second / first;
            Self { p: 1.0 / (1.0 + odds), q: odds / (1.0 + odds) }
        } else {
            let odds = first / second;
            Self { p: odds / (1.0 + odds), q: 1.0 / (1.0 + odds) }
        }
    }

    /// The share itself.
    pub fn p(self) -> f64 {
        self.p
    }

    /// p (1 − p), the variance of one trial.
    pub fn variance(self) -> f64 {
        self.p * self.q
    }

    /// P(X ≥ k) and P(X = k − 1) of n, for 0 < k ≤ n.
    fn tail(self, n: f64, k: f64) -> (f64, f64) {
        if self.q == 0.0 {
            return (1.0, 0.0);
        }
        let law = Binomial { n, p: self.p, q: self.q };
        (law.ln_tail(Tail::Upper, k, WHOLE).exp(), law.ln_point(k - 1.0).exp())
    }
}

/// Power given the total count, from some total upwards.
pub struct Saw {
    /// Shares of the first count if the rates are equal, and in truth.
    equal: Share,
    truth: Share,
    level: f64,
    least: f64,
    powers: Vec<f64>,
    /// The critical count of the last total.
    critical: f64,
    /// The tails of the last total at its critical count, and the points below it: equal rates, then the truth.
    now: [(f64, f64); 2],
}

impl Saw {
    /// The saw from a total of `least` upwards, with no teeth yet.
    pub fn new(equal: Share, truth: Share, level: f64, least: f64) -> Self {
        let mut saw = Self { equal, truth, level, least, powers: Vec::new(), critical: 0.0, now: [(0.0, 0.0); 2] };
        let (mut no, mut yes) = (0.0, least + 1.0);
        while yes - no > 1.0 {
            let middle = (0.5 * (no + yes)).floor();
            if saw.rejects(least, middle) { yes = middle } else { no = middle }
        }
        saw.critical = yes;
        saw.anchor(least);
        saw
    }

    /// The total from which the saw starts.
    pub fn least(&self) -> f64 {
        self.least
    }

    /// The share of the first count if the rates are equal.
    pub fn equal(&self) -> Share {
        self.equal
    }

    /// The last total whose power is below this one, if any is.
    pub fn last_below(&self, power: f64) -> Option<f64> {
        self.powers.iter().rposition(|&given| given < power).map(|at| self.least + at as f64)
    }

    /// Works the saw out to a total of at least `most`.
    pub fn extend(&mut self, most: f64) {
        while self.end() <= most {
            if !self.powers.is_empty() {
                self.step(self.end());
            }
            self.powers.push(if self.critical > self.end() { 0.0 } else { self.now[1].0.min(1.0) });
        }
    }

    /// Power where the total is a Poisson count of this mean, for which the saw has to reach far enough.
    pub fn power(&self, mean: f64) -> f64 {
        self.average(mean, |_, power| power)
    }

    /// Mean of a function of the total and its power over the Poisson law of the total.
    pub fn average(&self, mean: f64, of: impl Fn(f64, f64) -> f64) -> f64 {
        let (law, (first, last)) = (Poisson { mean }, reach(mean));
        let from = (first - self.least).max(0.0) as usize;
        let to = ((last - self.least).max(0.0) as usize + 1).min(self.powers.len());
        let term = |at: usize| {
            let total = self.least + at as f64;
            law.ln_point(total).exp() * of(total, self.powers[at])
        };
        (from..to).map(term).sum()
    }

    /// The first total that is not worked out yet.
    pub fn end(&self) -> f64 {
        self.least + self.powers.len() as f64
    }

    fn rejects(&self, n: f64, k: f64) -> bool {
        k > n || Binomial { n, p: self.equal.p, q: self.equal.q }.ln_tail(Tail::Upper, k, WHOLE) <= self.level.ln()
    }

    fn anchor(&mut self, n: f64) {
        if self.critical <= n {
            self.now = [self.equal, self.truth].map(|share| share.tail(n, self.critical));
        }
    }

    /// From a total of n − 1 to n.
    fn step(&mut self, n: f64) {
        let k = self.critical;
        if k > n - 1.0 {
            self.anchor(n);
        } else {
            for (share, (tail, point)) in [self.equal, self.truth].into_iter().zip(&mut self.now) {
                *tail += share.p * *point;
                *point *= n / (n - k + 1.0) * share.q;
            }
        }
        // the sums are good to many digits, but the test itself is the judge
        if k <= n && self.now[0].0 > self.level * (1.0 - 1e-9) {
            while !self.rejects(n, self.critical) {
                self.critical += 1.0;
            }
            self.anchor(n);
        }
    }
}

/// Totals outside of which a Poisson law of this mean has nothing that matters.
pub fn reach(mean: f64) -> (f64, f64) {
    let reach = 10.0 * mean.sqrt() + 40.0;
    ((mean - reach).max(0.0).floor(), (mean + reach).ceil())
}
