//! SHA-256 instructions in the numbers that one block needs (32 `sha256rnds2`, 12 `sha256msg1`, 12 `sha256msg2`) and nothing
//! else, on independent registers.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;

    const BLOCKS: usize = 200;

    #[target_feature(enable = "sha,sse2")]
    fn blocks(count: usize) {
        let mut state: [__m128i; 4] = std::array::from_fn(|i| _mm_set1_epi32(black_box(i as i32)));
        let mut one: [__m128i; 3] = std::array::from_fn(|i| _mm_set1_epi32(black_box(7 + i as i32)));
        let mut two = one;
        let words = black_box(_mm_set1_epi32(0x1234_5678));
        for _ in 0..count {
            for _ in 0..4 {
                for _ in 0..2 {
                    state = state.map(|s| _mm_sha256rnds2_epu32(s, words, words));
                }
                one = one.map(|w| _mm_sha256msg1_epu32(w, words));
                two = two.map(|w| _mm_sha256msg2_epu32(w, words));
            }
        }
        black_box((state, one, two));
    }

    if !is_x86_feature_detected!("sha") {
        return Vec::new();
    }
    // SAFETY: sha was detected above
    let run = Box::new(|| unsafe { blocks(black_box(BLOCKS)) });
    vec![Yardstick { kernel: "cipher.sha256", variant: Variant::Avx2, units: BLOCKS as u64, run }]
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
