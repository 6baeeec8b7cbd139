//! The calculators through the program itself: published worked examples, documents, and what is said about sources.
//! Where a number stands in `tests/data/statistics.csv` too, its row is named; the row says how far it may be leaned on.

use std::io::Write;
use std::process::Stdio;

use serde_json::Value;

use super::running::{Scratch, json, program, run};

/// What one calculator says, as a document.
fn reckon(args: &str) -> Value {
    let mut all = vec!["reckon"];
    all.extend(args.split(' '));
    all.extend(["--format", "json"]);
    let output = run(&all);
    assert_eq!(output.status.code(), Some(0), "{args}: {}", String::from_utf8_lossy(&output.stderr));
    json(&output)
}

/// The text of one calculator.
fn text(args: &str) -> String {
    let mut all = vec!["reckon"];
    all.extend(args.split(' '));
    let output = run(&all);
    assert_eq!(output.status.code(), Some(0), "{args}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

/// Half a unit in the last printed digit of a published number, unless its row allows another error.
fn agrees(document: &Value, at: &str, expected: f64, error: f64, source: &str) {
    let Some(actual) = document.pointer(at).and_then(Value::as_f64) else {
        panic!("{source}: no number at {at}: {document}")
    };
    assert!((actual - expected).abs() <= error, "{source}: {at} is {actual}, published {expected} ± {error}");
}

/// Command, then where in the document which number stands, with its error; then the source.
type Example<'a> = (&'a str, &'a [(&'a str, f64, f64)], &'a str);

