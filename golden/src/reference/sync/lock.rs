//! `sync.lock`: all updates of a record at once, since they commute.

use kernels::Case;

use super::common_words::{chain, cut, mix};
use crate::reference::chacha::Stream;

const LOCKS: usize = 5;
const ROUNDS: usize = 48;

/// The output words of role 0, then of role 1.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let setups: Vec<Vec<u64>> = (0..LOCKS).map(|_| stream.words(46)).collect();
    let roles: Vec<Vec<u64>> = (0..2).map(|_| stream.words(LOCKS * ROUNDS)).collect();
    let count = 2 * ROUNDS as u64;
    let mut output = vec![];
    for mine in &roles {
        for (lock, setup) in setups.iter().enumerate() {
            let added =
                |role: &Vec<u64>| role.iter().skip(lock).step_by(LOCKS).fold(0u64, |sum, &x| sum.wrapping_add(x));
            let all = roles.iter().map(added).fold(0u64, u64::wrapping_add);
            let digest = (0..30).fold(0, |digest, i| {
                let pair = setup[31 + i / 2];
                let number = if i % 2 == 0 { cut(pair, 32) } else { pair / (1 << 32) };
                chain(digest, setup[i].wrapping_add(all).wrapping_add(number * count))
            });
            let sum = setup[30].wrapping_add(all);
            output.extend([0, added(mine), count, sum, digest, mix(sum).wrapping_sub(mix(setup[30]))]);
        }
    }
    output
}
