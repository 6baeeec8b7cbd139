//! `float.x87`: the extended-precision stack unit, under all four roundings and all three precisions.
//!
//! Everything that is exactly specified: addition, subtraction, multiplication, division (both ways round), square root,
//! integral rounding, scaling, extraction, partial remainder with its quotient bits, comparison into status word and flags,
//! conditional moves, conversions between 80, 64 and 32 bits and integers of 16, 32, 64, operands from memory in those
//! formats, and the built-in constants, which obey rounding control. Not here: sine, logarithm and their kind, whose last bits
//! are the maker's choice.
//!
//! A run takes 8 pairs through 4 × 3 control words (rounding outermost: nearest, down, up, toward zero; precision 24, 53, 64
//! bits). Each of 49 results is two words, significand or integer and sign with exponent (0 for integers, status and the
//! narrower formats), and goes word by word into its own two sums s ← s + word, t ← t + s modulo 2^64.
//! No operation overflows, underflows or meets a zero operand, but for the stores in 32 and 64 bits of odd seeds.
//!
//! Operands: nine words a pair. Significands of a and b from the first two, bit 63 set; bits 32–33 (a), 34–35 (b) of the third,
//! e, choose: 0 a tie of 53 bits, 1 a tie of 24 bits. Signs bits 63, 62 of e. Exponent of a: e mod 41 − 20, odd seeds
//! e mod 14001 − 7000; b's is lower by bits 16–21 of e, modulo 8 in even seeds and at most 62 in odd ones. Then a 64-bit
//! integer; a word with a 32-bit one (bits 0–31), an odd 16-bit one (32–47) and a scale (48–63, modulo 2001, − 1000); one for a
//! binary32 (exponent −7 … 8), one for a binary64 (−8 … 7); a significand m and a word f for the numbers that become integers
//! of 16, 32, 64 bits: exponents f, f / 2^8, f / 2^16 modulo 16, 32, 64, − 2, signs bits 48, 49, 50 of f; if bits 40–41 of f are 0
//! they are cut to an odd number of halves where they have a fraction. Output: s and t of each result, in the order of the slots below.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Roles, Size, Work};
#[cfg(target_arch = "x86_64")]
use crate::{
    kernel::{Proven, Ready, Variant},
    operands::Operands,
};

const PAIRS: usize = 8;
const RESULTS: usize = 49;
const CONTROLS: usize = 12;

/// See the file's head.
pub struct X87;

impl Kernel for X87 {
    fn id(&self) -> &'static str {
        "float.x87"
    }

    fn summary(&self) -> &'static str {
        "80-bit stack unit: every exactly specified operation, all roundings and precisions"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(2)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * RESULTS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (RESULTS * PAIRS * CONTROLS) as u64, unit: "result" }
    }

    #[cfg(target_arch = "x86_64")]
    fn builds(&self) -> &'static [Build] {
        const MARKS: &[&str] = &[
            "fadd", "fsub", "fsubr", "fmul", "fdiv", "fdivr", "fsqrt", "fabs", "fchs", "frndint", "fscale", "fxtract",
            "fprem", "fnstsw", "fcom", "fcomi", "fucomi", "fcmovb", "fcmovnb", "fcmovbe", "fcmovnbe", "fcmove",
            "fcmovne", "fcmovu", "fcmovnu", "fxch", "fiadd", "fidiv", "fist", "fistp", "fisttp", "fild", "fld1",
            "fldpi", "fldl2e", "fldl2t", "fldlg2", "fldln2", "fldz", "fldt", "fstpt", "flds", "fldl", "fsts", "fstl",
            "fldcw", "fnstcw", "fnclex",
        ];
        &[Build { variant: Variant::Portable, needs: &[], marks: MARKS, proven: Proven::Hardware }]
    }

    #[cfg(not(target_arch = "x86_64"))]
    fn builds(&self) -> &'static [Build] {
        &[]
    }

    #[cfg(target_arch = "x86_64")]
    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        assert_eq!(proof.variant_for(self.id()), Variant::Portable);
        let mut operands = Operands::new(case);
        let pairs = std::array::from_fn(|_| pair(std::array::from_fn(|_| operands.word()), case.seed.0 % 2 == 1));
        operands.finish(9 * PAIRS);
        Roles::One(Box::new(Prepared { pairs, results: [[0; 2]; RESULTS] }))
    }

    #[cfg(not(target_arch = "x86_64"))]
    fn prepare(&self, _case: &Case, proof: Proof) -> Roles {
        unreachable!("no proof is made for {}, which is not among the builds", proof.variant())
    }
}

/// One pair as it lies in memory. The asm below knows the offsets.
#[cfg(target_arch = "x86_64")]
#[repr(C, align(64))]
struct Pair {
    /// a, b at 0 and 16, the numbers for 16, 32, 64-bit integers at 32, 48, 64.
    extended: [[u64; 2]; 5],
    long: i64,
    int: i32,
    short: i16,
    scale: i16,
    single: u32,
    double: u64,
}