const EXAMPLES: &[Example] = &[
    (
        "interval --events 682 --runs 925",
        &[("/lower", 0.7076683, 5e-8), ("/upper", 0.7654066, 5e-8), ("/estimate", 0.7372973, 5e-8)],
        "binom.test(682, 925), R reference output (row binomial-003)",
    ),
    (
        "interval --events 4 --runs 20 --confidence 90%",
        &[("/lower", 0.071354, 5e-7), ("/upper", 0.401029, 2e-6)],
        "NIST/SEMATECH e-Handbook 7.2.4.1 (row binomial-001)",
    ),
    (
        "interval --events 20 --runs 100 --one-sided upper",
        &[("/upper", 0.2772002496709138, 1e-12), ("/lower", 0.0, 0.0)],
        "binom.test(20, 100), one-sided, R (row binomial-024)",
    ),
    (
        "interval --events 20 --runs 100 --one-sided lower",
        &[("/lower", 0.1366613252458672, 1e-12), ("/upper", 1.0, 0.0)],
        "binom.test(20, 100), one-sided, R (row binomial-024)",
    ),
    (
        "interval --events 81 --runs 263 --method mid-p",
        &[("/lower", 0.2544, 5e-5), ("/upper", 0.3658, 5e-5)],
        "R. G. Newcombe, Statistics in Medicine 17 (1998), table I, method 6 (row binomial-013)",
    ),
    (
        "interval --events 81 --runs 263 --method score",
        &[("/lower", 0.2553, 5e-5), ("/upper", 0.3662, 5e-5)],
        "R. G. Newcombe, Statistics in Medicine 17 (1998), table I, method 3 (row binomial-012)",
    ),
    (
        "interval --events 137 --hours 24.19893",
        &[("/lower", 4.753125, 5e-7), ("/upper", 6.692709, 5e-7), ("/estimate", 5.661407, 5e-7)],
        "poisson.test(137, 24.19893), R reference output (row poisson-001)",
    ),
    (
        "interval --events 25 --hours 1",
        &[("/lower", 16.18, 0.005), ("/upper", 36.90, 0.005)],
        "Garwood's limits for 25 events as printed by a calculator (row poisson-005)",
    ),
    (
        "interval --events 2 --hours 800 --confidence 90%",
        &[("/hours_between/lower", 127.0690, 5e-5), ("/hours_between/upper", 2251.229, 5e-4)],
        "NIST/SEMATECH e-Handbook 8.4.5.1 (row zero_failure-030)",
    ),
    (
        "zero --runs 14",
        &[("/upper", 0.193, 5e-4), ("/rule_of_three", 0.214, 5e-4)],
        "J. A. Hanley & A. Lippman-Hand, JAMA 249 (1983) (rows zero_failure-022, -029)",
    ),
    ("zero --hours 1h", &[("/upper", 2.996, 5e-4)], "-ln 0.05, the 3 of the rule of three (row zero_failure-029)"),
    (
        "zero --hours 1000 --devices 231 --acceleration 78.6 --confidence 60%",
        &[("/fit_at_most", 50.5, 0.05)],
        "JEDEC JESD85 worked for 231 devices (row zero_failure-141)",
    ),
    (
        "zero --hours 1000 --devices 1_000_000 --failures 5",
        &[("/fit_at_most", 10.513, 5e-4), ("/estimate", 5e-9, 1e-15)],
        "JEDEC JESD85, 5 failures (row zero_failure-142)",
    ),
    (
        "zero --mtbf 200h --failures 4 --confidence 90%",
        &[("/hours", 1598.0, 1.5)],
        "NIST/SEMATECH e-Handbook 8.3.1.1, which rounds its factor to 7.99 (row zero_failure-139)",
    ),
    ("zero --below 0.1 --confidence 90%", &[("/runs", 22.0, 0.0)], "success-run theorem (row zero_failure-001)"),
    (
        "zero --below 0.01 --failures 1",
        &[("/runs", 473.0, 0.0), ("/by_failures/0/runs", 299.0, 0.0)],
        "binomial demonstration tables (row zero_failure-020); 299 for none by the success-run theorem",
    ),
    (
        "compare --first 11/800h --second 21/3011h",
        &[
            ("/estimate", 1.971488, 5e-7),
            ("/lower", 0.8584264, 5e-8),
            ("/upper", 4.2772659, 5e-8),
            ("/p_two_sided", 0.07967, 5e-6),
        ],
        "poisson.test(c(11, 21), c(800, 3011)), R reference output (row compare-006)",
    ),
    (
        "compare --first 60/51477.5h --second 30/54308.7h",
        &[("/p_greater", 0.000428, 5e-7), ("/p_greater_mid", 0.000310, 5e-7)],
        "K. Gu et al., Biometrical Journal 50 (2008), example 1 (row compare-002)",
    ),
    (
        "compare --first 3/4 --second 1/4",
        &[("/fisher/p_greater", 0.2429, 5e-5), ("/fisher/odds_ratio/estimate", 6.408309, 4e-5)],
        "fisher.test, the lady tasting tea, R reference output (row compare-011)",
    ),
    (
        "compare --first 0/16 --second 15/72",
        &[("/fisher/p_two_sided", 0.06287, 5e-6)],
        "Fisher's test of K. Ritland's data of 2007 (row compare-014)",
    ),
    (
        "sequential --good 1/2h --bad 1/1h --fixed --hours 18.8 --reject-at 14",
        &[("/alpha", 0.096, 6e-4), ("/beta", 0.106, 6e-4)],
        "MIL-HDBK-781A plan XII-D (row sequential-013)",
    ),
    (
        "sequential --good 1/3h --bad 1/1h --fixed --hours 5.4 --reject-at 4",
        &[("/alpha", 0.109, 6e-4), ("/beta", 0.213, 6e-4)],
        "MIL-HDBK-781A plan XVI-D (row sequential-017)",
    ),
    (
        "sequential --good 0.01 --bad 0.1",
        &[
            ("/slope", 0.0397, 5e-5),
            ("/accept", 0.939, 5e-4),
            ("/reject", 1.205, 5e-4),
            ("/boundaries/0/accept_from_runs", 24.0, 0.0),
        ],
        "NIST/SEMATECH e-Handbook 6.2.6 (rows sequential-022, -027)",
    ),
    ("power --rate 0.1 --probability 90%", &[("/runs", 22.0, 0.0)], "success-run theorem (row zero_failure-001)"),
    ("power --rate 1/h --probability 95%", &[("/hours", 2.996, 5e-4)], "-ln 0.05 (row zero_failure-029)"),
    (
        // at a true rate of nought the plan is the zero-failure test
        "power --below 1/200h --true 0 --confidence 90% --probability 50%",
        &[("/hours", 460.0, 0.6), ("/failures_allowed", 0.0, 0.0), ("/probability", 1.0, 0.0)],
        "NIST/SEMATECH e-Handbook 8.3.1.1, factor 2.30 (row zero_failure-075)",
    ),
    (
        "shrink --counts 5,1,5,14,3,19,1,1,4,22 --exposures 94.3,15.7,62.9,126,5.24,31.4,1.05,1.05,2.1,10.5",
        &[
            ("/prior/shape", 0.82, 0.005),
            ("/prior/rate", 1.26, 0.005),
            ("/cells/0/estimate", 0.0609, 5e-5),
            ("/cells/9/estimate", 1.9405, 5e-5),
        ],
        "ten pumps, D. P. Gaver & I. G. O'Muircheartaigh, Technometrics 29 (1987) (rows empirical_bayes-004, -005)",
    ),
    (
        "family --p 0.002,0.004,0.006,0.008,0.01,0.012",
        &[
            ("/holm/adjusted/0", 0.012, 1e-12),
            ("/holm/adjusted/1", 0.02, 1e-12),
            ("/holm/adjusted/5", 0.024, 1e-12),
            ("/benjamini_hochberg/adjusted/0", 0.012, 1e-12),
        ],
        "R multtest, ties (rows multiple-009, -010)",
    ),
];

