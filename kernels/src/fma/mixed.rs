//! `fma.mixed`: products of binary16 and bfloat16 numbers, accumulated in binary32, sums narrowed to both formats again.
//!
//! Widening is exact, every fused multiply-add rounds once, narrowing rounds to nearest even. 64 rows of 64 binary16 numbers
//! h and as many bfloat16 numbers b; in pass p (of 64) row i of h meets row (i + p) mod 64 of b. Eight rows make a segment:
//! in each column x ← 0, then by the row's place in its segment
//!
//! ```text
//! 0  h·b + x    1  h·b − x    2  x − h·b    3  −x − h·b    4  even columns h·b − x, odd ones h·b + x
//! 5  even columns h·b + x, odd ones h·b − x    6  x − h·b    7  h·b + x
//! ```
//!
//! A segment is short, so that x hardly outgrows its addends and few wrong bits are rounded away. At its end x, in binary16
//! and in bfloat16 as well, goes into sums: s ← s + bits, t ← t + s, for each column modulo 2^32; the narrowed numbers two by
//! two as 32-bit words, the 64 binary16 first. There is no part for the x86 dot product on bfloat16 pairs: it flushes
//! subnormals and rounds in steps of its own, which are another kernel's subject.
//!
//! Operands: 4 to a word, lowest bits first, all of h by rows, then b; then a word w for each column. binary16: sign bit 15,
//! fraction bits 0–9, exponent E − 1 less bits 10–11; below the normal numbers the significand is cut. bfloat16: sign bit 15,
//! fraction bits 0–6, exponent −E less bits 7–8. E is 0 in even seeds, w mod 35 − 20 in odd ones: then h goes from
//! subnormal to the largest, and products stay in ±[2^−8, 2). Output: s and t of x, then s and t of the narrowed, two to a
//! word, the earlier in the low half.

use std::hint::black_box;

use crate::isa::{Feature, Proof};
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::lanes::mixed::MixedLanes;
use crate::operands::Operands;

const COLUMNS: usize = 64;
const ROWS: usize = 64;
const PASSES: usize = 64;
const SEGMENT: usize = 8;

/// See the file's head.
pub struct Mixed;

impl Kernel for Mixed {
    fn id(&self) -> &'static str {
        "fma.mixed"
    }

    fn summary(&self) -> &'static str {
        "16-bit formats widened, fused into binary32 in six kinds, narrowed again"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(18)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * COLUMNS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * PASSES * ROWS * COLUMNS) as u64, unit: "flop" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            const MARKS: &[&str] = &[
                "vcvtph2ps",
                "vcvtps2ph",
                "vpmovzxwd",
                "vpslld",
                "vfmadd",
                "vfmsub",
                "vfnmadd",
                "vfnmsub",
                "vfmaddsub",
                "vfmsubadd",
            ];
            &[
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Fma, Feature::F16c],
                    marks: MARKS,
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: MARKS,
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[Build {
                variant: Variant::Neon,
                needs: &[Feature::Neon],
                marks: &["fcvtl", "fcvtn", "shll", "fmla", "fmls", "fneg"],
                proven: Proven::Emulator,
            }]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let run: unsafe fn(&Factors, &mut Sums) = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            other => unreachable!("no proof is made for {other}, which is not among the builds"),
        };
        Roles::One(Box::new(Prepared { factors: factors(case), sums: Sums::new(), run }))
    }
}

#[repr(C, align(64))]
struct Factors {
    half: [[u16; COLUMNS]; ROWS],
    bfloat: [[u16; COLUMNS]; ROWS],
}

fn factors(case: &Case) -> Box<Factors> {
    let mut operands = Operands::new(case);
    let mut draw = || {
        let mut rows = [[0u16; COLUMNS]; ROWS];
        for four in rows.as_flattened_mut().as_chunks_mut::<4>().0 {
            let word = operands.word();
            *four = std::array::from_fn(|i| (word >> (16 * i)) as u16);
        }
        rows
    };
    let mut all = Box::new(Factors { half: draw(), bfloat: draw() });
    for column in 0..COLUMNS {
        let word = operands.word();
        let level = if case.seed.0 % 2 == 1 { (word % 35) as i32 - 20 } else { 0 };
        all.half.iter_mut().for_each(|row| row[column] = half(row[column], level));
        all.bfloat.iter_mut().for_each(|row| row[column] = bfloat(row[column], level));
    }
    operands.finish(2 * ROWS * COLUMNS / 4 + COLUMNS);
    all
}

fn half(raw: u16, level: i32) -> u16 {
    let exponent = level - 1 - i32::from(raw >> 10 & 3);
    let magnitude = if exponent < -14 {
        (raw & 0x3ff | 0x400) >> (-14 - exponent)
    } else {
        ((exponent + 15) as u16) << 10 | raw & 0x3ff
    };
    raw & 0x8000 | magnitude
}

fn bfloat(raw: u16, level: i32) -> u16 {
    let exponent = -level - i32::from(raw >> 7 & 3);
    raw & 0x8000 | ((exponent + 127) as u16) << 7 | raw & 0x7f
}

/// Everything that a run writes. Sums are bit patterns; kept out of the stack so that vectors on it can only be spills.
#[repr(C, align(64))]
struct Sums {
    /// s and t of x, s and t of the narrowed.
    sums: [[f32; COLUMNS]; 4],
    /// x of one segment: binary16, then bfloat16.
    narrow: [[u16; COLUMNS]; 2],
}

impl Sums {
    fn new() -> Box<Sums> {
        Box::new(Sums { sums: [[0.0; COLUMNS]; 4], narrow: [[0; COLUMNS]; 2] })
    }
}

