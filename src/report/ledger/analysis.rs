//! Exact tests on where and when outputs were wrong: is one lane, one condition, a warm core over-represented?
//!
//! Every lane and every condition that was looked at is one test, and Holm's step-down corrects for their number. The unit
//! is what may be taken as independent: a failing case for lanes, an episode for conditions and temperature.

use serde::Serialize;

use crate::ledger::places::Places;
use crate::ledger::wrongs::{EpisodeOf, Work, Wrongs};
use crate::report::figures::short;
use crate::stats::{Observed, compare_rates, fisher_exact, holm};

/// Below this corrected p something is called suggested.
pub const SMALL: f64 = 0.01;

/// A p for people.
pub fn p_text(p: f64) -> String {
    format!("p = {}", short(p))
}

/// The lane that stands out most.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LaneTest {
    /// Datapath width, bits.
    pub width_bits: usize,
    /// Lane size, bits.
    pub lane_bits: usize,
    /// Which.
    pub lane: usize,
    /// Failing cases with this lane alone wrong.
    pub cases: u64,
    /// Failing cases with one lane wrong.
    pub of: u64,
    /// Failing cases with several lanes wrong, all next to each other.
    pub adjacent: u64,
    /// Failing cases with several others.
    pub scattered: u64,
    /// Exact binomial, one-sided, each lane as likely as the others, Holm over all lanes looked at.
    pub p: f64,
    /// Lanes looked at, over all widths and lane sizes.
    pub looked_at: usize,
}

/// The lane with the smallest p, the wider datapath and larger lane of several; `None` where no case could be placed.
pub fn lanes(places: &Places) -> Option<LaneTest> {
    let mut tests = Vec::new();
    for place in &places.places {
        let of: u64 = place.one.iter().sum();
        if of == 0 {
            continue;
        }
        let others = (place.one.len() - 1) as f64;
        for (lane, &cases) in place.one.iter().enumerate() {
            let (here, elsewhere) =
                (Observed { events: cases, exposure: 1.0 }, Observed { events: of - cases, exposure: others });
            let p = compare_rates(here, elsewhere, 1.0).map_or(1.0, |t| t.p_greater);
            tests.push((place, lane, cases, of, p));
        }
    }
    let corrected = holm(&tests.iter().map(|t| t.4).collect::<Vec<f64>>()).ok()?;
    let looked_at = tests.len();
    // Holm keeps the order and caps at 1: the uncorrected p tells apart what the corrected ones no longer do
    let ((place, lane, cases, of, _), p) = tests
        .into_iter()
        .zip(corrected)
        .min_by(|((a, .., p), _), ((b, .., q), _)| p.total_cmp(q).then((b.width, b.lane).cmp(&(a.width, a.lane))))?;
    Some(LaneTest {
        width_bits: place.width,
        lane_bits: place.lane,
        lane,
        cases,
        of,
        adjacent: place.adjacent,
        scattered: place.scattered,
        p,
        looked_at,
    })
}

/// A condition's part of the episodes against its part of the busy time.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ConditionTest {
    /// Condition without the footprint.
    pub condition: String,
    /// Episodes that began under it.
    pub episodes: u64,
    /// All episodes.
    pub of: u64,
    /// Its part of the busy time, 0 to 1.
    pub busy_share: f64,
    /// Exact conditional test of two rates, one-sided, Holm over all conditions looked at.
    pub p: f64,
    /// Conditions looked at.
    pub looked_at: usize,
}

/// Every condition that was run, the most over-represented first; empty where only one was.
pub fn conditions(wrongs: &Wrongs, work: &Work, episodes: &[EpisodeOf]) -> Vec<ConditionTest> {
    let all_ns: u128 = work.busy_ns.values().sum();
    let run: Vec<(usize, u128)> = work.busy_ns.iter().map(|(s, ns)| (*s, *ns)).filter(|(_, ns)| *ns > 0).collect();
    if run.len() < 2 || episodes.is_empty() {
        return Vec::new();
    }
    let of = episodes.len() as u64;
    let count = |setting| episodes.iter().filter(|e| e.first.setting == setting).count() as u64;
    let p = |(setting, ns): &(usize, u128)| {
        let here = Observed { events: count(*setting), exposure: *ns as f64 };
        let elsewhere = Observed { events: of - count(*setting), exposure: (all_ns - ns) as f64 };
        compare_rates(here, elsewhere, 1.0).map_or(1.0, |t| t.p_greater)
    };
    let Ok(corrected) = holm(&run.iter().map(p).collect::<Vec<f64>>()) else { return Vec::new() };
    let mut tests: Vec<ConditionTest> = run
        .iter()
        .zip(corrected)
        .map(|((setting, ns), p)| ConditionTest {
            condition: wrongs.settings.name(*setting).to_owned(),
            episodes: count(*setting),
            of,
            busy_share: *ns as f64 / all_ns as f64,
            p,
            looked_at: run.len(),
        })
        .collect();
    tests.sort_by(|a, b| a.p.total_cmp(&b.p).then(b.episodes.cmp(&a.episodes)));
    tests
}

