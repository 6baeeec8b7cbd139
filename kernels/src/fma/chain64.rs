//! `fma.chain64`: fused multiply-add of binary64 in chains that amplify their own errors.
//!
//! 8 lanes × 12 chains of 2,048 dependent fused multiply-adds, in cycles of four (see `common_walk`). Operands (see
//! `common_operands`): even seeds bounded in (−1, 1), odd seeds over nearly the whole exponent range with subnormal
//! results. Output: the 96 chains, by accumulator, then lane, then the lanes' sums.

use super::common_operands::BINARY64;
use super::common_walk::{ACCUMULATORS, FOOTPRINT_KIB, OUTPUT_ROWS, ROWS, Row, STEPS, Table, walk};
use crate::isa::{Feature, Proof};
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const LANES: usize = 8;
const STARTS: usize = ACCUMULATORS * LANES;

type Out = [[f64; LANES]; OUTPUT_ROWS];

/// See the file's head.
pub struct Chain64;

impl Kernel for Chain64 {
    fn id(&self) -> &'static str {
        "fma.chain64"
    }

    fn summary(&self) -> &'static str {
        "fused multiply-add units: binary64, every vector width, errors amplified"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(FOOTPRINT_KIB)]
    }

    fn output_words(&self, _size: Size) -> usize {
        OUTPUT_ROWS * LANES
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * STEPS * ACCUMULATORS * LANES) as u64, unit: "flop" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Fma],
                    marks: &["vfmadd", "vpaddq"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vfmadd", "vpaddq"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["fmadd"], proven: Proven::Emulator },
                Build { variant: Variant::Neon, needs: &[Feature::Neon], marks: &["fmla"], proven: Proven::Emulator },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let run: unsafe fn(&Table<f64, LANES>, &mut Out) = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => neon,
            #[cfg(target_arch = "aarch64")]
            Variant::Portable => portable,
            other => unreachable!("no proof is made for {other}, which is not among the builds"),
        };
        Roles::One(Box::new(Chains { table: table(case), run }))
    }
}

fn table(case: &Case) -> Table<f64, LANES> {
    let full_range = case.seed.0 % 2 == 1;
    let mut operands = Operands::new(case);
    let starts = std::array::from_fn(|_| std::array::from_fn(|_| f64::from_bits(BINARY64.start(operands.word()))));
    let rows = (0..ROWS)
        .map(|i| {
            let raw: [[u64; LANES]; 5] = std::array::from_fn(|_| std::array::from_fn(|_| operands.word()));
            let mut row = Row([[0.0; LANES]; 5]);
            for lane in 0..LANES {
                let bits = BINARY64.row(raw.map(|r| r[lane]), full_range, i);
                (0..5).for_each(|k| row.0[k][lane] = f64::from_bits(bits[k]));
            }
            row
        })
        .collect();
    operands.finish(STARTS + ROWS * 5 * LANES);
    Table { starts, rows }
}

struct Chains {
    table: Table<f64, LANES>,
    run: unsafe fn(&Table<f64, LANES>, &mut Out),
}

impl Ready for Chains {
    fn run(&mut self, out: &mut [u64]) {
        let mut chains = [[0.0; LANES]; OUTPUT_ROWS];
        // SAFETY: `run` was chosen in `prepare` for a `Proof` of its variant, which `isa` makes only when the CPU has
        // every feature in the build's `needs`
        unsafe { (self.run)(&self.table, &mut chains) };
        for (word, chain) in out.iter_mut().zip(chains.as_flattened()) {
            *word = chain.to_bits();
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,fma")]
fn avx2(table: &Table<f64, LANES>, out: &mut Out) {
    // SAFETY: this function is entered only where AVX2 and FMA are present
    unsafe { walk::<std::arch::x86_64::__m256d, LANES>(table, out) }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(table: &Table<f64, LANES>, out: &mut Out) {
    // SAFETY: this function is entered only where AVX-512F is present
    unsafe { walk::<std::arch::x86_64::__m512d, LANES>(table, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn portable(table: &Table<f64, LANES>, out: &mut Out) {
    // SAFETY: fused multiply-add of scalars is in the architecture's baseline
    unsafe { walk::<f64, LANES>(table, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon")]
fn neon(table: &Table<f64, LANES>, out: &mut Out) {
    // SAFETY: this function is entered only where Advanced SIMD is present
    unsafe { walk::<std::arch::aarch64::float64x2_t, LANES>(table, out) }
}
