//! Student's law: how far an estimate may lie off when its variance is itself estimated.

use super::numerics::root;
use statrs::function::{beta::beta_reg, erf::erfc_inv};
use std::f64::consts::SQRT_2;

/// Degrees of freedom from which the expansion about the normal law is exact to the last digits.
const NEARLY_NORMAL: f64 = 2e4;

/// The t with P(|T| ≤ t) = `confidence` for `degrees` of freedom. Both are the caller's to check: confidence in
/// (0, 1), degrees > 0.
///
/// Source: P(|T| > t) = I_x(ν/2, ½) with x = ν / (ν + t²), DLMF 8.17; for many degrees M. Abramowitz & I. A. Stegun,
/// Handbook of Mathematical Functions, 26.7.5.
pub(super) fn student_t(confidence: f64, degrees: f64) -> f64 {
    let z = SQRT_2 * erfc_inv(1.0 - confidence);
    if degrees >= NEARLY_NORMAL {
        let square = z * z;
        let first = z * (square + 1.0) / 4.0;
        let second = z * ((5.0 * square + 16.0) * square + 3.0) / 96.0;
        let third = z * (((3.0 * square + 19.0) * square + 17.0) * square - 15.0) / 384.0;
        return z + (first + (second + third / degrees) / degrees) / degrees;
    }
    let ln_outside = (-confidence).ln_1p();
    let excess = |ln_t: f64| {
        let square = (2.0 * ln_t).exp();
        let x = if square.is_finite() { degrees / (degrees + square) } else { 0.0 };
        beta_reg(0.5 * degrees, 0.5, x).ln() - ln_outside
    };
    root(excess, false, z.max(1e-12).ln(), 0.1, (-40.0, 340.0)).exp()
}

#[cfg(test)]
mod tests {
    use super::student_t;

    /// R. A. Fisher & F. Yates, Statistical Tables, table III, from memory; one degree is Cauchy's law, tan(π c / 2).
    #[test]
    fn quantiles_are_those_of_the_tables() {
        for (degrees, t) in [(1.0, 12.706), (2.0, 4.303), (5.0, 2.571), (10.0, 2.228), (30.0, 2.042), (120.0, 1.980)] {
            assert!((student_t(0.95, degrees) - t).abs() < 5.1e-4, "{degrees}");
        }
        let cauchy = (0.5 * std::f64::consts::PI * 0.999).tan();
        assert!((student_t(0.999, 1.0) / cauchy - 1.0).abs() < 1e-10);
        assert!((student_t(0.95, 1e9) - 1.959_963_985).abs() < 1e-8);
    }

    #[test]
    fn the_two_ways_meet() {
        for confidence in [0.5, 0.95, 0.999_999] {
            let (below, above) = (student_t(confidence, 1.99999e4), student_t(confidence, 2e4));
            assert!((below / above - 1.0).abs() < 1e-7 && below > above, "{below} {above}");
        }
    }
}
