//! `float.elementary`: exp, log, sin and cos in binary64 by our own pinned steps, one multiplication or addition at a time.
//!
//! The platform's functions are not pinned; these are, down to the order of every rounding, and no variant fuses. Constants are
//! ln 2 and π/2 in parts (Cody and Waite, *Software Manual for the Elementary Functions*, 1980), the heads of 33 bits so
//! that their products with k are exact; polynomials by interpolation at Chebyshev's points (the witness works them out anew).
//! k = (x·c + 1.5·2^52) − 1.5·2^52 is x·c to the nearest integer, and the low bits of the first sum are k's.
//!
//! ```text
//! exp   c = log₂e; r = (x − k·L₁) − k·L₂; ((r·r)·E(r) + r) + 1, its exponent raised by k
//! log   x = 2^e · m, m in [√½, √2); s = (m − 1)/(m + 1); w = s·s; (((s·w)·G(w) + e·L₂) + (s + s)) + e·L₁
//! sin   c = 2/π; r = ((x − k·P₁) − k·P₂) − k·P₃; w = r·r; s = (r·w)·S(w) + r; t = ((w·w)·C(w) − w·½) + 1
//!       sin x is s, t, −s, −t and cos x is t, −s, −t, s for k mod 4 = 0, 1, 2, 3
//! ```
//!
//! All polynomials by Horner's rule. Furthest from the true value over 100,000 points each and the edges of the ranges
//! (`golden/witness/check_elementary.py`): exp 0.971, log 1.861, sin 1.399, cos 1.421 last places.
//!
//! 1,024 numbers for each of exp, log and the two of the circle. Operands: a word each, in that order. exp: |x| < 512; sin and
//! cos: |x| < 4096: sign bit 63, fraction the low 52 bits, exponent bits 52–55 − 6, at most 8, or − 4. log: fraction the low 52
//! bits; even seeds biased exponent 1 + bits 52–62 modulo 2046, odd seeds 1022 + bit 63: near 1, where bits are lost first.
//! Output: for each of the four, over its results in eight lanes, s ← s + bits and t ← t + s modulo 2^64.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::lanes::bits::Bits;
use crate::operands::Operands;

const COUNT: usize = 1024;
const LANES: usize = 8;
const FUNCTIONS: usize = 4;

const EXP: [u64; 10] = [
    0x3fe0_0000_0000_0001,
    0x3fc5_5555_5555_5556,
    0x3fa5_5555_5555_3d68,
    0x3f81_1111_1111_09b5,
    0x3f56_c16c_1788_9ef1,
    0x3f2a_01a0_1a7c_2efe,
    0x3efa_019b_9149_a41c,
    0x3ec7_1de0_db2f_6b19,
    0x3e92_8917_c89a_43a7,
    0x3e5a_f389_ecfc_4b9c,
];
const LOG: [u64; 7] = [
    0x3fe5_5555_5555_5558,
    0x3fd9_9999_9999_52e2,
    0x3fd2_4924_92df_148d,
    0x3fcc_71c6_2e58_00a1,
    0x3fc7_462b_4ab2_ef6b,
    0x3fc3_9fe6_0654_2dde,
    0x3fc2_b584_aae7_8a57,
];
const SIN: [u64; 6] = [
    0xbfc5_5555_5555_5555,
    0x3f81_1111_1111_0bb2,
    0xbf2a_01a0_19e8_3aae,
    0x3ec7_1de3_7968_a100,
    0xbe5a_e600_b02b_6262,
    0x3de5_e0b1_9f8b_1451,
];
const COS: [u64; 6] = [
    0x3fa5_5555_5555_5555,
    0xbf56_c16c_16c1_6967,
    0x3efa_01a0_19f4_eb01,
    0xbe92_7e4f_a17d_a09e,
    0x3e21_eeb6_8e93_b64c,
    0xbda9_07da_367a_37cb,
];
const LN2: [u64; 2] = [0x3fe6_2e42_fef0_0000, 0x3dd4_73de_6af2_78ed];
const QUARTER: [u64; 3] = [0x3ff9_21fb_5440_0000, 0x3dd0_b461_1a60_0000, 0x3ba3_198a_2e03_7073];
const LOG2_E: u64 = 0x3ff7_1547_652b_82fe;
const TWO_OVER_PI: u64 = 0x3fe4_5f30_6dc9_c883;
const SQRT_HALF: u64 = 0x3fe6_a09e_667f_3bcd;
const ONE: u64 = 0x3ff0_0000_0000_0000;
/// 1.5 · 2^52.
const MAGIC: f64 = 6_755_399_441_055_744.0;
/// 2^52: a number's low bits are an integer behind it.
const PLACE: u64 = 0x4330_0000_0000_0000;

