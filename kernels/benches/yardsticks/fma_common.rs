//! Peak of fused multiply-add: twelve accumulators, both operands in registers.

use std::hint::black_box;

use kernels::lanes::fma::FmaLanes;

const ACCUMULATORS: usize = 12;
const ROUNDS: usize = 2048;

/// Flop in one call with registers of `width` lanes.
pub const fn flop(width: usize) -> u64 {
    (2 * ACCUMULATORS * ROUNDS * width) as u64
}

/// One call.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
pub unsafe fn peak<V: FmaLanes>(half: V::Scalar) {
    let operands = black_box([half; 64]);
    let at = |i: usize| {
        // SAFETY: no register here has more than 16 lanes; the caller has the instructions
        unsafe { V::load(operands.as_ptr().add(16 * i)) }
    };
    let (factor, addend) = (at(0), at(1));
    let mut x: [V; ACCUMULATORS] = std::array::from_fn(|_| at(2));
    // different values, or the twelve chains would be one to the compiler
    for (i, x) in x.iter_mut().enumerate() {
        for _ in 0..i {
            // SAFETY: the caller has the instructions
            *x = unsafe { x.mul_add(factor, addend) };
        }
    }
    for _ in 0..ROUNDS {
        for x in &mut x {
            // SAFETY: the caller has the instructions
            *x = unsafe { x.mul_add(factor, addend) };
        }
    }
    for (i, x) in x.into_iter().enumerate() {
        let mut end = [half; 16];
        // SAFETY: no register here has more than 16 lanes; the caller has the instructions
        unsafe { x.store(end.as_mut_ptr()) };
        black_box((i, end));
    }
}
