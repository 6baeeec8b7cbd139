//! Sums of two 16-limb numbers in memory, by the same carrying instruction, one after another without waiting.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::Variant;
    use kernels::isa::Feature;

    let mut list = vec![Yardstick {
        kernel: "integer.carry",
        variant: Variant::Portable,
        units: 32 * LOOPS,
        run: Box::new(one_flag),
    }];
    if Feature::Adx.present() {
        list.push(Yardstick {
            kernel: "integer.carry",
            variant: Variant::Avx2,
            units: 32 * LOOPS,
            run: Box::new(two_flags),
        });
    }
    list
}

#[cfg(target_arch = "x86_64")]
const LOOPS: u64 = 512;

#[cfg(target_arch = "x86_64")]
macro_rules! limbs {
    ($first:literal, $second:literal, $start:literal, $($at:literal)*) => {
        concat!("2:\n", $start, $(
            "mov {s}, qword ptr [{x} + ", $at, "]\n", $first, " {s}, qword ptr [{y} + ", $at, "]\n",
            "mov qword ptr [{out} + ", $at, "], {s}\n",
            "mov {t}, qword ptr [{x} + 128 + ", $at, "]\n", $second, " {t}, qword ptr [{y} + 128 + ", $at, "]\n",
            "mov qword ptr [{out} + 128 + ", $at, "], {t}\n",
        )* "dec {n}\n", "jnz 2b\n")
    };
}

#[cfg(target_arch = "x86_64")]
macro_rules! sums {
    ($name:ident, $first:literal, $second:literal, $start:literal) => {
        fn $name() {
            let (x, y) = std::hint::black_box(([0x9e37_79b9_7f4a_7c15_u64; 32], [0xbf58_476d_1ce4_e5b9_u64; 32]));
            let mut out = [0u64; 32];
            // SAFETY: listed only where its instructions are present; reads and writes 256 bytes of each array
            unsafe {
                std::arch::asm!(
                    limbs!($first, $second, $start, 0 8 16 24 32 40 48 56 64 72 80 88 96 104 112 120),
                    x = in(reg) &x, y = in(reg) &y, out = in(reg) &mut out,
                    n = inout(reg) LOOPS => _, s = out(reg) _, t = out(reg) _,
                    options(nostack),
                );
            }
            std::hint::black_box(out);
        }
    };
}

#[cfg(target_arch = "x86_64")]
sums!(one_flag, "adc", "adc", "clc\n");
#[cfg(target_arch = "x86_64")]
sums!(two_flags, "adcx", "adox", "xor {s:e}, {s:e}\n");
