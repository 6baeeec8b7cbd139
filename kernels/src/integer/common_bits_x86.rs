//! The operations of `integer.bits` by the x86 instructions of their names, in assembly, as a compiler would choose others.
//!
//! No result depends on what the manuals leave undefined: bit scans get no zero, counts stay below the width, and of the flags
//! only those are read that the instruction before defines for every operand.

use std::arch::asm;

use super::common_bits::Bits;

/// Instructions of the x86-64 baseline.
pub(super) struct Baseline;

/// One instruction on one register and the count register; the result is cut to `$cut`.
macro_rules! counted {
    ($($name:ident $line:literal $cut:ty),* $(,)?) => {$(
        #[inline(always)]
        fn $name(mut a: u64, k: u32) -> u64 {
            // SAFETY: a baseline instruction on the registers named
            unsafe { asm!($line, a = inout(reg) a, in("cl") k as u8, options(pure, nomem, nostack)) };
            u64::from(a as $cut)
        }
    )*};
}

/// One instruction from one register to another; whoever uses the type proved the feature.
macro_rules! unary {
    ($($name:ident $line:literal),* $(,)?) => {$(
        #[inline(always)]
        fn $name(a: u64) -> u64 {
            let out: u64;
            // SAFETY: one instruction on the registers named, of the set that the implementing type stands for
            unsafe { asm!($line, a = in(reg) a, out = out(reg) out, options(pure, nomem, nostack)) };
            out
        }
    )*};
}

/// One instruction from two registers to another.
macro_rules! binary {
    ($($name:ident($b:ty) $line:literal),* $(,)?) => {$(
        #[inline(always)]
        fn $name(a: u64, b: $b) -> u64 {
            let out: u64;
            // SAFETY: one instruction on the registers named, of the set that the implementing type stands for
            unsafe { asm!($line, a = in(reg) a, b = in(reg) u64::from(b), out = out(reg) out, options(pure, nomem, nostack)) };
            out
        }
    )*};
}

/// One instruction on one register with the carry flag set before and read afterwards.
macro_rules! carried {
    ($($name:ident($b:ident: $type:ty, $($operand:tt)*) $line:literal),* $(,)?) => {$(
        #[inline(always)]
        fn $name(mut a: u64, $b: $type, carry: bool) -> (u64, bool) {
            let mut flag = u8::from(carry);
            // SAFETY: baseline instructions on the registers named
            unsafe {
                // all ones added to 1 carry, to 0 they do not
                asm!("add {flag}, 255", $line, "setc {flag}", a = inout(reg) a, $($operand)*, flag = inout(reg_byte) flag,
                    options(pure, nomem, nostack));
            }
            (a, flag != 0)
        }
    )*};
}

/// A bit test that changes the bit.
macro_rules! tested {
    ($($name:ident $line:literal),* $(,)?) => {$(
        #[inline(always)]
        fn $name(mut a: u64, k: u32) -> (u64, bool) {
            let flag: u8;
            // SAFETY: baseline instructions on the registers named
            unsafe {
                asm!($line, "setc {flag}", a = inout(reg) a, k = in(reg) u64::from(k), flag = lateout(reg_byte) flag,
                    options(pure, nomem, nostack));
            }
            (a, flag != 0)
        }
    )*};
}

/// `$line` for every condition with its number and the number after that.
macro_rules! conditions {
    ($line:ident) => {
        concat!(
            $line!("o", "0", "1"),
            $line!("no", "1", "2"),
            $line!("b", "2", "3"),
            $line!("ae", "3", "4"),
            $line!("e", "4", "5"),
            $line!("ne", "5", "6"),
            $line!("be", "6", "7"),
            $line!("a", "7", "8"),
            $line!("s", "8", "9"),
            $line!("ns", "9", "10"),
            $line!("p", "10", "11"),
            $line!("np", "11", "12"),
            $line!("l", "12", "13"),
            $line!("ge", "13", "14"),
            $line!("le", "14", "15"),
            $line!("g", "15", "16")
        )
    };
}

macro_rules! move_line {
    ($condition:literal, $i:literal, $next:literal) => {
        concat!("mov {t}, {no}\ncmov", $condition, " {t}, {yes}\nlea {h}, [{h} + 8 * {h}]\nlea {h}, [{h} + {t}]\n")
    };
}

macro_rules! set_line {
    ($condition:literal, $i:literal, $next:literal) => {
        concat!("set", $condition, " byte ptr [{out} + ", $i, "]\n")
    };
}

macro_rules! jump_line {
    ($condition:literal, $i:literal, $next:literal) => {
        concat!("lea {h}, [{h} + 8 * {h}]\nj", $condition, " 2f\nlea {h}, [{h} + ", $next, "]\n2:\n")
    };
}

