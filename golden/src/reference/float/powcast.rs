//! `float.powcast` on softfloat: the same double-double steps on bit patterns, the product's error by a fused operation.

use kernels::Case;

use super::chain64::RECIPE;
use crate::reference::chacha::Stream;
use crate::softfloat::{self as soft, Format, Round};

const F: Format = Format::F64;
const NEAR: Round = Round::NearestEven;
const ONE: u64 = 0x3ff0_0000_0000_0000;
const PUBLISHED: [i64; 7] = [53, 68, 3, 107, -3, 52, 78];

fn add(a: u64, b: u64) -> u64 {
    soft::add(F, a, b, NEAR).0
}
fn sub(a: u64, b: u64) -> u64 {
    soft::sub(F, a, b, NEAR).0
}
fn mul(a: u64, b: u64) -> u64 {
    soft::mul(F, a, b, NEAR).0
}
fn div(a: u64, b: u64) -> u64 {
    soft::div(F, a, b, NEAR).0
}

#[derive(Clone, Copy)]
struct Pair {
    hi: u64,
    lo: u64,
}

fn fast_sum(a: u64, b: u64) -> Pair {
    let hi = add(a, b);
    Pair { hi, lo: sub(b, sub(hi, a)) }
}

/// The rounded product and its exact error.
fn two_product(a: u64, b: u64) -> (u64, u64) {
    let p = mul(a, b);
    (p, soft::fma(F, a, b, soft::negate(F, p), NEAR).0)
}

fn product(a: Pair, b: Pair) -> Pair {
    let (p, e) = two_product(a.hi, b.hi);
    fast_sum(p, add(e, add(mul(a.hi, b.lo), mul(a.lo, b.hi))))
}

fn root(a: Pair) -> Pair {
    let q = soft::sqrt(F, a.hi, NEAR).0;
    let (p, e) = two_product(q, q);
    let rest = add(sub(sub(a.hi, p), e), a.lo);
    fast_sum(q, div(rest, add(q, q)))
}

fn reciprocal(a: Pair) -> Pair {
    let q = div(ONE, a.hi);
    let (p, e) = two_product(q, a.hi);
    let rest = sub(sub(sub(ONE, p), e), mul(q, a.lo));
    fast_sum(q, div(rest, a.hi))
}

/// x to the power `sixteenths` / 16.
fn pow(x: u64, sixteenths: i64) -> u64 {
    let n = sixteenths.unsigned_abs();
    let x = Pair { hi: x, lo: 0 };
    let one = Pair { hi: ONE, lo: 0 };
    let (mut r, mut square) = (one, x);
    let whole = n / 16;
    for bit in 0..64 - whole.leading_zeros() {
        if bit > 0 {
            square = product(square, square);
        }
        if whole >> bit & 1 == 1 {
            r = product(r, square);
        }
    }
    let mut fraction = x;
    for half in [8, 4, 2, 1] {
        fraction = root(fraction);
        if n & half != 0 {
            r = product(r, fraction);
        }
    }
    if sixteenths < 0 { reciprocal(r).hi } else { r.hi }
}

fn operand(w: u64, z: u64) -> (u64, i64) {
    let fraction = z % (1 << 52);
    let (x, bound) = match w >> 60 & 3 {
        3 => (ONE - (1 << 52) + fraction, 961),
        2 => (ONE + fraction, 961),
        _ => (ONE + fraction / 8, 4096),
    };
    let y = (w % bound) as i64;
    (x, if w >> 63 == 1 { -y } else { y })
}

/// Bits of the powers, their integer parts, the folds of both over all rounds, the chains' last states.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let chains = RECIPE.draw(&mut stream, 8, false);
    // a row before each of 48 powers in 8 rounds: each chain walks its 8 rows 48 times
    let states = RECIPE.walk(&chains, 48);
    let base = soft::div(F, soft::from_uint(F, 11, NEAR).0, soft::from_uint(F, 10, NEAR).0, NEAR).0;
    let powers: Vec<u64> = PUBLISHED
        .iter()
        .map(|y| (base, 16 * y))
        .chain((0..41).map(|_| {
            let w = stream.word();
            operand(w, stream.word())
        }))
        .map(|(x, y)| pow(x, y))
        .collect();
    let integers: Vec<u64> = powers.iter().map(|&p| soft::to_i64(F, p, Round::TowardZero).0 as u64).collect();
    let folds = powers.iter().zip(&integers).map(|(&power, &integer)| {
        [power, integer].repeat(8).into_iter().fold(0u64, |f, word| f.rotate_left(7).wrapping_add(word))
    });
    powers.iter().chain(&integers).copied().chain(folds).chain(states).collect()
}