struct Prepared {
    factors: Box<Factors>,
    sums: Box<Sums>,
    run: unsafe fn(&Factors, &mut Sums),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        // SAFETY: `run` was chosen in `prepare` for a `Proof` of its variant, which `isa` makes only when the CPU has
        // every feature in the build's `needs`
        unsafe { (self.run)(&self.factors, &mut self.sums) };
        for (word, [low, high]) in out.iter_mut().zip(self.sums.sums.as_flattened().as_chunks::<2>().0) {
            *word = u64::from(low.to_bits()) | u64::from(high.to_bits()) << 32;
        }
    }
}

/// All passes, `AT_ONCE` registers of columns at a time.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn walk<V: MixedLanes, const AT_ONCE: usize>(factors: &Factors, to: &mut Sums) {
    const { assert!(COLUMNS.is_multiple_of(AT_ONCE * V::WIDTH)) };
    to.sums = [[0.0; COLUMNS]; 4];
    for pass in 0..PASSES {
        for segment in 0..ROWS / SEGMENT {
            // hidden, or the compiler would want more registers than there are for the sums
            let to = black_box(&mut *to);
            for first in (0..COLUMNS).step_by(AT_ONCE * V::WIDTH) {
                // SAFETY: first + AT_ONCE registers are within COLUMNS; instructions by this function's contract
                unsafe { part::<V, AT_ONCE>(factors, pass, segment, first, &mut to.narrow, &mut to.sums) };
            }
            let [_, _, s, t] = &mut to.sums;
            let narrow = to.narrow.as_ptr().cast::<f32>();
            for at in (0..COLUMNS).step_by(V::WIDTH) {
                // SAFETY: both lines of narrow numbers are as many bytes as a line of sums; instructions by this function's
                // contract
                unsafe { sum(V::load(narrow.add(at)), s.as_mut_ptr().add(at), t.as_mut_ptr().add(at)) };
            }
        }
    }
}

/// One segment of `AT_ONCE` registers of columns, into the sums of x and into `narrow`.
///
/// # Safety
/// The CPU has the instructions of `V`; the registers are within the columns.
#[inline(always)]
unsafe fn part<V: MixedLanes, const AT_ONCE: usize>(
    factors: &Factors,
    pass: usize,
    segment: usize,
    first: usize,
    narrow: &mut [[u16; COLUMNS]; 2],
    [s, t, ..]: &mut [[f32; COLUMNS]; 4],
) {
    // SAFETY: by this function's contract
    unsafe {
        let mut x = [V::no_bits(); AT_ONCE];
        let row = |step: usize| {
            let row = segment * SEGMENT + step;
            let (half, bfloat) = (&factors.half[row], &factors.bfloat[(row + pass) % ROWS]);
            (half.as_ptr().add(first), bfloat.as_ptr().add(first))
        };
        // written out, so that no step asks at run time which it is
        fuse(&mut x, row(0), |x, h, b| h.mul_add(b, x));
        fuse(&mut x, row(1), |x, h, b| x.fused_minus(h, b));
        fuse(&mut x, row(2), |x, h, b| x.minus_fused(h, b));
        fuse(&mut x, row(3), |x, h, b| x.minus_both(h, b));
        fuse(&mut x, row(4), |x, h, b| x.even_minus(h, b));
        fuse(&mut x, row(5), |x, h, b| x.odd_minus(h, b));
        fuse(&mut x, row(6), |x, h, b| x.minus_fused(h, b));
        fuse(&mut x, row(7), |x, h, b| h.mul_add(b, x));
        let [half, bfloat] = narrow;
        for (r, x) in x.into_iter().enumerate() {
            let at = first + r * V::WIDTH;
            x.narrow_half(half.as_mut_ptr().add(at));
            x.narrow_bfloat(bfloat.as_mut_ptr().add(at));
            sum(x, s.as_mut_ptr().add(at), t.as_mut_ptr().add(at));
        }
    }
}

/// One step of all registers.
///
/// # Safety
/// The CPU has the instructions of `V`; the pointers have as many numbers as `x` has lanes.
#[inline(always)]
unsafe fn fuse<V: MixedLanes>(x: &mut [V], (half, bfloat): (*const u16, *const u16), by: impl Fn(V, V, V) -> V) {
    for (r, x) in x.iter_mut().enumerate() {
        // SAFETY: by this function's contract
        let (h, b) = unsafe { (V::widen_half(half.add(r * V::WIDTH)), V::widen_bfloat(bfloat.add(r * V::WIDTH))) };
        *x = by(*x, h, b);
    }
}

/// # Safety
/// The CPU has the instructions of `V`; a register may be read and written at both pointers.
#[inline(always)]
unsafe fn sum<V: MixedLanes>(x: V, s: *mut f32, t: *mut f32) {
    // SAFETY: by this function's contract
    unsafe {
        let sum = V::load(s).add_bits(x);
        sum.store(s);
        V::load(t).add_bits(sum).store(t);
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma,f16c")]
fn avx2(factors: &Factors, to: &mut Sums) {
    // SAFETY: this function is entered only where AVX2, FMA and F16C are present
    unsafe { walk::<std::arch::x86_64::__m256, 4>(factors, to) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(factors: &Factors, to: &mut Sums) {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { walk::<std::arch::x86_64::__m512, 2>(factors, to) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon(factors: &Factors, to: &mut Sums) {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { walk::<std::arch::aarch64::float32x4_t, 8>(factors, to) }
}
