//! `integer.carry`: schoolbook addition and subtraction in 32-bit limbs inside 64-bit words, so that no flag is needed.

use kernels::Case;

use crate::reference::chacha::Stream;

/// 1,024 bits, least significant limb first.
type Number = [u32; 32];

/// Ten 32-bit places are five 64-bit ones.
const TURN: usize = 10;

fn number(words: &[u64]) -> Number {
    std::array::from_fn(|i| (words[i / 2] >> (32 * (i % 2))) as u32)
}

fn draw(stream: &mut Stream) -> Number {
    number(&stream.words(16))
}

fn draw_mask(stream: &mut Stream) -> Number {
    let v = stream.words(4);
    let mut mask = [0; 32];
    let fields = v[1..].iter().flat_map(|w| (0..6).map(move |f| (w >> (10 * f) & 1023) as usize));
    for place in fields.take(1 + (v[0] % 16) as usize) {
        mask[place / 32] |= 1 << (place % 32);
    }
    mask
}

fn turned(x: Number) -> Number {
    std::array::from_fn(|i| x[(i + 32 - TURN) % 32])
}

fn plus(x: &Number, y: &Number, carry: &mut u64) -> Number {
    let mut sum = [0; 32];
    for (place, (&a, &b)) in sum.iter_mut().zip(x.iter().zip(y)) {
        let total = u64::from(a) + u64::from(b) + *carry;
        *place = total as u32;
        *carry = total >> 32;
    }
    turned(sum)
}

fn minus(x: &Number, y: &Number, borrow: &mut u64) -> Number {
    let mut rest = [0; 32];
    for (place, (&a, &b)) in rest.iter_mut().zip(x.iter().zip(y)) {
        let needed = u64::from(b) + *borrow;
        *borrow = u64::from(u64::from(a) < needed);
        *place = ((*borrow << 32) + u64::from(a) - needed) as u32;
    }
    turned(rest)
}

fn zip(x: &Number, y: &Number, f: impl Fn(u32, u32) -> u32) -> Number {
    std::array::from_fn(|i| f(x[i], y[i]))
}

/// The numbers P and Q of both pairs after four passes of 48 steps, then the two carries.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let mut pairs: Vec<(Number, Number, u64)> = (0..2).map(|_| (draw(&mut stream), draw(&mut stream), 0)).collect();
    let steps: Vec<[Number; 4]> = (0..48)
        .map(|_| {
            let (carries, borrows) = (draw_mask(&mut stream), draw_mask(&mut stream));
            [carries, borrows, draw(&mut stream), draw(&mut stream)]
        })
        .collect();
    for [carries, borrows, add, subtract] in (0..4).flat_map(|_| &steps) {
        for (p, q, c) in &mut pairs {
            let t = plus(q, &zip(q, carries, |a, m| !(a ^ m)), c);
            *p = minus(p, &t, c);
            let u = minus(&zip(p, borrows, |a, m| a ^ m), p, c);
            *p = plus(p, add, c);
            *q = plus(q, &u, c);
            *q = minus(q, subtract, c);
        }
    }
    let numbers = pairs.iter().flat_map(|(p, q, _)| p.chunks(2).chain(q.chunks(2)));
    let mut out: Vec<u64> = numbers.map(|l| u64::from(l[0]) | u64::from(l[1]) << 32).collect();
    out.push(pairs[0].2 | pairs[1].2 << 1);
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    const ONES: Number = [u32::MAX; 32];

    fn one() -> Number {
        let mut n = [0; 32];
        n[0] = 1;
        n
    }

    /// 2¹⁰²⁴ − 1 + 1 = 2¹⁰²⁴: zero with a carry out that has run over every limb; and back.
    #[test]
    fn a_carry_and_a_borrow_run_over_every_limb() {
        let mut c = 0;
        assert_eq!(plus(&ONES, &one(), &mut c), [0; 32]);
        assert_eq!(c, 1);
        // the same carry let in at the bottom
        assert_eq!(plus(&ONES, &[0; 32], &mut c), [0; 32]);
        assert_eq!(c, 1);
        let mut b = 0;
        assert_eq!(minus(&[0; 32], &one(), &mut b), ONES);
        assert_eq!(b, 1);
        assert_eq!(minus(&[0; 32], &[0; 32], &mut b), ONES);
        assert_eq!(b, 1);
    }

    /// x − y = x + ¬y + 1, with the borrow as the carry's complement (any text on two's complement).
    #[test]
    fn subtraction_is_addition_of_the_complement() {
        let case = Case { kernel: "integer.carry", seed: kernels::Seed(3), size: kernels::Size(25) };
        let mut stream = Stream::new(&case);
        for _ in 0..200 {
            let (x, y) = (draw(&mut stream), draw(&mut stream));
            for borrow in [0, 1] {
                let (mut b, mut c) = (borrow, 1 - borrow);
                assert_eq!(minus(&x, &y, &mut b), plus(&x, &y.map(|l| !l), &mut c));
                assert_eq!(b, 1 - c);
            }
        }
    }
}
