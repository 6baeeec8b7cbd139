//! The string instructions of x86: `movs`, `stos`, `cmps`, `scas` and `lods` in all four widths, repeated, upwards and, with the
//! direction flag set, downwards. Every block that sets the flag clears it again.

use std::arch::asm;

use super::common_moves::{F, Moves, shift};

/// The string instructions; all are part of the x86-64 baseline.
#[derive(Clone, Copy)]
pub struct Strings;

/// One block of assembly for each width, the instructions' suffix and a count of bytes filled in.
macro_rules! widths {
    ($width:expr, $block:ident) => {
        match $width {
            1 => $block!("b", "0"),
            2 => $block!("w", "1"),
            4 => $block!("d", "3"),
            _ => $block!("q", "7"),
        }
    };
}

/// Where an upward search that left `rcx` elements unread ended.
#[inline(always)]
fn upwards(ended: u8, count: usize, left: usize) -> usize {
    if ended == 1 { count - left - 1 } else { count }
}

/// The same of a downward search, plus one.
#[inline(always)]
fn downwards(ended: u8, left: usize) -> usize {
    if ended == 1 { left + 1 } else { 0 }
}

impl Moves for Strings {
    #[inline(always)]
    unsafe fn copy(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: moves `len` bytes between regions that the caller gives
                unsafe {
                    asm!(concat!("rep movs", $suffix), "mov ecx, {rest:e}", "rep movsb", rest = in(reg) len % width,
                         inout("rcx") len / width => _, inout("rsi") from => _, inout("rdi") to => _, options(nostack))
                }
            };
        }
        widths!(width, block);
    }

    #[inline(always)]
    unsafe fn copy_back(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        let last = len.wrapping_sub(width);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: moves `len` bytes between regions that the caller gives; the direction flag is clear at the end
                unsafe {
                    asm!("std", concat!("rep movs", $suffix), concat!("add rsi, ", $less), concat!("add rdi, ", $less),
                         "mov ecx, {rest:e}", "rep movsb", "cld", rest = in(reg) len % width,
                         inout("rcx") len / width => _, inout("rsi") from.wrapping_add(last) => _,
                         inout("rdi") to.wrapping_add(last) => _, options(nostack))
                }
            };
        }
        widths!(width, block);
    }

    #[inline(always)]
    unsafe fn pieces(self, from: *const u8, to: *mut u8, len: usize) {
        let mut at = 0;
        // SAFETY: every piece ends at or before `len`, in regions that the caller gives; SSE2 is part of the baseline
        unsafe {
            while len - at >= 48 {
                let (from, to) = (from.add(at), to.add(at));
                asm!("movdqu {a}, [{from}]", "movups {b}, [{from} + 16]", "movupd {c}, [{from} + 32]",
                     "movups [{to}], {a}", "movupd [{to} + 16], {b}", "movdqu [{to} + 32], {c}", from = in(reg) from,
                     to = in(reg) to, a = out(xmm_reg) _, b = out(xmm_reg) _, c = out(xmm_reg) _,
                     options(nostack, preserves_flags));
                at += 48;
            }
            while len - at >= 16 {
                let (from, to) = (from.add(at), to.add(at));
                asm!("movdqu {a}, [{from}]", "movdqu [{to}], {a}", from = in(reg) from, to = in(reg) to,
                     a = out(xmm_reg) _, options(nostack, preserves_flags));
                at += 16;
            }
            for width in [8, 4, 2, 1] {
                if len & width != 0 {
                    shift(from.add(at), to.add(at), width);
                    at += width;
                }
            }
        }
    }

    #[inline(always)]
    unsafe fn fill(self, to: *mut u8, count: usize, width: usize, value: u64) {
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: writes `count` elements in a region that the caller gives
                unsafe {
                    asm!(concat!("rep stos", $suffix), in("rax") value, inout("rcx") count => _, inout("rdi") to => _,
                         options(nostack, preserves_flags))
                }
            };
        }
        widths!(width, block);
    }

    #[inline(always)]
    unsafe fn fill_back(self, to: *mut u8, count: usize, width: usize, value: u64) {
        let last = to.wrapping_add((count * width).wrapping_sub(width));
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: writes `count` elements in a region that the caller gives; the direction flag is clear at the end
                unsafe {
                    asm!("std", concat!("rep stos", $suffix), "cld", in("rax") value, inout("rcx") count => _,
                         inout("rdi") last => _, options(nostack))
                }
            };
        }
        widths!(width, block);
    }

    #[inline(always)]
    unsafe fn differ(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        let (ended, left): (u8, usize);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: reads `count` elements of regions that the caller gives; without any the flag of equality stays set
                unsafe {
                    asm!("cmp ecx, ecx", concat!("repe cmps", $suffix), "setne {ended}", ended = out(reg_byte) ended,
                         inout("rcx") count => left, inout("rsi") a => _, inout("rdi") b => _,
                         options(nostack, readonly))
                }
            };
        }
        widths!(width, block);
        upwards(ended, count, left)
    }

    #[inline(always)]
    unsafe fn differ_back(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        let last = (count * width).wrapping_sub(width);
        let (ended, left): (u8, usize);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: as for `differ`; the direction flag is clear at the end
                unsafe {
                    asm!("cmp ecx, ecx", "std", concat!("repe cmps", $suffix), "cld", "setne {ended}",
                         ended = out(reg_byte) ended, inout("rcx") count => left, inout("rsi") a.wrapping_add(last) => _,
                         inout("rdi") b.wrapping_add(last) => _, options(nostack, readonly))
                }
            };
        }
        widths!(width, block);
        downwards(ended, left)
    }

    #[inline(always)]
    unsafe fn find(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let (ended, left): (u8, usize);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: reads `count` elements of a region that the caller gives; without any the flag of equality stays clear
                unsafe {
                    asm!("test {one}, {one}", concat!("repne scas", $suffix), "sete {one}",
                         one = inout(reg_byte) 1u8 => ended, in("rax") value, inout("rcx") count => left,
                         inout("rdi") a => _, options(nostack, readonly))
                }
            };
        }
        widths!(width, block);
        upwards(ended, count, left)
    }

    #[inline(always)]
    unsafe fn find_back(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let last = a.wrapping_add((count * width).wrapping_sub(width));
        let (ended, left): (u8, usize);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: as for `find`; the direction flag is clear at the end
                unsafe {
                    asm!("test {one}, {one}", "std", concat!("repne scas", $suffix), "cld", "sete {one}",
                         one = inout(reg_byte) 1u8 => ended, in("rax") value, inout("rcx") count => left,
                         inout("rdi") last => _, options(nostack, readonly))
                }
            };
        }
        widths!(width, block);
        downwards(ended, left)
    }

    #[inline(always)]
    unsafe fn read(self, at: *const u8, count: usize, width: usize) -> u64 {
        let (a, b): (u64, u64);
        macro_rules! block {
            ($suffix:literal, $less:literal) => {
                // SAFETY: reads `count` elements of a region that the caller gives
                unsafe {
                    asm!("jrcxz 3f", "2:", concat!("lods", $suffix), "add {a}, rax", "add {b}, {a}", "loop 2b", "3:",
                         a = inout(reg) 0u64 => a, b = inout(reg) 0u64 => b, inout("rax") 0u64 => _,
                         inout("rcx") count => _, inout("rsi") at => _, options(nostack, readonly))
                }
            };
        }
        widths!(width, block);
        a.wrapping_add(b.wrapping_mul(F))
    }
}
