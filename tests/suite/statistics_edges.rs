//! Where statistics usually break: the far ends of the counts, answers that are infinite, inputs that make no sense.

use proofhouse::stats::{self, GammaPrior, Interval, JackknifeRatio, Observed, Reading, SequentialPlan, StatsError};

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

/// Student's t at 97.5 % is 2.365 with 7 degrees of freedom and 12.706 with 1 (any printed table); the patch data are
/// those of `tests/data/statistics.csv`, in thousands.
#[test]
fn a_jackknifed_ratio_spans_its_student_interval() {
    let patch = [
        (-1.2, 8.406),
        (2.601, 2.342),
        (-2.705, 8.187),
        (1.982, 8.459),
        (-1.29, 4.795),
        (0.351, 3.516),
        (-0.638, 4.796),
        (-2.719, 10.238),
    ];
    let found = stats::jackknife_ratio(&patch).unwrap();
    let reach = |of: &JackknifeRatio| (of.interval(0.95).unwrap().upper - of.ratio) / of.standard_error;
    assert!((reach(&found) - 2.365).abs() < 5e-4, "{found:?}");
    let two = stats::jackknife_ratio(&patch[..2]).unwrap();
    assert!((reach(&two) - 12.706).abs() < 5e-4, "{two:?}");
    // units that agree have no error, and equal denominators make the ratio a mean: no bias, σ/√n in its own unit
    let alike = stats::jackknife_ratio(&[(1.0, 2.0), (2.0, 4.0), (4.0, 8.0)]).unwrap();
    assert_eq!((alike.ratio, alike.bias, alike.standard_error), (0.5, 0.0, 0.0));
    let mean = stats::jackknife_ratio(&[(1.0, 2.0), (2.0, 2.0), (6.0, 2.0)]).unwrap();
    assert_eq!(mean.bias, 0.0);
    close(mean.standard_error, (7.0_f64 / 3.0).sqrt() / 2.0, 1e-14);
    // one unit with nearly all of the exposure: the rest must not drown in the total
    let lopsided = stats::jackknife_ratio(&[(1e18, 1e20), (1.0, 1.0), (3.0, 1.0)]).unwrap();
    assert!(lopsided.standard_error > 1.0 && lopsided.standard_error.is_finite(), "{lopsided:?}");
}

/// Quarterly counts of Whyte et al. (1987) in A. J. Dobson, An Introduction to Generalized Linear Models: slope 0.2565
/// with standard error 0.0220, level 0.3396 at 0; from memory, verified with statsmodels 0.15.0. The second set: the
/// same library, made-up temperatures.
#[test]
fn a_log_linear_rate_agrees_with_the_library() {
    let counts = [0, 1, 2, 3, 1, 4, 9, 18, 23, 31, 20, 25, 37, 45];
    let quarters: Vec<Reading> =
        (1..).zip(counts).map(|(at, events)| Reading { events, exposure: 1.0, at: f64::from(at) }).collect();
    let line = stats::log_linear(&quarters, 0.95).unwrap();
    close(line.slope.estimate, 0.256_523_59, 1e-7);
    close(line.rate_at(0.0).unwrap().estimate.ln(), 0.339_633_92, 1e-7);
    close(line.dispersion, 28.847_304_994_760_986 / 12.0, 1e-9);
    // P(χ²₁₂ > 28.85) = 0.004: the limits are √dispersion and Student's 2.1788 wide
    assert!(line.widened);
    let reach = line.slope.upper - line.slope.estimate;
    close(reach, 0.022_039_11 * 2.178_812_829_7 * line.dispersion.sqrt(), 1e-6);

    let warm: Vec<Reading> =
        [(1, 10.0, 40.0), (0, 8.0, 45.0), (3, 9.5, 50.0), (2, 4.0, 60.0), (6, 5.0, 65.0), (11, 6.0, 75.0)]
            .map(|(events, exposure, at)| Reading { events, exposure, at })
            .to_vec();
    let line = stats::log_linear(&warm, 0.95).unwrap();
    assert!(!line.widened && line.events == 23 && line.readings == 6);
    close(line.slope.estimate, 0.087_033_47, 1e-7);
    close(line.slope.lower, 0.050_055_78, 1e-6);
    close(line.factor_per_ten.upper, 1.240_111_6_f64.exp(), 1e-6);
    let hot = line.rate_at(70.0).unwrap();
    close(hot.estimate, 1.314_932, 1e-6);
    close(hot.lower, 0.854_586, 1e-6);
    close(hot.upper, 2.023_257, 1e-6);
}

