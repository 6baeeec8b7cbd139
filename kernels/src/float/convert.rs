//! `float.convert`: conversions between binary64, binary32, binary16, bfloat16 and integers, rounded to nearest even.
//!
//! Fifteen tracks of 256 numbers each, in the order of [`tracks`]; operands by `common_boundary.rs` sit on and next to
//! rounding boundaries, in range and never NaN. A track's results are its memory image, read as 64-bit words (the first
//! number lowest), eight words to a row. Per track and word position two sums modulo 2^64 run over the rows:
//! s ← s + word, t ← t + s, so that an error's place counts and equal errors do not cancel. A run passes over each
//! track 24 times in turn, the sums going on.
//!
//! Operands, in stream order: 13 arrays of 256 numbers, two words a number; i32 results toward zero and to nearest
//! share one array, and so do the two conversions from i32. Output, per track: 8 sums s, 8 sums t, the last word.

use super::common_boundary::{BFLOAT, DOUBLE, HALF, SINGLE, any, from_integer, narrowing, to_integer};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::lanes::Convert;
use crate::lanes::convert::{BLOCK, Plain};
use crate::operands::Operands;

const ITEMS: usize = 256;
const BLOCKS: usize = ITEMS / BLOCK;
const TRACKS: usize = 15;
const PASSES: usize = 24;
const ARRAYS: usize = 13;
const WORDS: usize = 17;

/// See the file's head.
pub struct Conversions;

impl Kernel for Conversions {
    fn id(&self) -> &'static str {
        "float.convert"
    }

    fn summary(&self) -> &'static str {
        "conversions between floating-point widths and integers, on rounding boundaries"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(18)]
    }

    fn output_words(&self, _size: Size) -> usize {
        TRACKS * WORDS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (TRACKS * ITEMS * PASSES) as u64, unit: "conversion" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["cvtpd2ps", "cvtps2pd", "cvttsd2si", "cvtdq2ps"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::F16c],
                    marks: &[
                        "vcvtpd2ps",
                        "vcvtps2pd",
                        "vcvtps2ph",
                        "vcvtph2ps",
                        "vcvttpd2dq",
                        "vcvtpd2dq",
                        "vcvtdq2pd",
                        "vcvtdq2ps",
                        "vcvttsd2si",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f, Feature::Avx512dq],
                    marks: &[
                        "vcvtpd2ps",
                        "vcvtps2pd",
                        "vcvtps2ph",
                        "vcvtph2ps",
                        "vcvttpd2dq",
                        "vcvtpd2dq",
                        "vcvttpd2udq",
                        "vcvttpd2qq",
                        "vcvtqq2pd",
                        "vcvtuqq2pd",
                        "vcvtudq2ps",
                    ],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["fcvtn", "fcvtl", "fcvtzs", "scvtf", "ucvtf"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["fcvtn", "fcvtl", "fcvtns", "fcvtzs", "scvtf", "ucvtf"],
                    proven: Proven::Emulator,
                },
            ]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["cvt"], proven: Proven::Unexecuted }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let arrays = Arrays::draw(&mut operands);
        operands.finish(2 * ITEMS * ARRAYS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            _ => portable,
        };
        Roles::One(Box::new(Prepared { arrays, run }))
    }
}

/// A block of numbers where a register may look for it.
#[repr(C, align(64))]
#[derive(Clone, Copy)]
struct Block<T>([T; BLOCK]);

impl<T: Copy> Block<T> {
    /// The block's memory image.
    #[inline(always)]
    fn words(&self) -> &[u64] {
        let count = BLOCK * size_of::<T>() / 8;
        // SAFETY: only used with integers and floats of 2, 4 or 8 bytes: `count` initialised words, aligned to 64 bytes
        unsafe { std::slice::from_raw_parts(self.0.as_ptr().cast(), count) }
    }
}

type Track<T> = [Block<T>; BLOCKS];

struct Arrays {
    double_to_single: Track<f64>,
    single: Track<f32>,
    single_to_half: Track<f32>,
    half: Track<u16>,
    single_to_bfloat: Track<f32>,
    bfloat: Track<u16>,
    double_to_i32: Track<f64>,
    i32: Track<i32>,
    u32: Track<u32>,
    double_to_i64: Track<f64>,
    i64: Track<i64>,
    u64: Track<u64>,
    double_to_u32: Track<f64>,
}

