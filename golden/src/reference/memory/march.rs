//! `memory.march`: the elements played on a plain array of words, lane by lane.

use kernels::Case;

use super::common_digest::Lane;
use crate::reference::chacha::Stream;

/// March C− as it is written: order, read, write.
const ELEMENTS: [(char, &str, &str); 6] =
    [('u', "", "w0"), ('u', "r0", "w1"), ('u', "r1", "w0"), ('d', "r0", "w1"), ('d', "r1", "w0"), ('u', "r0", "")];

/// For each background, reading element and half the eight lane digests.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let starts = stream.words(8);
    let pattern = stream.words(8);
    let seeded = stream.words(8);
    let step = stream.word() | 1;
    let address: Vec<u64> = (0..8).map(|l| (8 * l) << 32 | (8 * l)).collect();
    let grounds = [(pattern, 0), (address, 64 << 32 | 64), (seeded, step)];

    let lines = case.size.0 as usize * 16;
    let mut out = vec![0; grounds.len() * 5 * 2 * 8];
    for lane in 0..8 {
        let mut cells = vec![0u64; lines];
        for (g, (start, step)) in grounds.iter().enumerate() {
            let zero = |i: usize| start[lane].wrapping_add((i as u64).wrapping_mul(*step));
            let mut reading = 0;
            for (order, read, write) in ELEMENTS {
                let mut digests =
                    [0, 1].map(|h| Lane::new(starts[lane].wrapping_add((10 * g + 2 * reading + h) as u64)));
                for n in 0..lines {
                    let i = if order == 'd' { lines - 1 - n } else { n };
                    if !read.is_empty() {
                        digests[usize::from(i >= lines / 2)].push(cells[i]);
                    }
                    match write {
                        "w0" => cells[i] = zero(i),
                        "w1" => cells[i] = !zero(i),
                        _ => {}
                    }
                }
                if !read.is_empty() {
                    for (h, digest) in digests.into_iter().enumerate() {
                        out[((g * 5 + reading) * 2 + h) * 8 + lane] = digest.finish();
                    }
                    reading += 1;
                }
            }
        }
    }
    out
}
