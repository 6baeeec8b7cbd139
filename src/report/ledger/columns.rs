//! Figures as columns of a table: the one place that knows how they are written for people.

use crate::report::figures::{Figures, short};
use crate::stats::Counted;

/// Headings of [`columns`].
pub const HEADINGS: [&str; 6] = ["runs", "busy s", "wrong", "episodes", "wrong per run", "per busy hour"];

/// The figures, one column each.
pub fn columns(f: &Figures) -> [String; 6] {
    [
        f.runs.to_string(),
        format!("{:.2}", f.busy_s),
        f.mismatches.to_string(),
        f.episodes.to_string(),
        rate(f, true),
        rate(f, false),
    ]
}

/// The interval of a rate, or the bound where nothing was seen. Per hour it is the rate that the figures state, which
/// counts episodes where mismatches cluster.
pub fn rate(figures: &Figures, per_run: bool) -> String {
    let rate = if per_run { figures.per_run.as_ref() } else { figures.stated() };
    let Some(rate) = rate else { return "unknown".to_owned() };
    let i = &rate.interval;
    let unit = if !per_run && figures.counted == Counted::Episodes { " episodes" } else { "" };
    match (figures.mismatches, i.upper.is_finite()) {
        (0, _) => format!("< {}", short(i.upper)),
        (_, true) => format!("{} to {}{unit}", short(i.lower), short(i.upper)),
        (_, false) => format!("> {}{unit}", short(i.lower)),
    }
}

/// A table whose first columns have these headings and whose others are those of figures.
pub fn headings<'a>(first: &[&'a str]) -> Vec<&'a str> {
    first.iter().copied().chain(HEADINGS).collect()
}
