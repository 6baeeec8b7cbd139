//! `reckon shrink`: many cells with few events each, every rate pulled towards what all have in common.

use serde::Serialize;

use super::{Method, Reckoned, counted, range};
use crate::report::figures::{percent, short};
use crate::report::text::Table;
use crate::stats::{self, GammaPrior, Interval, StatsError};

/// Sources of the methods, for `--help`.
pub const SOURCES: &str = "\
Sources: gamma law of rates by maximum likelihood D. P. Gaver & I. G. O'Muircheartaigh, Technometrics 29 (1987); rate of \
a cell given that law NIST/SEMATECH e-Handbook 8.4.6.";

/// What was asked.
#[derive(Clone, Debug, Serialize)]
pub struct Inputs {
    /// Events by cell.
    pub counts: Vec<u64>,
    /// Exposure by cell.
    pub exposures: Vec<f64>,
    /// One unit of the exposure.
    pub unit: &'static str,
    /// Confidence of the credible intervals.
    pub confidence: f64,
}

/// The law and the cells.
#[derive(Clone, Debug, Serialize)]
pub struct Answer {
    /// `None` where the counts scatter no more than one common rate would make them.
    prior: Option<GammaPrior>,
    pooled: Interval,
    cells: Vec<Interval>,
}

/// Reckons.
///
/// # Errors
/// What the calculators refuse: lists of different lengths, fewer than two counts, no events.
pub fn reckon(inputs: Inputs) -> Result<Reckoned<Inputs, Answer>, StatsError> {
    let confidence = inputs.confidence;
    let prior = match GammaPrior::fit(&inputs.counts, &inputs.exposures) {
        Err(StatsError::OneRate) => None,
        fitted => Some(fitted?),
    };
    let pooled = stats::garwood(inputs.counts.iter().sum(), inputs.exposures.iter().sum(), confidence)?;
    let seen = inputs.counts.iter().zip(&inputs.exposures);
    let cells = seen.clone().map(|(&x, &t)| prior.map_or(Ok(pooled), |prior| prior.posterior(x, t, confidence)));
    let cells: Vec<Interval> = cells.collect::<Result<_, _>>()?;
    let (unit, level, number) = (inputs.unit, percent(confidence), counted(inputs.counts.len() as u64, "cell"));
    let statement = match prior {
        None => format!(
            "{number} scatter no more than one common rate would make them: pool them, {} per {unit}, {} ({level}).",
            short(pooled.estimate),
            range(&pooled)
        ),
        Some(law) => format!(
            "{number}: rates follow a gamma law of shape {} and mean {} per {unit}, which weighs as much as {} {unit}s \
             of exposure in each.",
            short(law.shape),
            short(law.shape / law.rate),
            short(law.rate)
        ),
    };
    let mut table = Table::new(&["cell", "events", "exposure", "raw rate", "shrunken", "from", "to"]);
    for (number, ((x, t), i)) in seen.zip(&cells).enumerate() {
        let raw = short(*x as f64 / t);
        let row = [
            (number + 1).to_string(),
            x.to_string(),
            short(*t),
            raw,
            short(i.estimate),
            short(i.lower),
            short(i.upper),
        ];
        table.row(row);
    }
    let figures = format!("Rates per {unit}, credible intervals {level}:\n{}", table.text());
    let answer = Answer { prior, pooled, cells };
    Ok(Reckoned::new("shrink", inputs, answer, METHOD, statement, figures))
}

const METHOD: Method = Method {
    name: "empirical Bayes: gamma law fitted by maximum likelihood of the negative binomial, then the conjugate update",
    source: "D. P. Gaver & I. G. O'Muircheartaigh, Technometrics 29 (1987); NIST/SEMATECH e-Handbook 8.4.6",
    assumption: "\
the cells are of one kind, events in each independent; the law is taken as known, so with few cells the credible \
intervals are somewhat narrow",
};
