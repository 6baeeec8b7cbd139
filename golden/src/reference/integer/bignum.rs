//! `integer.bignum`: products column by column in 32-bit digits; M(u, v) = u·v/R mod N without Montgomery's method, as the
//! remainder of u·v by shifting and subtracting, halved 2,048 times modulo N.

use kernels::Case;

use crate::reference::chacha::Stream;

/// 32-bit digits, lowest first.
type Digits = Vec<u32>;

const DIGITS: usize = 64;

fn digits(words: &[u64]) -> Digits {
    words.iter().flat_map(|w| [*w as u32, (*w >> 32) as u32]).collect()
}

fn limbs(digits: &[u32]) -> Vec<u64> {
    digits.chunks(2).map(|d| u64::from(d[0]) | u64::from(d[1]) << 32).collect()
}

fn product(x: &[u32], y: &[u32]) -> Digits {
    let mut column = 0u128;
    let mut out = Digits::new();
    for place in 0..x.len() + y.len() {
        for i in place.saturating_sub(y.len() - 1)..x.len().min(place + 1) {
            column += u128::from(x[i]) * u128::from(y[place - i]);
        }
        out.push(column as u32);
        column >>= 32;
    }
    out
}

/// x ← 2x + bit; the bit that leaves at the top.
fn double(x: &mut [u32], mut bit: u32) -> u32 {
    for digit in x {
        let top = *digit >> 31;
        *digit = *digit << 1 | bit;
        bit = top;
    }
    bit
}

fn halve(x: &mut [u32], mut bit: u32) {
    for digit in x.iter_mut().rev() {
        let low = *digit & 1;
        *digit = *digit >> 1 | bit << 31;
        bit = low;
    }
}

fn add(x: &mut [u32], y: &[u32]) -> u32 {
    let mut carry = 0;
    for (x, y) in x.iter_mut().zip(y) {
        let sum = u64::from(*x) + u64::from(*y) + carry;
        *x = sum as u32;
        carry = sum >> 32;
    }
    carry as u32
}

fn subtract(x: &mut [u32], y: &[u32]) {
    let mut borrow = 0;
    for (x, y) in x.iter_mut().zip(y) {
        let needed = u64::from(*y) + borrow;
        borrow = u64::from(u64::from(*x) < needed);
        *x = (u64::from(*x) + (borrow << 32) - needed) as u32;
    }
}

fn at_least(x: &[u32], y: &[u32]) -> bool {
    x.iter().rev().ge(y.iter().rev())
}

/// x·2^-2048 mod n for odd n.
fn over_r(x: &[u32], n: &[u32]) -> Digits {
    let mut rest = vec![0; DIGITS];
    for place in (0..32 * x.len()).rev() {
        let over = double(&mut rest, x[place / 32] >> (place % 32) & 1);
        if over == 1 || at_least(&rest, n) {
            subtract(&mut rest, n);
        }
    }
    for _ in 0..32 * DIGITS {
        // an odd number plus n is even and the same modulo n
        let carry = if rest[0] & 1 == 1 { add(&mut rest, n) } else { 0 };
        halve(&mut rest, carry);
    }
    rest
}

/// The sixteenth product, the power after 12 and after 24 bits.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let (mut a, mut b) = (digits(&stream.words(32)), digits(&stream.words(32)));
    let mut out = Vec::new();
    for _ in 0..16 {
        let mask = stream.words(32);
        let backwards: Vec<u64> = mask.iter().rev().copied().collect();
        let p = product(&a, &b);
        out = limbs(&p);
        a = p.iter().zip(digits(&mask)).map(|(d, m)| d ^ m).collect();
        b = p[DIGITS..].iter().zip(digits(&backwards)).map(|(d, m)| d ^ m).collect();
    }
    let mut n = digits(&stream.words(32));
    n[0] |= 1;
    n[DIGITS - 1] |= 1 << 31;
    let mut below = || {
        let mut x = digits(&stream.words(32));
        x[DIGITS - 1] &= u32::MAX >> 1;
        x
    };
    let (mut y, zero, one) = (below(), below(), below());
    let exponent = stream.word();
    for bit in (0..24).rev() {
        y = over_r(&product(&y, &y), &n);
        y = over_r(&product(&y, if exponent >> bit & 1 == 1 { &one } else { &zero }), &n);
        if bit == 12 || bit == 0 {
            out.extend(limbs(&y));
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// 2²⁰⁴⁸ ≡ 1 modulo 2²⁰⁴⁸ − 1: dividing by R changes nothing; and (2ᵏ − 1)² = 2²ᵏ − 2ᵏ⁺¹ + 1.
    #[test]
    fn identities_of_numbers_near_powers_of_two() {
        let n = vec![u32::MAX; DIGITS];
        let x: Digits = (0..DIGITS as u32).map(|i| i * 0x0123_4567).collect();
        assert_eq!(over_r(&x, &n), x);
        let square = product(&n, &n);
        assert_eq!(square[0], 1);
        assert!(square[1..DIGITS].iter().all(|d| *d == 0));
        assert_eq!(square[DIGITS], u32::MAX - 1);
        assert!(square[DIGITS + 1..].iter().all(|d| *d == u32::MAX));
    }
}
