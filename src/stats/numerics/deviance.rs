//! The pieces of a saddle-point point probability.
//! Source: C. Loader, "Fast and accurate computation of binomial probabilities", 2000.

use std::f64::consts::TAU;

/// ln(1 + u) − u without cancellation, u > −1.
///
/// With v = u / (2 + u), ln(1 + u) = 2 artanh v, and 2v − u = −u v (Abramowitz & Stegun 4.1.27).
pub fn ln_1p_minus(u: f64) -> f64 {
    if !(-0.5..=0.5).contains(&u) {
        return u.ln_1p() - u;
    }
    let v = u / (2.0 + u);
    let square = v * v;
    let (mut sum, mut power, mut odd) = (0.0, 1.0, 3.0);
    loop {
        let next = sum + power / odd;
        if next == sum {
            return 2.0 * v * square * sum - u * v;
        }
        (sum, power, odd) = (next, power * square, odd + 2.0);
    }
}

/// k ln(k / mean) + mean − k, given also `excess` = k − mean, which the caller knows better than by subtracting.
/// k and mean > 0.
pub fn poisson_deviance(k: f64, excess: f64, mean: f64) -> f64 {
    let u = excess / mean;
    if u.abs() > 0.5 {
        return k * (k / mean).ln() - excess;
    }
    mean * ((1.0 + u) * ln_1p_minus(u) + u * u)
}

/// ln Γ(k + 1) − [(k + ½) ln k − k + ½ ln 2π], the error of Stirling's formula, k > 0.
/// From 16 on the series of Abramowitz & Stegun 6.1.41, whose next term is below 1e-17 there.
pub fn stirling_error(k: f64) -> f64 {
    if k < 16.0 {
        return statrs::function::gamma::ln_gamma(k + 1.0) - (k + 0.5) * k.ln() + k - 0.5 * TAU.ln();
    }
    let square = k * k;
    let series = [1.0 / 12.0, -1.0 / 360.0, 1.0 / 1260.0, -1.0 / 1680.0, 1.0 / 1188.0, -691.0 / 360_360.0, 1.0 / 156.0];
    series.iter().rev().fold(0.0, |sum, coefficient| sum / square + coefficient) / k
}