/// Without an effect of the covariate the pooled rate is the answer at every value, and a rate that doubles per unit
/// is found as it was put in.
#[test]
fn a_log_linear_rate_has_its_closed_forms_at_the_far_ends() {
    let flat = [20.0, 50.0, 80.0].map(|at| Reading { events: 7, exposure: 2.0, at });
    let line = stats::log_linear(&flat, 0.9).unwrap();
    assert!(line.slope.estimate.abs() < 1e-14 && line.dispersion < 1e-20, "{line:?}");
    close(line.rate_at(-400.0).unwrap().estimate, 3.5, 1e-12);
    let doubling = [0, 10, 20, 30, 40].map(|at| Reading { events: 1 << at, exposure: 3.0, at: f64::from(at) });
    let line = stats::log_linear(&doubling, 0.9).unwrap();
    close(line.slope.estimate, std::f64::consts::LN_2, 1e-14);
    close(line.factor_per_ten.estimate, 1024.0, 1e-13);
    close(line.rate_at(0.0).unwrap().estimate, 1.0 / 3.0, 1e-10);
    // 10^12 events in two units at one end and a single one in one unit beyond keep a finite slope
    let steep = [(TRILLION, 0.0), (0, 0.0), (1, 30.0)].map(|(events, at)| Reading { events, exposure: 1.0, at });
    let line = stats::log_linear(&steep, 0.9).unwrap();
    close(line.slope.estimate, (2e-12_f64).ln() / 30.0, 1e-13);
}

#[test]
fn a_slope_that_does_not_exist_is_refused_and_named() {
    let at = |readings: [(u64, f64); 3]| readings.map(|(events, at)| Reading { events, exposure: 1.0, at });
    let told = |readings: &[Reading]| stats::log_linear(readings, 0.95).unwrap_err().to_string();
    let end = told(&at([(0, 40.0), (0, 50.0), (5, 60.0)]));
    assert!(end.starts_with("all 5 events lie at the highest value, 60: no finite slope fits best"), "{end}");
    let end = told(&at([(2, 40.0), (3, 40.0), (0, 60.0)]));
    assert!(end.starts_with("all 5 events lie at the lowest value, 40: no finite slope"), "{end}");
    // all at a middle value is no end
    assert!(stats::log_linear(&at([(0, 40.0), (5, 50.0), (0, 60.0)]), 0.95).is_ok());
    assert_eq!(told(&at([(1, 50.0); 3])), "every reading is at 50: a slope needs readings at different values");
    assert_eq!(told(&at([(1, 40.0), (0, 50.0), (0, 60.0)])), "1 events are too few: give at least 2");
    assert_eq!(told(&at([(9, 40.0), (9, 50.0), (9, 60.0)])[..2]), "2 readings are too few: give at least 3");
    assert!(stats::log_linear(&[], 0.95).is_err());
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        assert!(told(&at([(9, 40.0), (9, bad), (9, 60.0)])).contains("is not a finite number"), "{bad}");
        let exposed = [1.0, bad, 1.0].map(|exposure| Reading { events: 9, exposure, at: exposure });
        assert!(told(&exposed).contains("is not positive and finite"), "{bad}");
    }
    let good = stats::log_linear(&at([(9, 40.0), (9, 50.0), (9, 60.0)]), 0.95).unwrap();
    assert!(matches!(good.rate_at(f64::NAN), Err(StatsError::NotFinite { .. })));
    assert!(stats::log_linear(&at([(9, 40.0), (9, 50.0), (9, 60.0)]), 1.0).is_err());
    let wide = at([(9, -1e308), (9, 0.0), (9, 1e308)]);
    assert!(matches!(stats::log_linear(&wide, 0.95), Err(StatsError::NotFinite { .. })));
}

