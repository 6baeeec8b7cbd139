//! How many standard errors a limit lies away: by the normal law, and by Student's where the error itself is estimated.
//!
//! With t = √ν tan φ the tail of Student's law is ∫ cos^(ν−1) from φ to ½π over twice the same integral from 0: the
//! integrand is smooth and falls, so the quadrature of the other tails serves, without a gamma function.

use super::Poisson;
use crate::stats::numerics::{integrate_decay, root};
use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, LN_2};

/// The z with P(|Z| > z) = exp(`ln_error`) for a standard normal Z: the root of χ² with one degree of freedom.
pub fn normal_reach(ln_error: f64) -> f64 {
    let excess = |ln_z: f64| Poisson::chi_square_above(1.0, (2.0 * ln_z).exp()).ln() - ln_error;
    root(excess, false, 0.0, 0.5, (-700.0, 350.0)).exp()
}

/// The t with P(|T| > t) = exp(`ln_error`) for a T with so many degrees of freedom, at least 1.
pub fn student_reach(degrees: usize, ln_error: f64) -> f64 {
    let (nu, half_all) = (degrees as f64, ln_rest(degrees, 0.0, FRAC_PI_2));
    let excess = |ln_t: f64| {
        let t = ln_t.exp() / nu.sqrt();
        ln_rest(degrees, t.atan(), (1.0 / t).atan()) - half_all - ln_error
    };
    root(excess, false, LN_2, 0.5, (-700.0, 700.0)).exp()
}

/// ln of ∫ cos^(ν−1) from `from` to ½π, given also `rest` = ½π − `from`, which the caller knows better.
fn ln_rest(degrees: usize, from: f64, rest: f64) -> f64 {
    let power = degrees as f64 - 1.0;
    if degrees == 1 {
        return rest.ln();
    }
    // near 0 the cosine itself has lost what its logarithm needs, near ½π the sine of the angle has
    let ln_cos = |s: f64| {
        if from + s < FRAC_PI_4 { 0.5 * (-(from + s).sin().powi(2)).ln_1p() } else { (rest - s).sin().ln() }
    };
    let start = ln_cos(0.0);
    let slope = -power / rest.tan();
    let area = integrate_decay(|s| power * (ln_cos(s) - start), slope, power / rest.sin().powi(2), rest);
    power * start + area.ln()
}
