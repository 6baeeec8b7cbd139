//! The full-width product alone: a limb in a register times limbs in memory, nothing added up and nothing to wait for. What the
//! multiplication of whole numbers can reach beside it, `scripts/ratio-bignum` measures with a library.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::Variant;
    use kernels::isa::Feature;

    let list =
        |variant, run: fn()| Yardstick { kernel: "integer.bignum", variant, units: 4 * 8 * LOOPS, run: Box::new(run) };
    let mut all = vec![list(Variant::Portable, by_mul)];
    if Feature::Bmi2.present() {
        all.push(list(Variant::Avx2, by_mulx));
    }
    all
}

#[cfg(target_arch = "x86_64")]
const LOOPS: u64 = 128;

/// The eight limbs, one after the other.
#[cfg(target_arch = "x86_64")]
macro_rules! eight {
    ($before:literal, $product:literal) => {
        eight!($before, $product, 0, 8, 16, 24, 32, 40, 48, 56)
    };
    ($before:literal, $product:literal, $($at:literal),*) => {
        concat!($($before, $product, " [{m} + ", $at, "]\n"),*)
    };
}

/// Long stretches, as even the loop's own two instructions take issue slots from the multiplier.
#[cfg(target_arch = "x86_64")]
macro_rules! products {
    ($name:ident, $before:literal, $product:literal) => {
        fn $name() {
            let limbs: [u64; 8] = std::hint::black_box(std::array::from_fn(|i| u64::MAX / (i as u64 + 1)));
            let (low, high): (u64, u64);
            // SAFETY: reads the eight limbs; the instructions are listed only where the CPU has them; the registers are named
            unsafe {
                std::arch::asm!(
                    "2:",
                    eight!($before, $product),
                    eight!($before, $product),
                    eight!($before, $product),
                    eight!($before, $product),
                    "dec {n}",
                    "jnz 2b",
                    m = in(reg) &limbs, n = inout(reg) LOOPS => _, x = in(reg) u64::MAX,
                    inout("rax") 3_u64 => low, inout("rdx") u64::MAX - 5 => high,
                    out("rcx") _,
                    options(readonly, nostack),
                );
            }
            std::hint::black_box((low, high));
        }
    };
}

#[cfg(target_arch = "x86_64")]
products!(by_mul, "mov rax, {x}\n", "mul qword ptr");
#[cfg(target_arch = "x86_64")]
products!(by_mulx, "/* {x} */", "mulx rax, rcx, qword ptr");
