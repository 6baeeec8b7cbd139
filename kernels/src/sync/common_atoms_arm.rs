//! Locked operations of aarch64: by load-exclusive and store-exclusive, and by the single instructions of LSE.

use std::arch::asm;
use std::sync::atomic::{AtomicU8, AtomicU16, AtomicU32, AtomicU64, Ordering};

use super::common_atoms::{Atoms, Locked, Pair, Width};

/// Load-exclusive and store-exclusive: every aarch64 CPU has them.
#[derive(Clone, Copy)]
pub struct Exclusive;

/// Evidence that the large system extensions are present.
#[derive(Clone, Copy)]
pub struct Lse(());

impl Lse {
    /// # Safety
    /// The CPU must have `lse`.
    #[inline(always)]
    pub unsafe fn new() -> Lse {
        Lse(())
    }
}

#[inline(always)]
fn full_fence() {
    // SAFETY: baseline instruction
    unsafe { asm!("dmb ish", options(nostack, preserves_flags)) };
}

/// A loop of load-exclusive, one operation, store-exclusive; the old value.
macro_rules! exclusive {
    ($suffix:literal, $mark:literal, $cell:expr, $x:expr, $operation:literal) => {{
        let old: u64;
        // SAFETY: baseline instructions; they touch nothing but the atomic cell
        unsafe {
            asm!("2:", concat!("ldaxr", $suffix, " {old:", $mark, "}, [{cell}]"),
                concat!($operation),
                concat!("stlxr", $suffix, " {fail:w}, {new:", $mark, "}, [{cell}]"), "cbnz {fail:w}, 2b",
                cell = in(reg) $cell.as_ptr(), x = in(reg) $x, old = out(reg) old, new = out(reg) _,
                fail = out(reg) _, options(nostack));
        }
        old
    }};
}

macro_rules! exclusive_forms {
    ($type:ty, $cell:ty, $suffix:literal, $mark:literal) => {
        impl Locked<$type> for Exclusive {
            #[inline(always)]
            fn add(self, cell: &$cell, x: $type) {
                exclusive!($suffix, $mark, cell, u64::from(x), "add {new}, {old}, {x}");
            }
            #[inline(always)]
            fn inc(self, cell: &$cell) {
                exclusive!($suffix, $mark, cell, 0u64, "add {new}, {old}, #1 /* {x} */");
            }
            #[inline(always)]
            fn adc(self, cell: &$cell, x: $type) {
                // cmp of equal values sets the carry
                exclusive!($suffix, $mark, cell, u64::from(x), "cmp {x}, {x}\nadc {new}, {old}, {x}");
            }
            #[inline(always)]
            fn sub(self, cell: &$cell, x: $type) {
                exclusive!($suffix, $mark, cell, u64::from(x), "sub {new}, {old}, {x}");
            }
            #[inline(always)]
            fn dec(self, cell: &$cell) {
                exclusive!($suffix, $mark, cell, 0u64, "sub {new}, {old}, #1 /* {x} */");
            }
            #[inline(always)]
            fn sbb(self, cell: &$cell, x: $type) {
                // cmn of 0 and 0 clears the carry, which is a borrow
                exclusive!($suffix, $mark, cell, u64::from(x), "cmn xzr, xzr\nsbc {new}, {old}, {x}");
            }
            #[inline(always)]
            fn or(self, cell: &$cell, x: $type) {
                exclusive!($suffix, $mark, cell, u64::from(x), "orr {new}, {old}, {x}");
            }
            #[inline(always)]
            fn and(self, cell: &$cell, x: $type) {
                exclusive!($suffix, $mark, cell, u64::from(x), "and {new}, {old}, {x}");
            }
            #[inline(always)]
            fn xor(self, cell: &$cell, x: $type) {
                exclusive!($suffix, $mark, cell, u64::from(x), "eor {new}, {old}, {x}");
            }
            #[inline(always)]
            fn not(self, cell: &$cell) {
                exclusive!($suffix, $mark, cell, 0u64, "mvn {new}, {old} /* {x} */");
            }
            #[inline(always)]
            fn neg(self, cell: &$cell) {
                exclusive!($suffix, $mark, cell, 0u64, "neg {new}, {old} /* {x} */");
            }
            #[inline(always)]
            fn set(self, cell: &$cell, bit: u32) -> bool {
                exclusive!($suffix, $mark, cell, 1u64 << bit, "orr {new}, {old}, {x}") >> bit & 1 == 1
            }
            #[inline(always)]
            fn clear(self, cell: &$cell, bit: u32) -> bool {
                exclusive!($suffix, $mark, cell, 1u64 << bit, "bic {new}, {old}, {x}") >> bit & 1 == 1
            }
            #[inline(always)]
            fn toggle(self, cell: &$cell, bit: u32) -> bool {
                exclusive!($suffix, $mark, cell, 1u64 << bit, "eor {new}, {old}, {x}") >> bit & 1 == 1
            }
            #[inline(always)]
            fn exchange_add(self, cell: &$cell, x: $type) -> $type {
                exclusive!($suffix, $mark, cell, u64::from(x), "add {new}, {old}, {x}") as $type
            }
            #[inline(always)]
            fn compare(self, cell: &$cell, expected: $type, new: $type) -> $type {
                let seen: u64;
                // SAFETY: baseline instructions; they touch nothing but the atomic cell
                unsafe {
                    asm!("2:", concat!("ldaxr", $suffix, " {seen:", $mark, "}, [{cell}]"), "cmp {seen}, {expected}",
                        "b.ne 3f", concat!("stlxr", $suffix, " {fail:w}, {new:", $mark, "}, [{cell}]"),
                        "cbnz {fail:w}, 2b", "b 4f", "3:", "clrex", "4:", cell = in(reg) cell.as_ptr(),
                        expected = in(reg) u64::from(expected), new = in(reg) u64::from(new), seen = out(reg) seen,
                        fail = out(reg) _, options(nostack));
                }
                seen as $type
            }
            #[inline(always)]
            fn swap(self, cell: &$cell, x: $type) -> $type {
                exclusive!($suffix, $mark, cell, u64::from(x), "mov {new}, {x}") as $type
            }
        }
    };
}