#[test]
fn published_examples_come_out() {
    for (command, numbers, source) in EXAMPLES {
        let document = reckon(command);
        for (at, expected, error) in *numbers {
            agrees(&document, at, *expected, *error, source);
        }
    }
}

/// 150 leaves with 0 to 7 mites: C. I. Bliss & R. A. Fisher, Biometrics 9 (1953) (rows overdispersion-001, -009).
/// 200 corps-years with 0 to 4 horse kicks: L. von Bortkiewicz 1898 (row overdispersion-006).
#[test]
fn clumped_counts_and_plain_ones_are_told_apart() {
    let scratch = Scratch::new("reckon-counts");
    let list = |name: &str, leaves: &[usize]| {
        let path = scratch.path().join(name);
        let rows = leaves.iter().enumerate().map(|(count, times)| format!("{count}\n").repeat(*times));
        std::fs::write(&path, rows.collect::<String>()).unwrap();
        format!("spread --counts @{}", path.display())
    };
    let mites = reckon(&list("mites", &[70, 38, 17, 10, 9, 3, 2, 1]));
    agrees(&mites, "/dispersion/chi_square", 295.4, 0.05, "Bliss & Fisher 1953");
    agrees(&mites, "/negative_binomial/shape", 1.0246, 5e-5, "Bliss & Fisher 1953");
    agrees(&mites, "/estimate", 1.1467, 5e-5, "Bliss & Fisher 1953");
    assert_ne!(mites["holds"], "poisson");
    let kicks = reckon(&list("kicks", &[109, 65, 22, 3, 1]));
    agrees(&kicks, "/dispersion/p_upper", 0.480, 5e-4, "Bortkiewicz 1898");
    assert_eq!(kicks["holds"], "poisson");
    assert_eq!(kicks["lower"], kicks["poisson"]["lower"]);
}

/// By hand from the definition: 1 and 2.5 are 1.5 s apart, 900 is far from both.
#[test]
fn episodes_are_counted_by_hand() {
    let document = reckon("episodes --times 900,1,2.5 --gap 60s --hours 1");
    assert_eq!((&document["episodes"], &document["events"]), (&2.into(), &3.into()));
    assert_eq!(document["list"][0]["end_s"], 2.5);
    // two episodes in an hour by Garwood: Biometrika Tables for Statisticians I, table 40: 0.242 to 7.22
    agrees(&document, "/per_hour/lower", 0.242, 5e-4, "Garwood, table 40");
    agrees(&document, "/per_hour/upper", 7.22, 5e-3, "Garwood, table 40");
    assert_eq!(reckon("episodes --times 900,1,2.5 --gap 1s")["episodes"], 3);
}

/// Two temperatures and a third of no weight in between: the slope through two groups is the log of the ratio of their
/// rates over the distance, ln(8) / 20.
#[test]
fn the_slope_of_a_line_through_exact_points() {
    let document = reckon("slope --readings 10/100h@50,20/70.7106781186548h@60,80/100h@70 --at 60");
    agrees(&document, "/estimate", 8f64.ln() / 20.0, 1e-9, "closed form");
    agrees(&document, "/factor_per_ten_celsius/estimate", 8f64.sqrt(), 1e-8, "closed form");
    agrees(&document, "/per_hour_at/estimate", 0.8f64.sqrt() * 0.1f64.sqrt(), 1e-8, "closed form");
    assert!(text("slope --readings 10/100h@50,20/70h@60,80/100h@70").contains("rises with temperature"));
}

