//! `sync.ordering`: nothing forbidden, nothing foreign, and the last value of each place that only one store can have left.

use kernels::Case;

use super::common_words::chain;
use crate::reference::chacha::Stream;

const TIMES: usize = 32;

/// Of each shape, in order: how many registers role 0 and role 1 load, and which value is left in X and Y, if determined.
const SHAPES: [([usize; 2], [Option<usize>; 2]); 17] = [
    ([0, 2], [Some(1), Some(1)]),
    ([0, 2], [Some(1), Some(1)]),
    ([0, 2], [Some(1), Some(1)]),
    ([1, 1], [Some(1), Some(1)]),
    ([1, 1], [Some(1), Some(1)]),
    ([1, 1], [Some(1), Some(1)]),
    ([1, 1], [Some(1), Some(1)]),
    ([1, 1], [Some(1), Some(1)]),
    ([0, 1], [None, Some(1)]),
    ([0, 1], [Some(1), None]),
    ([0, 0], [None, None]),
    ([0, 2], [Some(1), Some(0)]),
    ([0, 2], [Some(2), Some(0)]),
    ([1, 0], [None, Some(0)]),
    ([1, 0], [None, Some(0)]),
    ([2, 2], [Some(1), Some(1)]),
    ([1, 1], [None, Some(0)]),
];

const MARKS: [u64; 3] = [0, 0x9e37_79b9_7f4a_7c15, 0x6a09_e667_f3bc_c908];

/// The output words of role 0, then of role 1.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let mut output = [vec![], vec![]];
    for (registers, ends) in SHAPES {
        let bases: Vec<[u64; 2]> = (0..TIMES).map(|_| [stream.word(), stream.word()]).collect();
        for (role, words) in output.iter_mut().enumerate() {
            let digest = bases.iter().fold(0, |digest, base| {
                // nothing is foreign in any register
                let digest = (0..registers[role]).fold(digest, |digest, _| chain(digest, 0));
                let left = |place: usize| ends[place].map_or(0, |number| base[place] ^ MARKS[number]);
                chain(chain(digest, left(0)), left(1))
            });
            words.extend([0, 0, digest]);
        }
    }
    output.concat()
}
