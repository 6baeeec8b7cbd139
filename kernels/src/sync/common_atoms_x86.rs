//! Locked operations by the x86 instructions that take a lock prefix, each by its own mnemonic in each width.
//!
//! Inline assembly, because a compiler makes one instruction of several of them (`dec` of `sub`, `not` of `xor`) and
//! never uses `adc`, `sbb`, `neg`, `cmpxchg8b` with a lock at all.

use std::arch::asm;
use std::sync::atomic::{AtomicU8, AtomicU16, AtomicU32, AtomicU64, Ordering};

use super::common_atoms::{Atoms, Locked, Pair, Width};

/// The baseline, or with `WIDE` evidence that `cmpxchg16b` is present.
#[derive(Clone, Copy)]
pub struct X86<const WIDE: bool>(());

impl X86<false> {
    /// What every x86-64 CPU has.
    #[inline(always)]
    pub fn baseline() -> X86<false> {
        X86(())
    }
}

impl X86<true> {
    /// With `cmpxchg16b`.
    ///
    /// # Safety
    /// The CPU must have `cmpxchg16b`.
    #[inline(always)]
    pub unsafe fn wide() -> X86<true> {
        X86(())
    }
}

/// One locked instruction on a cell: without operand, with one, with one that comes back, or with a bit number.
macro_rules! locked {
    ($size:literal, $cell:expr, $before:literal, $name:literal) => {
        // SAFETY: baseline instruction; it touches nothing but the atomic cell, in one piece
        unsafe {
            asm!($before, concat!("lock ", $name, " ", $size, " ptr [{cell}]"), cell = in(reg) $cell.as_ptr(),
                options(nostack));
        }
    };
    ($size:literal, $cell:expr, $before:literal, $name:literal, $class:ident, $mark:literal, $x:expr) => {
        // SAFETY: baseline instruction; it touches nothing but the atomic cell, in one piece
        unsafe {
            asm!($before, concat!("lock ", $name, " ", $size, " ptr [{cell}], {x", $mark, "}"),
                cell = in(reg) $cell.as_ptr(), x = in($class) $x, options(nostack));
        }
    };
}

macro_rules! bit_instruction {
    ($size:literal, $cell:expr, $name:literal, $mark:literal, $bit:expr) => {{
        let old: u8;
        // SAFETY: baseline instruction; `bit` is below the cell's width, so it touches nothing but the atomic cell
        unsafe {
            asm!(concat!("lock ", $name, " ", $size, " ptr [{cell}], {bit", $mark, "}"), "setc {old}",
                cell = in(reg) $cell.as_ptr(), bit = in(reg) $bit, old = out(reg_byte) old, options(nostack));
        }
        old != 0
    }};
}

macro_rules! forms {
    ($type:ty, $cell:ty, $size:literal, $class:ident, $mark:literal, $accumulator:tt, { $($bits:item)* }) => {
        impl<const WIDE: bool> Locked<$type> for X86<WIDE> {
            #[inline(always)]
            fn add(self, cell: &$cell, x: $type) {
                locked!($size, cell, "", "add", $class, $mark, x);
            }
            #[inline(always)]
            fn inc(self, cell: &$cell) {
                locked!($size, cell, "", "inc");
            }
            #[inline(always)]
            fn adc(self, cell: &$cell, x: $type) {
                locked!($size, cell, "stc", "adc", $class, $mark, x);
            }
            #[inline(always)]
            fn sub(self, cell: &$cell, x: $type) {
                locked!($size, cell, "", "sub", $class, $mark, x);
            }
            #[inline(always)]
            fn dec(self, cell: &$cell) {
                locked!($size, cell, "", "dec");
            }
            #[inline(always)]
            fn sbb(self, cell: &$cell, x: $type) {
                locked!($size, cell, "stc", "sbb", $class, $mark, x);
            }
            #[inline(always)]
            fn or(self, cell: &$cell, x: $type) {
                locked!($size, cell, "", "or", $class, $mark, x);
            }
            #[inline(always)]
            fn and(self, cell: &$cell, x: $type) {
                locked!($size, cell, "", "and", $class, $mark, x);
            }
            #[inline(always)]
            fn xor(self, cell: &$cell, x: $type) {
                locked!($size, cell, "", "xor", $class, $mark, x);
            }
            #[inline(always)]
            fn not(self, cell: &$cell) {
                locked!($size, cell, "", "not");
            }
            #[inline(always)]
            fn neg(self, cell: &$cell) {
                locked!($size, cell, "", "neg");
            }
            $($bits)*
            #[inline(always)]
            fn exchange_add(self, cell: &$cell, mut x: $type) -> $type {
                // SAFETY: baseline instruction; it touches nothing but the atomic cell, in one piece
                unsafe {
                    asm!(concat!("lock xadd ", $size, " ptr [{cell}], {x", $mark, "}"), cell = in(reg) cell.as_ptr(),
                        x = inout($class) x, options(nostack));
                }
                x
            }
            #[inline(always)]
            fn compare(self, cell: &$cell, expected: $type, new: $type) -> $type {
                let seen;
                // SAFETY: baseline instruction; it touches nothing but the atomic cell, in one piece
                unsafe {
                    asm!(concat!("lock cmpxchg ", $size, " ptr [{cell}], {new", $mark, "}"), cell = in(reg) cell.as_ptr(),
                        new = in($class) new, inout($accumulator) expected => seen, options(nostack));
                }
                seen
            }
            #[inline(always)]
            fn swap(self, cell: &$cell, mut x: $type) -> $type {
                // SAFETY: baseline instruction, locked without a prefix; it touches nothing but the atomic cell
                unsafe {
                    asm!(concat!("xchg ", $size, " ptr [{cell}], {x", $mark, "}"), cell = in(reg) cell.as_ptr(),
                        x = inout($class) x, options(nostack, preserves_flags));
                }
                x
            }
        }
    };
}

