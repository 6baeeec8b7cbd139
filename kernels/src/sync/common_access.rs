//! Single accesses to shared places by chosen instructions, which the compiler neither moves nor joins.

use std::sync::atomic::AtomicU64;

/// A place on a cache line of its own.
#[repr(C, align(64))]
#[derive(Debug, Default)]
pub struct Spot {
    /// What is read and written.
    pub value: AtomicU64,
    /// Written along where only a pair can be, read by nobody.
    spare: AtomicU64,
}

/// How places are read and written.
pub trait Access: Copy {
    /// Plain store.
    fn write(self, at: &AtomicU64, value: u64);
    /// Store after all earlier accesses.
    fn release(self, at: &AtomicU64, value: u64);
    /// Store past the caches.
    fn stream(self, at: &Spot, value: u64);
    /// Exchange.
    fn exchange(self, at: &AtomicU64, value: u64);
    /// Plain load.
    fn read(self, at: &AtomicU64) -> u64;
    /// Load before all later accesses.
    fn acquire(self, at: &AtomicU64) -> u64;
    /// Full fence.
    fn fence(self);
    /// Full fence by a locked operation.
    fn locked(self);
    /// Fence between stores.
    fn stores(self);
}

/// By general registers.
#[derive(Clone, Copy)]
pub struct Scalar;

#[cfg(target_arch = "x86_64")]
mod x86 {
    use super::{Access, Scalar, Spot};
    use std::arch::asm;
    use std::sync::atomic::AtomicU64;

    #[inline(always)]
    fn stream(at: &AtomicU64, value: u64) {
        // SAFETY: SSE2 is part of the x86-64 baseline; the instruction writes nothing but the atomic cell, in one piece
        unsafe {
            asm!("movnti qword ptr [{at}], {value}", at = in(reg) at.as_ptr(), value = in(reg) value,
                options(nostack, preserves_flags));
        }
    }

    #[inline(always)]
    fn exchange(at: &AtomicU64, value: u64) {
        // SAFETY: baseline instruction; it touches nothing but the atomic cell, in one piece
        unsafe {
            asm!("xchg qword ptr [{at}], {value}", at = in(reg) at.as_ptr(), value = inout(reg) value => _,
                options(nostack, preserves_flags));
        }
    }

    #[inline(always)]
    fn fence() {
        // SAFETY: SSE2 is part of the x86-64 baseline
        unsafe { asm!("mfence", options(nostack, preserves_flags)) };
    }

    #[inline(always)]
    fn locked() {
        let mut own = 0u32;
        // SAFETY: baseline instruction; it touches nothing but a local
        unsafe { asm!("lock or dword ptr [{own}], 0", own = in(reg) &raw mut own, options(nostack)) };
    }

    #[inline(always)]
    fn stores() {
        // SAFETY: SSE is part of the x86-64 baseline
        unsafe { asm!("sfence", options(nostack, preserves_flags)) };
    }

    impl Access for Scalar {
        #[inline(always)]
        fn write(self, at: &AtomicU64, value: u64) {
            // SAFETY: an aligned store of eight bytes to the atomic cell is done in one piece
            unsafe {
                asm!("mov qword ptr [{at}], {value}", at = in(reg) at.as_ptr(), value = in(reg) value,
                    options(nostack, preserves_flags));
            }
        }
        #[inline(always)]
        fn release(self, at: &AtomicU64, value: u64) {
            self.write(at, value);
        }
        #[inline(always)]
        fn stream(self, at: &Spot, value: u64) {
            stream(&at.value, value);
        }
        #[inline(always)]
        fn exchange(self, at: &AtomicU64, value: u64) {
            exchange(at, value);
        }
        #[inline(always)]
        fn read(self, at: &AtomicU64) -> u64 {
            let value;
            // SAFETY: an aligned load of eight bytes from the atomic cell is done in one piece
            unsafe {
                asm!("mov {value}, qword ptr [{at}]", at = in(reg) at.as_ptr(), value = out(reg) value,
                    options(nostack, preserves_flags));
            }
            value
        }
        #[inline(always)]
        fn acquire(self, at: &AtomicU64) -> u64 {
            self.read(at)
        }
        #[inline(always)]
        fn fence(self) {
            fence();
        }
        #[inline(always)]
        fn locked(self) {
            locked();
        }
        #[inline(always)]
        fn stores(self) {
            stores();
        }
    }

    /// By vector registers, whose loads and stores take part in the same order: evidence of avx2.
    #[derive(Clone, Copy)]
    pub struct Vector(());

    impl Vector {
        /// # Safety
        /// The CPU must have `avx2`.
        #[inline(always)]
        pub unsafe fn new() -> Vector {
            Vector(())
        }
    }

