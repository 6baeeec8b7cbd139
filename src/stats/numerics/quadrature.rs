//! Integral of a falling, concave exponential: ∫ exp(g(s)) ds from 0 to `end`, g(0) = 0.
//!
//! Panels of 16-point Gauss–Legendre, each as wide as the exponential takes to fall by about e, until nothing is
//! left that a double would notice. On such a panel the integrand is as smooth as a piece of a bell curve, and the
//! rule is exact up to rounding.

/// Nodes and weights on (−1, 1), Abramowitz & Stegun table 25.4, n = 16 (the other half by symmetry).
const HALF_RULE: [(f64, f64); 8] = [
    (0.09501250983763744, 0.1894506104550685),
    (0.2816035507792589, 0.18260341504492358),
    (0.45801677765722737, 0.16915651939500254),
    (0.6178762444026438, 0.14959598881657674),
    (0.755404408355003, 0.12462897125553388),
    (0.8656312023878318, 0.09515851168249279),
    (0.9445750230732326, 0.062253523938647894),
    (0.9894009349916499, 0.027152459411754096),
];

/// What is left after the exponent has fallen this far is below the rounding of the sum.
const NOTHING_LEFT: f64 = -42.0;

/// ∫₀^end exp(g(s)) ds. `slope` = g′(0) ≤ 0 and `curvature` = −g″(0) ≥ 0, not both zero, set the panel width.
pub fn integrate_decay(g: impl Fn(f64) -> f64, slope: f64, curvature: f64, end: f64) -> f64 {
    let width = 1.0 / slope.abs().max(curvature.sqrt());
    let (mut sum, mut from) = (0.0, 0.0);
    while from < end {
        let to = (from + width).min(end);
        let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
        let panel: f64 =
            HALF_RULE.iter().map(|&(x, w)| w * (g(middle - half * x).exp() + g(middle + half * x).exp())).sum();
        sum += half * panel;
        if g(to) < NOTHING_LEFT {
            break;
        }
        from = to;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::{HALF_RULE, integrate_decay};

    #[test]
    fn rule_is_exact_for_every_degree_that_it_promises() {
        // ∫₋₁¹ x^d = 2/(d+1) for even d: a 16-point rule promises it up to degree 31
        for degree in (0..=30).step_by(2) {
            let sum: f64 = HALF_RULE.iter().map(|(x, w)| 2.0 * w * x.powi(degree)).sum();
            let exact = 2.0 / f64::from(degree + 1);
            assert!((sum - exact).abs() < 2e-15, "degree {degree}: {sum} for {exact}");
        }
    }

    #[test]
    fn half_a_bell_curve_and_an_exponential() {
        // ∫₀^∞ exp(−s²/2) = √(π/2); ∫₀^∞ exp(−s) = 1; ∫₀^1 exp(−s) = 1 − 1/e
        let bell = integrate_decay(|s| -0.5 * s * s, 0.0, 1.0, f64::INFINITY);
        assert!((bell / std::f64::consts::FRAC_PI_2.sqrt() - 1.0).abs() < 1e-15, "{bell}");
        let fall = integrate_decay(|s| -s, -1.0, 0.0, f64::INFINITY);
        assert!((fall - 1.0).abs() < 1e-15, "{fall}");
        let part = integrate_decay(|s| -s, -1.0, 0.0, 1.0);
        assert!((part - 0.632_120_558_828_557_7).abs() < 1e-15, "{part}");
    }
}
