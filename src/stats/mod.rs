//! Pure numbers: counts and times in, estimates with honest limits out. Knows no core, kernel or ledger.
//!
//! Exact methods stay exact from one run to 10^12 runs and from confidence 0.5 to 1 − 10⁻⁹; `scripts/check-stats.py`
//! measures that against independent implementations.
//!
//! | question | calculator |
//! |---|---|
//! | how likely is a mismatch per run? | [`clopper_pearson`], [`mid_p`], [`wilson`], [`exact_test`] |
//! | how many per hour? | [`garwood`], [`mid_p_rate`] |
//! | what does silence prove, how long must it last? | [`upper_per_run`], [`upper_rate`], [`exposure_needed`], [`success_runs`], [`demonstration_runs`], [`mtbf`], [`fit_rate`] |
//! | is this core worse than that one? | [`compare_rates`], [`rate_ratio`], [`fisher_exact`], [`odds_ratio`] |
//! | does the rate go with the temperature? | [`log_linear()`] |
//! | do failures cluster, and what then? | [`episodes()`], [`dispersion()`], [`Clusters`], [`clustered_rate`], [`clustered_share`], [`compare_clustered`], [`negative_binomial_rate`] |
//! | which interval holds for these counts? | [`Scatter`] |
//! | what is a ratio of totals worth whose parts differ? | [`jackknife_ratio`] |
//! | many cells with few events? | [`GammaPrior`] |
//! | may the test stop now? | [`SequentialPlan`], [`RunLines`] |
//! | would the test notice? | [`detection_probability`], [`exposure_to_detect`], [`comparison_power`] |
//! | how long must it last to notice, to compare, to prove? | [`exposure_to_compare`], [`exposure_to_show_below`], [`SequentialPlan::with_risks`] |
//! | what of many tests at once? | [`holm`], [`benjamini_hochberg`] |

mod binomial;
mod choice;
mod cluster;
mod compare;
mod conditional;
mod dispersion;
mod episodes;
mod fisher;
mod interval;
mod jackknife;
mod law;
mod log_linear;
mod multiple;
mod negative_binomial;
mod numerics;
mod plan_search;
mod poisson;
mod power;
mod sequential;
mod shrinkage;
mod walk;
mod zero_failure;

pub use binomial::{clopper_pearson, clopper_pearson_lower, clopper_pearson_upper, exact_test, mid_p, wilson};
pub use choice::{Choice, Counted, Method, Scatter, Stated};
pub use cluster::{ClusteredShare, ClusteredTest, Clusters, clustered_rate, clustered_share, compare_clustered};
pub use compare::{Observed, RateTest, compare_rates, rate_ratio};
pub use dispersion::{Dispersion, dispersion, dispersion_with_exposure};
pub use episodes::{Episode, episodes};
pub use fisher::{FisherTest, fisher_exact, odds_ratio, odds_ratio_lower};
pub use interval::{Interval, StatsError};
pub use jackknife::{JackknifeRatio, jackknife_ratio};
pub use log_linear::{LogLinear, Reading, log_linear};
pub use multiple::{benjamini_hochberg, bonferroni, hochberg, holm, rejections};
pub use negative_binomial::{NegativeBinomial, negative_binomial_rate};
pub use poisson::{garwood, garwood_lower, garwood_upper, mid_p_rate, poisson_at_least};
pub use power::{
    ShowBelow, comparison_power, detection_probability, exposure_to_compare, exposure_to_detect, exposure_to_show_below,
};
pub use sequential::{OperatingPoint, RunLines, SequentialPlan};
pub use shrinkage::GammaPrior;
pub use zero_failure::{
    demonstration_runs, exposure_needed, fit_rate, mtbf, rule_of_three, success_runs, test_length_factor,
    upper_per_run, upper_rate,
};
