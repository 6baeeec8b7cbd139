//! What a wrong bit does to a chain, and that chains stay apart and in range.

use std::collections::HashSet;

use kernels::{Seed, Size};

use super::super::{chain32, chain64};
use super::*;

fn case(kernel: &'static str, seed: u64) -> Case {
    Case { kernel, seed: Seed(seed), size: Size(22) }
}

/// (kernel, plan) of both formats.
const BOTH: [(&str, Plan); 2] = [("fma.chain32", chain32::PLAN), ("fma.chain64", chain64::PLAN)];

/// Share of wrong fraction bits, put in after a random step, that still show at the end.
fn share_shown(kernel: &'static str, plan: &Plan, parity: u64) -> f64 {
    let (mut shown, mut tries) = (0u32, 0u32);
    for seed in (parity..16).step_by(2) {
        let drive = plan.drive(&case(kernel, seed));
        let mut dice = Stream::new(&Case { kernel: "dice", seed: Seed(seed), size: Size(0) });
        for _ in 0..250 {
            let chain = dice.word() as usize % drive.starts.len();
            let at = dice.word() as usize % (4 * ROWS * REPEATS);
            let bit = 1 << (dice.word() % u64::from(plan.format.fraction_bits));
            let right = end(plan, &drive, chain, |_, x| x);
            let wrong = end(plan, &drive, chain, |step, x| if step == at { x ^ bit } else { x });
            tries += 1;
            shown += u32::from(right != wrong);
        }
    }
    f64::from(shown) / f64::from(tries)
}

#[test]
fn wrong_bits_show_at_the_end() {
    for ((kernel, plan), floors) in BOTH.iter().zip([[0.995, 0.99], [0.998, 0.995]]) {
        for parity in [0, 1] {
            let share = share_shown(kernel, plan, parity);
            println!("{kernel} {} seeds: {:.2} % shown", ["even", "odd"][parity as usize], 100.0 * share);
            assert!(share >= floors[parity as usize], "{kernel}, parity {parity}: {share}");
        }
    }
}

#[test]
fn chains_stay_apart() {
    for (kernel, plan) in &BOTH {
        for seed in 0..32 {
            let mut all = ends(plan, &case(kernel, seed));
            all.truncate(all.len() - plan.lanes);
            // sign aside: the fold would make equals of opposites
            let distinct: HashSet<u64> = all.iter().map(|x| x & (plan.format.sign_bit() - 1)).collect();
            println!("{kernel} seed {seed}: {} of {}", distinct.len(), all.len());
            // two of 2^24 states can meet by chance; more would be a pull
            assert!(distinct.len() + 2 >= all.len(), "{kernel} seed {seed}: {} of {}", distinct.len(), all.len());
        }
    }
}

/// Exponents as the encoding has them: nothing infinite, the bounded profile below 1, the other from subnormal to huge.
#[test]
fn profiles_are_what_they_say() {
    for (kernel, plan) in &BOTH {
        let f = plan.format;
        for seed in 0..8 {
            let drive = plan.drive(&case(kernel, seed));
            let (mut subnormal, mut steps, mut huge) = (0u32, 0u32, 0u64);
            for chain in 0..plan.lanes {
                end(plan, &drive, chain, |step, x| {
                    let size = x & (f.sign_bit() - 1);
                    assert!(size < f.infinity() && size != 0, "{kernel} seed {seed} chain {chain} step {step}");
                    subnormal += u32::from(size >> f.fraction_bits == 0);
                    steps += 1;
                    huge = huge.max(size >> f.fraction_bits);
                    x
                });
            }
            let one = f.emax() as u64;
            println!("{kernel} seed {seed}: {subnormal} of {steps} subnormal, largest 2^{}", huge as i64 - one as i64);
            if seed % 2 == 0 {
                assert!(
                    huge < one && subnormal == 0,
                    "{kernel} seed {seed}: 2^{} {subnormal}",
                    huge as i64 - one as i64
                );
            } else {
                assert!(huge > one * 8 / 5 && subnormal > steps / 100, "{kernel} seed {seed}: {subnormal}");
            }
        }
    }
}
