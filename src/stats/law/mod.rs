//! Laws of counting: point probabilities and tails that stay exact from one run to 10^12 and far out.
//!
//! Every law gives its log point probability and two quotients, tail / point; the tails in `CountLaw` are put together
//! from these, always from the side on which the quotient is small, so nothing is lost to subtraction.

mod binomial;
mod hypergeometric;
mod poisson;
mod student;

pub(super) use binomial::Binomial;
pub(super) use hypergeometric::Hypergeometric;
pub(super) use poisson::Poisson;
pub(super) use student::{normal_reach, student_reach};

/// Which tail of a law, the counted value included.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Tail {
    /// P(X ≤ k): falls as the rate rises, so it sets upper limits.
    Lower,
    /// P(X ≥ k): sets lower limits.
    Upper,
}

/// How much of P(X = k) belongs to the tail at k.
pub(super) const WHOLE: f64 = 1.0;
/// The mid-P convention (H. O. Lancaster, Biometrika 36, 1949; JASA 56, 1961).
pub(super) const HALF: f64 = 0.5;

/// Two point probabilities count as equal within this relative margin in "as unlikely as what was seen" tests.
/// Exact ties come out a few last digits apart; reference implementations use the same margin.
pub(super) const TIE: f64 = 1e-7;

pub(super) trait CountLaw {
    fn mean(&self) -> f64;
    /// ln P(X = k).
    fn ln_point(&self, k: f64) -> f64;
    /// P(X ≥ k) / P(X = k), asked only for k ≥ mean.
    fn above(&self, k: f64) -> f64;
    /// P(X ≤ k) / P(X = k), asked only for k ≤ mean.
    fn below(&self, k: f64) -> f64;

    /// ln of the tail at k, with `weight` of P(X = k) in it.
    fn ln_tail(&self, tail: Tail, k: f64, weight: f64) -> f64 {
        let point = self.ln_point(k);
        match (tail, k <= self.mean()) {
            (Tail::Lower, true) => point + (self.below(k) - (1.0 - weight)).ln(),
            (Tail::Upper, false) => point + (self.above(k) - (1.0 - weight)).ln(),
            (Tail::Lower, false) => (-point.exp() * (self.above(k) - weight)).ln_1p(),
            (Tail::Upper, true) => (-point.exp() * (self.below(k) - weight)).ln_1p(),
        }
    }

    /// P-value against "some other value is as unlikely as k": the sum over all values not more probable than k.
    /// `least` and `most` bound the support.
    fn as_unlikely(&self, k: f64, (least, most): (f64, f64)) -> f64 {
        let limit = self.ln_point(k) + TIE;
        let mean = self.mean();
        // the first value on the far side of the mean that is not more probable than k
        let far = |inner: f64, outer: f64| {
            let (mut inside, mut outside) = (inner, outer);
            if self.ln_point(inside) <= limit {
                return Some(inside);
            }
            if self.ln_point(outside) > limit {
                return None;
            }
            while (outside - inside).abs() > 1.0 {
                let middle = (0.5 * (inside + outside)).floor();
                if self.ln_point(middle) <= limit { outside = middle } else { inside = middle }
            }
            Some(outside)
        };
        let (near_tail, far_tail, other) = if k < mean {
            (Tail::Lower, Tail::Upper, far(mean.ceil().min(most), most))
        } else if k > mean {
            (Tail::Upper, Tail::Lower, far(mean.floor().max(least), least))
        } else {
            return 1.0;
        };
        let other = other.map_or(0.0, |j| self.ln_tail(far_tail, j, WHOLE).exp());
        (self.ln_tail(near_tail, k, WHOLE).exp() + other).min(1.0)
    }
}