/// Whether episodes begin in warmer or cooler slices than the clean ones are.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct HeatTest {
    /// Half of the clean slices, or as near as whole degrees allow, were at this temperature or above, °C.
    pub from_celsius: i64,
    /// Episodes whose first wrong slice was so warm.
    pub episodes: u64,
    /// Episodes with a reading.
    pub of: u64,
    /// Clean slices that were so warm.
    pub clean: u64,
    /// Clean slices with a reading.
    pub of_clean: u64,
    /// Fisher's exact test, two-sided.
    pub p: f64,
}

/// `None` without readings, or where all clean slices had the same.
pub fn heat(work: &Work, episodes: &[EpisodeOf]) -> Option<HeatTest> {
    let of_clean: u64 = work.clean_celsius.values().sum();
    let from = |c: i64| work.clean_celsius.range(c..).map(|(_, n)| n).sum::<u64>();
    let from_celsius = *work.clean_celsius.keys().skip(1).min_by_key(|c| (2 * from(**c)).abs_diff(of_clean))?;
    let clean = from(from_celsius);
    let readings: Vec<f64> = episodes.iter().filter_map(|e| e.first.celsius).collect();
    let of = readings.len() as u64;
    let warm = readings.iter().filter(|c| **c >= from_celsius as f64).count() as u64;
    if of == 0 {
        return None;
    }
    let p = fisher_exact([[warm, of - warm], [clean, of_clean - clean]]).ok()?.p_two_sided;
    Some(HeatTest { from_celsius, episodes: warm, of, clean, of_clean, p })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// (1/8)^n by hand: n cases all in one of eight lanes; 42 lanes looked at, and Holm multiplies the smallest p by 42.
    #[test]
    fn one_lane_of_eight_is_found_at_the_width_that_shows_it() {
        let mut places = Places::default();
        for case in 0..6 {
            // high halves of words 1 and 5 by turns: lanes 3 and 11 of 512 bits, one lane of 256
            places.add(&[(1 + 4 * (case % 2), 0x3fc << 32)], 8);
        }
        let test = lanes(&places).unwrap();
        assert_eq!((test.width_bits, test.lane_bits, test.lane, test.cases, test.of), (256, 32, 3, 6, 6));
        assert_eq!(test.looked_at, 2 + 4 + 4 + 8 + 8 + 16);
        let expected = 42.0 / 8f64.powi(6);
        assert!((test.p / expected - 1.0).abs() < 1e-9, "{} against {expected}", test.p);
        assert!(lanes(&Places::default()).is_none());
    }

    #[test]
    fn cases_all_over_the_vector_suggest_nothing() {
        let mut places = Places::default();
        for word in 0..64 {
            places.add(&[(word % 8, 1 << (word % 64))], 8);
        }
        assert!(lanes(&places).unwrap().p > SMALL);
    }

    fn episode(celsius: f64) -> EpisodeOf {
        let slice = crate::ledger::episodes::BadSlice {
            job_id: 1,
            slice: 1,
            first_ms: 1,
            last_ms: 1,
            runs: 1,
            busy_ns: 1,
            mismatches: 1,
            fold_wrong: false,
        };
        let first = crate::ledger::wrongs::Bad { slice, kernel: 0, setting: 0, celsius: Some(celsius) };
        let episode = crate::ledger::Episode { first_ms: 1, last_ms: 1, mismatches: 1, slices: 1 };
        EpisodeOf { episode, kernels: Default::default(), first }
    }

    /// Fisher's tea tasting (The Design of Experiments, 1935, II): 4 and 0 against 0 and 4 has p = 2/70 two-sided.
    #[test]
    fn warm_episodes_are_held_against_warm_clean_slices() {
        let work = Work { clean_celsius: [(50, 4), (70, 0)].into(), ..Work::default() };
        let test = heat(&work, &[71.0, 72.0, 70.0, 90.0].map(episode)).unwrap();
        assert_eq!((test.from_celsius, test.episodes, test.of, test.clean, test.of_clean), (70, 4, 4, 0, 4));
        assert!((test.p - 2.0 / 70.0).abs() < 1e-12, "{}", test.p);
        assert!(heat(&work, &[]).is_none());
        let same = Work { clean_celsius: [(50, 4)].into(), ..Work::default() };
        assert!(heat(&same, &[episode(50.0)]).is_none(), "nothing tells warm from cool");
    }
}
