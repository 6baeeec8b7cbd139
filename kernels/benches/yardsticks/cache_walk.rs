//! Dependent loads alone: a random cycle of one address a line over 256 KiB.

use std::hint::black_box;

use kernels::Variant;

use super::Yardstick;

pub fn yardsticks() -> Vec<Yardstick> {
    const LINES: usize = 4096;
    const LAPS: usize = 2;
    // each line's first word is the word index of the next line; 2,645·i + 1 mod 4,096 is one cycle
    let mut words = kernels::aligned::lines(256);
    for (i, line) in words.iter_mut().enumerate() {
        line.0[0] = ((2645 * i + 1) % LINES * 8) as u64;
    }
    let run = Box::new(move || {
        let words = kernels::aligned::words_mut(&mut words);
        let mut at = black_box(0usize);
        for _ in 0..LINES * LAPS {
            // the bare load: bounds are known, every link is below 32,768
            at = words[at & 32_767] as usize;
        }
        black_box(at);
    });
    vec![Yardstick { kernel: "cache.walk", variant: Variant::Portable, units: (LINES * LAPS) as u64, run }]
}
