//! AES rounds: twelve independent blocks, encryption and decryption rounds by halves, keys in registers.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::x86_64::*;
    use std::hint::black_box;

    use kernels::Variant;

    const TURNS: usize = 1000;
    const BLOCKS: usize = 12;

    #[target_feature(enable = "aes,avx")]
    fn rounds(turns: usize) {
        let mut x: [__m128i; BLOCKS] = std::array::from_fn(|i| _mm_set1_epi32(black_box(i as i32)));
        let k = black_box(_mm_set1_epi32(0x1234_5678));
        for _ in 0..turns {
            for x in &mut x {
                *x = _mm_aesenc_si128(*x, k);
            }
        }
        for _ in 0..turns {
            for x in &mut x {
                *x = _mm_aesdec_si128(*x, k);
            }
        }
        black_box(x);
    }

    if !(is_x86_feature_detected!("aes") && is_x86_feature_detected!("avx")) {
        return Vec::new();
    }
    // SAFETY: aes and avx were detected above
    let run = Box::new(|| unsafe { rounds(black_box(TURNS)) });
    vec![Yardstick { kernel: "cipher.aes", variant: Variant::Avx2, units: (2 * TURNS * BLOCKS) as u64, run }]
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
