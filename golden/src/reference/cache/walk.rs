//! `cache.walk`: the laps played on a plain array of words.

use kernels::Case;

use crate::reference::chacha::Stream;

/// The segment digests of every lap.
pub fn words(case: &Case) -> Vec<u64> {
    let (laps, segments) = match case.size.0 {
        16 => (32, 4),
        256 => (8, 16),
        _ => (2, 64),
    };
    let lines = u64::from(case.size.0) * 16;
    let mut stream = Stream::new(case);
    let mut cycles = Vec::new();
    for _ in 0..4 {
        let (a, c) = (stream.word(), stream.word());
        cycles.push((a - a % 4 + 1, c | 1));
    }
    let tags = stream.words(4);
    let step = stream.word() | 1;
    let updates = stream.words(8);

    let mut link = Vec::new();
    let mut tag = Vec::new();
    for i in 0..lines {
        link.push(cycles.iter().map(|(a, c)| a.wrapping_mul(i).wrapping_add(*c) % lines).collect::<Vec<_>>());
        tag.push(tags.iter().map(|t| t.wrapping_add(i.wrapping_mul(step))).collect::<Vec<_>>());
    }
    let mut out = Vec::new();
    for lap in 0..laps {
        let mut i = 0u64;
        for _ in 0..segments {
            let mut digests = [0u64; 2];
            for _ in 0..lines / segments {
                let line = &mut tag[i as usize];
                for (which, digest) in digests.iter_mut().enumerate() {
                    let column = (i as usize + lap + which) % 4;
                    *digest = digest.wrapping_mul(0xd134_2543_de82_ef95).wrapping_add(line[column]);
                }
                let rewritten = (i as usize + lap + 1) % 4;
                line[rewritten] = line[rewritten].wrapping_add(updates[lap % 8]);
                i = link[i as usize][lap % 4];
            }
            out.extend(digests);
        }
    }
    out
}
