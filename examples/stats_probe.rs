//! Drives the statistics over many inputs for `scripts/check-stats.py`: one JSON array of strings per line in,
//! `[function, argument, …]`, one JSON array of numbers out (`null` for +∞), or `{"error": …}`. Numbers travel as
//! strings so that every double arrives bit for bit; lists are separated by spaces.

use proofhouse::stats::{self, Interval, Observed, Reading, SequentialPlan, StatsError};
use std::io::{self, BufRead, Write};

fn main() -> io::Result<()> {
    let mut out = io::BufWriter::new(io::stdout().lock());
    for line in io::stdin().lock().lines() {
        let words: Vec<String> = serde_json::from_str(&line?)?;
        match answer(&words) {
            Ok(numbers) => serde_json::to_writer(&mut out, &numbers)?,
            Err(error) => serde_json::to_writer(&mut out, &serde_json::json!({ "error": error.to_string() }))?,
        }
        out.write_all(b"\n")?;
    }
    out.flush()
}

fn answer(words: &[String]) -> Result<Vec<f64>, StatsError> {
    let count = |at: usize| words[at].parse::<u64>().expect("a count");
    let number = |at: usize| words[at].parse::<f64>().expect("a number");
    let counts = |at: usize| words[at].split(' ').map(|word| word.parse().expect("a count")).collect::<Vec<u64>>();
    let numbers = |at: usize| words[at].split(' ').map(|word| word.parse().expect("a number")).collect::<Vec<f64>>();
    let side = |at: usize| Observed { events: count(at), exposure: number(at + 1) };
    let table = || [[count(1), count(2)], [count(3), count(4)]];
    let ends = |interval: Interval| vec![interval.lower, interval.upper];
    Ok(match words[0].as_str() {
        "clopper_pearson" => ends(stats::clopper_pearson(count(1), count(2), number(3))?),
        "clopper_pearson_one" => vec![
            stats::clopper_pearson_lower(count(1), count(2), number(3))?,
            stats::clopper_pearson_upper(count(1), count(2), number(3))?,
        ],
        "mid_p" => ends(stats::mid_p(count(1), count(2), number(3))?),
        "wilson" => ends(stats::wilson(count(1), count(2), number(3))?),
        "exact_test" => vec![stats::exact_test(count(1), count(2), number(3))?],
        "garwood" => ends(stats::garwood(count(1), number(2), number(3))?),
        "garwood_one" => vec![
            stats::garwood_lower(count(1), number(2), number(3))?,
            stats::garwood_upper(count(1), number(2), number(3))?,
        ],
        "mid_p_rate" => ends(stats::mid_p_rate(count(1), number(2), number(3))?),
        "test_length_factor" => vec![stats::test_length_factor(count(1), number(2))?],
        "exposure_needed" => vec![stats::exposure_needed(number(1), count(2), number(3))?],
        "success_runs" => vec![stats::success_runs(number(1), number(2))? as f64],
        "demonstration_runs" => vec![stats::demonstration_runs(number(1), count(2), number(3))? as f64],
        "mtbf" => ends(stats::mtbf(number(1), count(2), number(3))?),
        "fit_rate" => vec![stats::fit_rate(count(1), number(2), number(3), number(4), number(5))?],
        "compare_rates" => {
            let test = stats::compare_rates(side(1), side(3), number(5))?;
            vec![test.p_greater, test.p_greater_mid, test.p_less, test.p_less_mid, test.p_two_sided]
        }
        "rate_ratio" => ends(stats::rate_ratio(side(1), side(3), number(5))?),
        "fisher_exact" => {
            let test = stats::fisher_exact(table())?;
            vec![test.p_greater, test.p_less, test.p_two_sided]
        }
        "odds_ratio" => {
            let interval = stats::odds_ratio(table(), number(5))?;
            vec![interval.estimate, interval.lower, interval.upper]
        }
        "dispersion" => {
            let test = stats::dispersion_with_exposure(&counts(1), &numbers(2))?;
            vec![test.chi_square, test.p_upper]
        }
        "gamma_fit" => {
            let prior = stats::GammaPrior::fit(&counts(1), &numbers(2))?;
            vec![prior.shape, prior.rate]
        }
        "gamma_posterior" => {
            let prior = stats::GammaPrior { shape: number(1), rate: number(2) };
            ends(prior.posterior(count(3), number(4), number(5))?)
        }
        "clustered_rate" => {
            let clusters: Vec<(u64, f64)> = counts(1).into_iter().zip(numbers(2)).collect();
            ends(stats::clustered_rate(&clusters, number(3))?)
        }
        "chance_of_scatter" => {
            let clusters: Vec<(u64, f64)> = counts(1).into_iter().zip(numbers(2)).collect();
            vec![stats::Clusters::of(&clusters)?.chance_of_scatter()]
        }
        "poisson_at_least" => vec![stats::poisson_at_least(count(1), number(2))],
        "sequential" => {
            let plan = stats::SequentialPlan::wald(number(1), number(2), number(3), number(4), count(5) as usize)?;
            let point = plan.at_rate(number(6))?;
            vec![point.accept, point.reject, point.expected_exposure]
        }
        "plan_risks" | "fixed_plan" => {
            let search =
                if words[0] == "fixed_plan" { SequentialPlan::fixed_with_risks } else { SequentialPlan::with_risks };
            let (good, bad) = (number(1), number(2));
            let plan = search(good, bad, number(3), number(4))?;
            let (at_good, at_bad) = (plan.at_rate(good)?, plan.at_rate(bad)?);
            let risks = [at_good.reject, at_bad.accept, at_good.expected_exposure, at_bad.expected_exposure];
            // an event number that never rejects has a rejection time of 0
            let boundaries = plan.accept_at.iter().copied().chain(plan.reject_at.iter().map(|at| at.unwrap_or(0.0)));
            risks.into_iter().chain([plan.longest()]).chain(boundaries).collect()
        }
        "jackknife_ratio" => {
            let pairs: Vec<(f64, f64)> = numbers(1).into_iter().zip(numbers(2)).collect();
            let found = stats::jackknife_ratio(&pairs)?;
            let interval = found.interval(number(3))?;
            vec![found.ratio, found.bias, found.standard_error, interval.lower, interval.upper]
        }
        "log_linear" => {
            let readings: Vec<Reading> = counts(1)
                .into_iter()
                .zip(numbers(2).into_iter().zip(numbers(3)))
                .map(|(events, (exposure, at))| Reading { events, exposure, at })
                .collect();
            let found = stats::log_linear(&readings, number(4))?;
            let away = found.rate_at(number(5))?;
            let intervals = [found.slope, found.factor_per_ten, found.rate_at_mean, away];
            let ends = intervals.iter().flat_map(|i| [i.estimate, i.lower, i.upper]);
            ends.chain([found.dispersion, f64::from(u8::from(found.widened))]).collect()
        }
        "negative_binomial_rate" => {
            let clusters: Vec<(u64, f64)> = counts(1).into_iter().zip(numbers(2)).collect();
            let found = stats::negative_binomial_rate(&clusters, number(3))?;
            vec![found.rate.estimate, found.rate.lower, found.rate.upper, found.shape.unwrap_or(f64::INFINITY)]
        }
        "exposure_to_compare" => {
            vec![stats::exposure_to_compare(number(1), number(2), number(3), number(4), number(5))?]
        }
        "exposure_to_show_below" => {
            let found = stats::exposure_to_show_below(number(1), number(2), number(3), number(4))?;
            vec![found.exposure, found.failures_allowed as f64, found.probability]
        }
        "comparison_power" => {
            vec![stats::comparison_power((number(1), number(2)), (number(3), number(4)), number(5))?]
        }
        "holm" => stats::holm(&numbers(1))?,
        "hochberg" => stats::hochberg(&numbers(1))?,
        "benjamini_hochberg" => stats::benjamini_hochberg(&numbers(1))?,
        "episodes" => stats::episodes(&numbers(1), number(2))?
            .iter()
            .flat_map(|e| [e.start, e.end, e.mismatches as f64])
            .collect(),
        unknown => panic!("no such calculator: {unknown}"),
    })
}