    impl Access for Vector {
        #[inline(always)]
        fn write(self, at: &AtomicU64, value: u64) {
            // SAFETY: `Vector` is evidence of avx2; an aligned store of eight bytes is done in one piece
            unsafe {
                asm!("vmovq {v}, {value}", "vmovlps qword ptr [{at}], {v}", at = in(reg) at.as_ptr(),
                    value = in(reg) value, v = out(xmm_reg) _, options(nostack, preserves_flags));
            }
        }
        #[inline(always)]
        fn release(self, at: &AtomicU64, value: u64) {
            // SAFETY: `Vector` is evidence of avx2; an aligned store of eight bytes is done in one piece
            unsafe {
                asm!("vmovq {v}, {value}", "vpunpcklqdq {v}, {v}, {v}", "vmovhps qword ptr [{at}], {v}",
                    at = in(reg) at.as_ptr(), value = in(reg) value, v = out(xmm_reg) _,
                    options(nostack, preserves_flags));
            }
        }
        #[inline(always)]
        fn stream(self, at: &Spot, value: u64) {
            stream(&at.value, value);
        }
        #[inline(always)]
        fn exchange(self, at: &AtomicU64, value: u64) {
            exchange(at, value);
        }
        #[inline(always)]
        fn read(self, at: &AtomicU64) -> u64 {
            let value;
            // SAFETY: `Vector` is evidence of avx2; an aligned load of eight bytes is done in one piece
            unsafe {
                asm!("vpbroadcastq {v:y}, qword ptr [{at}]", "vextracti128 {w}, {v:y}, 1", "vmovq {value}, {w}",
                    at = in(reg) at.as_ptr(), value = out(reg) value, v = out(xmm_reg) _, w = out(xmm_reg) _,
                    options(nostack, preserves_flags));
            }
            value
        }
        #[inline(always)]
        fn acquire(self, at: &AtomicU64) -> u64 {
            let value;
            // SAFETY: `Vector` is evidence of avx2; an aligned load of eight bytes is done in one piece
            unsafe {
                asm!("vmovq {v}, qword ptr [{at}]", "vpextrq {value}, {v}, 0", at = in(reg) at.as_ptr(),
                    value = out(reg) value, v = out(xmm_reg) _, options(nostack, preserves_flags));
            }
            value
        }
        #[inline(always)]
        fn fence(self) {
            fence();
        }
        #[inline(always)]
        fn locked(self) {
            locked();
        }
        #[inline(always)]
        fn stores(self) {
            stores();
        }
    }
}

#[cfg(target_arch = "x86_64")]
pub use x86::Vector;

#[cfg(target_arch = "aarch64")]
mod arm {
    use super::{Access, Scalar, Spot};
    use crate::sync::common_atoms::Locked;
    use crate::sync::common_atoms_arm::Exclusive;
    use std::arch::asm;
    use std::sync::atomic::AtomicU64;

    /// A store by one instruction.
    macro_rules! store {
        ($name:literal, $at:expr, $value:expr) => {
            // SAFETY: an aligned store of eight bytes to the atomic cell is done in one piece
            unsafe {
                asm!(concat!($name, " {value}, [{at}]"), at = in(reg) $at.as_ptr(), value = in(reg) $value,
                    options(nostack, preserves_flags));
            }
        };
    }

    /// A load by one instruction.
    macro_rules! load {
        ($name:literal, $at:expr) => {{
            let value;
            // SAFETY: an aligned load of eight bytes from the atomic cell is done in one piece
            unsafe {
                asm!(concat!($name, " {value}, [{at}]"), at = in(reg) $at.as_ptr(), value = out(reg) value,
                    options(nostack, preserves_flags));
            }
            value
        }};
    }

    macro_rules! barrier {
        ($name:literal) => {
            // SAFETY: baseline instruction
            unsafe { asm!($name, options(nostack, preserves_flags)) }
        };
    }

    impl Access for Scalar {
        #[inline(always)]
        fn write(self, at: &AtomicU64, value: u64) {
            store!("str", at, value);
        }
        #[inline(always)]
        fn release(self, at: &AtomicU64, value: u64) {
            store!("stlr", at, value);
        }
        #[inline(always)]
        fn stream(self, at: &Spot, value: u64) {
            // the non-temporal store writes a pair
            // SAFETY: a spot is two atomic cells, aligned; each word of the pair is stored in one piece
            unsafe {
                asm!("stnp {value}, {value}, [{at}]", at = in(reg) (&raw const *at), value = in(reg) value,
                    options(nostack, preserves_flags));
            }
        }
        #[inline(always)]
        fn exchange(self, at: &AtomicU64, value: u64) {
            Locked::<u64>::swap(Exclusive, at, value);
        }
        #[inline(always)]
        fn read(self, at: &AtomicU64) -> u64 {
            load!("ldr", at)
        }
        #[inline(always)]
        fn acquire(self, at: &AtomicU64) -> u64 {
            load!("ldar", at)
        }
        #[inline(always)]
        fn fence(self) {
            barrier!("dmb ish");
        }
        #[inline(always)]
        fn locked(self) {
            barrier!("dmb sy");
        }
        #[inline(always)]
        fn stores(self) {
            barrier!("dmb ishst");
        }
    }
}
