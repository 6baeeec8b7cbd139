//! Mismatches come in bursts: how many bursts were there?

use super::interval::{StatsError, check_positive};
use serde::{Deserialize, Serialize};

/// Mismatches closer together than the gap.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Episode {
    /// Time of the first, in the seconds of the input.
    pub start: f64,
    /// Time of the last.
    pub end: f64,
    /// How many.
    pub mismatches: u64,
}

/// Groups mismatch times (seconds on any one clock, in any order) into episodes: a mismatch less than `gap` seconds
/// after the one before belongs to the same episode. The number of episodes is the length of the answer.
///
/// # Errors
/// A gap that is not positive and finite, or a time that is not finite.
///
/// Source: runs declustering of exceedances; S. Coles, An Introduction to Statistical Modeling of Extreme Values, 5.3.2.
pub fn episodes(times: &[f64], gap: f64) -> Result<Vec<Episode>, StatsError> {
    check_positive("gap", gap, "the seconds of quiet that end an episode, such as 60")?;
    if let Some(&time) = times.iter().find(|time| !time.is_finite()) {
        return Err(StatsError::Time(time));
    }
    let mut sorted = times.to_vec();
    sorted.sort_by(f64::total_cmp);
    let mut episodes: Vec<Episode> = Vec::new();
    for time in sorted {
        match episodes.last_mut() {
            Some(last) if time - last.end < gap => (last.end, last.mismatches) = (time, last.mismatches + 1),
            _ => episodes.push(Episode { start: time, end: time, mismatches: 1 }),
        }
    }
    Ok(episodes)
}
