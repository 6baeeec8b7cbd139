//! Dependent loads alone: a random cycle through all pages of the default size, one aligned word on each, in another line from page
//! to page.

use std::hint::black_box;

use kernels::Variant;

use super::Yardstick;

pub fn yardsticks() -> Vec<Yardstick> {
    const PAGES: usize = 1024;
    const LAPS: usize = 4;
    let variants = [Variant::Portable, Variant::Avx2].into_iter().filter(|v| super::available("memory.walk", *v));
    variants
        .map(|variant| {
            let mut words = kernels::aligned::lines(4096);
            // word index of the link on page i; 645·i + 1 mod 1,024 is one cycle
            let place = |i: usize| 512 * i + 8 * (1 + i % 62);
            let lines = kernels::aligned::words_mut(&mut words);
            (0..PAGES).for_each(|i| lines[place(i)] = place((645 * i + 1) % PAGES) as u64);
            let run = Box::new(move || {
                let words = kernels::aligned::words_mut(&mut words);
                let mut at = black_box(place(0));
                for _ in 0..PAGES * LAPS {
                    // the bare load: bounds are known, every link is below 524,288
                    at = words[at & 524_287] as usize;
                }
                black_box(at);
            });
            Yardstick { kernel: "memory.walk", variant, units: (PAGES * LAPS) as u64, run: run as Box<dyn FnMut()> }
        })
        .collect()
}
