//! `integer.divide`: restoring long division, one bit of the quotient at a time; signed operands by sign and magnitude.

use kernels::Case;

use crate::reference::chacha::Stream;

/// Quotient and remainder of (high, low) by `d`, for high below `d`.
fn divide(high: u64, low: u64, d: u64) -> (u64, u64) {
    let (mut rest, mut quotient) = (high, 0);
    for bit in (0..64).rev() {
        // the bit shifted out of the rest means that it is above the divisor in any case
        let over = rest >> 63 == 1;
        rest = rest << 1 | low >> bit & 1;
        quotient <<= 1;
        if over || rest >= d {
            rest = rest.wrapping_sub(d);
            quotient |= 1;
        }
    }
    (quotient, rest)
}

/// Truncated division of two's-complement numbers of 64 bits; the remainder has the dividend's sign.
fn divide_signed(n: u64, d: u64) -> (u64, u64) {
    let negative = |v: u64| v >> 63 == 1;
    let magnitude = |v: u64| if negative(v) { v.wrapping_neg() } else { v };
    let (q, r) = divide(0, magnitude(n), magnitude(d));
    let q = if negative(n) != negative(d) { q.wrapping_neg() } else { q };
    (q, if negative(n) { r.wrapping_neg() } else { r })
}

/// The two's-complement number in the low 32 bits, widened to 64.
fn widen(v: u64) -> u64 {
    (v & 0xffff_ffff ^ 0x8000_0000).wrapping_sub(0x8000_0000)
}

fn absorb(x: &mut u64, (q, r): (u64, u64)) {
    *x = x.wrapping_add(q).rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(r);
}

fn bit_length(v: u64) -> u32 {
    (0..64).rev().find(|&b| v >> b & 1 == 1).map_or(0, |b| b + 1)
}

/// The four chains after 128 steps of five divisions.
pub fn words(case: &Case) -> Vec<u64> {
    const HALF: u64 = 0xffff_ffff;
    let mut stream = Stream::new(case);
    let mut chains = stream.words(4);
    for _ in 0..128 {
        let w = stream.words(6);
        let field = |from: u32, bits: u32| w[5] >> from & ((1 << bits) - 1);
        let sign = |v: u64, bit: u32| if w[5] >> bit & 1 == 1 { v.wrapping_neg() } else { v };
        let wide = (w[0] | 1 << 63) >> field(0, 6);
        let long = (w[2] | 1 << 63) >> field(6, 6);
        let signed = sign((w[3] | 1 << 63) >> (1 + field(12, 6).min(61)), 18);
        let short = (w[4] & HALF | 1 << 31) >> field(19, 5);
        let short_signed = sign((w[4] >> 32 | 1 << 31) >> (1 + field(24, 5).min(29)), 29);
        // as many leading bits of x as the divisor has, less one
        let keep = bit_length(wide) - 1;
        for x in &mut chains {
            let high = if keep == 0 { 0 } else { *x >> (64 - keep) };
            let low = x.rotate_right(32) ^ w[1];
            absorb(x, divide(high, low, wide));
            absorb(x, divide(0, *x, long));
            absorb(x, divide_signed(*x, signed));
            absorb(x, divide(0, *x & HALF, short));
            let (q, r) = divide_signed(widen(*x >> 32), short_signed);
            absorb(x, (q & HALF, r & HALF));
        }
    }
    chains
}

#[cfg(test)]
mod tests {
    use super::*;

    /// n = q·d + r with 0 ≤ r < d has one solution; the host's 128-bit multiplication finds it independently.
    #[test]
    fn division_identity() {
        let mut state = 0x0123_4567_89ab_cdef_u64;
        for i in 0..20_000u32 {
            let mut next = || {
                state ^= state << 13;
                state ^= state >> 7;
                state ^= state << 17;
                state
            };
            let d = next() >> (i % 64) | 1;
            let (high, low) = (u64::try_from((u128::from(next()) * u128::from(d)) >> 64).expect("below d"), next());
            let (q, r) = divide(high, low, d);
            assert!(r < d);
            assert_eq!(u128::from(q) * u128::from(d) + u128::from(r), u128::from(high) << 64 | u128::from(low));
        }
    }

    /// The division table in the Rust reference and in ISO C (6.5.5): quotients truncate towards zero.
    #[test]
    fn signs() {
        let n = |v: i64| v as u64;
        for (a, b, q, r) in [(7, 2, 3, 1), (-7, 2, -3, -1), (7, -2, -3, 1), (-7, -2, 3, -1), (i64::MIN, 2, -1 << 62, 0)]
        {
            assert_eq!(divide_signed(n(a), n(b)), (n(q), n(r)), "{a} / {b}");
        }
        assert_eq!(widen(0x8000_0000), n(i64::from(i32::MIN)));
        assert_eq!(widen(0xffff_ffff_7fff_ffff), 0x7fff_ffff);
    }

    /// The operands of the divider flaw of 1994 (4195835 / 3145727), here as integers: quotient 1, remainder 1050108.
    #[test]
    fn historic_operands() {
        assert_eq!(divide(0, 4_195_835, 3_145_727), (1, 1_050_108));
        assert_eq!(divide(4_195_834, u64::MAX, 4_195_835), (u64::MAX, 4_195_834));
    }
}
