//! Full-width products of the same two registers, none waiting for another: the multiplier's issue rate.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::Variant;
    use kernels::isa::Feature;

    let mut list =
        vec![Yardstick { kernel: "integer.multiply", variant: Variant::Portable, units: 8 * LOOPS, run: Box::new(mul) }];
    if Feature::Bmi2.present() {
        list.push(Yardstick {
            kernel: "integer.multiply",
            variant: Variant::Avx2,
            units: 8 * LOOPS,
            run: Box::new(mulx),
        });
    }
    list
}

#[cfg(target_arch = "x86_64")]
const LOOPS: u64 = 4096;

#[cfg(target_arch = "x86_64")]
macro_rules! eightfold {
    ($text:literal) => {
        concat!("2:\n", $text, $text, $text, $text, $text, $text, $text, $text, "dec {n}\n", "jnz 2b\n")
    };
}

#[cfg(target_arch = "x86_64")]
fn mul() {
    let (a, b) = std::hint::black_box((0x9e37_79b9_7f4a_7c15_u64, 0xbf58_476d_1ce4_e5b9_u64));
    let (low, high): (u64, u64);
    // SAFETY: baseline instructions on the registers named
    unsafe {
        std::arch::asm!(
            eightfold!("mov rax, {a}\nmul {b}\n"),
            a = in(reg) a, b = in(reg) b, n = inout(reg) LOOPS => _, out("rax") low, out("rdx") high,
            options(nomem, nostack),
        );
    }
    std::hint::black_box((low, high));
}

#[cfg(target_arch = "x86_64")]
fn mulx() {
    let (a, b) = std::hint::black_box((0x9e37_79b9_7f4a_7c15_u64, 0xbf58_476d_1ce4_e5b9_u64));
    let (low, high): (u64, u64);
    // SAFETY: listed only where bmi2 is present; works on the registers named
    unsafe {
        std::arch::asm!(
            eightfold!("mulx {high}, {low}, {b}\n"),
            b = in(reg) b, n = inout(reg) LOOPS => _, low = out(reg) low, high = out(reg) high, in("rdx") a,
            options(nomem, nostack),
        );
    }
    std::hint::black_box((low, high));
}
