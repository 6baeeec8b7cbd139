//! The few numerical tools under the laws of counting.
//!
//! Why not a library's incomplete beta and gamma: those in reach take the difference of log-gammas and cap their
//! continued fractions, which costs all but nine digits at 10^6 runs and all but three at 10^12 (statrs 0.19 measured
//! against SciPy). Here a point probability comes from its deviance (no cancellation at any size), and a tail from the
//! point probability by adding positive terms, or by integrating a smooth concave exponential where the terms would be
//! too many.

mod deviance;
mod quadrature;
mod root;

pub(super) use deviance::{ln_1p_minus, poisson_deviance, stirling_error};
pub(super) use quadrature::integrate_decay;
pub(super) use root::root;

/// Terms that a tail may take before the integral is cheaper.
const MOST_TERMS: usize = 2_000;

/// 1 + r(0) + r(0) r(1) + …, for ratios that fall and end below 1. `None` if it has not settled after 2,000 terms.
pub(super) fn sum_of_ratios(ratio: impl Fn(f64) -> f64) -> Option<f64> {
    let (mut sum, mut term) = (1.0, 1.0);
    for step in 0..MOST_TERMS {
        term *= ratio(step as f64);
        if term <= 1e-18 * sum {
            return Some(sum);
        }
        sum += term;
    }
    None
}