#[cfg(target_arch = "x86_64")]
fn encode(negative: bool, exponent: i32, significand: u64) -> [u64; 2] {
    [significand, (exponent + 16383) as u64 | u64::from(negative) << 15]
}

#[cfg(target_arch = "x86_64")]
fn pair([a, b, e, long, ints, single, double, m, f]: [u64; 9], wide: bool) -> Pair {
    let bit = |word: u64, at: u32| word >> at & 1 == 1;
    let significand = |word: u64, choice: u64| match choice & 3 {
        0 => (word | 1 << 63) & !0x7ff | 0x400,
        1 => (word | 1 << 63) & !0xff_ffff_ffff | 0x80_0000_0000,
        _ => word | 1 << 63,
    };
    let apart = (e >> 16 & 63) as i32;
    let (exponent, apart) =
        if wide { ((e % 14001) as i32 - 7000, apart.min(62)) } else { ((e % 41) as i32 - 20, apart & 7) };
    let integral = |modulus: u64, at: u32| {
        let exponent = ((f >> (8 * at)) % modulus) as i32 - 2;
        // the place of one half is 62 − exponent
        let half = 1u64.checked_shl((62 - exponent) as u32).unwrap_or(0);
        let cut = f >> 40 & 3 == 0 && exponent >= 0 && half > 1;
        let all = m | 1 << 63;
        encode(bit(f, 48 + at), exponent, if cut { all & !(half - 1) | half } else { all })
    };
    Pair {
        extended: [
            encode(bit(e, 63), exponent, significand(a, e >> 32)),
            encode(bit(e, 62), exponent - apart, significand(b, e >> 34)),
            integral(16, 0),
            integral(32, 1),
            integral(64, 2),
        ],
        long: long as i64,
        int: ints as i32,
        short: (ints >> 32) as i16 | 1,
        scale: ((ints >> 48) % 2001) as i16 - 1000,
        single: single as u32 & 0x807f_ffff | (120 + (single as u32 >> 23 & 15)) << 23,
        double: double & 0x800f_ffff_ffff_ffff | (1015 + (double >> 52 & 15)) << 52,
    }
}

#[cfg(target_arch = "x86_64")]
type Results = [[u64; 2]; RESULTS];

#[cfg(target_arch = "x86_64")]
struct Prepared {
    pairs: [Pair; PAIRS],
    results: Results,
}

#[cfg(target_arch = "x86_64")]
impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        portable(&self.pairs, &mut self.results, out);
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable(pairs: &[Pair; PAIRS], results: &mut Results, out: &mut [u64]) {
    out.fill(0);
    for rounding in 0..4u16 {
        for precision in [0u16, 2, 3] {
            // all exceptions masked
            let control = 0x3f | precision << 8 | rounding << 10;
            for pair in pairs {
                operate(pair, results, control);
                for (sums, words) in out.as_chunks_mut::<2>().0.iter_mut().zip(results.iter()) {
                    for word in words {
                        sums[0] = sums[0].wrapping_add(*word);
                        sums[1] = sums[1].wrapping_add(sums[0]);
                    }
                }
            }
        }
    }
}

