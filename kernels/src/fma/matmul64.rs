//! `fma.matmul64`: a blocked matrix product of binary64 by fused multiply-add, closed by checksums.
//!
//! The algorithm, the checksums and their bound are in `common_matmul`. Operands, in stream order: the 95 × 96 drawn elements
//! of A, by rows; the 96 × 95 of B, by rows, a word each: sign the top bit, fraction
//! the low 52 bits, exponent −1 less the two bits above the fraction; then a word w for each k, from which odd seeds take the
//! scale 2^(w mod 1801 − 900) of column k of A, and its inverse for row k of B. Output: the numbers of rows and of columns whose sum is
//! beyond its bound, 0 and 0 when all is well; s and t of C; s and t of the rows' sums; s and t of the columns' sums.

use super::common_matmul::{DRAWN, Factors, ORDER, OUTPUT_WORDS, Product, run};
use crate::isa::{Feature, Proof};
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const FRACTION: u32 = 52;
const BIAS: u64 = 1023;
/// Scales are 2^−SPAN … 2^SPAN.
const SPAN: u64 = 900;

/// See the file's head.
pub struct Matmul64;

impl Kernel for Matmul64 {
    fn id(&self) -> &'static str {
        "fma.matmul64"
    }

    fn summary(&self) -> &'static str {
        "matrix product of binary64 in register tiles, rows and columns closed by checksums"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(216)]
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
                    marks: &["vfmadd", "vaddpd", "vpaddq", "vbroadcasts"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vfmadd", "vaddpd", "vpaddq"],
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
        let run: unsafe fn(&Factors<f64>, &mut Product<f64>) = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            other => unreachable!("no proof is made for {other}, which is not among the builds"),
        };
        let mut operands = Operands::new(case);
        let drawn: Vec<f64> = operands.words(2 * DRAWN).into_iter().map(element).collect();
        let (mut left, mut right) = (drawn[..DRAWN].iter().copied(), drawn[DRAWN..].iter().copied());
        let next = "as many elements as are drawn";
        let mut factors = Factors::close(|| left.next().expect(next), || right.next().expect(next));
        let scales: [(f64, f64); ORDER] = std::array::from_fn(|_| scale(operands.word()));
        operands.finish(2 * DRAWN + ORDER);
        if case.seed.0 % 2 == 1 {
            factors.scale(&scales, |x, by| x * by);
        }
        Roles::One(Box::new(Prepared { factors, product: Product::empty(), run }))
    }
}

fn element(raw: u64) -> f64 {
    let fraction = raw & ((1 << FRACTION) - 1);
    let exponent = BIAS - 1 - (raw >> FRACTION & 3);
    f64::from_bits(raw >> 63 << 63 | exponent << FRACTION | fraction)
}

/// 2^s and 2^−s.
fn scale(word: u64) -> (f64, f64) {
    let biased = word % (2 * SPAN + 1) + BIAS - SPAN;
    (f64::from_bits(biased << FRACTION), f64::from_bits((2 * BIAS - biased) << FRACTION))
}

struct Prepared {
    factors: Factors<f64>,
    product: Box<Product<f64>>,
    run: unsafe fn(&Factors<f64>, &mut Product<f64>),
}

impl Ready for Prepared {
    fn run(&mut self, out: &mut [u64]) {
        // SAFETY: `run` was chosen in `prepare` for a `Proof` of its variant, which `isa` makes only when the CPU has
        // every feature in the build's `needs`
        unsafe { (self.run)(&self.factors, &mut self.product) };
        let (alarms, digests) = out.split_at_mut(2);
        alarms.copy_from_slice(&self.product.alarms());
        for (word, x) in digests.iter_mut().zip(self.product.digests.iter().flat_map(|lanes| &lanes[..8])) {
            *word = x.to_bits();
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2(factors: &Factors<f64>, to: &mut Product<f64>) {
    // SAFETY: this function is entered only where AVX2 and FMA are present
    unsafe { run::<std::arch::x86_64::__m256d, 2, 2>(factors, to) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(factors: &Factors<f64>, to: &mut Product<f64>) {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { run::<std::arch::x86_64::__m512d, 1, 2>(factors, to) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon(factors: &Factors<f64>, to: &mut Product<f64>) {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { run::<std::arch::aarch64::float64x2_t, 4, 4>(factors, to) }
}
