//! The walk that both FMA kernels share: twelve accumulators a register column, four fused multiply-adds a cycle.
//!
//! One cycle of a chain x, with the operands c, v, u, b, w of its lane:
//!
//! | step | value | on the bounded profile |
//! |---|---|---|
//! | fold | x ← x·x + c | c ≈ −1/2: (−1, 1) goes to (−1/2, 1/2) |
//! | lift | x ← x·v + x | 1 + v ≈ 1/\|u\|: to (−1, 1) at most |
//! | scale | x ← x·u + b | 1/2 ≤ \|u\| < 1, b small: to about (−1/2, 1/2) |
//! | widen | x ← x·w + x | w ≈ 0.98: back to (−1, 1) |
//!
//! Fold and widen together are the logistic map near its chaotic end, driven by fresh parameters: errors grow by more
//! than half a bit a cycle until they fill the word, and chains that start apart stay apart. A linear chain within
//! (−1, 1) could not do that: its gain cannot stay above one, and wrong last bits would be rounded away one by one.
//! The fold itself is blind to the last bits of a small x; so, before each, the bit pattern of x is added to an integer
//! sum of its lane, which is part of the output. Every factor and addend has a random significand.
//!
//! Twelve independent chains per lane hide the latency of two units of latency four or five; with the sum and two
//! registers for operands they fit the sixteen of AVX2.

use crate::lanes::fma::FmaLanes;

/// Chains per lane.
pub const ACCUMULATORS: usize = 12;
/// Operand rows; each drives one cycle.
pub const ROWS: usize = 64;
/// Times that a run goes through all rows.
pub const REPEATS: usize = 8;
/// Rows of the output: every chain's end, then the sums.
pub const OUTPUT_ROWS: usize = ACCUMULATORS + 1;
/// Fused multiply-adds of one chain in a run.
pub const STEPS: usize = ROWS * REPEATS * 4;
/// Footprint of either kernel: 64 rows of five and twelve starts of one 64-byte line, and the output, in KiB.
pub const FOOTPRINT_KIB: u32 = 22;

/// c, v, u, b, w for every lane.
#[derive(Clone)]
#[repr(C, align(64))]
pub struct Row<S, const LANES: usize>(pub [[S; LANES]; 5]);

/// All operands of a run.
#[repr(C, align(64))]
pub struct Table<S, const LANES: usize> {
    /// Where the chains start, by accumulator.
    pub starts: [[S; LANES]; ACCUMULATORS],
    /// What drives them.
    pub rows: Vec<Row<S, LANES>>,
}

/// Runs every chain to its end; `out` is by accumulator, then lane, then the sums by lane.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
pub unsafe fn walk<V: FmaLanes, const LANES: usize>(
    table: &Table<V::Scalar, LANES>,
    out: &mut [[V::Scalar; LANES]; OUTPUT_ROWS],
) {
    const { assert!(LANES.is_multiple_of(V::WIDTH)) };
    for first in (0..LANES).step_by(V::WIDTH) {
        // SAFETY: `first + WIDTH` is at most LANES, the length of each array that is read; the caller has the instructions
        let mut x: [V; ACCUMULATORS] = std::array::from_fn(|j| unsafe { V::load(table.starts[j].as_ptr().add(first)) });
        // SAFETY: the caller has the instructions
        let mut sum = unsafe { V::no_bits() };
        for _ in 0..REPEATS {
            for Row(row) in &table.rows {
                // SAFETY: as above
                let at = |i: usize| unsafe { V::load(row[i].as_ptr().add(first)) };
                let (c, v) = (at(0), at(1));
                for x in &mut x {
                    // SAFETY: the caller has the instructions
                    *x = unsafe { x.mul_add(*x, c) };
                }
                for x in &mut x {
                    // SAFETY: the caller has the instructions
                    *x = unsafe { x.mul_add(v, *x) };
                }
                let (u, b, w) = (at(2), at(3), at(4));
                for x in &mut x {
                    // SAFETY: the caller has the instructions
                    *x = unsafe { x.mul_add(u, b) };
                }
                for x in &mut x {
                    // SAFETY: the caller has the instructions
                    unsafe {
                        *x = x.mul_add(w, *x);
                        sum = sum.add_bits(*x);
                    }
                }
            }
        }
        for (x, to) in x.into_iter().chain([sum]).zip(&mut *out) {
            // SAFETY: `first + WIDTH` is at most LANES, the length of `to`; the caller has the instructions
            unsafe { x.store(to.as_mut_ptr().add(first)) };
        }
    }
}
