//! Bare stores of eight bytes, each loaded again at once from the same place: four places in turn, so that several are on their way.

use super::Yardstick;

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use std::arch::asm;
    use std::hint::black_box;

    use kernels::Variant;

    const LOADS: usize = 2 * 792 * 4;

    let variants = [Variant::Portable, Variant::Avx2].into_iter().filter(|v| super::available("cache.forward", *v));
    variants
        .map(|variant| {
            let mut line = kernels::aligned::lines(1);
            let run = Box::new(move || {
                let at = black_box(&mut line[0]).0.as_mut_ptr();
                let mut seen = [0u64; 4];
                for _ in 0..LOADS / 4 {
                    for (i, seen) in seen.iter_mut().enumerate() {
                        // SAFETY: four words are within the line
                        unsafe {
                            asm!("mov [{at}], {v}", "mov {v}, [{at}]", at = in(reg) at.add(i), v = inout(reg) i as u64 => *seen,
                                 options(nostack, preserves_flags));
                        }
                    }
                }
                black_box(seen);
            });
            Yardstick { kernel: "cache.forward", variant, units: LOADS as u64, run: run as Box<dyn FnMut()> }
        })
        .collect()
}

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}