/// Leaving out each unit by hand: 8/35; without 3/10 5/25, without 4/20 4/15, without 1/5 7/30.
#[test]
fn the_jackknife_by_hand() {
    let document = reckon("ratio --pairs 3/10,4/20,1/5");
    let ratio = 8.0 / 35.0;
    let left: [f64; 3] = [5.0 / 25.0, 4.0 / 15.0, 7.0 / 30.0];
    let mean = left.iter().sum::<f64>() / 3.0;
    let error = (2.0 / 3.0 * left.iter().map(|r| (r - mean).powi(2)).sum::<f64>()).sqrt();
    agrees(&document, "/estimate", ratio, 1e-12, "by hand");
    agrees(&document, "/standard_error", error, 1e-12, "by hand");
    // Student's t with 2 degrees of freedom, 97.5 %: 4.303 (any table)
    agrees(&document, "/upper", ratio + 4.303 * error, 1e-3 * error, "by hand");
}

#[test]
fn a_sequential_plan_keeps_its_risks_and_ends_sooner_on_average() {
    let plan = reckon("sequential --good 1/1000h --bad 1/200h --alpha 5% --beta 10%");
    let number = |at: &str| plan.pointer(at).and_then(Value::as_f64).unwrap();
    assert!(number("/alpha") <= 0.05 && number("/beta") <= 0.1);
    let points = plan["operating_characteristic"].as_array().unwrap();
    let good = points.iter().find(|p| p["name"] == "good").unwrap();
    assert!(good["expected_hours"].as_f64().unwrap() < number("/fixed_hours"), "{plan}");
    let accepts: Vec<f64> = points.iter().map(|p| p["accept"].as_f64().unwrap()).collect();
    assert!(accepts.is_sorted_by(|a, b| a >= b), "the higher the rate, the rarer it is accepted: {accepts:?}");
    assert_eq!(plan["boundaries"][0]["reject_until_hours"], Value::Null);
}

/// What was asked for is what the answer was made from: the two directions of one question agree.
#[test]
fn questions_and_their_reverse_agree() {
    let hours = reckon("power --first 1/100h --second 1/500h --power 0.9")["first_hours"].as_f64().unwrap();
    let power = reckon(&format!("power --first 1/100h --second 1/500h --hours {hours}"));
    agrees(&power, "/power", 0.9, 1e-6, "the power that was asked for");
    let hours = reckon("zero --below 1/500h --failures 2")["hours"].as_f64().unwrap();
    agrees(
        &reckon(&format!("zero --hours {hours} --failures 2")),
        "/upper",
        0.002,
        1e-12,
        "the bound that was asked for",
    );
    let seen = reckon("power --rate 1e-9 --runs 2995732273");
    agrees(&seen, "/probability", 0.95, 1e-9, "the runs of `power --rate 1e-9 --probability 95%`");
}

const COMMANDS: &[(&str, &str, &str)] = &[
    ("interval", "interval --events 3 --runs 1e9", "Clopper"),
    ("zero", "zero --hours 42", "Garwood"),
    ("zero", "zero --below 1/500h", "8.3.1.1"),
    ("compare", "compare --first 5/1000 --second 1/1000", "Przyborowski"),
    ("sequential", "sequential --good 1/1000h --bad 1/200h", "Wald"),
    ("sequential", "sequential --good 1% --bad 10%", "Wald"),
    ("power", "power --rate 1/500h --probability 95%", "success-run"),
    ("power", "power --first 1/100h --second 1/500h", "Lehmann"),
    ("power", "power --below 1/500h --true 1/5000h", "8.3.1.1"),
    ("spread", "spread --counts 3,0,1,12", "Fisher"),
    ("episodes", "episodes --times 1,2.5,900", "Coles"),
    ("family", "family --p 0.001,0.02,0.3", "Holm"),
    ("shrink", "shrink --counts 3,0,1,12 --exposures 1h,2h,1h,1h", "Gaver"),
    ("slope", "slope --readings 3/10h@61,1/12h@55,9/8h@70", "McCullagh"),
    ("ratio", "ratio --pairs 3/10,4/20", "Efron"),
];

#[test]
fn documents_name_their_schema_and_everything_names_its_source() {
    for (name, command, source) in COMMANDS {
        let document = reckon(command);
        assert_eq!(document["schema"], format!("proofhouse/reckon-{name}/1"), "{command}");
        for field in ["statement", "method", "source", "assumption"] {
            assert!(document[field].as_str().is_some_and(|text| text.len() > 5), "{command}: {field}: {document}");
        }
        assert!(document["source"].as_str().unwrap().contains(source), "{command}: {document}");
        assert!(document["inputs"].is_object(), "{command}");
        let plain = text(command);
        assert!(plain.contains(source) && plain.contains("Holds if"), "{command}: {plain}");
        assert!(plain.lines().all(|line| line.chars().count() <= 100), "{command}: {plain}");
        assert!(!plain.contains("NaN") && !plain.contains("inf"), "{command}: {plain}");
        let help = run(&["reckon", name, "--help"]);
        let help = String::from_utf8(help.stdout).unwrap().replace('\n', " ");
        assert!(help.contains("Source") && help.contains(source), "{name}: {help}");
    }
}

