//! Where statistics usually break: the far ends of the counts, answers that are infinite, inputs that make no sense.

use proofhouse::stats::{self, GammaPrior, Interval, Observed, SequentialPlan, StatsError};

const TRILLION: u64 = 1_000_000_000_000;

fn close(actual: f64, expected: f64, relative: f64) {
    assert!((actual - expected).abs() <= relative * expected.abs(), "{actual:e} for {expected:e}");
}

/// Expected values: SciPy 1.17.1, `beta.ppf` and `beta.isf`, and in closed form where one exists.
#[test]
fn binomial_limits_at_a_trillion_runs() {
    let none = stats::clopper_pearson(0, TRILLION, 0.95).unwrap();
    assert_eq!(none.lower, 0.0);
    // 1 − 0.025^(1/n) = −expm1(ln 0.025 / n)
    close(none.upper, -(0.025_f64.ln() / 1e12).exp_m1(), 1e-14);
    let many = stats::clopper_pearson(1_000_000_000, TRILLION, 0.95).unwrap();
    close(many.lower, 0.000_999_938_052_438_549_5, 1e-13);
    close(many.upper, 0.001_000_061_950_450_003_6, 1e-13);
    let nearly_all = stats::clopper_pearson(TRILLION - 1, TRILLION, 0.95).unwrap();
    close(nearly_all.lower, 0.999_999_999_994_428_3, 1e-15);
    assert_eq!(stats::clopper_pearson(TRILLION, TRILLION, 0.95).unwrap().upper, 1.0);
    let one_run = stats::clopper_pearson(1, 1, 0.95).unwrap();
    close(one_run.lower, 0.025, 1e-14);
    assert_eq!(one_run.upper, 1.0);
}

/// One mismatch: P(X ≥ 1) = 1 − (1 − p)^n in closed form, and the Poisson limit beside it.
#[test]
fn one_event_at_extreme_confidence_has_a_closed_form() {
    for confidence in [0.5, 0.95, 1.0 - 1e-9] {
        let side = (1.0 - confidence) / 2.0;
        let lower = stats::clopper_pearson(1, TRILLION, confidence).unwrap().lower;
        close(lower, -((-side).ln_1p() / 1e12).exp_m1(), 1e-13);
        close(stats::garwood(1, 1.0, confidence).unwrap().lower, -(-side).ln_1p(), 1e-13);
    }
}

/// Expected values: SciPy 1.17.1, `gamma.ppf` and `gamma.isf`.
#[test]
fn poisson_limits_at_a_billion_events() {
    let many = stats::garwood(1_000_000_000, 1.0, 0.95).unwrap();
    close(many.lower, 999_938_021.443_927_9, 1e-13);
    close(many.upper, 1_000_061_981.450_408_9, 1e-13);
}

#[test]
fn interval_covers_its_estimate_and_grows_with_confidence() {
    for (mismatches, runs) in [(0, 1), (1, 1), (1, 2), (3, 1000), (500, 1000), (999, 1000), (7, TRILLION)] {
        for intervals in [stats::clopper_pearson, stats::mid_p, stats::wilson] {
            let narrow = intervals(mismatches, runs, 0.9).unwrap();
            let wide = intervals(mismatches, runs, 1.0 - 1e-9).unwrap();
            assert!(narrow.lower <= narrow.estimate && narrow.estimate <= narrow.upper, "{narrow:?}");
            assert!(wide.lower <= narrow.lower && narrow.upper <= wide.upper, "{narrow:?} {wide:?}");
            assert!(wide.lower >= 0.0 && wide.upper <= 1.0, "{wide:?}");
        }
    }
}

