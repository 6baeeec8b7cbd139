//! Fisher's exact test of a two-by-two table, and the exact interval for its odds ratio.
//! Source: R. A. Fisher, JRSS 98 (1935); A. Agresti, Categorical Data Analysis, 2.6 and 3.5.

use super::interval::{Interval, StatsError, ln_error};
use super::law::{CountLaw, Hypergeometric, Tail, WHOLE};
use super::numerics::root;
use serde::{Deserialize, Serialize};
use std::f64::consts::LN_2;

/// P-values of Fisher's exact test that the odds ratio is 1.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct FisherTest {
    /// Against "the odds ratio is above 1".
    pub p_greater: f64,
    /// Against "the odds ratio is below 1".
    pub p_less: f64,
    /// Two-sided, summed over all tables that are no more probable than the one seen.
    pub p_two_sided: f64,
}

/// Fisher's exact test of `[[a, b], [c, d]]`, e.g. rows suspect and control, columns mismatches and good runs.
/// A table with an empty row or column can only be what it is: all p-values are 1.
///
/// # Errors
/// A table of zeros.
///
/// The work grows with the standard deviation of the first cell: under a second with 10^12 in every cell.
pub fn fisher_exact(table: [[u64; 2]; 2]) -> Result<FisherTest, StatsError> {
    let law = Margins::of(table)?.law(0.0);
    let a = table[0][0] as f64;
    let tail = |tail| law.ln_tail(tail, a, WHOLE).exp().min(1.0);
    let (p_greater, p_less) = (tail(Tail::Upper), tail(Tail::Lower));
    Ok(FisherTest { p_greater, p_less, p_two_sided: law.as_unlikely(a, law.support()) })
}

/// Two-sided exact interval for the odds ratio of `[[a, b], [c, d]]`; the estimate is the conditional maximum of
/// likelihood, not a d / b c.
///
/// # Errors
/// A table with an empty row or column, or a confidence outside (0, 1).
pub fn odds_ratio(table: [[u64; 2]; 2], confidence: f64) -> Result<Interval, StatsError> {
    let ln_side = ln_error(confidence)? - LN_2;
    let margins = Margins::of(table)?;
    let (least, most) = margins.law(0.0).support();
    if least == most {
        return Err(StatsError::NoEvents("the odds ratio"));
    }
    let a = margins.a;
    let estimate = match a {
        a if a == least => 0.0,
        a if a == most => f64::INFINITY,
        _ => margins.solve(|law| law.mean() - a, true),
    };
    Ok(Interval {
        estimate,
        lower: margins.limit(Tail::Upper, ln_side),
        upper: margins.limit(Tail::Lower, ln_side),
        confidence,
    })
}

/// One-sided exact lower limit for the odds ratio of `[[a, b], [c, d]]`.
///
/// # Errors
/// As [`odds_ratio`].
pub fn odds_ratio_lower(table: [[u64; 2]; 2], confidence: f64) -> Result<f64, StatsError> {
    let ln_alpha = ln_error(confidence)?;
    let margins = Margins::of(table)?;
    let (least, most) = margins.law(0.0).support();
    if least == most { Err(StatsError::NoEvents("the odds ratio")) } else { Ok(margins.limit(Tail::Upper, ln_alpha)) }
}

struct Margins {
    a: f64,
    rows: [f64; 2],
    column: f64,
    /// Where to look first, and in what steps: the sample log odds ratio and its standard error, with ½ in each cell.
    ln_sample: f64,
    error: f64,
}

impl Margins {
    fn of(table: [[u64; 2]; 2]) -> Result<Self, StatsError> {
        let [[a, b], [c, d]] = table.map(|row| row.map(|cell| cell as f64));
        if a + b + c + d == 0.0 {
            return Err(StatsError::NoEvents("a table of zeros"));
        }
        let half = [a, b, c, d].map(|cell| cell + 0.5);
        let ln_sample = (half[0] / half[1] * (half[3] / half[2])).ln();
        let error = half.iter().map(|cell| 1.0 / cell).sum::<f64>().sqrt();
        Ok(Self { a, rows: [a + b, c + d], column: a + c, ln_sample, error })
    }

    fn law(&self, ln_odds: f64) -> Hypergeometric {
        Hypergeometric::new(self.rows, self.column, ln_odds)
    }

    fn solve(&self, f: impl Fn(Hypergeometric) -> f64, increasing: bool) -> f64 {
        root(|ln_odds| f(self.law(ln_odds)), increasing, self.ln_sample, self.error, (-700.0, 700.0)).exp()
    }

    fn limit(&self, tail: Tail, ln_alpha: f64) -> f64 {
        let (least, most) = self.law(0.0).support();
        match tail {
            Tail::Upper if self.a == least => 0.0,
            Tail::Lower if self.a == most => f64::INFINITY,
            _ => self.solve(|law| law.ln_tail(tail, self.a, WHOLE) - ln_alpha, tail == Tail::Upper),
        }
    }
}
