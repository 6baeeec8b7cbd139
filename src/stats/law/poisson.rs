//! The Poisson law. `k` may also be fractional: then the tails are those of the gamma law (DLMF 8.4, 8.7).

use super::{CountLaw, Tail};
use crate::stats::numerics::{integrate_decay, ln_1p_minus, poisson_deviance, root, stirling_error, sum_of_ratios};
use std::f64::consts::{PI, TAU};

#[derive(Debug, Clone, Copy)]
pub struct Poisson {
    pub mean: f64,
}

impl Poisson {
    /// The mean at which the tail at `k` has probability exp(`ln_alpha`). For the upper tail k > 0.
    pub fn mean_where(tail: Tail, k: f64, weight: f64, ln_alpha: f64) -> f64 {
        let excess = |ln_mean: f64| Poisson { mean: ln_mean.exp() }.ln_tail(tail, k, weight) - ln_alpha;
        let middle = k + 0.5;
        root(excess, tail == Tail::Upper, middle.ln(), 1.0 / middle.sqrt(), (-700.0, 700.0)).exp()
    }

    /// P(χ² with `degrees` of freedom > `chi_square`), i.e. Q(degrees/2, χ²/2) (DLMF 8.4.8, 8.8).
    pub fn chi_square_above(degrees: f64, chi_square: f64) -> f64 {
        if chi_square <= 0.0 {
            return 1.0;
        }
        let (a, law) = (0.5 * degrees, Poisson { mean: 0.5 * chi_square });
        if law.mean < a {
            1.0 - law.ln_point(a).exp() * law.above(a)
        } else {
            // one degree of freedom: Γ(½) = √π, where Stirling's formula has nothing to say about k = −½
            let point = if a == 0.5 { (-law.mean).exp() / (PI * law.mean).sqrt() } else { law.ln_point(a - 1.0).exp() };
            point * law.below(a - 1.0)
        }
    }
}

impl CountLaw for Poisson {
    fn mean(&self) -> f64 {
        self.mean
    }

    fn ln_point(&self, k: f64) -> f64 {
        if k == 0.0 {
            return -self.mean;
        }
        -stirling_error(k) - poisson_deviance(k, k - self.mean, self.mean) - 0.5 * (TAU * k).ln()
    }

    fn above(&self, k: f64) -> f64 {
        let mean = self.mean;
        sum_of_ratios(|j| mean / (k + 1.0 + j)).unwrap_or_else(|| {
            // P(k, mean) as the integral of the gamma density from its end at the mean, s = mean (1 − u)
            let slope = mean - (k - 1.0);
            k * integrate_decay(|u| (k - 1.0) * ln_1p_minus(-u) + u * slope, slope, k - 1.0, 1.0)
        })
    }

    fn below(&self, k: f64) -> f64 {
        let mean = self.mean;
        let whole = k.fract() == 0.0;
        whole.then(|| sum_of_ratios(|j| (k - j).max(0.0) / mean)).flatten().unwrap_or_else(|| {
            let slope = k - mean;
            mean * integrate_decay(|u| k * ln_1p_minus(u) + u * slope, slope, k, f64::INFINITY)
        })
    }
}
