//! Does a wrong bit survive to the output? One result of one operation is disturbed in one chain and the last state
//! compared with the undisturbed one. The floors are our own requirement, not an outside source's. What stays unseen is
//! an error below half a last place of the state: in the low places of a difference after cancellation, in a last place
//! before the root, or below what a subnormal can hold.

use std::cell::Cell;

use super::common_chain::{Chains, DOUBLE, SINGLE, Shape, walk, words_drawn};
use crate::kernel::{Case, Seed, Size};
use crate::lanes::Arithmetic;
use crate::operands::Operands;

thread_local! {
    /// Operations until the disturbance, and its XOR mask or, if 0, one unit in the last place.
    static FAULT: Cell<(u64, u64)> = const { Cell::new((u64::MAX, 0)) };
    /// Results so far that were subnormal, and that were zero, infinite or NaN.
    static TALLY: Cell<(u64, u64)> = const { Cell::new((0, 0)) };
}

/// A scalar whose n-th result is wrong.
#[derive(Clone, Copy)]
struct Faulty<S>(S);

macro_rules! faulty {
    ($scalar:ident $bits:ident) => {
        impl Faulty<$scalar> {
            fn disturbed(x: $scalar) -> Self {
                let (subnormal, odd) = TALLY.get();
                TALLY.set((
                    subnormal + u64::from(x.is_subnormal()),
                    odd + u64::from(!x.is_normal() && !x.is_subnormal()),
                ));
                let (left, mask) = FAULT.get();
                FAULT.set((left.wrapping_sub(1), mask));
                if left != 0 {
                    return Faulty(x);
                }
                let bits = if mask == 0 { x.to_bits() + 1 } else { x.to_bits() ^ mask as $bits };
                Faulty($scalar::from_bits(bits))
            }
        }

        impl Arithmetic for Faulty<$scalar> {
            type Scalar = $scalar;
            const WIDTH: usize = 1;
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the trait's contract: one readable scalar
                Faulty(unsafe { *from })
            }
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the trait's contract: one writable scalar
                unsafe { *to = self.0 }
            }
            unsafe fn add(self, other: Self) -> Self {
                Self::disturbed(self.0 + other.0)
            }
            unsafe fn sub(self, other: Self) -> Self {
                Self::disturbed(self.0 - other.0)
            }
            unsafe fn mul(self, other: Self) -> Self {
                Self::disturbed(self.0 * other.0)
            }
            unsafe fn div(self, other: Self) -> Self {
                Self::disturbed(self.0 / other.0)
            }
            unsafe fn sqrt(self) -> Self {
                Self::disturbed(self.0.sqrt())
            }
            unsafe fn abs(self) -> Self {
                Faulty(self.0.abs())
            }
        }
    };
}
faulty!(f64 u64);
faulty!(f32 u32);

const CHAINS: usize = 8;
const ROUNDS: usize = 16;
const OPERATIONS: u64 = 8 * 16 * 7 * CHAINS as u64;

enum Disturbance {
    /// One flipped bit, at least this many places above the lowest, below this many.
    Flip(u64, u64),
    /// One more in the last place.
    LastPlace,
}

/// Share of random disturbances that the last states show.
fn seen<S>(shape: Shape, full: bool, kind: Disturbance, scalar: fn(u64) -> S) -> f64
where
    S: Copy + PartialEq,
    Faulty<S>: Arithmetic<Scalar = S>,
{
    let case = Case { kernel: "float.persistence", seed: Seed(u64::from(full)), size: Size(1) };
    let mut operands = Operands::new(&case);
    let chains: Chains<S, CHAINS> = Chains::draw(shape, full, &mut operands, scalar);
    operands.finish(words_drawn(CHAINS));
    let run = |left: u64, mask: u64| {
        FAULT.set((left, mask));
        let mut x = *chains.start;
        // SAFETY: a scalar needs no feature
        unsafe { walk::<Faulty<S>, CHAINS>(&chains.rows, &mut x, ROUNDS) };
        x
    };
    let right = run(u64::MAX, 0);
    let mut dice = Operands::new(&Case { size: Size(2), ..case });
    const TRIALS: u64 = 4000;
    let hits = (0..TRIALS)
        .filter(|_| {
            let mask = match kind {
                Disturbance::Flip(low, high) => 1 << (low + dice.word() % (high - low)),
                Disturbance::LastPlace => 0,
            };
            run(dice.word() % OPERATIONS, mask) != right
        })
        .count();
    hits as f64 / TRIALS as f64
}

