//! The kernel's mix of instructions on registers that never change, each result added up in one of eight chains, as the
//! kernel does it: nothing waits for a round's first half, and no block of operands is loaded but under a mask. Stores
//! under a mask, and the loads after them, are in the mix.

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
    use kernels::{Kernel, Variant};

    let kernel = kernels::vector::mask::Mask;
    // block operations of one round of one net
    let round = kernel.work(kernel.sizes()[0]).amount / (4 * 32 * 3);
    let units = round * LOOPS as u64;
    let id = kernel.id();
    // SAFETY: sse2 is in the baseline
    let run = Box::new(|| unsafe { portable() });
    let mut list = vec![Yardstick { kernel: id, variant: Variant::Portable, units, run }];
    if available(id, Variant::Avx2) {
        // SAFETY: avx2 is present
        let run = Box::new(|| unsafe { avx2() });
        list.push(Yardstick { kernel: id, variant: Variant::Avx2, units: 2 * units, run });
    }
    if available(id, Variant::Avx512) {
        // SAFETY: the features of the kernel's variant are present
        let run = Box::new(|| unsafe { avx512() });
        list.push(Yardstick { kernel: id, variant: Variant::Avx512, units: 4 * units, run });
    }
    list
}

#[cfg(target_arch = "x86_64")]
macro_rules! bare {
    ($name:ident $module:ident $class:ident $features:literal, $sources:literal) => {
        #[target_feature(enable = $features)]
        fn $name() {
            use kernels::vectors::{Line, $module::*, mask::$module::*};
            let line = std::hint::black_box(Line::from_words(std::array::from_fn(|i| (i as u64 + 1) * 0x0101_0305_0709)));
            let (mut word, mut memory) = ([0; 8], [line; 4]);
            let mut x = [load(&line, 0); 8];
            let (mut a, mut b, mut c, mut d) = (x[0], x[1], x[2], x[3]);
            for _ in 0..LOOPS {
                // opaque once a round, so that no operation can be done once for all
                // SAFETY: no instruction
                unsafe {
                    std::arch::asm!("/* {0} {1} {2} {3} */", inout($class) a, inout($class) b, inout($class) c,
                        inout($class) d, options(nostack, preserves_flags));
                }
                let s = [a, b, c, d];
                let y: [V; 8] = std::array::from_fn(|i| s[i % $sources]);
                macro_rules! k {
                    ($i:literal) => {
                        y[$i % 4]
                    };
                    ($keep:ident $i:literal, $m:expr) => {
                        $keep(&line, 0, $m)
                    };
                    ($j:literal $put:ident, $u:expr, $m:expr, $v:expr) => {{
                        let before = load(&memory[$j], 0);
                        $put($u, $m, $v, &mut memory[$j], 0);
                        before
                    }};
                }
                kernels::mask_round!(x, y, k);
                let m = and(and(k!(0), k!(1)), and(k!(2), k!(3)));
                let m = and(m, and(k!(1), k!(2)));
                signs(sub8(x[0], x[5]), &mut word, 0);
                tests(x[0], x[3], m, and(k!(1), k!(2)), &mut word, 0);
            }
            std::hint::black_box((x, word, memory));
        }
    };
}

#[cfg(target_arch = "x86_64")]
bare!(portable sse2 xmm_reg "sse2", 2);
#[cfg(target_arch = "x86_64")]
bare!(avx2 avx2 ymm_reg "avx2", 4);
#[cfg(target_arch = "x86_64")]
bare!(avx512 avx512 zmm_reg "avx2,avx512f,avx512bw,avx512dq,avx512vl", 4);