exclusive_forms!(u8, AtomicU8, "b", "w");
exclusive_forms!(u16, AtomicU16, "h", "w");
exclusive_forms!(u32, AtomicU32, "", "w");
exclusive_forms!(u64, AtomicU64, "", "x");

impl Atoms for Exclusive {
    #[inline(always)]
    fn halves_add(self, cell: &AtomicU64, x: u64) -> u64 {
        self.compare_add(cell, x)
    }

    #[inline(always)]
    fn pair_add(self, pair: &Pair, x: [u64; 2]) -> [u64; 2] {
        let mut old = [0; 2];
        // SAFETY: baseline instructions; `Pair` is 16 bytes, so aligned; they touch nothing else
        unsafe {
            asm!("2:", "ldaxp {a}, {b}, [{pair}]", "add {c}, {a}, {x}", "add {d}, {b}, {y}",
                "stlxp {fail:w}, {c}, {d}, [{pair}]", "cbnz {fail:w}, 2b", pair = in(reg) (&raw const pair.0),
                x = in(reg) x[0], y = in(reg) x[1], a = out(reg) old[0], b = out(reg) old[1], c = out(reg) _,
                d = out(reg) _, fail = out(reg) _, options(nostack));
        }
        old
    }

    #[inline(always)]
    fn fence(self) {
        full_fence();
    }
}

/// One LSE instruction with an operand and the old value.
macro_rules! single {
    ($name:literal, $suffix:literal, $mark:literal, $cell:expr, $x:expr) => {{
        let old: u64;
        // SAFETY: `Lse` is evidence of lse; the instruction touches nothing but the atomic cell
        unsafe {
            asm!(".arch_extension lse", concat!($name, $suffix, " {x:", $mark, "}, {old:", $mark, "}, [{cell}]"),
                cell = in(reg) $cell.as_ptr(), x = in(reg) $x, old = out(reg) old, options(nostack, preserves_flags));
        }
        old
    }};
}

