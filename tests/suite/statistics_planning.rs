//! How long a test has to be: exposures that are worked out beforehand, and plans whose risks are kept.

use proofhouse::stats::{self, SequentialPlan, StatsError};

fn close(actual: f64, expected: f64, relative: f64) {
    assert!((actual - expected).abs() <= relative * expected.abs(), "{actual:e} for {expected:e}");
}

/// Fixed-duration plans of MIL-HDBK-781A as in `tests/data/statistics.csv`, exposures in mean times of the bad rate.
/// Where the printed risks keep the nominal ones the plan is the printed one; where one exceeds them, ours is longer.
#[test]
fn plans_that_only_count_are_the_handbook_s_where_that_keeps_the_risks() {
    let plan = |discrimination: f64, alpha: f64, beta: f64| {
        let plan = SequentialPlan::fixed_with_risks(1.0 / discrimination, 1.0, alpha, beta).unwrap();
        let (good, bad) = (plan.at_rate(1.0 / discrimination).unwrap(), plan.at_rate(1.0).unwrap());
        assert!(good.reject <= alpha && bad.accept <= beta, "{good:?} {bad:?}");
        (plan.accept_at.len(), plan.longest())
    };
    // XVII-D: 3 rejects in 4.3, risks 17.5 % and 19.7 % of 20 %
    let (rejects, longest) = plan(3.0, 0.2, 0.2);
    assert_eq!(rejects, 3);
    assert!((longest - 4.3).abs() < 0.05, "{longest}");
    // XII-D: 14 in 18.8, but 10.6 % for 10 %; XIV-D: 6 in 7.8, but 21.0 % for 20 %; IX-D: 37 in 45.0, but 12.0 % for 10 %
    for (discrimination, risk, printed) in [(2.0, 0.1, (14, 18.8)), (2.0, 0.2, (6, 7.8)), (1.5, 0.1, (37, 45.0))] {
        let (rejects, longest) = plan(discrimination, risk, risk);
        assert!(rejects > printed.0 && rejects <= printed.0 + 4 && longest > printed.1, "{rejects} in {longest}");
    }
    // XI-D keeps both of its 20 %: no plan of ours that is longer than its 18 in 21.5
    let (rejects, longest) = plan(1.5, 0.2, 0.2);
    assert!(rejects <= 18 && longest < 21.55, "{rejects} in {longest}");
}

#[test]
fn truncated_plans_keep_both_risks_and_stop_early() {
    for (ratio, alpha, beta) in
        [(1.05, 0.1, 0.1), (1.5, 0.1, 0.1), (2.0, 0.05, 0.2), (3.0, 0.01, 0.01), (10.0, 0.1, 0.001), (30.0, 0.4, 0.4)]
    {
        let (good, bad) = (0.002, 0.002 * ratio);
        let plan = SequentialPlan::with_risks(good, bad, alpha, beta).unwrap();
        let fixed = SequentialPlan::fixed_with_risks(good, bad, alpha, beta).unwrap();
        let (at_good, at_bad) = (plan.at_rate(good).unwrap(), plan.at_rate(bad).unwrap());
        assert!(at_good.reject <= alpha && at_bad.accept <= beta, "{ratio}: {at_good:?} {at_bad:?}");
        close(at_good.accept + at_good.reject, 1.0, 1e-11);
        assert!(plan.longest() <= 1.4 * fixed.longest(), "{ratio}: {} {}", plan.longest(), fixed.longest());
        if fixed.accept_at.len() == 1 {
            assert_eq!(plan, fixed);
        } else {
            assert!(at_good.expected_exposure < 0.8 * fixed.longest(), "{ratio}: {at_good:?} {}", fixed.longest());
        }
    }
    // the same question in another unit has the same plan
    let (hours, seconds) = (
        SequentialPlan::with_risks(0.5, 1.0, 0.1, 0.1).unwrap(),
        SequentialPlan::with_risks(0.5 / 3600.0, 1.0 / 3600.0, 0.1, 0.1).unwrap(),
    );
    assert_eq!(hours.accept_at.len(), seconds.accept_at.len());
    close(seconds.longest(), hours.longest() * 3600.0, 1e-9);
}

#[test]
fn plans_without_sense_or_end_are_refused_and_named() {
    for search in [SequentialPlan::with_risks, SequentialPlan::fixed_with_risks] {
        let told = search(1.0, 1.04, 0.1, 0.1).unwrap_err().to_string();
        assert_eq!(
            told,
            "bad over good rate 1.04 is out of range: give a bad rate of at least 1.05 times the good one"
        );
        assert!(matches!(search(1.0, 1.06, 1e-9, 1e-9), Err(StatsError::TooClose { .. })));
        assert!(matches!(search(2.0, 1.0, 0.1, 0.1), Err(StatsError::NotPositive { .. })));
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(search(bad, 2.0, 0.1, 0.1).is_err() && search(1.0, bad, 0.1, 0.1).is_err(), "{bad}");
            assert!(search(1.0, 2.0, bad, 0.1).is_err() && search(1.0, 2.0, 0.1, bad).is_err(), "{bad}");
        }
        assert!(matches!(search(1.0, 2.0, 0.5, 0.1), Err(StatsError::OutOfRange { .. })));
        assert!(matches!(search(1.0, 2.0, 0.1, 1e-10), Err(StatsError::OutOfRange { .. })));
    }
}

