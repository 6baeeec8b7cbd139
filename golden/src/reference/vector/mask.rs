//! `vector.mask`: each block a 128-bit number, element by element; floats compared as the integers that their bits are.

use kernels::Case;

use crate::reference::chacha::Stream;

/// 16 bytes, the first one lowest.
type Block = u128;
type Line = [u64; 8];

fn element(x: Block, width: u32, i: u32) -> u64 {
    (x >> (width * i)) as u64 & u64::MAX >> (64 - width)
}

fn build(width: u32, f: impl Fn(u32) -> u64) -> Block {
    (0..128 / width).fold(0, |x, i| x | u128::from(f(i) & u64::MAX >> (64 - width)) << (width * i))
}

fn add(width: u32, a: Block, b: Block) -> Block {
    build(width, |i| element(a, width, i).wrapping_add(element(b, width, i)))
}

fn sub(width: u32, a: Block, b: Block) -> Block {
    build(width, |i| element(a, width, i).wrapping_sub(element(b, width, i)))
}

fn top(x: Block, width: u32, i: u32) -> bool {
    element(x, width, i) >> (width - 1) == 1
}

/// Elements of b where the mask's top bit is one, else of a.
fn select(width: u32, a: Block, b: Block, m: Block) -> Block {
    build(width, |i| element(if top(m, width, i) { b } else { a }, width, i))
}

/// The number that a float's place in the order is, −0 and +0 being the same; `None` for a NaN.
fn rank(bits: u64, width: u32) -> Option<i64> {
    let fraction = if width == 32 { 23 } else { 52 };
    let magnitude = bits & u64::MAX >> (65 - width);
    let infinite = (u64::MAX >> (65 - width)) >> fraction << fraction;
    let negative = bits >> (width - 1) == 1;
    (magnitude <= infinite).then_some(if negative { -(magnitude as i64) } else { magnitude as i64 })
}

/// Predicates by their number in the instruction's table (x86 manual, VCMPPS, predicates 0 to 15).
fn holds(predicate: u32, a: Option<i64>, b: Option<i64>) -> bool {
    use std::cmp::Ordering::{Equal, Less};
    let order = a.zip(b).map(|(a, b)| a.cmp(&b));
    match predicate {
        0 => order == Some(Equal),
        1 => order == Some(Less),
        2 => matches!(order, Some(Less | Equal)),
        3 => order.is_none(),
        8 => matches!(order, None | Some(Equal)),
        9 => matches!(order, None | Some(Less)),
        10 => matches!(order, None | Some(Less | Equal)),
        11 => false,
        // the second four of each eight are the opposites of the first
        4..=7 | 12..=15 => !holds(predicate - 4, a, b),
        _ => unreachable!("predicates are below 16"),
    }
}

fn compare(width: u32, predicate: u32, a: Block, b: Block) -> Block {
    let rank = |x, i| rank(element(x, width, i), width);
    build(width, |i| if holds(predicate, rank(a, i), rank(b, i)) { u64::MAX } else { 0 })
}

fn share(line: &Line, net: usize) -> Block {
    u128::from(line[2 * net]) | u128::from(line[2 * net + 1]) << 64
}

