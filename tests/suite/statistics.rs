//! Every published check value in `tests/data/statistics.csv`, each at the tolerance of its row.
//! Where a row comes from, and whether the value was read there, stands in the row itself.

use proofhouse::stats::{self, ClusteredShare, GammaPrior, Interval, Observed, RunLines, SequentialPlan};
use serde_json::{Map, Value, json};

const ROWS: &str = include_str!("../data/statistics.csv");

/// Fewer rows than this mean that the table was cut short, not that the project knows less.
const LEAST_ROWS: usize = 223;

#[test]
fn every_published_row_holds_at_its_tolerance() {
    let mut lines = ROWS.lines();
    assert_eq!(lines.next(), Some("id,topic,method,inputs,expected,tolerance,source,status"));
    let (mut rows, mut failures) = (0, Vec::new());
    for line in lines {
        let cells = split(line);
        let [id, _, method, inputs, expected, tolerance, source, status] = cells.as_slice() else {
            panic!("not eight columns: {line}");
        };
        assert!(!source.is_empty() && !status.is_empty(), "{id} hides where it comes from");
        let [inputs, expected, tolerance] = [inputs, expected, tolerance].map(|cell| object(id, cell));
        let actual = match answer(method, &inputs) {
            Some(Value::Object(actual)) => actual,
            _ => {
                failures.push(format!("{id}: no calculator for method {method}"));
                continue;
            }
        };
        for (key, want) in &expected {
            let tolerance = &tolerance[key];
            if !actual.get(key).is_some_and(|got| agrees(want, got, tolerance)) {
                let got = actual.get(key);
                failures.push(format!(
                    "{id}: {method}({inputs:?}).{key} = {got:?}, published {want} ± {tolerance}: {source}"
                ));
            }
        }
        rows += 1;
    }
    assert!(failures.is_empty(), "{} of the published rows fail:\n{}", failures.len(), failures.join("\n"));
    assert!(rows >= LEAST_ROWS, "only {rows} rows");
}

#[test]
fn the_comparison_itself_can_fail() {
    assert!(!agrees(&json!(1.0), &json!(1.1), &json!({"abs": 0.05})));
    assert!(agrees(&json!(1.0), &json!(1.1), &json!({"rel": 0.2})));
    assert!(!agrees(&json!(1.0), &Value::Null, &json!({"abs": 9.0})));
    assert!(!agrees(&json!(22), &json!(23), &json!({"exact": true})));
    assert!(!agrees(&json!([1.0, 2.0]), &json!([1.0]), &json!({"abs": 1.0})));
    assert!(answer("no_such_method", &Map::new()).is_none());
}

