//! The inner step of `integer.bignum`: eight limbs of one factor times eight of the other, added to a sum.

/// Eight limbs, lowest first.
pub(super) type Eight = [u64; 8];

/// Row i adds a·bᵢ at place i. The window holds the eight limbs of the sum from place i on that are not yet in `sum`.
pub(super) trait Rows {
    /// Adds a·b and the window to `sum`; what belongs above it is the window afterwards.
    fn add_rows(sum: &mut Eight, a: &Eight, b: &Eight, window: &mut Eight);

    /// The eight multiples m for which sum + n·m + window is 0 in its lowest eight limbs, where inverse = −1/n₀ mod 2⁶⁴; what
    /// belongs above these limbs is the window afterwards.
    fn find_rows(sum: &Eight, n: &Eight, inverse: u64, window: &mut Eight) -> Eight;
}

/// Products of 128 bits, each with the carry of the one before.
pub(super) struct ByCarry;

/// One row; the limb that leaves the window.
#[inline(always)]
fn row(sum: u64, a: &Eight, b: u64, window: &mut Eight) -> u64 {
    let mut out = 0;
    let mut carry = u128::from(sum);
    for j in 0..8 {
        // (2⁶⁴ − 1)² + 2·(2⁶⁴ − 1) = 2¹²⁸ − 1
        let total = u128::from(a[j]) * u128::from(b) + u128::from(window[j]) + carry;
        carry = total >> 64;
        if j == 0 {
            out = total as u64;
        } else {
            window[j - 1] = total as u64;
        }
    }
    window[7] = carry as u64;
    out
}

impl Rows for ByCarry {
    #[inline(always)]
    fn add_rows(sum: &mut Eight, a: &Eight, b: &Eight, window: &mut Eight) {
        for (sum, b) in sum.iter_mut().zip(b) {
            *sum = row(*sum, a, *b, window);
        }
    }

    #[inline(always)]
    fn find_rows(sum: &Eight, n: &Eight, inverse: u64, window: &mut Eight) -> Eight {
        let mut multiples = [0; 8];
        for (m, sum) in multiples.iter_mut().zip(sum) {
            *m = sum.wrapping_add(window[0]).wrapping_mul(inverse);
            row(*sum, n, *m, window);
        }
        multiples
    }
}
