//! One output; and a fault of either role, in computing, loading or storing, shows in the digest that the file's head names.

use super::super::common_carry::Baseline;
use super::super::common_meet::tests::{case, every_variant_agrees};
use super::*;

#[test]
fn variants_and_runs_agree() {
    let out = every_variant_agrees(&PingPong);
    let mut words = out.clone();
    words.sort_unstable();
    words.dedup();
    assert_eq!(words.len(), 2 * HALF, "every digest is another");
}

/// What goes wrong, by whom, in which kind and step.
struct Wrong {
    received: bool,
    made: bool,
    stored: bool,
    role: usize,
    kind: usize,
    step: usize,
}

impl Wrong {
    fn spoil(&self, yes: bool, role: usize, kind: usize, step: usize, words: &mut [u64]) {
        if yes && (role, kind, step) == (self.role, self.kind, self.step) {
            words[5] ^= 1 << 63;
        }
    }
}

impl Fault for Wrong {
    fn received(&self, role: usize, kind: usize, step: usize, words: &mut [u64]) {
        self.spoil(self.received, role, kind, step, words);
    }
    fn made(&self, role: usize, kind: usize, step: usize, words: &mut [u64]) {
        self.spoil(self.made, role, kind, step, words);
    }
    fn stored(&self, role: usize, kind: usize, step: usize, words: &mut [u64]) {
        self.spoil(self.stored, role, kind, step, words);
    }
}

/// Words that a fault makes wrong, by role, kind, quarter, received or made.
fn wrong_words(fault: &Wrong) -> Vec<(usize, usize, usize, usize)> {
    let right = every_variant_agrees(&PingPong);
    let [first, second] = roles(&case(&PingPong), Variant::Portable);
    let mut out = vec![0; 2 * HALF];
    let (low, high) = out.split_at_mut(HALF);
    std::thread::scope(|s| {
        s.spawn(|| second.run_with(high, |shared, role, moves| play(Baseline, shared, role, moves, fault)));
        first.run_with(low, |shared, role, moves| play(Baseline, shared, role, moves, fault));
    });
    (0..2 * HALF)
        .filter(|&i| out[i] != right[i])
        .map(|i| (i / HALF, i % HALF / (2 * QUARTERS), i / 2 % QUARTERS, i % 2))
        .collect()
}

#[test]
fn the_first_wrong_digest_tells_who_did_what() {
    for kind in 0..KINDS {
        for role in 0..2 {
            let step = QUARTER + 3;
            let at = |received, made, stored| wrong_words(&Wrong { received, made, stored, role, kind, step });
            let quarter = |list: &[(usize, usize, usize, usize)]| -> Vec<(usize, usize)> {
                assert!(list.iter().all(|&(_, k, q, _)| k == kind && q >= 1), "nothing before, nothing elsewhere");
                list.iter().filter(|w| w.2 == 1).map(|w| (w.0, w.3)).collect()
            };
            // in the next steps the partner receives it, and so on: both are wrong from then on
            let computed = quarter(&at(false, true, false));
            assert!(computed.contains(&(role, 1)), "what it made is wrong");
            let loaded = quarter(&at(true, false, false));
            assert!(loaded.contains(&(role, 0)), "what it received is wrong");
            let stored = quarter(&at(false, false, true));
            assert!(stored.contains(&(1 - role, 0)), "what the partner received is wrong");
        }
    }
}

#[test]
fn in_the_last_step_of_a_quarter_the_digests_part() {
    for role in 0..2 {
        let at = |received, made, stored| {
            let step = 2 * QUARTER - 1;
            let list = wrong_words(&Wrong { received, made, stored, role, kind: 2, step });
            list.into_iter().filter(|w| w.2 == 1).map(|w| (w.0, w.3)).collect::<Vec<_>>()
        };
        assert_eq!(at(true, false, false), [(role, 0), (role, 1)], "loaded wrongly");
        assert_eq!(at(false, true, false), [(role, 1)], "computed wrongly");
        assert_eq!(at(false, false, true), [], "stored wrongly: the partner's next quarter");
    }
}
