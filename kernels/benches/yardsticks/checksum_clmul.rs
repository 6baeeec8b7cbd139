//! The carry-less product alone, eight at a time that do not wait for one another; in plain code sixteen look-ups for each.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "checksum.clmul";
const CHAINS: usize = 8;
const ROUNDS: usize = 256;

fn portable(table: &[u128; 16]) {
    let mut x: [u64; CHAINS] = black_box([u64::MAX; CHAINS]);
    for _ in 0..ROUNDS {
        for x in &mut x {
            let product = (0..16).fold(0, |sum, i| sum ^ table[(*x >> (4 * i)) as usize & 15] << (4 * i));
            *x = product as u64 ^ (product >> 64) as u64;
        }
    }
    black_box(x);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx,pclmulqdq")]
fn avx2() {
    use std::arch::x86_64::{__m128i, _mm_clmulepi64_si128, _mm_set1_epi64x};
    let by = black_box(_mm_set1_epi64x(-1));
    let mut x: [__m128i; CHAINS] = black_box([by; CHAINS]);
    for _ in 0..ROUNDS {
        for x in &mut x {
            *x = _mm_clmulepi64_si128::<0x00>(*x, by);
        }
    }
    black_box(x);
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let table: [u128; 16] = black_box(std::array::from_fn(|i| u128::MAX / 15 * i as u128));
    let units = (CHAINS * ROUNDS) as u64;
    let run = Box::new(move || portable(black_box(&table)));
    #[cfg_attr(not(target_arch = "x86_64"), expect(unused_mut, reason = "one yardstick only"))]
    let mut list = vec![Yardstick { kernel: KERNEL, variant: Variant::Portable, units, run }];
    #[cfg(target_arch = "x86_64")]
    if available(KERNEL, Variant::Avx2) {
        // SAFETY: the kernel's variant, which needs these features, can run here
        let run = Box::new(move || unsafe { avx2() });
        list.push(Yardstick { kernel: KERNEL, variant: Variant::Avx2, units, run });
    }
    list
}
