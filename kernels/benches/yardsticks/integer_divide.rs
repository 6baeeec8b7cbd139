//! The kernel's mix of five divisions on operands that are all there beforehand, so that the divider never waits.
//!
//! The portable build needs two divisions for its 128-bit dividend, and is held against the same mix.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::{Case, Seed, Size, Variant, operands::Operands};

    const SETS: usize = 512;
    let list = |variant| {
        let mut stream = Operands::new(&Case { kernel: "yardstick.divide", seed: Seed(1), size: Size(16) });
        let sets: Vec<[u64; 4]> = (0..SETS)
            .map(|_| {
                let (n, d, shape) = (stream.word(), stream.word() | 1 << 63, stream.word());
                // divisors of 2 to 63 bits (long) and 2 to 31 bits (short): no overflow, signed or unsigned
                [n, d >> (1 + shape % 62), d >> (33 + (shape >> 8) % 30), n >> 1 >> (1 + shape % 62)]
            })
            .collect();
        let run = Box::new(move || sets.iter().for_each(five));
        Yardstick { kernel: "integer.divide", variant, units: (5 * SETS) as u64, run }
    };
    vec![list(Variant::Portable), list(Variant::Avx2)]
}

/// One division of each kind; `set` is dividend, long divisor, short divisor, and a high half below the long divisor.
#[cfg(target_arch = "x86_64")]
fn five(set: &[u64; 4]) {
    let &[n, long, short, high] = set;
    assert!(high < long && long > 1 && short > 1);
    // SAFETY: divisors are not zero and no quotient overflows, by the assertion above (the signed ones by divisors
    // above 1); baseline instructions on the registers named
    unsafe {
        std::arch::asm!(
            "mov rax, {n}", "mov rdx, {high}", "div {long}",
            "mov rax, {n}", "xor edx, edx", "div {long}",
            "mov rax, {n}", "cqo", "idiv {long}",
            "mov rax, {n}", "xor edx, edx", "div {short:e}",
            "mov rax, {n}", "cdq", "idiv {short:e}",
            n = in(reg) n, high = in(reg) high, long = in(reg) long, short = in(reg) short,
            out("rax") _, out("rdx") _,
            options(nomem, nostack),
        );
    }
}
