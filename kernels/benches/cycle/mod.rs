//! The length of a clock cycle, from additions that each wait for the last.

use std::hint::black_box;

/// Cycles in one call of [`dependent_adds`].
pub const CYCLES: u64 = 1 << 16;

/// A chain of operations of one cycle each on every CPU of these architectures. Additions alternate with exclusive ors
/// so that the compiler cannot merge neighbours.
#[inline(never)]
pub fn dependent_adds() {
    let (a, b) = black_box((0x1234_5678_9abc_def1u64, 0x9e37_79b9_7f4a_7c15u64));
    let mut x = black_box(1u64);
    for _ in 0..CYCLES / 32 {
        for _ in 0..16 {
            x = x.wrapping_add(a) ^ b;
        }
    }
    black_box(x);
}