/// Floors in percent: any bit, bits above the lowest `spared`, one unit in the last place.
fn hold<S>(shape: Shape, full: bool, spared: u64, scalar: fn(u64) -> S, floors: [f64; 3])
where
    S: Copy + PartialEq,
    Faulty<S>: Arithmetic<Scalar = S>,
{
    let bits = u64::from(shape.fraction_bits + shape.exponent_bits) + 1;
    let kinds = [Disturbance::Flip(0, bits), Disturbance::Flip(spared, bits), Disturbance::LastPlace];
    let shares = kinds.map(|kind| 100.0 * seen(shape, full, kind, scalar));
    assert!(
        shares.iter().zip(floors).all(|(share, floor)| *share >= floor),
        "{shares:.2?} % seen, {floors:?} required"
    );
}

fn single(bits: u64) -> f32 {
    f32::from_bits(bits as u32)
}

#[test]
fn double_bounded() {
    hold(DOUBLE, false, 8, f64::from_bits, [98.0, 99.5, 50.0]);
}

#[test]
fn double_full_range() {
    hold(DOUBLE, true, 8, f64::from_bits, [97.0, 99.0, 30.0]);
}

#[test]
fn single_bounded() {
    hold(SINGLE, false, 8, single, [96.0, 99.0, 50.0]);
}

#[test]
fn single_full_range() {
    hold(SINGLE, true, 8, single, [94.0, 99.0, 35.0]);
}

/// Subnormal results and results that are zero, infinite or NaN among those of 500 cases.
fn tally<S>(shape: Shape, full: bool, scalar: fn(u64) -> S) -> (u64, u64)
where
    S: Copy,
    Faulty<S>: Arithmetic<Scalar = S>,
{
    FAULT.set((u64::MAX, 0));
    TALLY.set((0, 0));
    for seed in 0..500 {
        let mut operands = Operands::new(&Case { kernel: "float.tally", seed: Seed(seed), size: Size(1) });
        let chains: Chains<S, CHAINS> = Chains::draw(shape, full, &mut operands, scalar);
        let mut x = *chains.start;
        // SAFETY: a scalar needs no feature
        unsafe { walk::<Faulty<S>, CHAINS>(&chains.rows, &mut x, 2) };
    }
    TALLY.get()
}

/// Our own requirement: bounded cases have normal results only (a difference may be zero), full-range ones also
/// subnormal results, in one of 500 at least, and no case a NaN or infinity.
#[test]
fn results_are_of_the_stated_kinds() {
    const RESULTS: u64 = 500 * 2 * 8 * 7 * CHAINS as u64;
    for (what, full, (subnormal, odd)) in [
        ("double", false, tally(DOUBLE, false, f64::from_bits)),
        ("double", true, tally(DOUBLE, true, f64::from_bits)),
        ("single", false, tally(SINGLE, false, single)),
        ("single", true, tally(SINGLE, true, single)),
    ] {
        // d = c − q cancels exactly now and then: d = 0, and then t = 0
        assert!(odd <= RESULTS / 10_000, "{what}, full range {full}: {odd} results are zero, infinite or NaN");
        assert_eq!(subnormal >= RESULTS / 500, full, "{what}, full range {full}: {subnormal} subnormal results");
    }
}
