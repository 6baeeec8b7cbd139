//! The comparator alone: pairs of 128-bit records put in order over and over in the first cache, without a branch.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "integer.sort";
const PAIRS: usize = 256;

fn exchange(low: &mut [u128; PAIRS], high: &mut [u128; PAIRS]) {
    for (low, high) in low.iter_mut().zip(high) {
        let (a, b) = (*low, *high);
        let change = b < a;
        *low = if change { b } else { a };
        *high = if change { a } else { b };
    }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let list = |variant| {
        let mut low: [u128; PAIRS] = std::array::from_fn(|i| (i as u128).wrapping_mul(u128::MAX / 5));
        let mut high: [u128; PAIRS] = std::array::from_fn(|i| (i as u128).wrapping_mul(u128::MAX / 7));
        let run = Box::new(move || exchange(black_box(&mut low), black_box(&mut high)));
        Yardstick { kernel: KERNEL, variant, units: PAIRS as u64, run }
    };
    [Variant::Portable, Variant::Avx2].into_iter().filter(|v| available(KERNEL, *v)).map(list).collect()
}