/// All results of one pair under one control word; the former one is put back.
#[cfg(target_arch = "x86_64")]
#[inline(always)]
fn operate(pair: &Pair, results: &mut Results, control: u16) {
    let mut words = [control, 0];
    // SAFETY: reads the pair, writes within the results (48 · 16 + 10 bytes at most) and the two control words, leaves the
    // register stack empty as it found it, restores the control word; x87 is in the baseline
    unsafe {
        std::arch::asm!(
            "fnstcw word ptr [{c} + 2]",
            "fldcw word ptr [{c}]",
            "fld tbyte ptr [{p} + 16]",
            "fld tbyte ptr [{p}]",
            // 0 … 5: a + b, a − b, b − a, a · b, a / b, b / a
            "fld st(0)", "fadd st, st(2)", "fstp tbyte ptr [{r}]",
            "fld st(0)", "fsub st, st(2)", "fstp tbyte ptr [{r} + 16]",
            "fld st(0)", "fsubr st, st(2)", "fstp tbyte ptr [{r} + 32]",
            "fld st(0)", "fmul st, st(2)", "fstp tbyte ptr [{r} + 48]",
            "fld st(0)", "fdiv st, st(2)", "fstp tbyte ptr [{r} + 64]",
            "fld st(0)", "fdivr st, st(2)", "fstp tbyte ptr [{r} + 80]",
            // 6 … 8: √|a|, −a, integral
            "fld st(0)", "fabs", "fsqrt", "fstp tbyte ptr [{r} + 96]",
            "fld st(0)", "fchs", "fstp tbyte ptr [{r} + 112]",
            "fld st(0)", "frndint", "fstp tbyte ptr [{r} + 128]",
            // 9: a · 2^scale
            "fild word ptr [{p} + 94]", "fld st(1)", "fscale", "fstp tbyte ptr [{r} + 144]", "fstp st(0)",
            // 10, 11: significand, exponent
            "fld st(0)", "fxtract", "fstp tbyte ptr [{r} + 160]", "fstp tbyte ptr [{r} + 176]",
            // 12, 13: remainder, quotient bits C0 C1 C3 with C2 clear
            "fld st(1)",
            "fld st(1)", "fprem", "fnstsw ax", "fstp tbyte ptr [{r} + 192]",
            "fstp st(0)",
            "and eax, 0x4700", "mov dword ptr [{r} + 208], eax",
            // 14: C0 C2 C3 of a compared with b
            "fcom st(1)", "fnstsw ax", "and eax, 0x4500", "mov dword ptr [{r} + 224], eax",
            // 15: below, equal, unordered as flags, twice
            "fcomi st, st(1)",
            "setb byte ptr [{r} + 240]", "sete byte ptr [{r} + 241]", "setp byte ptr [{r} + 242]",
            "fucomi st, st(1)",
            "setb byte ptr [{r} + 244]", "sete byte ptr [{r} + 245]", "setp byte ptr [{r} + 246]",
            // 16 … 23: a, or b where the condition holds
            "fld st(0)", "fcmovb st, st(2)", "fstp tbyte ptr [{r} + 256]",
            "fld st(0)", "fcmovnb st, st(2)", "fstp tbyte ptr [{r} + 272]",
            "fld st(0)", "fcmovbe st, st(2)", "fstp tbyte ptr [{r} + 288]",
            "fld st(0)", "fcmovnbe st, st(2)", "fstp tbyte ptr [{r} + 304]",
            "fld st(0)", "fcmove st, st(2)", "fstp tbyte ptr [{r} + 320]",
            "fld st(0)", "fcmovne st, st(2)", "fstp tbyte ptr [{r} + 336]",
            "fld st(0)", "fcmovu st, st(2)", "fstp tbyte ptr [{r} + 352]",
            "fld st(0)", "fcmovnu st, st(2)", "fstp tbyte ptr [{r} + 368]",
            // 24: b − a by way of the stack: a, b exchanged, b from a, reversed
            "fld st(1)", "fld st(1)", "fxch st(1)", "fsubrp st(1), st", "fstp tbyte ptr [{r} + 384]",
            // 25 … 28: a + binary32, a · binary64, a + 32-bit integer, a / 16-bit integer
            "fld st(0)", "fadd dword ptr [{p} + 96]", "fstp tbyte ptr [{r} + 400]",
            "fld st(0)", "fmul qword ptr [{p} + 104]", "fstp tbyte ptr [{r} + 416]",
            "fld st(0)", "fiadd dword ptr [{p} + 88]", "fstp tbyte ptr [{r} + 432]",
            "fld st(0)", "fidiv word ptr [{p} + 92]", "fstp tbyte ptr [{r} + 448]",
            // 29, 30: a in binary32 and binary64
            "fst dword ptr [{r} + 464]",
            "fst qword ptr [{r} + 480]",
            "fstp st(0)", "fstp st(0)",
            // 31 … 36: to integers, by rounding control and toward zero
            "fld tbyte ptr [{p} + 32]", "fist word ptr [{r} + 496]", "fisttp word ptr [{r} + 544]",
            "fld tbyte ptr [{p} + 48]", "fist dword ptr [{r} + 512]", "fisttp dword ptr [{r} + 560]",
            "fld tbyte ptr [{p} + 64]", "fld st(0)", "fistp qword ptr [{r} + 528]", "fisttp qword ptr [{r} + 576]",
            // 37 … 39: from integers
            "fild word ptr [{p} + 92]", "fstp tbyte ptr [{r} + 592]",
            "fild dword ptr [{p} + 88]", "fstp tbyte ptr [{r} + 608]",
            "fild qword ptr [{p} + 80]", "fstp tbyte ptr [{r} + 624]",
            // 40 … 46: the constants
            "fld1", "fstp tbyte ptr [{r} + 640]",
            "fldpi", "fstp tbyte ptr [{r} + 656]",
            "fldl2e", "fstp tbyte ptr [{r} + 672]",
            "fldl2t", "fstp tbyte ptr [{r} + 688]",
            "fldlg2", "fstp tbyte ptr [{r} + 704]",
            "fldln2", "fstp tbyte ptr [{r} + 720]",
            "fldz", "fstp tbyte ptr [{r} + 736]",
            // 47, 48: from binary32 and binary64
            "fld dword ptr [{p} + 96]", "fstp tbyte ptr [{r} + 752]",
            "fld qword ptr [{p} + 104]", "fstp tbyte ptr [{r} + 768]",
            // no exception may be pending when the former masks come back
            "fnclex",
            "fldcw word ptr [{c} + 2]",
            c = in(reg) words.as_mut_ptr(),
            p = in(reg) pair,
            r = in(reg) results.as_mut_ptr(),
            out("eax") _,
            out("st(0)") _, out("st(1)") _, out("st(2)") _, out("st(3)") _,
            out("st(4)") _, out("st(5)") _, out("st(6)") _, out("st(7)") _,
            options(nostack),
        );
    }
}