macro_rules! bit_forms {
    ($type:ty, $cell:ty, $size:literal, $mark:literal, $accumulator:tt) => {
        forms!($type, $cell, $size, reg, $mark, $accumulator, {
            #[inline(always)]
            fn set(self, cell: &$cell, bit: u32) -> bool {
                bit_instruction!($size, cell, "bts", $mark, (bit % <$type>::BITS) as $type)
            }
            #[inline(always)]
            fn clear(self, cell: &$cell, bit: u32) -> bool {
                bit_instruction!($size, cell, "btr", $mark, (bit % <$type>::BITS) as $type)
            }
            #[inline(always)]
            fn toggle(self, cell: &$cell, bit: u32) -> bool {
                bit_instruction!($size, cell, "btc", $mark, (bit % <$type>::BITS) as $type)
            }
        });
    };
}

// there are no bit instructions on bytes: the bit comes out of compare-and-swap
forms!(u8, AtomicU8, "byte", reg_byte, "", "al", {
    #[inline(always)]
    fn set(self, cell: &AtomicU8, bit: u32) -> bool {
        change(self, cell, bit, |old, mask| old | mask)
    }
    #[inline(always)]
    fn clear(self, cell: &AtomicU8, bit: u32) -> bool {
        change(self, cell, bit, |old, mask| old & !mask)
    }
    #[inline(always)]
    fn toggle(self, cell: &AtomicU8, bit: u32) -> bool {
        change(self, cell, bit, |old, mask| old ^ mask)
    }
});
bit_forms!(u16, AtomicU16, "word", ":x", "ax");
bit_forms!(u32, AtomicU32, "dword", ":e", "eax");
bit_forms!(u64, AtomicU64, "qword", ":r", "rax");

#[inline(always)]
fn change<const WIDE: bool>(x86: X86<WIDE>, cell: &AtomicU8, bit: u32, to: impl Fn(u8, u8) -> u8) -> bool {
    let mask = 1 << (bit % 8);
    let mut expected = u8::load(cell);
    loop {
        let seen = x86.compare(cell, expected, to(expected, mask));
        if seen == expected {
            return seen & mask != 0;
        }
        expected = seen;
    }
}

impl<const WIDE: bool> Atoms for X86<WIDE> {
    #[inline(always)]
    fn halves_add(self, cell: &AtomicU64, x: u64) -> u64 {
        let mut expected = cell.load(Ordering::Relaxed);
        loop {
            let new = expected.wrapping_add(x);
            let (low, high): (u64, u64);
            // SAFETY: baseline instruction; it touches nothing but the atomic cell; rbx, which the compiler keeps for
            // itself, is put back
            unsafe {
                asm!("xchg rbx, rsi", "lock cmpxchg8b qword ptr [rdi]", "mov rbx, rsi", in("rdi") cell.as_ptr(),
                    inout("rsi") new & 0xffff_ffff => _, in("rcx") new >> 32,
                    inout("rax") expected & 0xffff_ffff => low, inout("rdx") expected >> 32 => high, options(nostack));
            }
            let seen = high << 32 | low & 0xffff_ffff;
            if seen == expected {
                return seen;
            }
            expected = seen;
        }
    }

    #[inline(always)]
    fn pair_add(self, pair: &Pair, x: [u64; 2]) -> [u64; 2] {
        if !WIDE {
            return [self.exchange_add(&pair.0[0], x[0]), self.exchange_add(&pair.0[1], x[1])];
        }
        let mut expected = [pair.0[0].load(Ordering::Relaxed), pair.0[1].load(Ordering::Relaxed)];
        loop {
            let [low, high] = [expected[0].wrapping_add(x[0]), expected[1].wrapping_add(x[1])];
            let mut seen = [0; 2];
            // SAFETY: `WIDE` is evidence of cmpxchg16b; `Pair` is 16 bytes, so aligned; rbx is put back
            unsafe {
                asm!("xchg rbx, rsi", "lock cmpxchg16b xmmword ptr [rdi]", "mov rbx, rsi",
                    in("rdi") (&raw const pair.0), inout("rsi") low => _, in("rcx") high,
                    inout("rax") expected[0] => seen[0], inout("rdx") expected[1] => seen[1], options(nostack));
            }
            if seen == expected {
                return seen;
            }
            expected = seen;
        }
    }

    #[inline(always)]
    fn fence(self) {
        // SAFETY: SSE2 is part of the x86-64 baseline
        unsafe { asm!("mfence", options(nostack, preserves_flags)) };
    }
}
