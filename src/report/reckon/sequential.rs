//! `reckon sequential`: a test between a rate that should pass and one that should not, which stops as early as the
//! evidence allows; or the one that only counts.

use serde::Serialize;

use super::{Method, Rate, Reckoned, at_least, chance, counted, hours, hours_at_least, prose, whole};
use crate::report::figures::short;
use crate::report::text::Table;
use crate::stats::{OperatingPoint, RunLines, SequentialPlan, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: A. Wald, Sequential Analysis (1947); truncated plans and their risks B. Epstein & M. Sobel, Ann. Math. Statist. \
26 (1955); plans of this form MIL-HDBK-781A; lines per run NIST/SEMATECH e-Handbook 6.2.6.";

/// Events for which the lines per run are listed.
const LISTED: u64 = 10;

/// What was asked.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Inputs {
    /// Should pass; per hour.
    pub good: f64,
    /// Should fail; per hour.
    pub bad: f64,
    /// Highest risk of rejecting the good.
    pub alpha: f64,
    /// Highest risk of accepting the bad.
    pub beta: f64,
    /// Which kind of plan.
    pub kind: Kind,
}

/// Which kind of plan.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Kind {
    /// Stops early.
    Sequential,
    /// Counts to the end.
    Fixed,
    /// Counts to an end that was given: what are its risks?
    Given {
        /// Its length.
        hours: f64,
        /// Rejects at so many events.
        reject_at: u64,
    },
}