/// `memory` holds what was stored a round ago.
fn round(x: &mut [Block; 8], memory: &mut [Block; 4], lines: &[Block]) {
    let k = |i: usize| lines[i];
    let b = std::mem::replace(&mut memory[0], select(64, x[4], x[5], k(1)));
    let c = std::mem::replace(&mut memory[1], select(32, x[2], x[4], k(0)));
    x[0] = add(8, x[0], select(8, x[4], x[5], k(0)));
    x[1] = sub(16, x[1], select(8, x[4], x[2], (x[5] & x[3]) ^ k(0)));
    let a = select(32, x[4], k(1), x[2]);
    x[0] ^= a;
    x[1] = add(32, x[1], compare(32, 0, a, x[4]));
    x[0] = sub(64, x[0], compare(32, 1, k(1), a));
    x[1] = add(16, x[1], compare(32, 2, x[5], x[2]));
    x[0] = sub(8, x[0], compare(32, 3, x[3], k(0)));
    x[1] = add(64, x[1], select(32, 0, k(0), x[4]));
    x[0] = sub(32, x[0], x[4] & x[3]);
    let a = select(64, x[5], k(0), x[3]);
    x[1] = add(8, x[1], a);
    x[0] = sub(16, x[0], compare(64, 2, a, x[5]));
    x[1] ^= compare(64, 3, k(0), a);
    x[0] = add(32, x[0], compare(64, 0, x[4], x[3]));
    x[1] = sub(64, x[1], compare(64, 1, x[2], k(1)));
    x[0] = add(16, x[0], x[5] & x[3]);
    x[1] = sub(8, x[1], !x[5] & x[2]);
    let d = std::mem::replace(&mut memory[2], select(64, x[7], x[5], k(3)));
    x[2] = add(64, x[2], select(8, x[6], x[7], k(2)));
    x[3] = sub(32, x[3], select(16, x[7], x[4], (x[6] | x[5]) ^ k(3)));
    let a = select(32, x[6], k(3), x[4]);
    x[2] = add(8, x[2], a);
    x[3] = sub(16, x[3], compare(32, 4, a, x[6]));
    x[2] ^= compare(32, 5, k(3), a);
    x[3] = add(32, x[3], compare(32, 6, x[7], x[4]));
    x[2] = sub(64, x[2], compare(32, 7, x[5], k(2)));
    x[3] = add(16, x[3], select(64, 0, k(3), x[7]));
    x[2] = sub(8, x[2], x[7] | x[4]);
    let a = select(64, x[7], k(2), x[5]);
    x[3] = add(64, x[3], a);
    x[2] = sub(32, x[2], compare(64, 6, a, x[7]));
    x[3] = add(8, x[3], compare(64, 7, k(2), a));
    x[2] = sub(16, x[2], compare(64, 4, x[6], x[5]));
    x[3] ^= compare(64, 5, x[4], k(3));
    x[2] = add(32, x[2], x[6] | x[4]);
    x[3] = sub(64, x[3], b);
    x[2] = add(16, x[2], c);
    x[3] = sub(8, x[3], x[6] & x[7]);
    let e = std::mem::replace(&mut memory[3], select(32, x[7], x[6], k(4)));
    x[4] = add(64, x[4], select(8, x[0], x[1], k(4)));
    x[5] = sub(32, x[5], select(8, x[0], x[6], !(x[1] ^ x[7]) & k(4)));
    let a = select(32, x[0], k(5), x[6]);
    x[4] = add(8, x[4], a);
    x[5] = sub(16, x[5], compare(32, 8, a, x[0]));
    x[4] ^= compare(32, 9, k(5), a);
    x[5] = add(32, x[5], compare(32, 10, x[1], x[6]));
    x[4] = sub(64, x[4], compare(32, 11, x[7], k(4)));
    x[5] = add(16, x[5], select(32, 0, k(4), x[6]));
    x[4] = sub(8, x[4], x[6] ^ x[7]);
    let a = select(64, x[1], k(4), x[7]);
    x[5] = add(64, x[5], a);
    x[4] = sub(32, x[4], compare(64, 10, a, x[1]));
    x[5] = add(8, x[5], compare(64, 11, k(4), a));
    x[4] = sub(16, x[4], compare(64, 8, x[0], x[7]));
    x[5] ^= compare(64, 9, x[6], k(5));
    x[4] = add(32, x[4], x[6] ^ x[0]);
    x[5] = sub(64, x[5], d);
    x[4] = add(16, x[4], !x[1] & x[6]);
    x[7] = sub(8, x[7], select(8, x[2], x[3], k(6)));
    x[6] = add(64, x[6], select(32, x[3], x[1], (!x[2] & x[0]) | k(7)));
    let a = select(32, x[2], k(7), x[0]);
    x[7] = sub(32, x[7], a);
    x[6] = add(8, x[6], compare(32, 12, a, x[2]));
    x[7] = sub(16, x[7], compare(32, 13, k(7), a));
    x[6] ^= compare(32, 14, x[3], x[0]);
    x[7] = add(32, x[7], compare(32, 15, x[1], k(6)));
    x[6] = sub(64, x[6], select(64, 0, k(7), x[1]));
    x[7] = add(16, x[7], !x[1] & x[3]);
    let a = select(64, x[3], k(6), x[1]);
    x[6] = sub(8, x[6], a);
    x[7] = add(64, x[7], compare(64, 14, a, x[3]));
    x[6] = sub(32, x[6], compare(64, 15, k(6), a));
    x[7] = add(8, x[7], compare(64, 12, x[2], x[1]));
    x[6] = sub(16, x[6], compare(64, 13, x[0], k(7)));
    x[7] ^= !x[2] & x[3];
    x[6] = add(32, x[6], e);
    x[7] = sub(64, x[7], x[2] & x[3]);
}

