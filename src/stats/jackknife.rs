//! A ratio of totals from units that are not alike: its error from leaving each unit out in turn.
//!
//! Right where many units (hosts, cores, windows) contribute about alike: it asks for no law of the counts, only that
//! the units are independent. Poor with few units or few events: below some ten units the error is itself little more
//! than a guess (Student's t says so by width), with one unit that holds most of the events the interval is too short,
//! and without events the error is 0, which bounds nothing: use the exact limits there.
//! Source: B. Efron & R. J. Tibshirani, An Introduction to the Bootstrap (1993), ch. 10 and 11.

use super::interval::{Interval, StatsError, check_exposure, check_finite, ln_error};
use super::law::student_reach;
use serde::{Deserialize, Serialize};

/// A ratio of totals with what the jackknife says of it.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct JackknifeRatio {
    /// Σ numerator / Σ denominator.
    pub ratio: f64,
    /// Estimated bias of the ratio; already in `ratio`, not taken off.
    pub bias: f64,
    /// Standard error of the ratio.
    pub standard_error: f64,
    /// Number of units.
    pub units: usize,
}

/// The ratio of the totals of `pairs` (numerator, denominator), one pair a unit, such as events and busy hours of a host.
///
/// # Errors
/// Fewer than two units, a numerator that is not finite, a denominator that is not positive and finite, or totals
/// beyond the range of a double.
///
/// Source: B. Efron & R. J. Tibshirani, An Introduction to the Bootstrap (1993), (11.5) and 10.3.
pub fn jackknife_ratio(pairs: &[(f64, f64)]) -> Result<JackknifeRatio, StatsError> {
    let units = pairs.len();
    if units < 2 {
        return Err(StatsError::TooFew { name: "units", given: units, needed: 2 });
    }
    for &(numerator, denominator) in pairs {
        check_finite("numerator", numerator, "the number of events of the unit")?;
        check_exposure(denominator)?;
    }
    let (top, bottom) = pairs.iter().fold((0.0, 0.0), |(top, bottom), pair| (top + pair.0, bottom + pair.1));
    check_finite("total of the numerators", top, "numbers in a larger unit")?;
    check_finite("total of the denominators", bottom, "numbers in a larger unit")?;
    let ratio = top / bottom;
    // without unit i the ratio is off by (ratio d − n) / (what is left of the denominators); the remainders are added
    // up from both ends, because a total minus its largest part keeps no digits
    let mut after = vec![0.0; units];
    for unit in (1..units).rev() {
        after[unit - 1] = after[unit] + pairs[unit].1;
    }
    let mut before = 0.0;
    let mut shifts = Vec::with_capacity(units);
    for (unit, &(n, d)) in pairs.iter().enumerate() {
        let left = before + after[unit];
        shifts.push((ratio.mul_add(d, -n), left, d / bottom / left));
        before += d;
    }
    let number = units as f64;
    // the residuals sum to 0, so of 1 / left = 1 / bottom + leverage only the leverage counts, and that about its mean
    let usual = shifts.iter().map(|shift| shift.2).sum::<f64>() / number;
    let mean = shifts.iter().map(|(residual, _, leverage)| residual * (leverage - usual)).sum::<f64>() / number;
    let squares: f64 = shifts.iter().map(|(residual, left, _)| (residual / left - mean).powi(2)).sum();
    let standard_error = ((number - 1.0) / number * squares).sqrt();
    Ok(JackknifeRatio { ratio, bias: (number - 1.0) * mean, standard_error, units })
}

impl JackknifeRatio {
    /// Two-sided interval for the ratio: Student's t with units − 1 degrees of freedom times the standard error to
    /// either side. Approximate; the lower limit may fall below 0, which for a rate means that it bounds nothing.
    ///
    /// # Errors
    /// A confidence outside (0, 1), or fewer than two units.
    ///
    /// Source: J. W. Tukey, Ann. Math. Statist. 29 (1958), abstract; from memory.
    pub fn interval(&self, confidence: f64) -> Result<Interval, StatsError> {
        let ln_error = ln_error(confidence)?;
        if self.units < 2 {
            return Err(StatsError::TooFew { name: "units", given: self.units, needed: 2 });
        }
        let reach = student_reach(self.units - 1, ln_error) * self.standard_error;
        Ok(Interval { estimate: self.ratio, lower: self.ratio - reach, upper: self.ratio + reach, confidence })
    }
}