/// What both types have.
macro_rules! common {
    () => {
        counted! {
            shl32 "shl {a:e}, cl" u32, shr32 "shr {a:e}, cl" u32, sar32 "sar {a:e}, cl" u32,
            rol "rol {a}, cl" u64, ror "ror {a}, cl" u64, rol32 "rol {a:e}, cl" u32, ror32 "ror {a:e}, cl" u32,
            rol16 "rol {a:x}, cl" u16, ror8 "ror {a:l}, cl" u8,
        }

        unary! {
            bsr "bsr {out}, {a}",
            bsf "bsf {out}, {a}",
            bswap "mov {out}, {a}\nbswap {out}",
            bswap32 "mov {out:e}, {a:e}\nbswap {out:e}",
            neg "mov {out}, {a}\nneg {out}",
            not "mov {out}, {a}\nnot {out}",
            movsx8 "movsx {out}, {a:l}",
            movsx16 "movsx {out}, {a:x}",
            movsxd "movsxd {out}, {a:e}",
            carry_play "mov {out}, {a}\nstc\ninc {out}\nadc {out}, 0\ndec {out}\ncmc\nadc {out}, 0\nclc\nsbb {out}, 0",
        }

        binary! {
            lea(u64) "lea {out}, [{a} + 8 * {b} + 0x1234567]",
            lea32(u64) "lea {out:e}, [{a} + 4 * {b} - 77]",
        }

        carried! {
            rcl(k: u32, in("cl") k as u8) "rcl {a}, cl",
            rcr(k: u32, in("cl") k as u8) "rcr {a}, cl",
            adc(b: u64, b = in(reg) b) "adc {a}, {b}",
            sbb(b: u64, b = in(reg) b) "sbb {a}, {b}",
        }

        tested! {
            bts "bts {a}, {k}",
            btr "btr {a}, {k}",
            btc "btc {a}, {k}",
        }

        #[inline(always)]
        fn shld(mut a: u64, b: u64, k: u32) -> u64 {
            // SAFETY: a baseline instruction on the registers named
            unsafe { asm!("shld {a}, {b}, cl", a = inout(reg) a, b = in(reg) b, in("cl") k as u8, options(pure, nomem, nostack)) };
            a
        }

        #[inline(always)]
        fn shrd(mut a: u64, b: u64, k: u32) -> u64 {
            // SAFETY: a baseline instruction on the registers named
            unsafe { asm!("shrd {a}, {b}, cl", a = inout(reg) a, b = in(reg) b, in("cl") k as u8, options(pure, nomem, nostack)) };
            a
        }

        #[inline(always)]
        fn bt(a: u64, k: u32) -> bool {
            let flag: u8;
            // SAFETY: baseline instructions on the registers named
            unsafe {
                asm!("bt {a}, {k}", "setc {flag}", a = in(reg) a, k = in(reg) u64::from(k), flag = lateout(reg_byte) flag,
                    options(pure, nomem, nostack));
            }
            flag != 0
        }

        #[inline(always)]
        fn moves(e: u64, f: u64, yes: u64, no: u64) -> u64 {
            let h: u64;
            // SAFETY: baseline instructions on the registers named; moves and address arithmetic leave the flags alone
            unsafe {
                asm!("xor {h:e}, {h:e}", "cmp {e}, {f}", conditions!(move_line),
                    e = in(reg) e, f = in(reg) f, yes = in(reg) yes, no = in(reg) no, h = out(reg) h, t = out(reg) _,
                    options(pure, nomem, nostack));
            }
            h
        }

        #[inline(always)]
        fn sets(e: u32, f: u32) -> [u64; 2] {
            let mut out = [0; 2];
            // SAFETY: baseline instructions on the registers named; writes the 16 bytes of `out`
            unsafe {
                asm!("add {e:e}, {f:e}", conditions!(set_line), e = inout(reg) e => _, f = in(reg) f, out = in(reg) &raw mut out,
                    options(nostack));
            }
            out
        }

        #[inline(always)]
        fn jumps(e: u16, f: u16) -> u64 {
            let h: u64;
            // SAFETY: baseline instructions on the registers named; address arithmetic leaves the flags alone
            unsafe {
                asm!("xor {h:e}, {h:e}", "cmp {e:x}, {f:x}", conditions!(jump_line), e = in(reg) e, f = in(reg) f, h = out(reg) h,
                    options(pure, nomem, nostack));
            }
            h
        }

        #[inline(always)]
        fn exchange_add(mut a: u64, mut b: u64, mut c: u64) -> [u64; 2] {
            // SAFETY: baseline instructions on the registers named and on the word c, which is this function's own
            unsafe {
                asm!("xchg {a}, {b}", "xadd qword ptr [{c}], {a}", "sub {b}, {a}", a = inout(reg) a, b = inout(reg) b,
                    c = in(reg) &raw mut c, options(nostack));
            }
            // a holds what c was and has been used
            let _ = a;
            [c, b]
        }

        #[inline(always)]
        fn cmpxchg(mut held: u64, mut wanted: u64, new: u64) -> (u64, u64, bool) {
            let equal: u8;
            // SAFETY: baseline instructions on the registers named and on the word `held`, which is this function's own
            unsafe {
                asm!("cmpxchg qword ptr [{held}], {new}", "sete {equal}", held = in(reg) &raw mut held, new = in(reg) new,
                    equal = lateout(reg_byte) equal, inout("rax") wanted, options(nostack));
            }
            (held, wanted, equal != 0)
        }

        #[inline(always)]
        fn cmpxchg8b(mut held: u64, wanted: u64, new: u64) -> (u64, u64, bool) {
            let (mut low, mut high) = (wanted & 0xffff_ffff, wanted >> 32);
            let equal: u64;
            // SAFETY: cx8 is part of the x86-64 baseline; acts on the registers named and on the word `held`, which is this
            // function's own; rbx, which the compiler keeps for itself, gets its value back
            unsafe {
                asm!("xchg rbx, rsi", "cmpxchg8b qword ptr [rdi]", "mov rbx, rsi", "setz sil", "movzx esi, sil",
                    in("rdi") &raw mut held, inout("rsi") new & 0xffff_ffff => equal, in("rcx") new >> 32,
                    inout("rax") low, inout("rdx") high, options(nostack));
            }
            (held, low | high << 32, equal != 0)
        }

        #[inline(always)]
        fn mul8(a: u8, b: u8) -> u64 {
            let product: u64;
            // SAFETY: a baseline instruction on the registers named
            unsafe {
                asm!("mul {b}", b = in(reg_byte) b, inout("rax") u64::from(a) => product, options(pure, nomem, nostack));
            }
            product
        }

        #[inline(always)]
        fn imul16(a: u16, b: u16) -> u64 {
            let (low, high): (u16, u16);
            // SAFETY: a baseline instruction on the registers named
            unsafe {
                asm!("imul {b:x}", b = in(reg) b, inout("ax") a => low, lateout("dx") high, options(pure, nomem, nostack));
            }
            u64::from(low) | u64::from(high) << 16
        }

        #[inline(always)]
        fn div8(a: u8, d: u8) -> u64 {
            let both: u64;
            // SAFETY: the divisor is odd, so not zero, and the high half of the dividend is zero; the registers named
            unsafe {
                asm!("div {d}", d = in(reg_byte) d | 1, inout("rax") u64::from(a) => both, options(pure, nomem, nostack));
            }
            both
        }

        #[inline(always)]
        fn idiv16(a: u16, d: u16) -> u64 {
            let (quotient, rest): (u16, u16);
            // SAFETY: the divisor is odd and positive and the dividend is extended by its sign, so that nothing overflows
            unsafe {
                asm!("cwd", "idiv {d:x}", d = in(reg) d & 0x7fff | 1, inout("ax") a => quotient, out("dx") rest,
                    options(pure, nomem, nostack));
            }
            u64::from(quotient) | u64::from(rest) << 16
        }

        #[inline(always)]
        fn movzx(a: u64, b: u64) -> u64 {
            let (x, y): (u64, u64);
            // SAFETY: baseline instructions on the registers named
            unsafe {
                asm!("movzx {x:e}, {a:l}", "movzx {y:e}, {b:x}", a = in(reg) a, b = in(reg) b, x = out(reg) x, y = out(reg) y,
                    options(pure, nomem, nostack, preserves_flags));
            }
            x + y
        }

        #[inline(always)]
        fn widen(mut a: u64) -> u64 {
            // SAFETY: baseline instructions on the register named
            unsafe { asm!("cbw", "cwde", "cdqe", inout("rax") a, options(pure, nomem, nostack, preserves_flags)) };
            a
        }

        #[inline(always)]
        fn signs(a: u64, b: u64) -> u64 {
            let (long, short): (u64, u64);
            // SAFETY: baseline instructions on the registers named
            unsafe {
                asm!("cqo", "mov {long}, rdx", "mov eax, {b:e}", "cdq", b = in(reg) b, long = out(reg) long,
                    inout("rax") a => _, out("rdx") short, options(pure, nomem, nostack, preserves_flags));
            }
            long.wrapping_add(short)
        }

        #[inline(always)]
        fn threefold(mut a: u64, count: u64) -> u64 {
            // SAFETY: baseline instructions on the registers named
            unsafe {
                asm!("jrcxz 3f", "2:", "lea {a}, [{a} + 2 * {a}]", "loop 2b", "3:", a = inout(reg) a, inout("rcx") count => _,
                    options(pure, nomem, nostack, preserves_flags));
            }
            a
        }

        #[inline(always)]
        fn byte_of(table: &u64, i: u8) -> u64 {
            let byte: u64;
            // SAFETY: reads one of the eight bytes of `table`; rbx, which the compiler keeps for itself, gets its value back
            unsafe {
                asm!("xchg rbx, rdi", "xlatb", "xchg rbx, rdi", inout("rdi") table => _, inout("rax") u64::from(i & 7) => byte,
                    options(pure, readonly, nostack, preserves_flags));
            }
            byte
        }
    };
}

impl Bits for Baseline {
    common!();
    counted! { shl "shl {a}, cl" u64, shr "shr {a}, cl" u64, sar "sar {a}, cl" u64 }

    #[inline(always)]
    fn movbe16(a: u64) -> u64 {
        let mut out = u64::from(a as u16);
        // SAFETY: a baseline instruction on the register named
        unsafe { asm!("xchg al, ah", inout("rax") out, options(pure, nomem, nostack, preserves_flags)) };
        out
    }
}