/// Signs of a's elements of 32 bits, of b's of 64, and the tests of both against m and n.
fn bits(a: Block, b: Block, m: Block, n: Block) -> u64 {
    let signs = |x: Block, width: u32| (0..128 / width).map(|i| u64::from(top(x, width, i)) << i).sum::<u64>();
    let none = |condition: bool, place: u32| u64::from(condition) << place;
    signs(a, 32)
        | signs(b, 64) << 4
        | none(a & m == 0, 6)
        | none(!a & m == 0, 7)
        | none(signs(a & n, 32) == 0, 8)
        | none(signs(!a & n, 32) == 0, 9)
        | none(signs(b & n, 64) == 0, 10)
        | none(signs(!b & n, 64) == 0, 11)
}

fn line(stream: &mut Stream) -> Line {
    stream.words(8).try_into().expect("eight words")
}

/// The blocks after three passes of 32 rounds, then the digest of signs and tests.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let start: Vec<Line> = (0..8).map(|_| line(&mut stream)).collect();
    let rounds: Vec<Vec<Line>> = (0..32).map(|_| (0..8).map(|_| line(&mut stream)).collect()).collect();
    let (mut out, mut collected) = (vec![0; 65], vec![[0u64; 2]; 96]);
    for net in 0..4 {
        let mut x: [Block; 8] = std::array::from_fn(|i| share(&start[i], net));
        let mut memory = [0; 4];
        for (words, lines) in collected.iter_mut().zip((0..3).flat_map(|_| &rounds)) {
            let k: Vec<Block> = lines.iter().map(|line| share(line, net)).collect();
            round(&mut x, &mut memory, &k);
            let last = sub(8, x[0], x[5]);
            let m = k[..6].iter().fold(Block::MAX, |all, line| all & line);
            words[0] |= (0..16).map(|i| u64::from(top(last, 8, i)) << i).sum::<u64>() << (16 * net);
            words[1] |= bits(x[0], x[3], m, k[1] & k[6]) << (16 * net);
        }
        for (j, stored) in memory.into_iter().enumerate() {
            x[2 * j] = add(64, x[2 * j], stored);
        }
        for (block, value) in x.into_iter().enumerate() {
            out[8 * block + 2 * net] = value as u64;
            out[8 * block + 2 * net + 1] = (value >> 64) as u64;
        }
    }
    out[64] = collected
        .as_flattened()
        .iter()
        .fold(0, |h: u64, word| h.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(*word));
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Bit patterns of IEEE 754 binary32: 1, 2, −1, ±0, the least denormal, infinity, a NaN.
    const ONE: u64 = 0x3f80_0000;
    const TWO: u64 = 0x4000_0000;
    const MINUS: u64 = 0xbf80_0000;
    const ZERO: u64 = 0;
    const MINUS_ZERO: u64 = 0x8000_0000;
    const DENORMAL: u64 = 1;
    const INFINITY: u64 = 0x7f80_0000;
    const NAN: u64 = 0x7fc0_0000;

    /// IEEE 754-2019 §5.11: four mutually exclusive relations; −0 = +0; a NaN is unordered with everything.
    #[test]
    fn order_of_floats() {
        let relation = |a, b| [0, 1, 14, 3].map(|p| holds(p, rank(a, 32), rank(b, 32)));
        let (equal, less, greater, unordered) = (
            [true, false, false, false],
            [false, true, false, false],
            [false, false, true, false],
            [false, false, false, true],
        );
        for (a, b, right) in [
            (ONE, ONE, equal),
            (ZERO, MINUS_ZERO, equal),
            (ONE, TWO, less),
            (MINUS, MINUS_ZERO, less),
            (ZERO, DENORMAL, less),
            (INFINITY, TWO, greater),
            (NAN, NAN, unordered),
            (ONE, NAN, unordered),
        ] {
            assert_eq!(relation(a, b), right, "{a:x} {b:x}");
        }
    }

    /// PTEST and VTESTPD (x86 manual, from memory): zero flag for a and m, carry flag for not a and m.
    #[test]
    fn flags_of_tests() {
        let sign = 1u128 << 127;
        assert_eq!(bits(sign, 0, sign, 0) & 0xc0, 0x80);
        assert_eq!(bits(!sign, 0, sign, 0) & 0xc0, 0x40);
        assert_eq!(bits(0, sign, 0, sign) & 0xc00, 0x800);
        assert_eq!(bits(sign, sign | 1 << 63, 0, 0) & 0x3f, 0b11_1000);
    }
}
