//! The binomial law, with the probability and its complement both given so that neither end loses digits.

use super::{CountLaw, Tail};
use crate::stats::numerics::{integrate_decay, ln_1p_minus, poisson_deviance, root, stirling_error, sum_of_ratios};
use std::f64::consts::TAU;

#[derive(Debug, Clone, Copy)]
pub struct Binomial {
    pub n: f64,
    pub p: f64,
    /// 1 − p, from whoever knows it best.
    pub q: f64,
}

impl Binomial {
    /// The log odds ln(p / q) at which the tail at `k` has probability exp(`ln_alpha`).
    /// For the upper tail k > 0, for the lower k < n.
    pub fn ln_odds_where(tail: Tail, k: f64, n: f64, weight: f64, ln_alpha: f64) -> f64 {
        let excess = |ln_odds: f64| Binomial::at_ln_odds(n, ln_odds).ln_tail(tail, k, weight) - ln_alpha;
        let (hits, misses) = (k + 0.5, n - k + 0.5);
        let step = (1.0 / hits + 1.0 / misses).sqrt();
        root(excess, tail == Tail::Upper, (hits / misses).ln(), step, (-700.0, 700.0))
    }

    pub fn at_ln_odds(n: f64, ln_odds: f64) -> Self {
        Self { n, p: 1.0 / (1.0 + (-ln_odds).exp()), q: 1.0 / (1.0 + ln_odds.exp()) }
    }

    fn mirrored(&self) -> Self {
        Self { n: self.n, p: self.q, q: self.p }
    }

    /// k − m p for the smaller of p and q, in one rounding.
    fn excess(&self, k: f64, m: f64) -> f64 {
        if self.p <= self.q { m.mul_add(-self.p, k) } else { -m.mul_add(-self.q, m - k) }
    }

    fn ln_q(&self) -> f64 {
        if self.p < self.q { (-self.p).ln_1p() } else { self.q.ln() }
    }
}

impl CountLaw for Binomial {
    fn mean(&self) -> f64 {
        if self.p <= self.q { self.n * self.p } else { self.n - self.n * self.q }
    }

    fn ln_point(&self, k: f64) -> f64 {
        let n = self.n;
        if k == 0.0 {
            return n * self.ln_q();
        }
        if k == n {
            return n * self.mirrored().ln_q();
        }
        let excess = self.excess(k, n);
        let deviance = poisson_deviance(k, excess, n * self.p) + poisson_deviance(n - k, -excess, n * self.q);
        let stirling = stirling_error(n) - stirling_error(k) - stirling_error(n - k);
        stirling - deviance - 0.5 * (TAU * k * ((n - k) / n)).ln()
    }

    fn above(&self, k: f64) -> f64 {
        let (n, odds) = (self.n, self.p / self.q);
        sum_of_ratios(|j| (n - k - j).max(0.0) * odds / (k + 1.0 + j)).unwrap_or_else(|| {
            // I_p(k, n − k + 1) (DLMF 8.17.5) as the integral of the beta density from its end at p, s = p (1 − u)
            let slope = -self.excess(k - 1.0, n - 1.0) / self.q;
            let exponent = |u: f64| (k - 1.0) * ln_1p_minus(-u) + (n - k) * ln_1p_minus(u * odds) + u * slope;
            k * integrate_decay(exponent, slope, (k - 1.0) + (n - k) * odds * odds, 1.0)
        })
    }

    fn below(&self, k: f64) -> f64 {
        self.mirrored().above(self.n - k)
    }
}
