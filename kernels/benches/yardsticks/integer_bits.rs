//! Eight chains of bit instructions that do nothing but wait for their own: a rotation, a byte swap, a bit test that inverts,
//! a conditional move and a double shift in turn, as a core finds room for them.

use super::Yardstick;

#[cfg(not(target_arch = "x86_64"))]
pub fn yardsticks() -> Vec<Yardstick> {
    Vec::new()
}

#[cfg(target_arch = "x86_64")]
pub fn yardsticks() -> Vec<Yardstick> {
    use kernels::Variant;

    let list = |variant| Yardstick { kernel: "integer.bits", variant, units: 8 * 5 * LOOPS, run: Box::new(five) };
    vec![list(Variant::Portable), list(Variant::Avx2)]
}

#[cfg(target_arch = "x86_64")]
const LOOPS: u64 = 512;

#[cfg(target_arch = "x86_64")]
macro_rules! each {
    ($first:literal, $last:literal) => {
        concat!(
            $first, " {a}", $last, $first, " {b}", $last, $first, " {c}", $last, $first, " {d}", $last, $first, " {e}",
            $last, $first, " {f}", $last, $first, " {g}", $last, $first, " {h}", $last
        )
    };
}

#[cfg(target_arch = "x86_64")]
fn five() {
    let mut x: [u64; 8] = std::hint::black_box(std::array::from_fn(|i| u64::MAX / (i as u64 + 3)));
    // SAFETY: baseline instructions on the registers named
    unsafe {
        std::arch::asm!(
            "2:",
            each!("rol", ", 29\n"),
            each!("bswap", "\n"),
            each!("btc", ", 11\n"),
            each!("cmovc", ", {m}\n"),
            each!("shld", ", {m}, 7\n"),
            "dec {n}",
            "jnz 2b",
            a = inout(reg) x[0], b = inout(reg) x[1], c = inout(reg) x[2], d = inout(reg) x[3],
            e = inout(reg) x[4], f = inout(reg) x[5], g = inout(reg) x[6], h = inout(reg) x[7],
            m = in(reg) 0x9e37_79b9_7f4a_7c15_u64, n = inout(reg) LOOPS => _,
            options(pure, nomem, nostack),
        );
    }
    std::hint::black_box(x);
}
