//! `cache.forward`: every byte around a border knows the store that wrote it last, and is looked up in that store's words.

use kernels::Case;

use crate::reference::chacha::Stream;

const WIDTHS: [usize; 6] = [1, 2, 4, 8, 16, 32];

/// Where a store began, and the index of its first word.
#[derive(Clone, Copy)]
struct Store {
    begin: usize,
    index: usize,
}

/// The bytes around one border, by their last store.
struct Around(Vec<Store>);

impl Around {
    fn store(&mut self, begin: usize, bytes: usize, index: usize) {
        self.0[begin..begin + bytes].fill(Store { begin, index });
    }

    fn byte(&self, at: usize, words: &[u64]) -> u64 {
        let Store { begin, index } = self.0[at];
        words[index + (at - begin) / 8] >> (8 * ((at - begin) % 8)) & 0xff
    }

    fn load(&self, begin: usize, bytes: usize, words: &[u64], digest: &mut u64) {
        for word in (0..bytes).step_by(8) {
            let value = (word..bytes.min(word + 8)).map(|i| self.byte(begin + i, words) << (8 * (i - word))).sum();
            *digest = digest.wrapping_mul(0xd134_2543_de82_ef95).wrapping_add(value);
        }
    }
}

/// For each pair of widths the digest after one store and that after two.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let words = stream.words(64);
    let (z, h) = ((case.seed.0 % 64) as usize, (case.seed.0 / 64 % 2) as usize);
    let mut borders = [0, 1].map(|_| Around(vec![Store { begin: 0, index: 0 }; 256]));
    let mut out = vec![0u64; 72];
    for pass in 0..4 {
        let mut n = 0;
        for (i, w) in WIDTHS.into_iter().enumerate() {
            for (j, v) in WIDTHS.into_iter().enumerate() {
                for past in 0..=w + v {
                    let border = &mut borders[(n + pass + h) % 2];
                    let at = 64 + (z + 16 * pass + 11 * n) % 64;
                    let from = at + past - v;
                    border.store(at, w, (5 * n + 17 * pass) % 61);
                    border.load(from, v, &words, &mut out[12 * i + 2 * j]);
                    border.store(at, w, (7 * n + 23 * pass) % 61);
                    let u = 1usize << ((n + pass) % 6);
                    let over = from + (z + 3 * n + 5 * pass) % (v + u - 1) + 1 - u;
                    border.store(over, u, (11 * n + 29 * pass) % 61);
                    border.load(from, v, &words, &mut out[12 * i + 2 * j + 1]);
                    n += 1;
                }
            }
        }
    }
    out
}
