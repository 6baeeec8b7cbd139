//! The kernel's dot products on registers that never change, added up in twelve chains; those of two operands come from
//! one pair of lines. With 512 bits that is `vpdpbusd` and nothing else.

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

    let kernel = "vector.dot8";
    // 48 dot products of 16 bytes
    let units = 48 * 16 * LOOPS as u64;
    // SAFETY: sse2 is in the baseline
    let run = Box::new(|| unsafe { portable() });
    let mut list = vec![Yardstick { kernel, variant: Variant::Portable, units, run }];
    if available(kernel, Variant::Avx2) {
        // SAFETY: avx2 is present
        let run = Box::new(|| unsafe { avx2() });
        list.push(Yardstick { kernel, variant: Variant::Avx2, units: 2 * units, run });
    }
    if available(kernel, Variant::Avx512) {
        // SAFETY: the features of the kernel's variant are present
        let run = Box::new(|| unsafe { avx512() });
        list.push(Yardstick { kernel, variant: Variant::Avx512, units: 4 * units, run });
    }
    list
}

#[cfg(target_arch = "x86_64")]
macro_rules! bare {
    ($name:ident $class:ident $features:literal) => {
        #[target_feature(enable = $features)]
        fn $name() {
            use kernels::vectors::{Line, dot8::$name::*, $name::*};
            let line = std::hint::black_box(Line::from_words([0x0123_4567_89ab_cdef; 8]));
            let mut x = [load(&line, 0); 12];
            let (mut a, mut b) = (x[0], x[1]);
            for _ in 0..LOOPS {
                macro_rules! k {
                    ($i:literal) => {
                        b
                    };
                }
                macro_rules! both {
                    ($a:expr, $u:literal, $s:literal) => {
                        dot8_lines($a, &line, &line, 0)
                    };
                }
                // opaque once a round, so that no product can be had once for all
                // SAFETY: no instruction
                unsafe {
                    std::arch::asm!("/* {0} {1} */", inout($class) a, inout($class) b,
                        options(nostack, preserves_flags));
                }
                let y = [a; 12];
                kernels::dot8_round!(x, y, k, both);
            }
            std::hint::black_box(x);
        }
    };
}

#[cfg(target_arch = "x86_64")]
use sse2 as portable;
#[cfg(target_arch = "x86_64")]
bare!(sse2 xmm_reg "sse2");
#[cfg(target_arch = "x86_64")]
bare!(avx2 ymm_reg "avx2");
#[cfg(target_arch = "x86_64")]
bare!(avx512 zmm_reg "avx2,avx512f,avx512bw,avx512dq,avx512vl");
