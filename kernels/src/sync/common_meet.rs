//! How the two roles of a pair meet and wait, and how they digest what they saw.

use std::hint::spin_loop;
use std::sync::atomic::{AtomicU64, Ordering};

/// Two cache lines of its own: some CPUs fetch the neighbour of a line together with it.
#[repr(C, align(128))]
#[derive(Debug, Default)]
pub struct Apart<T>(pub T);

/// Spins after which a waiting role offers its cpu to others. Far above what a partner on another cpu takes, so that it
/// does not come to it there; but where both roles share one cpu the partner cannot go on before the waiter lets it.
const PATIENCE: u32 = 1000;

/// Spins until `done`. There is no time-out: a partner that has been descheduled is only slow. Where a fault lost what is
/// waited for, the wait has no end: whoever runs the pair has to give it a deadline, and to take its expiry for an outcome.
#[inline(always)]
pub fn wait(mut done: impl FnMut() -> bool) {
    let mut spins = 0;
    while !done() {
        spins += 1;
        if spins < PATIENCE {
            spin_loop();
        } else {
            give_way();
        }
    }
}

/// Outlined, so that the waiting loop itself stays small.
#[cold]
fn give_way() {
    std::thread::yield_now();
}

/// Spins that a role waits at most for its partner to draw level.
const LEVEL: u32 = 64;

/// Where the roles meet: each counts its arrivals on a line of its own.
pub struct Meeting {
    arrived: [Apart<AtomicU64>; 2],
    paced: [Apart<AtomicU64>; 2],
}

impl Meeting {
    /// Nobody has arrived.
    pub fn new() -> Meeting {
        Meeting { arrived: Default::default(), paced: Default::default() }
    }

    /// Arrives as `role` and waits until the partner has arrived as often. What either did before, both see after.
    #[inline(always)]
    pub fn meet(&self, role: usize) {
        // only this role writes its counter
        let count = self.arrived[role].0.load(Ordering::Relaxed) + 1;
        self.arrived[role].0.store(count, Ordering::Release);
        wait(|| self.arrived[1 - role].0.load(Ordering::Acquire) >= count);
    }

    /// Counts a step of `role` and waits a little for the partner to take as many: keeps roles abreast that both have a cpu,
    /// and holds up nobody whose partner has none. Nothing may rest on it, and it orders nothing.
    #[inline(always)]
    pub fn draw_level(&self, role: usize) {
        let count = self.paced[role].0.load(Ordering::Relaxed) + 1;
        self.paced[role].0.store(count, Ordering::Relaxed);
        for _ in 0..LEVEL {
            if self.paced[1 - role].0.load(Ordering::Relaxed) >= count {
                break;
            }
            spin_loop();
        }
    }

    /// How often both have arrived.
    pub fn met(&self) -> u64 {
        let [first, second] = &self.arrived;
        first.0.load(Ordering::Acquire).min(second.0.load(Ordering::Acquire))
    }
}

impl Default for Meeting {
    fn default() -> Meeting {
        Meeting::new()
    }
}

/// A digest that takes `word` in: a bijection of either, so that one wrong word always shows, and one that tells places
/// apart, so that two equal errors do not cancel.
#[inline(always)]
pub fn chain(digest: u64, word: u64) -> u64 {
    (digest ^ word).wrapping_mul(0x9e37_79b9_7f4a_7c15).rotate_left(29)
}

/// splitmix64's finaliser (Steele, Lea, Flood, OOPSLA 2014; constants from memory): a bijection that spreads every bit.
#[inline(always)]
pub fn mix(word: u64) -> u64 {
    let z = (word ^ word >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let z = (z ^ z >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ z >> 31
}

#[cfg(test)]
pub(crate) mod tests {
    use super::*;
    use crate::isa;
    use crate::kernel::Ready;
    use crate::{Case, Kernel, Roles, Seed};

    /// The first four outputs of the published splitmix64 for the seed 1234567 (as several public implementations list
    /// them; from memory): output n is the finaliser of seed + n times the golden gamma.
    #[test]
    fn mix_is_the_finaliser_of_splitmix64() {
        let gamma = 0x9e37_79b9_7f4a_7c15u64;
        let outputs: Vec<u64> = (1..=4u64).map(|n| mix(1_234_567u64.wrapping_add(n.wrapping_mul(gamma)))).collect();
        assert_eq!(
            outputs,
            [
                6_457_827_717_110_365_317,
                3_203_168_211_198_807_973,
                9_817_491_932_198_370_423,
                4_593_380_528_125_082_431
            ]
        );
    }

    #[test]
    fn chain_tells_places_and_equal_errors_apart() {
        let digest = |words: [u64; 3]| words.into_iter().fold(0, chain);
        let right = digest([5, 5, 7]);
        assert_ne!(right, digest([5, 7, 5]));
        for bit in 0..64 {
            let e = 1 << bit;
            for bad in
                [[5 ^ e, 5, 7], [5, 5 ^ e, 7], [5, 5, 7 ^ e], [5 ^ e, 5 ^ e, 7], [5, 5 ^ e, 7 ^ e], [5 ^ e, 5, 7 ^ e]]
            {
                assert_ne!(right, digest(bad), "bit {bit}");
            }
        }
    }

    /// A case of `kernel` outside the tables.
    pub fn case(kernel: &dyn Kernel) -> Case {
        Case { kernel: kernel.id(), seed: Seed(0x5eed), size: kernel.sizes()[0] }
    }

    /// Runs every variant that this CPU can run on two threads a few times: all outputs have to be the same.
    ///
    /// Returns that output.
    pub fn every_variant_agrees(kernel: &dyn Kernel) -> Vec<u64> {
        let case = case(kernel);
        let mut outputs = Vec::new();
        for (variant, proof) in isa::survey(kernel) {
            let Ok(proof) = proof else { continue };
            let mut roles: Roles = kernel.prepare(&case, proof);
            for fill in [0, u64::MAX, 1] {
                let mut out = vec![fill; kernel.output_words(case.size)];
                roles.run_anywhere(&mut out);
                outputs.push((variant, out));
            }
        }
        let (_, right) = outputs[0].clone();
        for (variant, out) in outputs {
            assert_eq!(out, right, "{variant}");
        }
        right
    }

    /// Runs the roles again and again beside a third thread that calls `stray` from the moment they have met in each run,
    /// until an output differs from `right`: that output. None if none does in `runs` runs.
    pub fn disturbed(
        mut roles: [Box<dyn Ready>; 2],
        right: &[u64],
        meeting: &Meeting,
        runs: usize,
        stray: impl Fn() + Sync,
    ) -> Option<Vec<u64>> {
        let half = right.len() / 2;
        (0..runs).find_map(|_| {
            let before = meeting.met();
            let returned = AtomicU64::new(0);
            let mut out = vec![0; right.len()];
            let (low, high) = out.split_at_mut(half);
            let [first, second] = &mut roles;
            std::thread::scope(|s| {
                for (role, half) in [(first, low), (second, high)] {
                    let returned = &returned;
                    s.spawn(move || {
                        role.run(half);
                        returned.fetch_add(1, Ordering::Release);
                    });
                }
                wait(|| meeting.met() > before);
                while returned.load(Ordering::Acquire) < 2 {
                    stray();
                    std::thread::yield_now();
                }
            });
            (out != right).then_some(out)
        })
    }
}