/// See the file's head.
pub struct Elementary;

impl Kernel for Elementary {
    fn id(&self) -> &'static str {
        "float.elementary"
    }

    fn summary(&self) -> &'static str {
        "exp, log, sin, cos by pinned polynomials, multiplication and addition apart"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(24)]
    }

    fn output_words(&self, _size: Size) -> usize {
        FUNCTIONS * 2 * LANES
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (FUNCTIONS * COUNT) as u64, unit: "value" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            const WIDE: &[&str] = &["vmulpd", "vaddpd", "vdivpd", "vpsllq", "vpsrlq", "vpaddq", "vpsubq"];
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["mul", "add", "sub", "div", "psllq", "psrlq"],
                    proven: Proven::Hardware,
                },
                Build { variant: Variant::Avx2, needs: &[Feature::Avx2], marks: WIDE, proven: Proven::Hardware },
                Build { variant: Variant::Avx512, needs: &[Feature::Avx512f], marks: WIDE, proven: Proven::Unexecuted },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["fmul", "fadd", "fsub", "fdiv"],
                    proven: Proven::Emulator,
                },
                #[cfg(target_arch = "aarch64")]
                Build {
                    variant: Variant::Neon,
                    needs: &[crate::isa::Feature::Neon],
                    marks: &["fmul", "fadd", "fsub", "fdiv", "shl"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let mut draw = |make: &dyn Fn(u64) -> u64| {
            let mut all = Box::new([0.0; COUNT]);
            all.iter_mut().for_each(|x| *x = f64::from_bits(make(operands.word())));
            all
        };
        let odd = case.seed.0 % 2 == 1;
        let fraction = |word: u64| word & ((1 << 52) - 1);
        let bounded = |word: u64, lowest: i64, highest: i64| {
            let exponent = (lowest + (word >> 52 & 15) as i64).min(highest);
            word & 1 << 63 | ((exponent + 1023) as u64) << 52 | fraction(word)
        };
        let exp = draw(&|word| bounded(word, -6, 8));
        let log = draw(&|word| {
            let biased = if odd { 1022 + (word >> 63) } else { 1 + (word >> 52 & 0x7ff) % 2046 };
            biased << 52 | fraction(word)
        });
        let circle = draw(&|word| bounded(word, -4, 11));
        operands.finish(3 * COUNT);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => run_neon,
            _ => portable,
        };
        Roles::One(Box::new(Prepared { arguments: Arguments { exp, log, circle }, run }))
    }
}

struct Arguments {
    exp: Box<[f64; COUNT]>,
    log: Box<[f64; COUNT]>,
    circle: Box<[f64; COUNT]>,
}

