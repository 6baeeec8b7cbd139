//! `reckon family`: many tests at once.

use serde::Serialize;

use super::{Method, Reckoned, counted};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: O. J. Dunn, JASA 56 (1961); S. Holm, Scandinavian Journal of Statistics 6 (1979); Y. Hochberg, Biometrika 75 \
(1988); Y. Benjamini & Y. Hochberg, JRSS B 57 (1995).";

/// What was asked.
#[derive(Clone, Debug, Serialize)]
pub struct Inputs {
    /// P-values.
    pub p: Vec<f64>,
    /// Level.
    pub level: f64,
}

/// Adjusted p-values in the order given, by method.
#[derive(Clone, Debug, Serialize)]
pub struct Answer {
    bonferroni: Adjusted,
    holm: Adjusted,
    hochberg: Adjusted,
    benjamini_hochberg: Adjusted,
}

#[derive(Clone, Debug, Serialize)]
struct Adjusted {
    rejected: usize,
    adjusted: Vec<f64>,
    promise: &'static str,
}

const FAMILY: &str = "the chance of any false alarm is at most the level; any dependence";
const FAMILY_IF: &str = "the same; tests independent or positively dependent";
const SHARE: &str = "the expected share of false alarms is at most the level; tests alike";

/// Tests that the text lists one by one.
const LISTED: usize = 100;

/// Reckons.
///
/// # Errors
/// What the calculators refuse.
pub fn reckon(inputs: Inputs) -> Result<Reckoned<Inputs, Answer>, StatsError> {
    let adjusted = |by: fn(&[f64]) -> Result<Vec<f64>, StatsError>, promise| {
        let adjusted = by(&inputs.p)?;
        Ok::<_, StatsError>(Adjusted { rejected: stats::rejections(&adjusted, inputs.level)?, adjusted, promise })
    };
    let answer = Answer {
        bonferroni: adjusted(stats::bonferroni, FAMILY)?,
        holm: adjusted(stats::holm, FAMILY)?,
        hochberg: adjusted(stats::hochberg, FAMILY_IF)?,
        benjamini_hochberg: adjusted(stats::benjamini_hochberg, SHARE)?,
    };
    let (tests, level) = (counted(inputs.p.len() as u64, "test"), percent(inputs.level));
    let statement = format!(
        "At {level}, {} of {tests} stand by Holm, which bounds the chance of any false alarm, and {} by \
         Benjamini-Hochberg, which bounds the expected share of false alarms.",
        answer.holm.rejected, answer.benjamini_hochberg.rejected
    );
    let methods = [
        ("Bonferroni", &answer.bonferroni),
        ("Holm", &answer.holm),
        ("Hochberg", &answer.hochberg),
        ("Benjamini-Hochberg", &answer.benjamini_hochberg),
    ];
    let mut promises = Table::new(&["method", "stand", "promises"]);
    methods.iter().for_each(|(name, a)| {
        promises.row([(*name).to_owned(), a.rejected.to_string(), a.promise.to_owned()]);
    });
    let mut table = Table::new(&["test", "p", "Bonferroni", "Holm", "Hochberg", "Benjamini-Hochberg"]);
    let mut order: Vec<usize> = (0..inputs.p.len()).collect();
    let mut more = String::new();
    if order.len() > LISTED {
        order.sort_by(|&a, &b| inputs.p[a].total_cmp(&inputs.p[b]));
        order.truncate(LISTED);
        more = format!(", the {LISTED} smallest of {} (--format json has all)", inputs.p.len());
    }
    for test in order {
        let cells = methods.iter().map(|(_, a)| short(a.adjusted[test]));
        table.row([(test + 1).to_string(), short(inputs.p[test])].into_iter().chain(cells));
    }
    let figures = format!("{}\nAdjusted p-values{more}:\n{}", promises.text(), table.text());
    Ok(Reckoned::new("family", inputs, answer, METHOD, statement, figures))
}

const METHOD: Method = Method {
    name: "adjusted p-values; a test stands where its adjusted p-value is at most the level",
    source: "O. J. Dunn 1961; S. Holm 1979; Y. Hochberg 1988; Y. Benjamini & Y. Hochberg 1995",
    assumption: "the list has every test that was made, not only those that looked interesting",
};
