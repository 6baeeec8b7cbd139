//! `memory.walk`: borders apart from each other, each 128 bytes of its own; a visit takes words out byte by byte.

use kernels::Case;

use crate::reference::chacha::Stream;

const M: u64 = 0xd134_2543_de82_ef95;

/// Adds to the word at `at` and gives what it was.
fn bump(border: &mut [u8], at: usize, update: u64) -> u64 {
    let word = border[at..at + 8].iter().rev().fold(0u64, |word, byte| word * 256 + u64::from(*byte));
    let mut next = word.wrapping_add(update);
    for byte in &mut border[at..at + 8] {
        *byte = (next % 256) as u8;
        next /= 256;
    }
    word
}

/// The segment digests of every lap.
pub fn words(case: &Case) -> Vec<u64> {
    let (laps, segments) = match case.size.0 {
        256 => (32, 1),
        4096 => (4, 8),
        _ => (2, 16),
    };
    let pages = u64::from(case.size.0) / 4;
    let mut stream = Stream::new(case);
    let mut cycles = Vec::new();
    for _ in 0..4 {
        let (a, c) = (stream.word(), stream.word());
        cycles.push((a - a % 4 + 1, c | 1));
    }
    let (tag, step) = (stream.word(), stream.word() | 1);
    let updates = stream.words(8);

    let mut borders: Vec<Vec<u8>> = (0..pages)
        .map(|i| {
            let words = (512 * i + 504)..(512 * i + 520);
            words.flat_map(|x| tag.wrapping_add(x.wrapping_mul(step)).to_le_bytes()).collect()
        })
        .collect();
    let mut out = Vec::new();
    for lap in 0..laps {
        let (a, c) = cycles[lap % 4];
        let mut page = 0u64;
        for _ in 0..segments {
            let (mut d, mut e) = (0u64, 0u64);
            for _ in 0..pages / segments {
                let i = page as usize;
                let border = &mut borders[i];
                let x = bump(border, 64 - 1 - (i + lap) % 7, updates[lap % 8]);
                d = d.wrapping_mul(M).wrapping_add(x);
                e = e.wrapping_mul(M);
                let mut factor = 1u64;
                for word in 0..4 {
                    let y = bump(border, 64 - 1 - (i + 3 * lap) % 31 + 8 * word, updates[lap % 8]);
                    factor = factor.wrapping_mul(M);
                    e = e.wrapping_add(y.wrapping_mul(factor));
                }
                page = a.wrapping_mul(page).wrapping_add(c) % pages;
            }
            out.extend([d, e]);
        }
    }
    out
}
