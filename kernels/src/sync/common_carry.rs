//! Ways by which lines leave a core other than a plain store: past its caches, or out of every cache.

/// How lines are carried to memory.
pub trait Carry: Copy {
    /// Stores lines with a hint that they are not needed here again, and orders that before later stores.
    ///
    /// # Safety
    /// `to` has to be aligned to 64 bytes and writable for as many lines, and nobody else may touch them.
    unsafe fn stream(self, to: *mut [u64; 8], lines: &[[u64; 8]]);

    /// Writes lines back to memory and throws them out of every cache, and orders that before later stores.
    ///
    /// # Safety
    /// `at` has to be aligned to 64 bytes and writable for `lines` lines.
    unsafe fn flush(self, at: *mut [u64; 8], lines: usize);
}

/// By baseline instructions.
#[derive(Clone, Copy)]
pub struct Baseline;

#[cfg(target_arch = "x86_64")]
mod x86 {
    use super::{Baseline, Carry};
    use std::arch::asm;
    use std::arch::x86_64::{_mm_clflush, _mm_mfence, _mm_sfence};

    /// # Safety
    /// As [`Carry::flush`].
    #[inline(always)]
    unsafe fn flush(at: *mut [u64; 8], lines: usize) {
        for line in 0..lines {
            // SAFETY: the caller's promise
            unsafe { _mm_clflush(at.add(line).cast()) };
        }
        // SAFETY: SSE2 is part of the x86-64 baseline
        unsafe { _mm_mfence() };
    }

    impl Carry for Baseline {
        #[inline(always)]
        unsafe fn stream(self, to: *mut [u64; 8], lines: &[[u64; 8]]) {
            for (i, line) in lines.iter().enumerate() {
                // half of the line from general registers, half from vector registers
                // SAFETY: the caller's promise; SSE2 is part of the x86-64 baseline
                unsafe {
                    asm!("movnti qword ptr [{to}], {a}", "movnti qword ptr [{to} + 8], {b}",
                        "movnti qword ptr [{to} + 16], {c}", "movnti qword ptr [{to} + 24], {d}",
                        "movdqu {v}, xmmword ptr [{from} + 32]", "movdqu {w}, xmmword ptr [{from} + 48]",
                        "movntdq xmmword ptr [{to} + 32], {v}", "movntps xmmword ptr [{to} + 48], {w}",
                        to = in(reg) to.add(i), from = in(reg) line.as_ptr(), a = in(reg) line[0], b = in(reg) line[1],
                        c = in(reg) line[2], d = in(reg) line[3], v = out(xmm_reg) _, w = out(xmm_reg) _,
                        options(nostack, preserves_flags));
                }
            }
            // SAFETY: SSE is part of the x86-64 baseline
            unsafe { _mm_sfence() };
        }

        #[inline(always)]
        unsafe fn flush(self, at: *mut [u64; 8], lines: usize) {
            // SAFETY: the caller's promise
            unsafe { flush(at, lines) };
        }
    }

    /// By 256-bit vectors: evidence of avx2.
    #[derive(Clone, Copy)]
    pub struct Avx(());

    impl Avx {
        /// # Safety
        /// The CPU must have `avx2`.
        #[inline(always)]
        pub unsafe fn new() -> Avx {
            Avx(())
        }
    }

    impl Carry for Avx {
        #[inline(always)]
        unsafe fn stream(self, to: *mut [u64; 8], lines: &[[u64; 8]]) {
            for (i, line) in lines.iter().enumerate() {
                // SAFETY: the caller's promise; `Avx` is evidence of avx2
                unsafe {
                    asm!("vmovdqu {v:y}, ymmword ptr [{from}]", "vmovdqu {w:y}, ymmword ptr [{from} + 32]",
                        "vmovntdq ymmword ptr [{to}], {v:y}", "vmovntps ymmword ptr [{to} + 32], {w:y}",
                        to = in(reg) to.add(i), from = in(reg) line.as_ptr(), v = out(xmm_reg) _, w = out(xmm_reg) _,
                        options(nostack, preserves_flags));
                }
            }
            // SAFETY: SSE is part of the x86-64 baseline
            unsafe { _mm_sfence() };
        }

        #[inline(always)]
        unsafe fn flush(self, at: *mut [u64; 8], lines: usize) {
            // SAFETY: the caller's promise
            unsafe { flush(at, lines) };
        }
    }
}

#[cfg(target_arch = "x86_64")]
pub use x86::Avx;

#[cfg(target_arch = "aarch64")]
mod arm {
    use super::{Baseline, Carry};
    use std::arch::asm;

    impl Carry for Baseline {
        #[inline(always)]
        unsafe fn stream(self, to: *mut [u64; 8], lines: &[[u64; 8]]) {
            for (i, line) in lines.iter().enumerate() {
                // SAFETY: the caller's promise; baseline instructions
                unsafe {
                    asm!("ldp {a}, {b}, [{from}]", "ldp {c}, {d}, [{from}, #16]", "ldp {v:q}, {w:q}, [{from}, #32]",
                        "stnp {a}, {b}, [{to}]", "stnp {c}, {d}, [{to}, #16]", "stnp {v:q}, {w:q}, [{to}, #32]",
                        to = in(reg) to.add(i), from = in(reg) line.as_ptr(), a = out(reg) _, b = out(reg) _,
                        c = out(reg) _, d = out(reg) _, v = out(vreg) _, w = out(vreg) _,
                        options(nostack, preserves_flags));
                }
            }
            // SAFETY: baseline instruction
            unsafe { asm!("dmb ishst", options(nostack, preserves_flags)) };
        }

        #[inline(always)]
        unsafe fn flush(self, at: *mut [u64; 8], lines: usize) {
            for line in 0..lines {
                // Linux lets programs do this (SCTLR_EL1.UCI); lines of CPUs with longer ones are flushed more than once
                // SAFETY: the caller's promise
                unsafe { asm!("dc civac, {at}", at = in(reg) at.add(line), options(nostack, preserves_flags)) };
            }
            // SAFETY: baseline instruction
            unsafe { asm!("dsb ish", options(nostack, preserves_flags)) };
        }
    }
}
