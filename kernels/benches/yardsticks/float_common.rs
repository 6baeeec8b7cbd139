//! Peak of the chains' instruction mix: three multiplications, a square root, a division, a subtraction, an addition,
//! in `K` independent sets of registers, all operands in registers.

use std::hint::black_box;

use kernels::lanes::Arithmetic;

const ROUNDS: usize = 1024;

/// Flop in one call with `sets` sets of registers of `width` lanes.
pub const fn flop(sets: usize, width: usize) -> u64 {
    (7 * sets * ROUNDS * width) as u64
}

/// One call. `near_one` and `middle` are factors that keep every chain finite, normal and away from 1.
///
/// # Safety
/// The CPU has the instructions of `A`.
#[inline(always)]
pub unsafe fn mix<A: Arithmetic, const K: usize>(near_one: A::Scalar, middle: A::Scalar) {
    let (factors, starts) = (black_box([near_one; 16]), black_box([middle; 16]));
    // SAFETY: no register here has more than 16 lanes; the caller has the instructions
    unsafe {
        let (factor, start) = (A::load(factors.as_ptr()), A::load(starts.as_ptr()));
        // different values, or equal chains would be one to the compiler
        let mut next = start;
        let mut fresh = || {
            next = next.mul(factor);
            next
        };
        let mut set = || -> [A; K] { std::array::from_fn(|_| fresh()) };
        let (mut m, mut n, mut root, mut quotient, mut difference, mut sum) =
            (set(), set(), set(), set(), set(), set());
        for _ in 0..ROUNDS {
            for k in 0..K {
                m[k] = m[k].mul(factor);
                n[k] = n[k].mul(factor);
                root[k] = root[k].mul(start).sqrt();
                quotient[k] = quotient[k].div(factor);
                difference[k] = difference[k].sub(factor);
                sum[k] = sum[k].add(factor);
            }
        }
        for x in [m, n, root, quotient, difference, sum].into_iter().flatten() {
            let mut end = starts;
            x.store(end.as_mut_ptr());
            black_box(end);
        }
    }
}