/// Bliss & Fisher's mites: shape 1.0246 (Biometrics 9, 1953). The unequal clusters: statsmodels 0.15.0 for the maximum,
/// SciPy 1.17.1 for the limits (root of the profile likelihood).
#[test]
fn a_clumped_rate_is_the_library_s() {
    let mites: Vec<(u64, f64)> = (0..8)
        .zip([70, 38, 17, 10, 9, 3, 2, 1])
        .flat_map(|(count, leaves)| std::iter::repeat_n((count, 1.0), leaves))
        .collect();
    let found = stats::negative_binomial_rate(&mites, 0.95).unwrap();
    assert!((found.shape.unwrap() - 1.0246).abs() < 5e-5, "{found:?}");
    close(found.rate.estimate, 172.0 / 150.0, 1e-12);
    close(found.rate.lower, 0.920_986_064_189, 1e-9);
    close(found.rate.upper, 1.429_768_463_999, 1e-9);
    let hosts = [(0, 1.0), (3, 2.0), (1, 1.0), (12, 2.0), (0, 1.0), (5, 2.0), (2, 1.0), (30, 3.0), (1, 1.0), (0, 1.0)];
    let found = stats::negative_binomial_rate(&hosts, 0.95).unwrap();
    close(found.shape.unwrap(), 0.786_635_890_4, 1e-9);
    close(found.rate.estimate, 2.568_184_664_67, 1e-9);
    close(found.rate.lower, 1.157_512_366_43, 1e-9);
    close(found.rate.upper, 6.671_486_282_31, 1e-9);
    // unequal exposures: at a shape without end the likelihood has a maximum too, but a lower one
    let two =
        stats::negative_binomial_rate(&[(1452, 46.696_339_990_212_145), (50, 1.0)], 0.890_669_227_241_138_1).unwrap();
    close(two.shape.unwrap(), 23.389_034_970_61, 1e-9);
    close(two.rate.estimate, 38.398_456_564_51, 1e-9);
    close(two.rate.lower, 27.920_626_159_49, 1e-9);
    close(two.rate.upper, 59.431_169_243_68, 1e-9);
}

/// Where only chance scatters the counts: deviance 2 (x ln(x/m) − x + m) at its 95 % point 3.8415, by SciPy 1.17.1 and
/// in closed form for no events.
#[test]
fn counts_that_do_not_clump_have_the_poisson_profile() {
    let even = stats::negative_binomial_rate(&[(2, 4.0), (3, 6.0)], 0.95).unwrap();
    assert_eq!(even.shape, None);
    close(even.rate.lower, 0.179_300_513_073, 1e-9);
    close(even.rate.upper, 1.074_638_863_348, 1e-9);
    let none = stats::negative_binomial_rate(&[(0, 4.0), (0, 6.0)], 0.95).unwrap();
    assert_eq!((none.rate.estimate, none.rate.lower, none.shape), (0.0, 0.0, None));
    close(none.rate.upper, 1.959_963_984_540_054_f64.powi(2) / 2.0 / 10.0, 1e-12);
    let many = stats::negative_binomial_rate(&[(TRILLION, 1.0), (TRILLION, 1.0)], 0.95).unwrap();
    close(many.rate.upper - many.rate.lower, 2.0 * 1.959_963_984_54 * (1e12_f64 / 2.0).sqrt(), 1e-6);
    // one cluster with everything among a few: the mean rate has hardly an upper limit
    let lone = stats::negative_binomial_rate(&[(40, 1.0), (0, 1.0), (0, 1.0)], 0.95).unwrap();
    assert!(
        lone.shape.unwrap() < 0.2 && lone.rate.upper > 1e3 * lone.rate.estimate && lone.rate.lower > 0.0,
        "{lone:?}"
    );
    assert!(stats::negative_binomial_rate(&[], 0.95).is_err());
    assert!(stats::negative_binomial_rate(&[(5, 1.0)], 0.95).is_err());
    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let told = stats::negative_binomial_rate(&[(5, 1.0), (5, bad)], 0.95);
        assert!(matches!(told, Err(StatsError::NotPositive { .. })), "{bad}");
        assert!(stats::negative_binomial_rate(&[(5, 1.0), (50, 1.0)], bad).is_err());
        assert!(stats::jackknife_ratio(&[(5.0, 1.0), (5.0, bad)]).is_err(), "{bad}");
    }
    assert!(stats::jackknife_ratio(&[(5.0, 1.0), (f64::NAN, 1.0)]).is_err());
    assert!(stats::jackknife_ratio(&[(5.0, f64::MAX), (5.0, f64::MAX)]).is_err());
    assert!(stats::jackknife_ratio(&[]).is_err() && stats::jackknife_ratio(&[(1.0, 1.0)]).is_err());
    let lone = JackknifeRatio { ratio: 1.0, bias: 0.0, standard_error: 1.0, units: 1 };
    assert!(lone.interval(0.95).is_err());
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