/// The plan and what it does.
#[derive(Clone, Debug, Serialize)]
pub struct Plan {
    /// Exact risk of rejecting the good rate.
    alpha: f64,
    /// Exact risk of accepting the bad rate.
    beta: f64,
    /// The test is over by then.
    longest_hours: f64,
    /// Accepts as early as that.
    shortest_accept_hours: f64,
    /// The shortest plan that counts to the end takes so long for the same risks.
    #[serde(skip_serializing_if = "Option::is_none")]
    fixed_hours: Option<f64>,
    boundaries: Vec<Boundary>,
    operating_characteristic: Vec<Point>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct Boundary {
    events: usize,
    accept_at_hours: Option<f64>,
    reject_until_hours: Option<f64>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct Point {
    rate: f64,
    name: &'static str,
    accept: f64,
    reject: f64,
    expected_hours: f64,
}

/// Reckons a plan on events in hours.
///
/// # Errors
/// What the calculators refuse.
pub fn reckon(inputs: Inputs) -> Result<Reckoned<Inputs, Plan>, StatsError> {
    let Inputs { good, bad, alpha, beta, kind } = inputs;
    let plan = match kind {
        Kind::Given { hours, reject_at } => {
            SequentialPlan::fixed(hours, usize::try_from(reject_at).unwrap_or(usize::MAX))?
        }
        Kind::Sequential | Kind::Fixed => SequentialPlan::fixed_with_risks(good, bad, alpha, beta)?,
    };
    let fixed_hours = (kind == Kind::Sequential).then(|| plan.longest());
    // where the first event rejects there is nothing to stop earlier for
    let plan = match kind {
        Kind::Sequential if plan.accept_at.len() > 1 => SequentialPlan::with_risks(good, bad, alpha, beta)?,
        _ => plan,
    };
    let apart = bad / good;
    let rates = [
        (0.5 * good, ""),
        (good, "good"),
        (good * apart.powf(0.25), ""),
        (good * apart.sqrt(), "half-way"),
        (good * apart.powf(0.75), ""),
        (bad, "bad"),
        (2.0 * bad, ""),
    ];
    let point = |(rate, name)| {
        let OperatingPoint { accept, reject, expected_exposure } = plan.at_rate(rate)?;
        Ok::<_, StatsError>(Point { rate, name, accept, reject, expected_hours: expected_exposure })
    };
    let points: Vec<Point> = rates.into_iter().map(point).collect::<Result<_, _>>()?;
    let at = |name: &str| points.iter().find(|p| p.name == name).copied();
    let (at_good, at_bad) = (at("good"), at("bad"));
    let boundaries = plan.reject_at.iter().enumerate().map(|(events, until)| Boundary {
        events,
        accept_at_hours: plan.accept_at.get(events).copied(),
        reject_until_hours: *until,
    });
    let answer = Plan {
        alpha: at_good.map_or(1.0, |p| p.reject),
        beta: at_bad.map_or(1.0, |p| p.accept),
        longest_hours: plan.longest(),
        shortest_accept_hours: plan.accept_at.first().copied().unwrap_or_default(),
        fixed_hours,
        boundaries: boundaries.collect(),
        operating_characteristic: points,
    };
    let statement = statement(&inputs, &answer, at_good.map_or(0.0, |p| p.expected_hours));
    let figures = figures(&inputs, &answer);
    let method = if kind == Kind::Sequential { SEQUENTIAL } else { FIXED };
    Ok(Reckoned::new("sequential", inputs, answer, method, statement, figures))
}

fn statement(inputs: &Inputs, plan: &Plan, expected: f64) -> String {
    let most = plan.boundaries.last().map_or(0, |b| b.events) as u64;
    let (good, bad) = (Rate::PerHour(inputs.good).words(), Rate::PerHour(inputs.bad).words());
    let what = match inputs.kind {
        Kind::Sequential => format!(
            "Accept after {} without an event; the test takes {} at most, and {} on average where the rate is good, where a \
             test of fixed length takes {}",
            hours_at_least(plan.shortest_accept_hours),
            hours_at_least(plan.longest_hours),
            hours(expected),
            hours_at_least(plan.fixed_hours.unwrap_or_default())
        ),
        Kind::Fixed | Kind::Given { .. } => format!(
            "Test for {}; accept with {} at most, reject at event number {most}",
            hours_at_least(plan.longest_hours),
            counted(most.saturating_sub(1), "event")
        ),
    };
    format!(
        "{what}. It rejects a good rate of {good} with probability {} and accepts a bad one of {bad} with probability {}.",
        chance(plan.alpha),
        chance(plan.beta)
    )
}

fn figures(inputs: &Inputs, plan: &Plan) -> String {
    let time = |t: Option<f64>| t.map_or("-".to_owned(), at_least);
    let mut out = String::new();
    if inputs.kind == Kind::Sequential {
        let mut table = Table::new(&["events so far", "accept at hours", "reject if the last came by hours"]);
        for b in &plan.boundaries {
            table.row([b.events.to_string(), time(b.accept_at_hours), time(b.reject_until_hours)]);
        }
        out.push_str(&table.text());
        out.push('\n');
    }
    let mut table = Table::new(&["true rate per hour", "accepts", "rejects", "hours on average", ""]);
    for p in &plan.operating_characteristic {
        let cells = [short(p.rate), chance(p.accept), chance(p.reject), short(p.expected_hours), p.name.to_owned()];
        table.row(cells);
    }
    out.push_str(&table.text());
    out
}

/// What was asked of runs.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct RunInputs {
    /// Should pass; probability per run.
    pub good: f64,
    /// Should fail; probability per run.
    pub bad: f64,
    /// Nominal risk of rejecting the good.
    pub alpha: f64,
    /// Nominal risk of accepting the bad.
    pub beta: f64,
}

/// Wald's lines and where they pass whole numbers.
#[derive(Clone, Debug, Serialize)]
pub struct Lines {
    #[serde(flatten)]
    lines: RunLines,
    boundaries: Vec<RunBoundary>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct RunBoundary {
    events: u64,
    accept_from_runs: Option<u64>,
    reject_until_runs: Option<u64>,
}

/// Reckons lines on events among runs.
///
/// # Errors
/// What the calculators refuse.
pub fn per_run(inputs: RunInputs) -> Result<Reckoned<RunInputs, Lines>, StatsError> {
    let RunInputs { good, bad, alpha, beta } = inputs;
    let lines = RunLines::wald(good, bad, alpha, beta)?;
    let boundaries: Vec<RunBoundary> = (0..=LISTED)
        .map(|events| RunBoundary {
            events,
            accept_from_runs: accept_from(&lines, events),
            reject_until_runs: reject_until(&lines, events),
        })
        .collect();
    let first = boundaries.first().and_then(|b| b.accept_from_runs);
    let when = first.map_or("more than 2^53 runs".to_owned(), |n| counted(n, "run"));
    let statement = format!(
        "Accept after {when} without an event. The lines reject a good probability of {} per run in about {} of tests and \
         accept a bad one of {} per run in about {}.",
        short(good),
        chance(alpha),
        short(bad),
        chance(beta)
    );
    let number = |n: Option<u64>| n.map_or("-".to_owned(), whole);
    let mut table = Table::new(&["events so far", "accept from runs", "reject until runs"]);
    for b in &boundaries {
        table.row([b.events.to_string(), number(b.accept_from_runs), number(b.reject_until_runs)]);
    }
    let figures = format!(
        "{}\n{}",
        prose(&format!(
            "Accept where events <= {} runs - {}; reject where events >= {} runs + {}.",
            short(lines.slope),
            short(lines.accept),
            short(lines.slope),
            short(lines.reject)
        )),
        table.text()
    );
    Ok(Reckoned::new("sequential", inputs, Lines { lines, boundaries }, LINES, statement, figures))
}

/// Counts beyond this are not exact.
const MOST_RUNS: f64 = 9_007_199_254_740_992.0;

/// The least number of runs that accepts with so many events: the line's own answer decides about a rounding error.
fn accept_from(lines: &RunLines, events: u64) -> Option<u64> {
    let near = ((events as f64 + lines.accept) / lines.slope).ceil();
    if near >= MOST_RUNS {
        return None;
    }
    let near = near as u64;
    (near.saturating_sub(1)..=near + 1).find(|&n| lines.acceptance_number(n).is_some_and(|most| most >= events))
}

/// The greatest number of runs at which so many events reject.
fn reject_until(lines: &RunLines, events: u64) -> Option<u64> {
    let near = ((events as f64 - lines.reject) / lines.slope).floor();
    if !(1.0..MOST_RUNS).contains(&near) {
        return None;
    }
    let near = near as u64;
    (near.saturating_sub(1)..=near + 1).rev().find(|&n| lines.rejection_number(n).is_some_and(|least| least <= events))
}

const ASSUMPTION: &str = "\
failures come independently at one constant rate, hours are summed over all that is on test, and the plan was fixed \
before the test";

const SEQUENTIAL: Method = Method {
    name: "Wald's sequential test on events in time, truncated; risks and mean lengths summed exactly",
    source: "A. Wald, Sequential Analysis (1947); B. Epstein & M. Sobel, Ann. Math. Statist. 26 (1955)",
    assumption: ASSUMPTION,
};

const FIXED: Method = Method {
    name: "fixed-length test: count events in a time fixed before; Poisson risks, exact",
    source: "B. Epstein & M. Sobel, Ann. Math. Statist. 26 (1955); plans of this form MIL-HDBK-781A",
    assumption: "failures come independently at one constant rate and the length was fixed before the test",
};

const LINES: Method = Method {
    name: "Wald's sequential test on events among runs: parallel lines, not truncated; risks nominal",
    source: "A. Wald, Sequential Analysis (1947); NIST/SEMATECH e-Handbook 6.2.6",
    assumption: "\
every run fails with the same probability, independently; Wald's bounds make the true risks add up to no more than the \
nominal ones",
};