struct Prepared {
    arguments: Arguments,
    run: fn(&Arguments, &mut [u64]),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.arguments, out);
    }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn number<V: Bits>(bits: u64) -> V {
    // SAFETY: by this function's contract
    unsafe { V::all(f64::from_bits(bits)) }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn horner<V: Bits, const N: usize>(coefficients: &[u64; N], v: V) -> V {
    // SAFETY: by this function's contract
    unsafe {
        let mut total = number::<V>(coefficients[N - 1]);
        for c in coefficients[..N - 1].iter().rev() {
            total = total.mul(v).add(number(*c));
        }
        total
    }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn exp<V: Bits>(x: V) -> V {
    // SAFETY: by this function's contract
    unsafe {
        let sum = x.mul(number(LOG2_E)).add(V::all(MAGIC));
        let k = sum.sub(V::all(MAGIC));
        let r = x.sub(k.mul(number(LN2[0]))).sub(k.mul(number(LN2[1])));
        let p = r.mul(r).mul(horner(&EXP, r)).add(r).add(number(ONE));
        p.plus_bits(sum.left::<52>())
    }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn log<V: Bits>(x: V) -> V {
    // SAFETY: by this function's contract
    unsafe {
        // e + 1023, where a fraction from √2 on counts for the next e
        let biased = x.plus_bits(number(ONE - SQRT_HALF)).right::<52>();
        let m = x.minus_bits(biased.left::<52>()).plus_bits(number(ONE));
        let e = biased.plus_bits(number(PLACE)).sub(V::all(4_503_599_627_370_496.0 + 1023.0));
        let s = m.sub(number(ONE)).div(m.add(number(ONE)));
        let w = s.mul(s);
        let low = s.mul(w).mul(horner(&LOG, w)).add(e.mul(number(LN2[1])));
        low.add(s.add(s)).add(e.mul(number(LN2[0])))
    }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn circle<V: Bits>(x: V) -> [V; 2] {
    // SAFETY: by this function's contract
    unsafe {
        let sum = x.mul(number(TWO_OVER_PI)).add(V::all(MAGIC));
        let k = sum.sub(V::all(MAGIC));
        let [a, b, c] = QUARTER.map(|part| k.mul(number(part)));
        let r = x.sub(a).sub(b).sub(c);
        let w = r.mul(r);
        let s = r.mul(w).mul(horner(&SIN, w)).add(r);
        let t = w.mul(w).mul(horner(&COS, w)).sub(w.mul(V::all(0.5))).add(number(ONE));
        let odd = sum.left::<63>();
        let sign = number::<V>(1 << 63);
        // −sin from k mod 4 = 2 on; −cos where k + 1 would be there
        let sin = odd.choose(t, s).flip_bits(sum.left::<62>().and_bits(sign));
        let cos = odd.choose(s, t).flip_bits(sum.plus_bits(number(1)).left::<62>().and_bits(sign));
        [sin, cos]
    }
}

/// All of one array's numbers through `function`, which has `N` results for each.
///
/// # Safety
/// The CPU has the instructions of `V`; `REGISTERS` of them are eight lanes.
#[inline(always)]
unsafe fn walk<V: Bits, const REGISTERS: usize, const N: usize>(
    from: &[f64; COUNT],
    out: &mut [u64],
    function: impl Fn(V) -> [V; N],
) {
    const { assert!(REGISTERS * V::WIDTH == LANES) };
    // SAFETY: eight lanes divide COUNT; out has N times 16 words; instructions by this function's contract
    unsafe {
        let mut sums = [[[V::all(0.0); REGISTERS]; 2]; N];
        for at in (0..COUNT).step_by(LANES) {
            for r in 0..REGISTERS {
                let results = function(V::load(from.as_ptr().add(at + r * V::WIDTH)));
                for ([s, t], x) in sums.iter_mut().zip(results) {
                    s[r] = s[r].plus_bits(x);
                    t[r] = t[r].plus_bits(s[r]);
                }
            }
        }
        let out = &mut out[..N * 2 * LANES];
        for (i, register) in sums.as_flattened().as_flattened().iter().enumerate() {
            let mut lanes = [0.0; LANES];
            register.store(lanes.as_mut_ptr());
            for (word, lane) in out[i * V::WIDTH..].iter_mut().zip(&lanes[..V::WIDTH]) {
                *word = lane.to_bits();
            }
        }
    }
}

/// # Safety
/// The CPU has the instructions of `V`; `REGISTERS` of them are eight lanes.
#[inline(always)]
unsafe fn all<V: Bits, const REGISTERS: usize>(x: &Arguments, out: &mut [u64]) {
    let (powers, out) = out.split_at_mut(2 * LANES);
    let (logarithms, sines) = out.split_at_mut(2 * LANES);
    // SAFETY: by this function's contract
    unsafe {
        walk::<V, REGISTERS, 1>(&x.exp, powers, |x| [exp(x)]);
        walk::<V, REGISTERS, 1>(&x.log, logarithms, |x| [log(x)]);
        walk::<V, REGISTERS, 2>(&x.circle, sines, |x| circle(x));
    }
}

#[inline(never)]
fn portable(x: &Arguments, out: &mut [u64]) {
    // SAFETY: a scalar needs no feature
    unsafe { all::<f64, 8>(x, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(x: &Arguments, out: &mut [u64]) {
    // SAFETY: avx2 is enabled on this function
    unsafe { all::<std::arch::x86_64::__m256d, 2>(x, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(x: &Arguments, out: &mut [u64]) {
    // SAFETY: avx512f is enabled on this function
    unsafe { all::<std::arch::x86_64::__m512d, 1>(x, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon(x: &Arguments, out: &mut [u64]) {
    // SAFETY: NEON is aarch64's baseline
    unsafe { all::<std::arch::aarch64::float64x2_t, 4>(x, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(x: &Arguments, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 is present
    unsafe { avx2(x, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx512(x: &Arguments, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx512`, which `isa` makes only when avx512f is present
    unsafe { avx512(x, out) }
}

#[cfg(target_arch = "aarch64")]
fn run_neon(x: &Arguments, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Neon`, which `isa` makes only when NEON is present
    unsafe { neon(x, out) }
}