/// What the project's own calculator says, under the row's names.
fn answer(method: &str, inputs: &Map<String, Value>) -> Option<Value> {
    let number = |key: &str| inputs[key].as_f64().expect("a number");
    let count = |key: &str| inputs[key].as_u64().expect("a count");
    let list = |key: &str| inputs[key].as_array().expect("a list").clone();
    let numbers = |key: &str| list(key).iter().map(|v| v.as_f64().expect("a number")).collect::<Vec<_>>();
    let counts = |key: &str| list(key).iter().map(|v| v.as_u64().expect("a count")).collect::<Vec<_>>();
    let one_sided = inputs.get("sides").is_some_and(|sides| sides == "one");
    let exposure = inputs.get("exposure").map_or(1.0, |exposure| exposure.as_f64().expect("a number"));
    let limits = |i: Interval| json!({"estimate": i.estimate, "rate": i.estimate, "lower": i.lower, "upper": i.upper});
    let answer = match method {
        "binom_ci_clopper_pearson" if one_sided => json!({
            "lower": stats::clopper_pearson_lower(count("x"), count("n"), number("conf")).unwrap(),
            "upper": stats::clopper_pearson_upper(count("x"), count("n"), number("conf")).unwrap(),
        }),
        "binom_ci_clopper_pearson" => limits(stats::clopper_pearson(count("x"), count("n"), number("conf")).unwrap()),
        "binom_ci_midp" => limits(stats::mid_p(count("x"), count("n"), number("conf")).unwrap()),
        "binom_ci_wilson" => limits(stats::wilson(count("x"), count("n"), number("conf")).unwrap()),
        "binom_test_exact" => json!({"p_value": stats::exact_test(count("x"), count("n"), number("p0")).unwrap()}),
        "poisson_ci_garwood" if one_sided => json!({
            "lower": stats::garwood_lower(count("x"), exposure, number("conf")).unwrap(),
            "upper": stats::garwood_upper(count("x"), exposure, number("conf")).unwrap(),
        }),
        "poisson_ci_garwood" => limits(stats::garwood(count("x"), exposure, number("conf")).unwrap()),
        "zero_failure_upper_binomial" => {
            json!({"upper": stats::upper_per_run(count("n"), number("conf")).unwrap()})
        }
        "rule_of_three" => json!({
            "upper": stats::rule_of_three(number("n")).unwrap(),
            "minus_ln_0_05": stats::upper_rate(1.0, 0.95).unwrap(),
        }),
        "success_run_n" => {
            json!({"n": stats::success_runs(1.0 - number("reliability"), number("conf")).unwrap()})
        }
        "binomial_demo_n" => {
            let below = 1.0 - number("reliability");
            json!({"n": stats::demonstration_runs(below, count("failures"), number("conf")).unwrap()})
        }
        "test_length_factor" => json!({"factor": stats::test_length_factor(count("r"), number("conf")).unwrap()}),
        "test_length_hours" => {
            json!({"hours": stats::exposure_needed(1.0 / number("mtbf"), count("r"), number("conf")).unwrap()})
        }
        "mtbf_ci" => limits(stats::mtbf(number("total_time"), count("r"), number("conf")).unwrap()),
        // factors of the mean: the interval of a test in which the mean is 1
        "mtbf_ci_factors" => limits(stats::mtbf(number("r"), count("r"), number("conf")).unwrap()),
        "fit_rate" => {
            let [devices, hours, acceleration] = ["devices", "hours", "af"].map(number);
            json!({"fit": stats::fit_rate(count("failures"), devices, hours, acceleration, number("conf")).unwrap()})
        }
        "poisson_two_conditional" => {
            let first = Observed { events: count("x1"), exposure: number("t1") };
            let second = Observed { events: count("x2"), exposure: number("t2") };
            let test = stats::compare_rates(first, second, 1.0).unwrap();
            let ratio = stats::rate_ratio(first, second, 0.95).unwrap();
            json!({
                "ratio": ratio.estimate, "lower": ratio.lower, "upper": ratio.upper,
                "p_greater": test.p_greater, "p_greater_midp": test.p_greater_mid,
                "p_two_sided_minlike": test.p_two_sided,
            })
        }
        "fisher_exact_2x2" => {
            let rows: Vec<Vec<u64>> = serde_json::from_value(inputs["table"].clone()).unwrap();
            let table = [[rows[0][0], rows[0][1]], [rows[1][0], rows[1][1]]];
            let test = stats::fisher_exact(table).unwrap();
            json!({
                "p_greater": test.p_greater, "p_two_sided": test.p_two_sided,
                "odds_ratio_cmle": stats::odds_ratio(table, 0.95).unwrap().estimate,
                "lower": stats::odds_ratio_lower(table, 0.95).unwrap(),
            })
        }
        "dispersion_index" => {
            let counts = cells_by_count(inputs);
            let test = stats::dispersion(&counts).unwrap();
            json!({
                "n": test.cells, "mean": test.mean, "variance": test.variance, "index": test.index,
                "chi2": test.chi_square, "p_upper": test.p_upper,
            })
        }
        "nb_mle_k" => {
            let counts = cells_by_count(inputs);
            let test = stats::dispersion(&counts).unwrap();
            json!({
                "n": test.cells, "mean": test.mean, "variance": test.variance, "k_moment": test.moment_shape,
                "k_mle": GammaPrior::fit(&counts, &vec![1.0; counts.len()]).unwrap().shape,
            })
        }
        "rao_scott" => {
            let groups: Vec<_> = list("groups").iter().map(clustered_share).collect();
            let test = stats::compare_clustered(&groups).unwrap();
            json!({
                "p": groups.iter().map(|g| g.estimate).collect::<Vec<_>>(),
                "deff": groups.iter().map(|g| g.design_effect).collect::<Vec<_>>(),
                "cluster_robust_se": groups.iter().map(|g| g.standard_error).collect::<Vec<_>>(),
                "chi2_naive": test.chi_square_naive, "chi2_adjusted": test.chi_square, "p_value": test.p_value,
            })
        }
        "gamma_poisson_mle" => {
            let (x, t) = (counts("x"), numbers("t"));
            let prior = GammaPrior::fit(&x, &t).unwrap();
            let shrunk = |(&x, &t): (&u64, &f64)| prior.posterior(x, t, 0.95).unwrap().estimate;
            json!({"alpha": prior.shape, "beta": prior.rate, "shrunk": x.iter().zip(&t).map(shrunk).collect::<Vec<_>>()})
        }
        "gamma_poisson_posterior" => {
            let prior = GammaPrior { shape: number("a"), rate: number("b") };
            let mean = |(x, t): (u64, f64)| prior.posterior(x, t, 0.95).unwrap().estimate;
            json!({"post_mean": counts("x").into_iter().zip(numbers("t")).map(mean).collect::<Vec<_>>()})
        }
        "gamma_poisson_relativity" => {
            let prior = GammaPrior { shape: number("a"), rate: number("b") };
            let mean = |k: u64, t: f64| prior.posterior(k, t, 0.95).unwrap().estimate;
            let percent = |k: u64| 100.0 * mean(k, number("t")) / mean(0, 0.0);
            json!({"percent": counts("k").into_iter().map(percent).collect::<Vec<_>>()})
        }
        // the gamma row of that table: claims seen once a policy, the law as Γ(nu, scale sigma)
        "robbins_and_gamma_counts" => {
            let claims = cells_by_count(inputs);
            let prior = GammaPrior::fit(&claims, &vec![1.0; claims.len()]).unwrap();
            let mean = |claims: u64| prior.posterior(claims, 1.0, 0.95).unwrap().estimate;
            json!({"nu": prior.shape, "sigma": 1.0 / prior.rate, "gamma_mle": (0..7).map(mean).collect::<Vec<_>>()})
        }
        "jackknife_ratio" => {
            let pairs: Vec<_> = numbers("num").into_iter().zip(numbers("den")).collect();
            let found = stats::jackknife_ratio(&pairs).unwrap();
            json!({"ratio": found.ratio, "jack_bias": found.bias, "jack_se": found.standard_error})
        }
        "sprt_binomial_lines" => {
            let lines = run_lines(number);
            json!({"slope": lines.slope, "h_accept": lines.accept, "h_reject": lines.reject})
        }
        "sprt_binomial_table" => {
            let (lines, n) = (run_lines(number), count("n"));
            json!({"accept": lines.acceptance_number(n), "reject": lines.rejection_number(n)})
        }
        // exposure in units of the mean time between failures that should fail: rate 1 is bad, 1/d is good
        "sprt_poisson_time_slope_and_accept0" => {
            let plan = SequentialPlan::wald(1.0 / number("d"), 1.0, number("alpha"), number("beta"), 9).unwrap();
            json!({"accept0": plan.accept_at[0], "slope": plan.accept_at[1] - plan.accept_at[0]})
        }
        "seq_poisson_plan_risks" => {
            let accept_at = numbers("accept_times");
            let reject_times = inputs["reject_times"].as_object().expect("times by number");
            let reject_at = (0..=accept_at.len()).map(|k| reject_times.get(&k.to_string())?.as_f64()).collect();
            risks(&SequentialPlan { accept_at, reject_at }, number("d"))
        }
        "fixed_time_plan_risks" => {
            risks(&SequentialPlan::fixed(number("duration_theta1"), count("reject_at") as usize).unwrap(), number("d"))
        }
        "multiple_test_rejections" => {
            let (p, level) = (numbers("p"), number("level"));
            let rejected = |adjusted: Result<Vec<f64>, _>| stats::rejections(&adjusted.unwrap(), level).unwrap();
            json!({
                "bh": rejected(stats::benjamini_hochberg(&p)), "holm": rejected(stats::holm(&p)),
                "hochberg": rejected(stats::hochberg(&p)), "bonferroni": rejected(stats::bonferroni(&p)),
            })
        }
        "p_adjust" => match inputs["kind"].as_str()? {
            "bh" => json!({"adjusted": stats::benjamini_hochberg(&numbers("p")).unwrap()}),
            "holm" => json!({"adjusted": stats::holm(&numbers("p")).unwrap()}),
            _ => return None,
        },
        _ => return None,
    };
    Some(answer)
}

