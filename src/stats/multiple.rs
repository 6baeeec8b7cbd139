//! Many tests at once: adjusted p-values, in the order of the input. A test is rejected where its adjusted p-value is
//! at most the level.

use super::interval::{StatsError, check_probability};

/// Bonferroni: every p-value times their number. Bounds the chance of any false rejection, whatever the dependence.
///
/// # Errors
/// A p-value outside [0, 1].
///
/// Source: O. J. Dunn, JASA 56 (1961).
pub fn bonferroni(p_values: &[f64]) -> Result<Vec<f64>, StatsError> {
    check(p_values)?;
    Ok(p_values.iter().map(|p| (p * p_values.len() as f64).min(1.0)).collect())
}

/// Holm's step-down: the same promise as Bonferroni, never weaker.
///
/// # Errors
/// A p-value outside [0, 1].
///
/// Source: S. Holm, Scandinavian Journal of Statistics 6 (1979).
pub fn holm(p_values: &[f64]) -> Result<Vec<f64>, StatsError> {
    let order = ascending(p_values)?;
    let mut adjusted = vec![0.0; p_values.len()];
    let mut largest = 0.0_f64;
    for (rank, &index) in order.iter().enumerate() {
        largest = largest.max(p_values[index] * (p_values.len() - rank) as f64).min(1.0);
        adjusted[index] = largest;
    }
    Ok(adjusted)
}

/// Hochberg's step-up: stronger than Holm, for tests that are independent or positively dependent.
///
/// # Errors
/// A p-value outside [0, 1].
///
/// Source: Y. Hochberg, Biometrika 75 (1988).
pub fn hochberg(p_values: &[f64]) -> Result<Vec<f64>, StatsError> {
    step_up(p_values, |rank, number| (number - rank) as f64)
}

/// Benjamini–Hochberg step-up: bounds the expected share of false rejections among all rejections, for tests that are
/// independent or positively dependent.
///
/// # Errors
/// A p-value outside [0, 1].
///
/// Source: Y. Benjamini & Y. Hochberg, JRSS B 57 (1995).
pub fn benjamini_hochberg(p_values: &[f64]) -> Result<Vec<f64>, StatsError> {
    step_up(p_values, |rank, number| number as f64 / (rank + 1) as f64)
}

/// How many of the adjusted p-values are at most `level`. An exact tie in decimals counts as rejected even where
/// binary rounding put it a last digit above.
///
/// # Errors
/// `level` outside [0, 1].
pub fn rejections(adjusted: &[f64], level: f64) -> Result<usize, StatsError> {
    check_probability("level", level)?;
    Ok(adjusted.iter().filter(|&&p| p <= level * (1.0 + 1e-12)).count())
}

fn step_up(p_values: &[f64], factor: impl Fn(usize, usize) -> f64) -> Result<Vec<f64>, StatsError> {
    let order = ascending(p_values)?;
    let mut adjusted = vec![0.0; p_values.len()];
    let mut smallest = 1.0_f64;
    for (rank, &index) in order.iter().enumerate().rev() {
        smallest = smallest.min(p_values[index] * factor(rank, p_values.len()));
        adjusted[index] = smallest;
    }
    Ok(adjusted)
}

fn check(p_values: &[f64]) -> Result<(), StatsError> {
    p_values.iter().try_for_each(|&p| check_probability("p-value", p))
}

fn ascending(p_values: &[f64]) -> Result<Vec<usize>, StatsError> {
    check(p_values)?;
    let mut order: Vec<usize> = (0..p_values.len()).collect();
    order.sort_by(|&a, &b| p_values[a].total_cmp(&p_values[b]));
    Ok(order)
}
