//! `reckon compare`: is the first rate higher than the second?

use serde::Serialize;

use super::{Exposure, Method, Observation, Reckoned, limit, prose, range};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, FisherTest, Interval, Observed, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: conditional exact test and interval of the ratio J. Przyborowski & H. Wilenski, Biometrika 31 (1940), E. L. \
Lehmann, Testing Statistical Hypotheses, 4.5; mid-P H. O. Lancaster, JASA 56 (1961); for runs R. A. Fisher, JRSS 98 \
(1935), A. Agresti, Categorical Data Analysis, 2.6 and 3.5.";

/// Fisher's test walks over as many tables as the smallest margin has events; from here on that would take too long.
const MOST_TABLES: u64 = 1_000_000;

/// What was asked.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Inputs {
    /// The one.
    pub first: Observation,
    /// The other, in the same unit.
    pub second: Observation,
    /// The ratio that is put to the test.
    pub ratio: f64,
    /// Confidence.
    pub confidence: f64,
}

/// The answer: the ratio first over second, and the p-values.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Answer {
    /// `None` where nothing was seen on either side, or nothing on the second.
    estimate: Option<f64>,
    lower: f64,
    upper: Option<f64>,
    confidence: f64,
    p_greater: f64,
    p_greater_mid: f64,
    p_less: f64,
    p_less_mid: f64,
    p_two_sided: f64,
    #[serde(skip_serializing_if = "Option::is_none")]
    fisher: Option<Fisher>,
    #[serde(skip_serializing_if = "Option::is_none")]
    fisher_left_out: Option<&'static str>,
}

#[derive(Clone, Copy, Debug, Serialize)]
struct Fisher {
    #[serde(flatten)]
    test: FisherTest,
    odds_ratio: Option<Interval>,
}

/// Reckons.
///
/// # Errors
/// What the calculators refuse.
pub fn reckon(inputs: Inputs) -> Result<Reckoned<Inputs, Answer>, StatsError> {
    let Inputs { first, second, ratio, confidence } = inputs;
    let observed = |o: Observation| Observed { events: o.events, exposure: o.exposure.amount() };
    let test = stats::compare_rates(observed(first), observed(second), ratio)?;
    let nothing = first.events == 0 && second.events == 0;
    let open = Interval { estimate: f64::INFINITY, lower: 0.0, upper: f64::INFINITY, confidence };
    let interval = if nothing { open } else { stats::rate_ratio(observed(first), observed(second), confidence)? };
    let finite = |value: f64| value.is_finite().then_some(value);
    let table = table(first, second);
    let fisher = table.filter(|t| tables(*t) <= MOST_TABLES).map(|t| fisher(t, confidence)).transpose()?;
    let answer = Answer {
        estimate: finite(interval.estimate),
        lower: interval.lower,
        upper: finite(interval.upper),
        confidence,
        p_greater: test.p_greater,
        p_greater_mid: test.p_greater_mid,
        p_less: test.p_less,
        p_less_mid: test.p_less_mid,
        p_two_sided: test.p_two_sided,
        fisher,
        fisher_left_out: (table.is_some() && fisher.is_none())
            .then_some("more than 1,000,000 events or good runs on both sides; the conditional test stands alone"),
    };
    let statement = statement(&inputs, &interval, nothing, test.p_two_sided);
    Ok(Reckoned::new("compare", inputs, answer, method(table.is_some()), statement, figures(&inputs, &answer)))
}

