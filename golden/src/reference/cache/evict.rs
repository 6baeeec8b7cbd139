//! `cache.evict`: a sound memory gives each line back as it was left, so a round is its lines in the order of visiting.

use kernels::Case;

use crate::reference::chacha::Stream;

/// The eight lane digests of every round.
pub fn words(case: &Case) -> Vec<u64> {
    let (groups, rounds) = match case.size.0 {
        512 => (8, 8),
        4096 => (4, 4),
        _ => (2, 3),
    };
    let pages = u64::from(case.size.0) / 4;
    let mut stream = Stream::new(case);
    let (starts, first, update) = (stream.words(8), stream.words(8), stream.words(8));
    let _column = stream.word();
    let (step, round_step) = (stream.word() | 1, stream.word() | 1);

    let mut out = Vec::new();
    // what the rounds before have added to every line
    let mut added = [0u64; 8];
    for round in 0..rounds {
        let stride = [1, 16, 256][round as usize % 3].min(pages / 2);
        let mut visits = Vec::new();
        for g in 0..groups {
            // the n-th page visited: n counts up through a column of pages a stride apart, then the next column
            visits.extend((0..pages).map(|n| (n % (pages / stride) * stride + n / (pages / stride)) * groups + g));
        }
        if round % 2 == 1 {
            visits.reverse();
        }
        for lane in 0..8 {
            let (mut a, mut b) = (starts[lane].wrapping_add(round), 0u64);
            for n in &visits {
                let v = first[lane].wrapping_add(n.wrapping_mul(step)).wrapping_add(added[lane]);
                a = a.wrapping_add(v ^ (v / (1 << 32)));
                b = b.wrapping_add(a);
            }
            out.push(a.wrapping_add(b.wrapping_mul(0xa24b_aed4_963e_e407)));
            added[lane] = added[lane].wrapping_add(update[lane]).wrapping_add(round.wrapping_mul(round_step));
        }
    }
    out
}