macro_rules! single_forms {
    ($type:ty, $cell:ty, $suffix:literal, $mark:literal) => {
        impl Locked<$type> for Lse {
            #[inline(always)]
            fn add(self, cell: &$cell, x: $type) {
                single!("ldaddal", $suffix, $mark, cell, u64::from(x));
            }
            #[inline(always)]
            fn inc(self, cell: &$cell) {
                single!("ldaddal", $suffix, $mark, cell, 1u64);
            }
            #[inline(always)]
            fn adc(self, cell: &$cell, x: $type) {
                single!("ldaddal", $suffix, $mark, cell, u64::from(x).wrapping_add(1));
            }
            #[inline(always)]
            fn sub(self, cell: &$cell, x: $type) {
                single!("ldaddal", $suffix, $mark, cell, u64::from(x).wrapping_neg());
            }
            #[inline(always)]
            fn dec(self, cell: &$cell) {
                single!("ldaddal", $suffix, $mark, cell, u64::MAX);
            }
            #[inline(always)]
            fn sbb(self, cell: &$cell, x: $type) {
                single!("ldaddal", $suffix, $mark, cell, !u64::from(x));
            }
            #[inline(always)]
            fn or(self, cell: &$cell, x: $type) {
                single!("ldsetal", $suffix, $mark, cell, u64::from(x));
            }
            #[inline(always)]
            fn and(self, cell: &$cell, x: $type) {
                single!("ldclral", $suffix, $mark, cell, u64::from(!x));
            }
            #[inline(always)]
            fn xor(self, cell: &$cell, x: $type) {
                single!("ldeoral", $suffix, $mark, cell, u64::from(x));
            }
            #[inline(always)]
            fn not(self, cell: &$cell) {
                single!("ldeoral", $suffix, $mark, cell, u64::MAX);
            }
            #[inline(always)]
            fn neg(self, cell: &$cell) {
                // LSE has no negation: compare and swap
                let mut expected = <$type>::load(cell);
                loop {
                    let seen = self.compare(cell, expected, expected.wrapping_neg());
                    if seen == expected {
                        return;
                    }
                    expected = seen;
                }
            }
            #[inline(always)]
            fn set(self, cell: &$cell, bit: u32) -> bool {
                single!("ldsetal", $suffix, $mark, cell, 1u64 << bit) >> bit & 1 == 1
            }
            #[inline(always)]
            fn clear(self, cell: &$cell, bit: u32) -> bool {
                single!("ldclral", $suffix, $mark, cell, 1u64 << bit) >> bit & 1 == 1
            }
            #[inline(always)]
            fn toggle(self, cell: &$cell, bit: u32) -> bool {
                single!("ldeoral", $suffix, $mark, cell, 1u64 << bit) >> bit & 1 == 1
            }
            #[inline(always)]
            fn exchange_add(self, cell: &$cell, x: $type) -> $type {
                single!("ldaddal", $suffix, $mark, cell, u64::from(x)) as $type
            }
            #[inline(always)]
            fn compare(self, cell: &$cell, expected: $type, new: $type) -> $type {
                let mut seen = u64::from(expected);
                // SAFETY: `Lse` is evidence of lse; the instruction touches nothing but the atomic cell
                unsafe {
                    asm!(".arch_extension lse",
                        concat!("casal", $suffix, " {seen:", $mark, "}, {new:", $mark, "}, [{cell}]"),
                        cell = in(reg) cell.as_ptr(), new = in(reg) u64::from(new), seen = inout(reg) seen,
                        options(nostack, preserves_flags));
                }
                seen as $type
            }
            #[inline(always)]
            fn swap(self, cell: &$cell, x: $type) -> $type {
                single!("swpal", $suffix, $mark, cell, u64::from(x)) as $type
            }
        }
    };
}

single_forms!(u8, AtomicU8, "b", "w");
single_forms!(u16, AtomicU16, "h", "w");
single_forms!(u32, AtomicU32, "", "w");
single_forms!(u64, AtomicU64, "", "x");

impl Atoms for Lse {
    #[inline(always)]
    fn halves_add(self, cell: &AtomicU64, x: u64) -> u64 {
        self.compare_add(cell, x)
    }

    #[inline(always)]
    fn pair_add(self, pair: &Pair, x: [u64; 2]) -> [u64; 2] {
        let mut expected = [pair.0[0].load(Ordering::Relaxed), pair.0[1].load(Ordering::Relaxed)];
        loop {
            let mut seen = expected;
            // SAFETY: `Lse` is evidence of lse; `Pair` is 16 bytes, so aligned; casp wants an even register and the next
            unsafe {
                asm!(".arch_extension lse", "caspal x0, x1, x2, x3, [{pair}]", pair = in(reg) (&raw const pair.0),
                    inout("x0") seen[0], inout("x1") seen[1], in("x2") expected[0].wrapping_add(x[0]),
                    in("x3") expected[1].wrapping_add(x[1]), options(nostack, preserves_flags));
            }
            if seen == expected {
                return seen;
            }
            expected = seen;
        }
    }

    #[inline(always)]
    fn fence(self) {
        full_fence();
    }
}