fn statement(inputs: &Inputs, interval: &Interval, nothing: bool, p: f64) -> String {
    let Inputs { first, second, ratio, confidence } = inputs;
    let level = percent(*confidence);
    let seen = format!("{} against {}", first.words(), second.words());
    if nothing {
        return format!("{seen}: without any event the ratio may be anything ({level}).");
    }
    let equal = *ratio == 1.0;
    let held = match (interval.lower > *ratio, interval.upper < *ratio) {
        (true, _) if equal => "the first rate is higher".to_owned(),
        (_, true) if equal => "the first rate is lower".to_owned(),
        _ if equal => "equal rates are not ruled out".to_owned(),
        (true, _) => format!("the ratio is above {}", short(*ratio)),
        (_, true) => format!("the ratio is below {}", short(*ratio)),
        _ => format!("a ratio of {} is not ruled out", short(*ratio)),
    };
    let times = if interval.estimate.is_finite() {
        format!("the first rate is {} times the second, {}", short(interval.estimate), range(interval))
    } else {
        format!("the first rate is at least {} times the second", short(interval.lower))
    };
    format!("{seen}: {times} ({level}); {held} (two-sided p {}).", short(p))
}

fn figures(inputs: &Inputs, answer: &Answer) -> String {
    let equal = if inputs.ratio == 1.0 {
        "the rates are equal".to_owned()
    } else {
        format!("the ratio is {}", short(inputs.ratio))
    };
    let mut table = Table::new(&["probability of so much or more by chance", "exact", "mid-P"]);
    table.row(["first higher".into(), short(answer.p_greater), short(answer.p_greater_mid)]);
    table.row(["first lower".into(), short(answer.p_less), short(answer.p_less_mid)]);
    table.row(["either".into(), short(answer.p_two_sided), "-".into()]);
    let mut out = format!("If {equal}:\n{}", table.text());
    if let Some(fisher) = &answer.fisher {
        out.push_str(&format!(
            "\nFisher's exact test of equal odds: first higher {}, first lower {}, either {}\n",
            short(fisher.test.p_greater),
            short(fisher.test.p_less),
            short(fisher.test.p_two_sided)
        ));
        if let Some(odds) = &fisher.odds_ratio {
            let (estimate, range) = (limit(odds.estimate), range(odds));
            out.push_str(&format!("Odds ratio: {estimate}, {range} ({})\n", percent(odds.confidence)));
        }
    }
    if let Some(why) = answer.fisher_left_out {
        out.push('\n');
        out.push_str(&prose(&format!("Fisher's exact test is left out: {why}")));
    }
    out
}

/// Events and good runs, where both sides counted runs.
fn table(first: Observation, second: Observation) -> Option<[[u64; 2]; 2]> {
    let (Exposure::Runs(n), Exposure::Runs(m)) = (first.exposure, second.exposure) else { return None };
    Some([[first.events, n.checked_sub(first.events)?], [second.events, m.checked_sub(second.events)?]])
}

/// The smallest margin.
fn tables([[a, b], [c, d]]: [[u64; 2]; 2]) -> u64 {
    [a.saturating_add(b), c.saturating_add(d), a.saturating_add(c), b.saturating_add(d)].into_iter().min().unwrap_or(0)
}

fn fisher(table: [[u64; 2]; 2], confidence: f64) -> Result<Fisher, StatsError> {
    // an empty column leaves the odds ratio open, and the test says 1
    Ok(Fisher { test: stats::fisher_exact(table)?, odds_ratio: stats::odds_ratio(table, confidence).ok() })
}

fn method(runs: bool) -> Method {
    if runs {
        Method {
            name: "conditional exact test, interval from the Clopper-Pearson limits of the first share; Fisher's exact test",
            source: "J. Przyborowski & H. Wilenski, Biometrika 31 (1940); R. A. Fisher, JRSS 98 (1935)",
            assumption: ASSUMPTION,
        }
    } else {
        Method {
            name: "conditional exact test, interval from the Clopper-Pearson limits of the first share",
            source: "J. Przyborowski & H. Wilenski, Biometrika 31 (1940); E. L. Lehmann, Testing Statistical Hypotheses, 4.5",
            assumption: ASSUMPTION,
        }
    }
}

const ASSUMPTION: &str = "\
events are independent on both sides and both saw the same work under the same conditions; one of many comparisons \
needs `reckon family`, failures that cluster need `reckon spread`";
