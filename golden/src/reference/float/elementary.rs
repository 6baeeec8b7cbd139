//! `float.elementary` on softfloat: the pinned steps, integers and quadrants by integer arithmetic.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::{self as soft, Format, Round};

const F: Format = Format::F64;
const NEAR: Round = Round::NearestEven;
const COUNT: usize = 1024;
const ONE: u64 = 0x3ff << 52;

const EXP: &[u64] = &[
    0x3fe0000000000001,
    0x3fc5555555555556,
    0x3fa5555555553d68,
    0x3f811111111109b5,
    0x3f56c16c17889ef1,
    0x3f2a01a01a7c2efe,
    0x3efa019b9149a41c,
    0x3ec71de0db2f6b19,
    0x3e928917c89a43a7,
    0x3e5af389ecfc4b9c,
];
const LOG: &[u64] = &[
    0x3fe5555555555558,
    0x3fd99999999952e2,
    0x3fd2492492df148d,
    0x3fcc71c62e5800a1,
    0x3fc7462b4ab2ef6b,
    0x3fc39fe606542dde,
    0x3fc2b584aae78a57,
];
const SIN: &[u64] = &[
    0xbfc5555555555555,
    0x3f81111111110bb2,
    0xbf2a01a019e83aae,
    0x3ec71de37968a100,
    0xbe5ae600b02b6262,
    0x3de5e0b19f8b1451,
];
const COS: &[u64] = &[
    0x3fa5555555555555,
    0xbf56c16c16c16967,
    0x3efa01a019f4eb01,
    0xbe927e4fa17da09e,
    0x3e21eeb68e93b64c,
    0xbda907da367a37cb,
];
const LN2: [u64; 2] = [0x3fe62e42fef00000, 0x3dd473de6af278ed];
const QUARTER: [u64; 3] = [0x3ff921fb54400000, 0x3dd0b4611a600000, 0x3ba3198a2e037073];
const LOG2_E: u64 = 0x3ff71547652b82fe;
const TWO_OVER_PI: u64 = 0x3fe45f306dc9c883;
const SQRT_HALF: u64 = 0x3fe6a09e667f3bcd;

fn add(a: u64, b: u64) -> u64 {
    soft::add(F, a, b, NEAR).0
}
fn sub(a: u64, b: u64) -> u64 {
    soft::sub(F, a, b, NEAR).0
}
fn mul(a: u64, b: u64) -> u64 {
    soft::mul(F, a, b, NEAR).0
}

fn horner(coefficients: &[u64], v: u64) -> u64 {
    coefficients.iter().rev().copied().reduce(|total, c| add(mul(total, v), c)).unwrap_or(0)
}

/// x·c to the nearest integer, and as a number. Adding 1.5·2^52 and taking it away rounds the rounded product to even.
fn nearest(x: u64, c: u64) -> (i64, u64) {
    let k = soft::to_i64(F, mul(x, c), NEAR).0;
    (k, soft::from_int(F, k, NEAR).0)
}

/// The exponential, |x| < 512.
pub fn exp(x: u64) -> u64 {
    let (k, number) = nearest(x, LOG2_E);
    let r = sub(sub(x, mul(number, LN2[0])), mul(number, LN2[1]));
    let p = add(add(mul(mul(r, r), horner(EXP, r)), r), ONE);
    p.wrapping_add_signed(k << F.fraction_bits)
}

/// The natural logarithm of a positive normal number.
pub fn log(x: u64) -> u64 {
    let mut e = (x >> 52) as i64 - 1022;
    // in [1/2, 1)
    let mut m = x % (1 << 52) + (0x3fe << 52);
    if m < SQRT_HALF {
        m += 1 << 52;
        e -= 1;
    }
    let e = soft::from_int(F, e, NEAR).0;
    let s = soft::div(F, sub(m, ONE), add(m, ONE), NEAR).0;
    let w = mul(s, s);
    let low = add(mul(mul(s, w), horner(LOG, w)), mul(e, LN2[1]));
    add(add(low, add(s, s)), mul(e, LN2[0]))
}

/// Sine and cosine, |x| < 4096.
pub fn circle(x: u64) -> [u64; 2] {
    let (k, number) = nearest(x, TWO_OVER_PI);
    let r = QUARTER.iter().fold(x, |r, part| sub(r, mul(number, *part)));
    let w = mul(r, r);
    let s = add(mul(mul(r, w), horner(SIN, w)), r);
    let half = soft::div(F, w, soft::from_int(F, 2, NEAR).0, NEAR).0;
    let t = add(sub(mul(mul(w, w), horner(COS, w)), half), ONE);
    let minus = |v: u64| soft::negate(F, v);
    match k.rem_euclid(4) {
        0 => [s, t],
        1 => [t, minus(s)],
        2 => [minus(s), minus(t)],
        _ => [minus(t), s],
    }
}

fn bounded(word: u64, lowest: i64, highest: i64) -> u64 {
    let exponent = (lowest + (word >> 52) as i64 % 16).min(highest);
    (word >> 63 << 63) + ((1023 + exponent) as u64) * (1 << 52) + word % (1 << 52)
}

/// s and t of eight lanes, by weights.
fn digest(results: &[u64]) -> Vec<u64> {
    let rows = (results.len() / 8) as u64;
    let sum = |lane: usize, weight: &dyn Fn(u64) -> u64| {
        let lanes = results.iter().skip(lane).step_by(8).zip(0..);
        lanes.fold(0u64, |sum, (x, row)| sum.wrapping_add(x.wrapping_mul(weight(row))))
    };
    (0..8).map(|lane| sum(lane, &|_| 1)).chain((0..8).map(|lane| sum(lane, &|row| rows - row))).collect()
}

/// s and t of exp, log, sin, cos.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let odd = case.seed.0 % 2 == 1;
    let powers: Vec<u64> = stream.words(COUNT).into_iter().map(|w| exp(bounded(w, -6, 8))).collect();
    let logarithms: Vec<u64> = stream
        .words(COUNT)
        .into_iter()
        .map(|w| {
            let biased = if odd { 1022 + (w >> 63) } else { 1 + (w >> 52) % 2048 % 2046 };
            log(biased * (1 << 52) + w % (1 << 52))
        })
        .collect();
    let both: Vec<[u64; 2]> = stream.words(COUNT).into_iter().map(|w| circle(bounded(w, -4, 11))).collect();
    let [sines, cosines] = [0, 1].map(|i| both.iter().map(|pair| pair[i]).collect::<Vec<u64>>());
    [powers, logarithms, sines, cosines].iter().flat_map(|results| digest(results)).collect()
}
