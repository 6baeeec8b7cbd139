//! `sync.pingpong`: each ball's path by itself, then the digests of who had it when.

use kernels::Case;

use super::common_words::chain;
use crate::reference::chacha::Stream;

const STEPS: usize = 32;
const LENGTHS: [usize; 4] = [7, 32, 32, 32];

/// The ball after each step, its start first.
fn path(start: &[u64], moves: impl Iterator<Item = Vec<u64>>) -> Vec<Vec<u64>> {
    let mut path = vec![start.to_vec()];
    for k in moves {
        let ball = &path[path.len() - 1];
        let mut next = ball.clone();
        // every word goes one place down, the first one to the end
        next.rotate_left(1);
        for (j, word) in next.iter_mut().enumerate() {
            let sum = (u128::from(*word) + u128::from(k[j % 8])) % (1 << 64);
            *word = ((sum << 23) % (1 << 64)) as u64 + (sum >> 41) as u64;
        }
        path.push(next);
    }
    path
}

/// The output words of role 0, then of role 1.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let starts: Vec<[Vec<u64>; 2]> = LENGTHS.iter().map(|&n| [stream.words(n), stream.words(n)]).collect();
    let mut output = [vec![], vec![]];
    for start in &starts {
        // by step, then role
        let moves: Vec<[Vec<u64>; 2]> = (0..STEPS).map(|_| [stream.words(8), stream.words(8)]).collect();
        let paths: Vec<Vec<Vec<u64>>> = (0..2)
            .map(|ball| path(&start[ball], moves.iter().enumerate().map(|(s, m)| m[(s + ball) % 2].clone())))
            .collect();
        for (role, words) in output.iter_mut().enumerate() {
            for quarter in 0..4 {
                for made in 0..2 {
                    let digest = (8 * quarter..8 * quarter + 8)
                        .flat_map(|s| paths[(s + role) % 2][s + made].iter().copied())
                        .fold(0, chain);
                    words.push(digest);
                }
            }
        }
    }
    output.concat()
}