/// A control that never fails leaves a closed form: equal rates would give each side half of the events (with three
/// times the exposure of the control, a quarter), so at 5 % five events, all on the first side, reject (three:
/// ½⁵ = 0.03, ¼³ = 0.016). The exposure is then that of 4 (2) failures in NIST/SEMATECH e-Handbook 8.3.1.1, where the
/// factor of 4 failures at 90 % is 7.99.
#[test]
fn comparing_with_a_clean_control_has_a_closed_form() {
    let even = stats::exposure_to_compare(2.0, 0.0, 1.0, 0.05, 0.9).unwrap();
    assert!((even * 2.0 - 7.99).abs() < 0.005, "{even}");
    close(even * 2.0, stats::test_length_factor(4, 0.9).unwrap(), 1e-12);
    let long_control = stats::exposure_to_compare(2.0, 0.0, 3.0, 0.05, 0.8).unwrap();
    close(long_control * 2.0, stats::test_length_factor(2, 0.8).unwrap(), 1e-12);
}

/// Held against the exact power at exposures on both sides, over the teeth of the saw.
#[test]
fn power_stays_above_from_the_answer_on_and_not_before() {
    for (first, second, ratio, level, power) in [
        (2.0, 1.0, 1.0, 0.05, 0.9),
        (0.01, 0.004, 2.0, 0.01, 0.8),
        (5.0, 0.1, 20.0, 0.05, 0.5),
        (1e-6, 5e-7, 0.2, 1e-4, 0.95),
        (3.0, 0.001, 300.0, 0.05, 0.3),
        (1.2, 1.0, 1.0, 0.05, 0.9),
    ] {
        let answer = stats::exposure_to_compare(first, second, ratio, level, power).unwrap();
        let at = |exposure: f64| {
            let (one, other) = ((first * exposure, exposure), (second * ratio * exposure, ratio * exposure));
            stats::comparison_power(one, other, level).unwrap()
        };
        close(at(answer), power, 1e-9);
        assert!(at(answer * (1.0 - 1e-6)) < power, "{first} {second}");
        for step in 1..60 {
            let later = answer * (1.0 + 0.02 * f64::from(step));
            assert!(at(later) > power, "{first} {second}: {} at {later}", at(later));
        }
    }
}

#[test]
fn showing_a_bound_is_the_counting_plan_seen_from_the_other_side() {
    // no failures expected: the zero-failure exposure itself, −ln 0.05 / bound
    let clean = stats::exposure_to_show_below(0.002, 0.0, 0.95, 0.9).unwrap();
    assert_eq!((clean.failures_allowed, clean.probability), (0, 1.0));
    close(clean.exposure, -(0.05_f64.ln()) / 0.002, 1e-12);
    for (bound, rate, confidence, probability) in [(1.0, 0.5, 0.9, 0.9), (0.01, 0.001, 0.95, 0.8), (3.0, 2.0, 0.8, 0.8)]
    {
        let found = stats::exposure_to_show_below(bound, rate, confidence, probability).unwrap();
        let plan = SequentialPlan::fixed_with_risks(rate, bound, 1.0 - probability, 1.0 - confidence).unwrap();
        assert_eq!(found.failures_allowed as usize + 1, plan.accept_at.len());
        close(found.exposure, plan.longest(), 1e-9);
        assert!(found.probability >= probability);
        let upper = stats::garwood_upper(found.failures_allowed, found.exposure, confidence).unwrap();
        close(upper, bound, 1e-12);
    }
    // close rates take millions of failures, and are still worked out
    let close_by = stats::exposure_to_show_below(1.0, 0.999, 0.95, 0.9).unwrap();
    assert!(close_by.failures_allowed > 8_000_000 && close_by.probability >= 0.9, "{close_by:?}");
}

#[test]
fn exposures_without_sense_are_refused_and_named() {
    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(stats::exposure_to_compare(bad, 1.0, 1.0, 0.05, 0.9).is_err(), "{bad}");
        assert!(stats::exposure_to_compare(2.0, 1.0, bad, 0.05, 0.9).is_err(), "{bad}");
        assert!(stats::exposure_to_compare(2.0, 1.0, 1.0, bad, 0.9).is_err(), "{bad}");
        assert!(stats::exposure_to_compare(2.0, 1.0, 1.0, 0.05, bad).is_err(), "{bad}");
        assert!(stats::exposure_to_show_below(bad, 0.5, 0.95, 0.9).is_err(), "{bad}");
        assert!(stats::exposure_to_show_below(1.0, 0.5, bad, 0.9).is_err(), "{bad}");
        assert!(stats::exposure_to_show_below(1.0, 0.5, 0.95, bad).is_err(), "{bad}");
        if bad != 0.0 {
            assert!(stats::exposure_to_compare(2.0, bad, 1.0, 0.05, 0.9).is_err(), "{bad}");
            assert!(stats::exposure_to_show_below(1.0, bad, 0.95, 0.9).is_err(), "{bad}");
        }
    }
    let same = stats::exposure_to_compare(1.0, 1.0, 1.0, 0.05, 0.9).unwrap_err().to_string();
    assert_eq!(same, "first minus second rate 0 is not positive and finite: give a first rate above the second");
    assert!(matches!(stats::exposure_to_compare(1.001, 1.0, 1.0, 0.05, 0.9), Err(StatsError::TooClose { .. })));
    assert!(matches!(stats::exposure_to_compare(2.0, 1.0, 1e5, 0.05, 0.9), Err(StatsError::OutOfRange { .. })));
    let same = stats::exposure_to_show_below(1.0, 1.0, 0.95, 0.9).unwrap_err().to_string();
    assert_eq!(same, "bound minus true rate 0 is not positive and finite: give a true rate below the bound");
    let near = stats::exposure_to_show_below(1.0, 1.0 - 1e-9, 0.95, 0.9);
    assert!(matches!(near, Err(StatsError::TooClose { .. })), "{near:?}");
}
