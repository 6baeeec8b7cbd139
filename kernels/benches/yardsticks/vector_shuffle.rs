//! In-lane byte shuffles of eight registers under one control, none waiting for another: the shuffle unit's issue rate.
//!
//! The kernel mixes a dozen kinds of move, some of which issue at half of this rate or less, and on sums adds one
//! addition a move. A portable yardstick does not exist: no baseline instruction shuffles bytes.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::Variant;
    use kernels::isa::Feature;

    let mut list = Vec::new();
    let kernel = "vector.shuffle";
    if Feature::Avx2.present() {
        list.push(Yardstick { kernel, variant: Variant::Avx2, units: 8 * LOOPS, run: Box::new(ymm) });
    }
    if Feature::Avx512bw.present() {
        list.push(Yardstick { kernel, variant: Variant::Avx512, units: 16 * LOOPS, run: Box::new(zmm) });
    }
    list
}

#[cfg(target_arch = "x86_64")]
const LOOPS: u64 = 4096;

#[cfg(target_arch = "x86_64")]
macro_rules! shuffles {
    ($name:ident $size:literal $load:literal $store:literal $kind:literal) => {
        fn $name() {
            let bytes = std::hint::black_box([0x5a_u8; $size]);
            let control = std::hint::black_box(std::array::from_fn::<u8, $size, _>(|i| (i * 7 % 16) as u8));
            let mut out = [0u8; $size];
            // SAFETY: listed only where the instructions are present; reads and writes the arrays' own sizes
            unsafe {
                std::arch::asm!(
                    concat!($load, " ", $kind, "8, [{control}]"),
                    concat!($load, " ", $kind, "9, [{bytes}]"),
                    "2:",
                    concat!("vpshufb ", $kind, "0, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "1, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "2, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "3, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "4, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "5, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "6, ", $kind, "9, ", $kind, "8"),
                    concat!("vpshufb ", $kind, "7, ", $kind, "9, ", $kind, "8"),
                    "dec {n}",
                    "jnz 2b",
                    concat!($store, " [{out}], ", $kind, "7"),
                    "vzeroupper",
                    control = in(reg) &control, bytes = in(reg) &bytes, out = in(reg) &mut out,
                    n = inout(reg) LOOPS => _,
                    out("xmm0") _, out("xmm1") _, out("xmm2") _, out("xmm3") _, out("xmm4") _,
                    out("xmm5") _, out("xmm6") _, out("xmm7") _, out("xmm8") _, out("xmm9") _,
                    options(nostack),
                );
            }
            std::hint::black_box(out);
        }
    };
}

#[cfg(target_arch = "x86_64")]
shuffles!(ymm 32 "vmovdqu" "vmovdqu" "ymm");
#[cfg(target_arch = "x86_64")]
shuffles!(zmm 64 "vmovdqu8" "vmovdqu8" "zmm");
