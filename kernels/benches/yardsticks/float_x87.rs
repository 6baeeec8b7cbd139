//! Peak of the x87 unit on its shortest round: a register loaded, multiplied, and popped, no round waiting for another.
//!
//! The kernel's mix has divisions, roots and remainders of tens of cycles each, and a store of 80 bits for most results: it
//! is bound to stay far below this.

#[cfg(target_arch = "x86_64")]
use kernels::Variant;

use super::Yardstick;
#[cfg(target_arch = "x86_64")]
use super::available;

#[cfg(target_arch = "x86_64")]
const ROUNDS: u64 = 1024;

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable() {
    let operands = std::hint::black_box([1.000_1f64, 0.999_7]);
    let mut end = 0.0f64;
    // SAFETY: reads the two operands, writes the end, leaves the register stack empty; x87 is in the baseline
    unsafe {
        std::arch::asm!(
            "fld qword ptr [{p} + 8]",
            "fld qword ptr [{p}]",
            "2:",
            "fld st(0)", "fmul st, st(2)", "fstp st(0)",
            "fld st(0)", "fadd st, st(2)", "fstp st(0)",
            "fld st(0)", "fmul st, st(2)", "fstp st(0)",
            "fld st(0)", "fadd st, st(2)", "fstp st(0)",
            "dec {n}",
            "jnz 2b",
            "fmulp st(1), st",
            "fstp qword ptr [{end}]",
            p = in(reg) operands.as_ptr(),
            end = in(reg) &raw mut end,
            n = inout(reg) ROUNDS => _,
            out("st(0)") _, out("st(1)") _, out("st(2)") _, out("st(3)") _,
            out("st(4)") _, out("st(5)") _, out("st(6)") _, out("st(7)") _,
            options(nostack),
        );
    }
    std::hint::black_box(end);
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    #[cfg(target_arch = "x86_64")]
    if available("float.x87", Variant::Portable) {
        return vec![Yardstick {
            kernel: "float.x87",
            variant: Variant::Portable,
            units: 4 * ROUNDS,
            run: Box::new(portable),
        }];
    }
    Vec::new()
}