/// `freq[k]` cells with k events each, written out.
fn cells_by_count(inputs: &Map<String, Value>) -> Vec<u64> {
    let freq = inputs["freq"].as_array().expect("a list").iter().enumerate();
    let cells = |(k, cells): (usize, &Value)| vec![k as u64; cells.as_u64().expect("a count") as usize];
    freq.flat_map(cells).collect()
}

fn clustered_share(group: &Value) -> ClusteredShare {
    let side = |key: &str| serde_json::from_value::<Vec<u64>>(group[key].clone()).unwrap();
    stats::clustered_share(&side("y").into_iter().zip(side("n")).collect::<Vec<_>>()).unwrap()
}

fn run_lines(number: impl Fn(&str) -> f64) -> RunLines {
    RunLines::wald(number("p0"), number("p1"), number("alpha"), number("beta")).unwrap()
}

fn risks(plan: &SequentialPlan, discrimination: f64) -> Value {
    let (good, bad) = (plan.at_rate(1.0 / discrimination).unwrap(), plan.at_rate(1.0).unwrap());
    json!({
        "alpha_pct": 100.0 * good.reject, "beta_pct": 100.0 * bad.accept,
        "expected_time_theta0": good.expected_exposure,
    })
}

/// Whether a number, list or null is what was published, within `{"abs": …}`, `{"rel": …}` or `{"exact": true}`.
fn agrees(want: &Value, got: &Value, tolerance: &Value) -> bool {
    if let (Value::Array(want), Value::Array(got)) = (want, got) {
        return want.len() == got.len() && want.iter().zip(got).all(|(want, got)| agrees(want, got, tolerance));
    }
    let (Some(want), Some(got)) = (want.as_f64(), got.as_f64()) else {
        return want.is_null() && got.is_null();
    };
    let allowed = match (tolerance["abs"].as_f64(), tolerance["rel"].as_f64(), tolerance["exact"].as_bool()) {
        (Some(abs), None, None) => abs,
        (None, Some(rel), None) => rel * want.abs(),
        (None, None, Some(true)) => 0.0,
        _ => panic!("no tolerance that is known: {tolerance}"),
    };
    (want - got).abs() <= allowed
}

fn object(id: &str, cell: &str) -> Map<String, Value> {
    serde_json::from_str(cell).unwrap_or_else(|error| panic!("{id}: {error}: {cell}"))
}

/// One line of comma-separated values, quotes doubled inside quotes (RFC 4180; no cell spans lines).
fn split(line: &str) -> Vec<String> {
    let (mut cells, mut quoted) = (vec![String::new()], false);
    let mut rest = line.chars().peekable();
    while let Some(c) = rest.next() {
        match c {
            '"' if quoted && rest.peek() == Some(&'"') => cells.last_mut().unwrap().extend(rest.next()),
            '"' => quoted = !quoted,
            ',' if !quoted => cells.push(String::new()),
            c => cells.last_mut().unwrap().push(c),
        }
    }
    assert!(!quoted, "a cell spans lines: {line}");
    cells
}
