//! Word-for-word comparison and the fold of every output: the in-loop alarm and the second opinion.
//!
//! The fold is linear over the prime field of p = 2^61 - 1: the digest of one output is the sum of w_i * k_i mod p,
//! the running fold is h * m + digest mod p. An output that repeats can therefore be folded n times in O(log n),
//! so another core can check what millions of runs folded to. No change of a single word by less than p, and of
//! those above only by a multiple of p, leaves a digest as it was; two changes cancel only where
//! e_1 * k_1 + e_2 * k_2 = 0 mod p, which bit flips (e = ±2^j) cannot be made to do by the data.

/// 2^61 - 1, a Mersenne prime.
const P: u64 = (1 << 61) - 1;
/// The multiplier between runs.
const STEP: u64 = 0x0b3a_9d2f_86e1_5c47;
const _: () = assert!(STEP < P);

/// Index of the first word that differs, if any.
#[inline]
pub fn first_difference(out: &[u64], expected: &[u64]) -> Option<usize> {
    let mut bits = 0u64;
    for (a, b) in out.iter().zip(expected) {
        bits |= a ^ b;
    }
    if bits == 0 && out.len() == expected.len() {
        return None;
    }
    out.iter().zip(expected).position(|(a, b)| a != b).or(Some(out.len().min(expected.len())))
}

fn reduce(x: u128) -> u64 {
    let folded = (x as u64 & P) as u128 + (x >> 61);
    let mut r = (folded as u64 & P) + (folded >> 61) as u64;
    if r >= P {
        r -= P;
    }
    r
}

fn mul(a: u64, b: u64) -> u64 {
    reduce(u128::from(a) * u128::from(b))
}

/// Multiplier of the word at `index`: splitmix64's finaliser, cut to 56 bits so that 256 products fit in 128 bits.
const fn weight(index: u64) -> u64 {
    let mut z = (index + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    ((z ^ (z >> 31)) >> 8) | 1
}

static WEIGHTS: [u64; crate::kernel::MAX_OUTPUT_WORDS] = {
    let mut table = [0; crate::kernel::MAX_OUTPUT_WORDS];
    let mut i = 0;
    while i < table.len() {
        table[i] = weight(i as u64);
        i += 1;
    }
    table
};

/// The digest of one output of at most [`crate::kernel::MAX_OUTPUT_WORDS`] words, below 2^61 - 1.
///
/// # Panics
/// When the output is longer.
pub fn digest(out: &[u64]) -> u64 {
    // 256 products below 2^64 * 2^56 stay below 2^128, however they are grouped; two sums, so that carries wait less
    let weights = &WEIGHTS[..out.len()];
    let (words, word) = out.as_chunks::<4>();
    let (factors, factor) = weights.as_chunks::<4>();
    let product = |w: u64, k: u64| u128::from(w) * u128::from(k);
    let (mut even, mut odd) = (0u128, 0u128);
    for (w, k) in words.iter().zip(factors) {
        even += product(w[0], k[0]);
        odd += product(w[1], k[1]);
        even += product(w[2], k[2]);
        odd += product(w[3], k[3]);
    }
    for (&w, &k) in word.iter().zip(factor) {
        even += product(w, k);
    }
    reduce(even + odd)
}

/// A running fold over the outputs of many runs.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Fold(pub u64);

impl Fold {
    /// Folds one output in.
    #[inline]
    pub fn push(&mut self, out: &[u64]) {
        self.0 = reduce(u128::from(self.0) * u128::from(STEP) + u128::from(digest(out)));
    }

    /// Folds `runs` outputs with the same `digest` in, in O(log runs).
    pub fn push_digest(&mut self, digest: u64, runs: u64) {
        let (mut slope, mut offset) = (1u64, 0u64);
        let (mut step_slope, mut step_offset) = (STEP, digest);
        let mut left = runs;
        while left > 0 {
            if left & 1 == 1 {
                offset = (mul(offset, step_slope) + step_offset) % P;
                slope = mul(slope, step_slope);
            }
            step_offset = (mul(step_offset, step_slope) + step_offset) % P;
            step_slope = mul(step_slope, step_slope);
            left >>= 1;
        }
        self.0 = (mul(self.0, slope) + offset) % P;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn many_equal_outputs_fold_as_one_by_one() {
        let out = [7, u64::MAX, 1 << 63, 0];
        for runs in [0u64, 1, 2, 3, 17, 1000, 4095] {
            let mut slow = Fold(5);
            for _ in 0..runs {
                slow.push(&out);
            }
            let mut fast = Fold(5);
            fast.push_digest(digest(&out), runs);
            assert_eq!(slow, fast, "{runs} runs");
        }
    }

    #[test]
    fn every_single_bit_flip_and_every_pair_of_equal_bits_changes_the_digest() {
        let out: Vec<u64> = (0..256).map(|i| weight(i) << 7).collect();
        let right = digest(&out);
        for word in 0..256 {
            for bit in 0..64 {
                let mut bad = out.clone();
                bad[word] ^= 1 << bit;
                assert_ne!(digest(&bad), right, "word {word} bit {bit}");
                bad[(word + 1) % 256] ^= 1 << bit;
                assert_ne!(digest(&bad), right, "words {word}, {} bit {bit}", word + 1);
            }
        }
    }

    /// Against the definition, written out with 128-bit remainders.
    #[test]
    fn digest_and_fold_are_what_the_head_says() {
        for length in (0..=9).chain([31, 104, 255, 256]) {
            let out: Vec<u64> = (0..length).map(|i| u64::MAX - weight(i as u64)).collect();
            let p = u128::from(P);
            let sum = out.iter().zip(WEIGHTS).map(|(&w, k)| u128::from(w) * u128::from(k) % p).sum::<u128>() % p;
            assert_eq!(u128::from(digest(&out)), sum, "{length} words");
            let mut fold = Fold(P - 1);
            fold.push(&out);
            assert_eq!(u128::from(fold.0), (u128::from(P - 1) * u128::from(STEP) + sum) % p, "{length} words");
        }
    }

    #[test]
    fn difference_is_found_and_lengths_count() {
        assert_eq!(first_difference(&[1, 2, 3], &[1, 2, 3]), None);
        assert_eq!(first_difference(&[1, 2, 3], &[1, 9, 3]), Some(1));
        assert_eq!(first_difference(&[1, 2], &[1, 2, 3]), Some(2));
    }
}