impl Arrays {
    fn draw(operands: &mut Operands) -> Box<Arrays> {
        fn track<T>(operands: &mut Operands, number: impl Fn(u64, u64) -> T) -> Track<T> {
            std::array::from_fn(|_| {
                Block(std::array::from_fn(|_| {
                    let w = operands.word();
                    number(w, operands.word())
                }))
            })
        }
        let single = |bits: u64| f32::from_bits(bits as u32);
        let double = f64::from_bits;
        let minus = |w: u64, magnitude: u64| {
            if w >> 63 == 1 { magnitude.wrapping_neg() } else { magnitude }
        };
        Box::new(Arrays {
            double_to_single: track(operands, |w, z| double(narrowing(DOUBLE, SINGLE, w, z))),
            single: track(operands, |w, z| single(any(SINGLE, w, z))),
            single_to_half: track(operands, |w, z| single(narrowing(SINGLE, HALF, w, z))),
            half: track(operands, |w, z| any(HALF, w, z) as u16),
            single_to_bfloat: track(operands, |w, z| single(narrowing(SINGLE, BFLOAT, w, z))),
            bfloat: track(operands, |w, z| any(BFLOAT, w, z) as u16),
            double_to_i32: track(operands, |w, z| double(to_integer(30, true, w, z))),
            i32: track(operands, |w, z| minus(w, from_integer(31, 24, w, z)) as i32),
            u32: track(operands, |w, z| from_integer(32, 24, w, z) as u32),
            double_to_i64: track(operands, |w, z| double(to_integer(62, true, w, z))),
            i64: track(operands, |w, z| minus(w, from_integer(63, 53, w, z)) as i64),
            u64: track(operands, |w, z| from_integer(64, 53, w, z)),
            double_to_u32: track(operands, |w, z| double(to_integer(32, false, w, z))),
        })
    }
}

struct Prepared {
    arrays: Box<Arrays>,
    run: fn(&Arrays, &mut [u64]),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.arrays, out);
    }
}

/// One track: `PASSES` times all its blocks through `convert`, results into the sums.
#[inline(always)]
fn track<A, B: Copy>(from: &Track<A>, zero: B, out: &mut [u64], convert: impl Fn(&[A; BLOCK], &mut [B; BLOCK])) {
    let (mut s, mut t) = ([0u64; 8], [0u64; 8]);
    let mut result = Block([zero; BLOCK]);
    for _ in 0..PASSES {
        for block in from {
            convert(&block.0, &mut result.0);
            for row in result.words().as_chunks::<8>().0 {
                for ((s, t), word) in s.iter_mut().zip(&mut t).zip(row) {
                    *s = s.wrapping_add(*word);
                    *t = t.wrapping_add(*s);
                }
            }
        }
    }
    out[..8].copy_from_slice(&s);
    out[8..16].copy_from_slice(&t);
    out[16] = result.words().last().copied().unwrap_or(0);
}

/// All tracks, in their order.
///
/// # Safety
/// The CPU has the features of `C`'s level.
#[inline(always)]
unsafe fn tracks<C: Convert>(x: &Arrays, out: &mut [u64]) {
    let (outs, _) = out.as_chunks_mut::<WORDS>();
    let [o0, o1, o2, o3, o4, o5, o6, o7, o8, o9, o10, o11, o12, o13, o14] = outs else {
        panic!("an output of {} words", TRACKS * WORDS)
    };
    // SAFETY: features by this function's contract
    unsafe {
        track(&x.double_to_single, 0.0, o0, |x, y| C::f64_to_f32(x, y));
        track(&x.single, 0.0, o1, |x, y| C::f32_to_f64(x, y));
        track(&x.single_to_half, 0, o2, |x, y| C::f32_to_half(x, y));
        track(&x.half, 0.0, o3, |x, y| C::half_to_f32(x, y));
        track(&x.single_to_bfloat, 0, o4, |x, y| C::f32_to_bfloat(x, y));
        track(&x.bfloat, 0.0, o5, |x, y| C::bfloat_to_f32(x, y));
        track(&x.double_to_i32, 0, o6, |x, y| C::f64_truncate_i32(x, y));
        track(&x.double_to_i32, 0, o7, |x, y| C::f64_nearest_i32(x, y));
        track(&x.i32, 0.0, o8, |x, y| C::i32_to_f64(x, y));
        track(&x.i32, 0.0, o9, |x, y| C::i32_to_f32(x, y));
        track(&x.u32, 0.0, o10, |x, y| C::u32_to_f32(x, y));
        track(&x.double_to_i64, 0, o11, |x, y| C::f64_truncate_i64(x, y));
        track(&x.i64, 0.0, o12, |x, y| C::i64_to_f64(x, y));
        track(&x.u64, 0.0, o13, |x, y| C::u64_to_f64(x, y));
        track(&x.double_to_u32, 0, o14, |x, y| C::f64_truncate_u32(x, y));
    }
}

#[inline(never)]
fn portable(x: &Arrays, out: &mut [u64]) {
    // SAFETY: plain casts need no feature
    unsafe { tracks::<Plain>(x, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,f16c")]
fn avx2(x: &Arrays, out: &mut [u64]) {
    // SAFETY: avx2 and f16c are enabled on this function
    unsafe { tracks::<crate::lanes::convert::Avx2>(x, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f,avx512dq")]
fn avx512(x: &Arrays, out: &mut [u64]) {
    // SAFETY: avx512f and avx512dq are enabled on this function
    unsafe { tracks::<crate::lanes::convert::Avx512>(x, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(x: &Arrays, out: &mut [u64]) {
    // SAFETY: NEON is aarch64's baseline
    unsafe { tracks::<crate::lanes::convert::Neon>(x, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(x: &Arrays, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 and f16c are present
    unsafe { avx2(x, out) }
}

#[cfg(target_arch = "x86_64")]
fn run_avx512(x: &Arrays, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx512`, which `isa` makes only when its features are present
    unsafe { avx512(x, out) }
}
