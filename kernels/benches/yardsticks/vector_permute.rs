//! The kernel's moves on four equal blocks that are loaded again for every round, so that no round waits for another. The
//! orders always come from the same lines. A portable yardstick does not exist: most of what that variant does is to load
//! elements one by one.

use super::Yardstick;

const LOOPS: usize = 256;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

/// Every yardstick that this CPU can run.
#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use super::available;
    use kernels::Variant;

    let kernel = "vector.permute";
    // 16 moves of one block and 10 of two
    let units = 36 * LOOPS as u64;
    let mut list = Vec::new();
    if available(kernel, Variant::Avx2) {
        // SAFETY: avx2 is present
        let run = Box::new(|| unsafe { avx2() });
        list.push(Yardstick { kernel, variant: Variant::Avx2, units, run });
    }
    if available(kernel, Variant::Avx512) {
        // SAFETY: the features of the kernel's variant are present
        let run = Box::new(|| unsafe { avx512() });
        list.push(Yardstick { kernel, variant: Variant::Avx512, units, run });
    }
    list
}

#[cfg(target_arch = "x86_64")]
macro_rules! bare {
    ($name:ident $features:literal) => {
        #[target_feature(enable = $features)]
        fn $name() {
            use kernels::vectors::{
                Line,
                permute::{Order, $name::*},
            };
            use std::hint::black_box;
            let line = black_box(Line::from_words([0x0123_4567_89ab_cdef; 8]));
            let orders = black_box([Order::new(std::array::from_fn(|i| (i * 7) as u8)); 4]);
            let mut out = Line([0; 64]);
            for _ in 0..LOOPS {
                // opaque once a round, so that no move can be made once for all
                let start = load(black_box(&line));
                let mut p = [start; 4];
                kernels::permute_round!(p, orders);
                for block in p {
                    store(black_box(&mut out), block);
                }
            }
        }
    };
}

#[cfg(target_arch = "x86_64")]
bare!(avx2 "avx2");
#[cfg(target_arch = "x86_64")]
bare!(avx512 "avx2,avx512f,avx512bw,avx512dq,avx512vl");