#[test]
fn needed_runs_are_the_least_that_prove_it() {
    for (below, confidence) in [(1e-9, 0.95), (0.1, 0.9), (1e-3, 0.99)] {
        let runs = stats::success_runs(below, confidence).unwrap();
        assert_eq!(stats::demonstration_runs(below, 0, confidence).unwrap(), runs);
        assert!(stats::upper_per_run(runs, confidence).unwrap() <= below * (1.0 + 1e-9));
        assert!(stats::upper_per_run(runs - 1, confidence).unwrap() > below);
    }
    // a requirement that is met exactly is not rounded up: 0.5² = 1 − 0.75, 0.1¹ = 1 − 0.9
    assert_eq!(stats::success_runs(0.5, 0.75).unwrap(), 2);
    assert_eq!(stats::success_runs(0.9, 0.9).unwrap(), 1);
}

#[test]
fn infinite_limits_survive_json_as_null() {
    let silent = stats::mtbf(100.0, 0, 0.95).unwrap();
    assert_eq!((silent.estimate, silent.upper), (f64::INFINITY, f64::INFINITY));
    let text = serde_json::to_string(&silent).unwrap();
    assert!(text.contains(r#""upper":null"#) && text.contains(r#""estimate":null"#), "{text}");
    assert_eq!(serde_json::from_str::<Interval>(&text).unwrap().upper, f64::INFINITY);
}

#[test]
fn swapping_the_two_sides_inverts_the_ratio() {
    let (a, b) = (Observed { events: 11, exposure: 800.0 }, Observed { events: 21, exposure: 3011.0 });
    let (there, back) = (stats::rate_ratio(a, b, 0.95).unwrap(), stats::rate_ratio(b, a, 0.95).unwrap());
    close(there.lower * back.upper, 1.0, 1e-12);
    close(there.upper * back.lower, 1.0, 1e-12);
    let (there, back) = (stats::compare_rates(a, b, 1.0).unwrap(), stats::compare_rates(b, a, 1.0).unwrap());
    close(there.p_greater, back.p_less, 1e-12);
}

#[test]
fn episodes_split_where_it_was_quiet_for_the_gap() {
    let found = stats::episodes(&[130.0, 0.0, 59.9, 200.0, 190.0], 60.0).unwrap();
    let starts: Vec<f64> = found.iter().map(|episode| episode.start).collect();
    // 59.9 − 0 < 60 joins; 130 − 59.9 and 190 − 130 are not less than 60 and split
    assert_eq!(starts, [0.0, 130.0, 190.0]);
    assert_eq!(found.iter().map(|episode| episode.mismatches).collect::<Vec<_>>(), [2, 1, 2]);
    assert!(stats::episodes(&[], 60.0).unwrap().is_empty());
}

/// A plan that only counts is the Poisson law itself; no plan loses probability on the way.
#[test]
fn plans_account_for_every_outcome() {
    // P(X < 1) = exp(−3), mean exposure (1 − exp(−3)) / 1: reject at the first event, accept at 3
    let point = SequentialPlan::fixed(3.0, 1).unwrap().at_rate(1.0).unwrap();
    close(point.accept, (-3.0_f64).exp(), 1e-14);
    close(point.expected_exposure, -(-3.0_f64).exp_m1(), 1e-14);
    let plan = SequentialPlan::wald(0.001, 0.004, 0.05, 0.1, 12).unwrap();
    for rate in [1e-5, 0.001, 0.002, 0.004, 0.1] {
        let point = plan.at_rate(rate).unwrap();
        close(point.accept + point.reject, 1.0, 1e-12);
        assert!(point.expected_exposure <= plan.accept_at[11], "{point:?}");
    }
    // Wald's inequality bounds the sum of the risks of the plan without truncation; late truncation changes little
    let (alpha, beta) = (plan.at_rate(0.001).unwrap().reject, plan.at_rate(0.004).unwrap().accept);
    assert!(alpha + beta < 0.15 && alpha > 0.01 && beta > 0.01, "{alpha} {beta}");
    let mut broken = plan.clone();
    broken.reject_at.pop();
    assert!(broken.at_rate(0.001).is_err());
    broken = plan;
    broken.accept_at.swap(0, 11);
    assert!(broken.at_rate(0.001).is_err());
}

#[test]
fn power_and_detection_agree_with_their_closed_forms() {
    close(stats::detection_probability(0.01, 100.0).unwrap(), -(-1.0_f64).exp_m1(), 1e-15);
    close(stats::exposure_to_detect(0.01, 0.95).unwrap(), 299.573_227_355_399_1, 1e-14);
    // two equal rates: the conditional test keeps its level, and a doubled sample has more power
    let idle = stats::comparison_power((20.0, 1.0), (20.0, 1.0), 0.05).unwrap();
    assert!(idle > 0.01 && idle <= 0.05, "{idle}");
    let short = stats::comparison_power((20.0, 1.0), (10.0, 1.0), 0.05).unwrap();
    let long = stats::comparison_power((40.0, 2.0), (20.0, 2.0), 0.05).unwrap();
    assert!(0.4 < short && short < long && long < 1.0, "{short} {long}");
}

#[test]
fn shrinkage_and_clusters_know_their_limits() {
    assert_eq!(GammaPrior::fit(&[5, 5, 5, 5], &[1.0; 4]), Err(StatsError::OneRate));
    let prior = GammaPrior::fit(&[0, 0, 0, 40, 1], &[1.0; 5]).unwrap();
    let quiet = prior.posterior(0, 1.0, 0.95).unwrap();
    assert!(quiet.lower < quiet.estimate && quiet.estimate < quiet.upper && quiet.estimate < 1.0, "{quiet:?}");
    // scatter as of chance leaves Garwood's interval, clumps widen it
    let even = stats::clustered_rate(&[(5, 1.0), (5, 1.0), (5, 1.0)], 0.95).unwrap();
    let exact = stats::garwood(15, 3.0, 0.95).unwrap();
    close(even.upper, exact.upper, 1e-14);
    let clumped = stats::clustered_rate(&[(15, 1.0), (0, 1.0), (0, 1.0)], 0.95).unwrap();
    assert!(clumped.upper > 2.0 * exact.upper && clumped.lower < 0.5 * exact.lower, "{clumped:?}");
}

#[test]
fn nonsense_is_refused_and_named() {
    for confidence in [0.0, 1.0, -0.5, 1.5, f64::NAN, f64::INFINITY] {
        assert!(matches!(stats::garwood(1, 1.0, confidence), Err(StatsError::Confidence(_))), "{confidence}");
        assert!(matches!(stats::wilson(1, 2, confidence), Err(StatsError::Confidence(_))), "{confidence}");
    }
    for exposure in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(matches!(stats::garwood(1, exposure, 0.95), Err(StatsError::NotPositive { .. })), "{exposure}");
        assert!(stats::exposure_needed(exposure, 0, 0.95).is_err(), "{exposure}");
    }
    assert_eq!(stats::clopper_pearson(0, 0, 0.95), Err(StatsError::NoRuns));
    let too_many = stats::clopper_pearson(3, 2, 0.95).unwrap_err();
    assert_eq!(too_many.to_string(), "3 mismatches exceed 2 runs: count at most one mismatch per run");
    let nothing = Observed { events: 0, exposure: 1.0 };
    assert!(matches!(stats::rate_ratio(nothing, nothing, 0.95), Err(StatsError::NoEvents(_))));
    assert!(stats::exact_test(1, 2, f64::NAN).is_err() && stats::exact_test(1, 2, 1.1).is_err());
    assert!(stats::holm(&[0.5, f64::NAN]).is_err() && stats::benjamini_hochberg(&[-0.1]).is_err());
    assert!(stats::dispersion(&[1]).is_err() && stats::dispersion(&[0, 0]).is_err());
    assert!(stats::dispersion_with_exposure(&[1, 2], &[1.0]).is_err());
    assert!(stats::episodes(&[f64::NAN], 60.0).is_err() && stats::episodes(&[1.0], 0.0).is_err());
    assert!(stats::fisher_exact([[0, 0], [0, 0]]).is_err() && stats::odds_ratio([[1, 0], [1, 0]], 0.9).is_err());
    assert_eq!(stats::success_runs(1e-300, 0.95), Err(StatsError::BeyondCounts));
    assert_eq!(stats::demonstration_runs(1e-300, 1, 0.95), Err(StatsError::BeyondCounts));
}
