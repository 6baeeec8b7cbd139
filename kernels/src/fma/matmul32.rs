//! `fma.matmul32`: a blocked matrix product of binary32 by fused multiply-add, closed by checksums.
//!
//! The algorithm, the checksums and their bound are in `common_matmul`. Operands, in stream order: the 95 × 96 drawn elements
//! of A, by rows; the 96 × 95 of B, by rows, two to a word, the earlier in the low half: sign the top bit, fraction
//! the low 23 bits, exponent −1 less the two bits above the fraction; then a word w for each k, from which odd seeds take the
//! scale 2^(w mod 201 − 100) of column k of A, and its inverse for row k of B. Output: the numbers of rows and of columns whose sum is
//! beyond its bound, 0 and 0 when all is well; s and t of C; s and t of the rows' sums; s and t of the columns' sums.

use super::common_matmul::{DRAWN, Factors, ORDER, OUTPUT_WORDS, Product, run};
use crate::isa::{Feature, Proof};
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const FRACTION: u32 = 23;
const BIAS: u32 = 127;
/// Scales are 2^−SPAN … 2^SPAN.
const SPAN: u64 = 100;

/// See the file's head.
pub struct Matmul32;

impl Kernel for Matmul32 {
    fn id(&self) -> &'static str {
        "fma.matmul32"
    }

    fn summary(&self) -> &'static str {
        "matrix product of binary32 in register tiles, rows and columns closed by checksums"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(108)]
    }

    fn output_words(&self, _size: Size) -> usize {
        OUTPUT_WORDS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * ORDER * ORDER * ORDER) as u64, unit: "flop" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Fma],
                    marks: &["vfmadd", "vaddps", "vpaddd", "vbroadcasts"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vfmadd", "vaddps", "vpaddd"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[Build {
                variant: Variant::Neon,
                needs: &[Feature::Neon],
                marks: &["fmla", "fadd"],
                proven: Proven::Emulator,
            }]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let run: unsafe fn(&Factors<f32>, &mut Product<f32>) = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            other => unreachable!("no proof is made for {other}, which is not among the builds"),
        };
        let mut operands = Operands::new(case);
        let halves = |word: u64| [word as u32, (word >> 32) as u32];
        let drawn: Vec<f32> = operands.words(DRAWN).into_iter().flat_map(halves).map(element).collect();
        let (mut left, mut right) = (drawn[..DRAWN].iter().copied(), drawn[DRAWN..].iter().copied());
        let next = "as many elements as are drawn";
        let mut factors = Factors::close(|| left.next().expect(next), || right.next().expect(next));
        let scales: [(f32, f32); ORDER] = std::array::from_fn(|_| scale(operands.word()));
        operands.finish(DRAWN + ORDER);
        if case.seed.0 % 2 == 1 {
            factors.scale(&scales, |x, by| x * by);
        }
        Roles::One(Box::new(Prepared { factors, product: Product::empty(), run }))
    }
}

fn element(raw: u32) -> f32 {
    let fraction = raw & ((1 << FRACTION) - 1);
    let exponent = BIAS - 1 - (raw >> FRACTION & 3);
    f32::from_bits(raw >> 31 << 31 | exponent << FRACTION | fraction)
}

/// 2^s and 2^−s.
fn scale(word: u64) -> (f32, f32) {
    let biased = (word % (2 * SPAN + 1)) as u32 + BIAS - SPAN as u32;
    (f32::from_bits(biased << FRACTION), f32::from_bits((2 * BIAS - biased) << FRACTION))
}

struct Prepared {
    factors: Factors<f32>,
    product: Box<Product<f32>>,
    run: unsafe fn(&Factors<f32>, &mut Product<f32>),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        // SAFETY: `run` was chosen in `prepare` for a `Proof` of its variant, which `isa` makes only when the CPU has
        // every feature in the build's `needs`
        unsafe { (self.run)(&self.factors, &mut self.product) };
        let (alarms, digests) = out.split_at_mut(2);
        alarms.copy_from_slice(&self.product.alarms());
        for (word, [low, high]) in digests.iter_mut().zip(self.product.digests.as_flattened().as_chunks::<2>().0) {
            *word = u64::from(low.to_bits()) | u64::from(high.to_bits()) << 32;
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2(factors: &Factors<f32>, to: &mut Product<f32>) {
    // SAFETY: this function is entered only where AVX2 and FMA are present
    unsafe { run::<std::arch::x86_64::__m256, 2, 2>(factors, to) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(factors: &Factors<f32>, to: &mut Product<f32>) {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { run::<std::arch::x86_64::__m512, 1, 2>(factors, to) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon(factors: &Factors<f32>, to: &mut Product<f32>) {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { run::<std::arch::aarch64::float32x4_t, 4, 4>(factors, to) }
}
