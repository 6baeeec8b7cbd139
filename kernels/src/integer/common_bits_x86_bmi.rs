//! The operations of `integer.bits` by the instructions that came after the x86-64 baseline.

use std::arch::asm;

use super::common_bits::Bits;

/// BMI1, BMI2, LZCNT, POPCNT, MOVBE and CMPXCHG16B as well; LAHF and SAHF, which every 64-bit CPU with BMI2 has.
pub(super) struct Extended;

impl Bits for Extended {
    common!();

    unary! {
        popcnt "popcnt {out}, {a}",
        popcnt32 "popcnt {out:e}, {a:e}",
        lzcnt "lzcnt {out}, {a}",
        lzcnt32 "lzcnt {out:e}, {a:e}",
        tzcnt "tzcnt {out}, {a}",
        tzcnt32 "tzcnt {out:e}, {a:e}",
        blsi "blsi {out}, {a}",
        blsr "blsr {out}, {a}",
        blsmsk "blsmsk {out}, {a}",
        rorx27 "rorx {out}, {a}, 27",
    }

    binary! {
        shl(u32) "shlx {out}, {a}, {b}",
        shr(u32) "shrx {out}, {a}, {b}",
        sar(u32) "sarx {out}, {a}, {b}",
        pdep(u64) "pdep {out}, {a}, {b}",
        pext(u64) "pext {out}, {a}, {b}",
        bzhi(u32) "bzhi {out}, {a}, {b}",
        andn(u64) "andn {out}, {a}, {b}",
    }

    #[inline(always)]
    fn bextr(a: u64, start: u32, length: u32) -> u64 {
        let out: u64;
        // SAFETY: one instruction on the registers named, of the set that the implementing type stands for
        unsafe {
            asm!("bextr {out}, {a}, {field}", a = in(reg) a, field = in(reg) u64::from(start | length << 8), out = out(reg) out,
                options(pure, nomem, nostack));
        }
        out
    }

    #[inline(always)]
    fn movbe(a: u64) -> u64 {
        let out: u64;
        // SAFETY: reads the word a; the instruction is of the set that the implementing type stands for
        unsafe {
            asm!("movbe {out}, qword ptr [{a}]", a = in(reg) &raw const a, out = out(reg) out, options(pure, readonly, nostack))
        };
        out
    }

    #[inline(always)]
    fn movbe32(a: u64) -> u64 {
        let mut out = 0u32;
        // SAFETY: writes `out`; the instruction is of the set that the implementing type stands for
        unsafe { asm!("movbe dword ptr [{out}], {a:e}", a = in(reg) a, out = in(reg) &raw mut out, options(nostack)) };
        u64::from(out)
    }

    #[inline(always)]
    fn movbe16(a: u64) -> u64 {
        let mut out = 0u16;
        // SAFETY: writes `out`; the instruction is of the set that the implementing type stands for
        unsafe { asm!("movbe word ptr [{out}], {a:x}", a = in(reg) a, out = in(reg) &raw mut out, options(nostack)) };
        u64::from(out)
    }

    #[inline(always)]
    fn cmpxchg16b(held: [u64; 2], wanted: [u64; 2], new: [u64; 2]) -> ([u64; 2], bool) {
        #[repr(align(16))]
        struct Aligned([u64; 2]);
        let mut held = Aligned(held);
        let equal: u64;
        // SAFETY: acts on the registers named and on `held`, which is this function's own and aligned as it must be; rbx, which
        // the compiler keeps for itself, gets its value back; the instruction is of the set that the implementing type stands for
        unsafe {
            asm!("xchg rbx, rsi", "cmpxchg16b xmmword ptr [rdi]", "mov rbx, rsi", "setz sil", "movzx esi, sil",
                in("rdi") &raw mut held.0, inout("rsi") new[0] => equal, in("rcx") new[1],
                inout("rax") wanted[0] => _, inout("rdx") wanted[1] => _, options(nostack));
        }
        (held.0, equal != 0)
    }

    #[inline(always)]
    fn flags_byte(a: u8) -> u64 {
        let mut word = u64::from(a) << 8;
        // SAFETY: acts on the register named and the flags; every CPU for which this type may be used has both instructions
        unsafe { asm!("sahf", "lahf", inout("rax") word, options(pure, nomem, nostack)) };
        word >> 8
    }
}