#[test]
fn what_was_asked_is_echoed() {
    let document = reckon("zero --hours 7d --devices 4 --failures 1 --confidence 0.9");
    assert_eq!(
        document["inputs"],
        serde_json::json!({"hours": 168.0, "devices": 4, "acceleration": 1.0, "failures": 1, "confidence": 0.9})
    );
    assert_eq!(reckon("compare --first 5/90m --second 1/1h")["inputs"]["first"]["hours"], 1.5);
}

/// No limit is `null` in documents and words in the text, never a number.
#[test]
fn no_limit_is_no_number() {
    let document = reckon("compare --first 3/100h --second 0/100h");
    assert_eq!((&document["upper"], &document["estimate"]), (&Value::Null, &Value::Null));
    assert!(text("compare --first 3/100h --second 0/100h").contains("at least"));
    let nothing = reckon("compare --first 0/100h --second 0/200h");
    assert_eq!(
        (&nothing["lower"], &nothing["upper"], &nothing["p_two_sided"]),
        (&0.0.into(), &Value::Null, &1.0.into())
    );
    assert_eq!(reckon("interval --events 3 --hours 1 --one-sided lower")["upper"], Value::Null);
    let alike = reckon("shrink --counts 1,1,1");
    assert_eq!(alike["prior"], Value::Null);
    assert!(text("shrink --counts 1,1,1").contains("pool"));
}

/// The answer to nothing seen is a bound, and it never says that all is well.
#[test]
fn silence_is_a_bound() {
    for command in ["zero --runs 1e9", "zero --hours 42", "interval --events 0 --hours 12.5"] {
        let plain = text(command);
        assert!(!plain.contains("healthy") && !plain.contains(" ok"), "{plain}");
    }
    assert!(text("zero --hours 42").contains("fewer than 0.0713 per hour (95 %)"), "3 / 42 h, Hanley & Lippman-Hand");
}

#[test]
fn lists_come_from_files_and_standard_input() {
    let scratch = Scratch::new("reckon-lists");
    let path = scratch.path().join("times.csv");
    std::fs::write(&path, "# host 7\n1, 2.5 # a burst\n\n900\n").unwrap();
    assert_eq!(reckon(&format!("episodes --times @{}", path.display()))["episodes"], 2);
    let mut child =
        program(&["reckon", "episodes", "--times", "-", "--format", "json"]).stdin(Stdio::piped()).spawn().unwrap();
    child.stdin.take().unwrap().write_all(b"1\n2.5\n900\n").unwrap();
    assert_eq!(json(&child.wait_with_output().unwrap())["episodes"], 2);
}

/// Every command that README works out gives what README shows, as far as it shows it.
#[test]
fn the_readme_shows_what_comes_out() {
    let readme = include_str!("../../README.md");
    let (_, section) = readme.split_once("## Reckoning by hand\n").expect("the section");
    let section = section.split("\n## ").next().unwrap();
    let blocks = section.split("```console\n").skip(1).map(|block| block.split("```").next().unwrap());
    let mut shown = 0;
    for block in blocks {
        let (command, output) = block.strip_prefix("$ proofhouse reckon ").expect(block).split_once('\n').unwrap();
        let output = output.trim_end();
        assert!(
            !output.is_empty() && text(command).starts_with(output),
            "{command}:\n{output}\nbut\n{}",
            text(command)
        );
        shown += 1;
    }
    assert!(shown >= 6, "only {shown} worked commands");
}

/// Of many tests the text lists the smallest p-values under their own numbers; the document has all.
#[test]
fn a_long_family_is_listed_from_its_smallest() {
    let scratch = Scratch::new("reckon-family");
    let path = scratch.path().join("p");
    let list: String = (0..300).map(|i| format!("{}\n", 1.0 - f64::from(i) / 300.0)).collect();
    std::fs::write(&path, list).unwrap();
    let command = format!("family --p @{}", path.display());
    let plain = text(&command);
    let first = plain.lines().skip_while(|l| !l.starts_with("test ")).nth(1).unwrap();
    assert!(first.trim().starts_with("300 ") && plain.contains("100 smallest of 300"), "{plain}");
    assert_eq!(reckon(&command)["holm"]["adjusted"].as_array().unwrap().len(), 300);
}
