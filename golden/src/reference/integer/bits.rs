//! `integer.bits` on lists of bits, lowest first: one bit moved at a time; conditions from exact numbers, not from flags.

use kernels::Case;

use crate::reference::chacha::Stream;

type Bits = Vec<bool>;

fn bits(number: u64, width: usize) -> Bits {
    (0..width).map(|i| number >> i & 1 == 1).collect()
}

fn number(bits: &[bool]) -> u64 {
    bits.iter().rev().fold(0, |n, bit| n << 1 | u64::from(*bit))
}

/// `width` bits of `x`, those from `from` upwards; beyond its end the list goes on with `fill`.
fn part(x: &[bool], from: usize, width: usize, fill: bool) -> u64 {
    number(&(from..from + width).map(|i| x.get(i).copied().unwrap_or(fill)).collect::<Bits>())
}

/// `count` zeros below `x`.
fn raised(x: &[bool], count: usize) -> Bits {
    std::iter::repeat_n(false, count).chain(x.iter().copied()).collect()
}

/// One place after the other, `count` times.
fn turned(x: &[bool], count: usize, left: bool) -> Bits {
    let mut x = x.to_vec();
    for _ in 0..count {
        if left {
            let top = x.pop().unwrap_or(false);
            x.insert(0, top);
        } else {
            let bottom = x.remove(0);
            x.push(bottom);
        }
    }
    x
}

fn signed(x: u64, width: u32) -> i128 {
    let x = i128::from(x) % (1 << width);
    if x >> (width - 1) == 1 { x - (1 << width) } else { x }
}

/// An exact number in the given width.
fn cut(x: i128, width: u32) -> u64 {
    x.rem_euclid(1 << width) as u64
}

/// Which of the sixteen conditions hold after e − f, or e + f.
fn conditions(e: u64, f: u64, width: u32, minus: bool) -> [bool; 16] {
    let sign = if minus { -1 } else { 1 };
    let exact = signed(e, width) + sign * signed(f, width);
    let unsigned = i128::from(e) + sign * i128::from(f);
    let result = cut(exact, width);
    let overflow = exact != signed(result, width);
    let carry = unsigned != i128::from(result);
    let negative = signed(result, width) < 0;
    let even = bits(result, 8).iter().filter(|bit| **bit).count() % 2 == 0;
    // less: the exact result is negative
    let (zero, less) = (result == 0, exact < 0);
    let mut out = [false; 16];
    for (i, yes) in [overflow, carry, zero, carry || zero, negative, even, less, less || zero].into_iter().enumerate() {
        out[2 * i] = yes;
        out[2 * i + 1] = !yes;
    }
    out
}

/// Truncated quotient and remainder of small numbers by counting how often the divisor fits.
fn divided(a: i128, d: i128) -> (i128, i128) {
    let (mut rest, mut times) = (a.abs(), 0);
    while rest >= d {
        rest -= d;
        times += 1;
    }
    if a < 0 { (-times, -rest) } else { (times, rest) }
}

fn step(a: u64, b: u64, c: u64) -> Vec<u64> {
    let low = |x: u64, width: u32| x % (1 << width);
    let (k, l) = ((c % 64) as usize, (c / 64 % 64) as usize);
    let bit = |i: usize| c >> i & 1 == 1;
    let (av, bv) = (bits(a, 64), bits(b, 64));
    let (a32, b32) = (bits(a, 32), bits(b, 32));
    let (as_one, by_one) = (av.iter(), bv.iter());
    let mut z = av.clone();
    z[63] = true;
    let z: Bits = (k..k + 64).map(|i| z.get(i).copied().unwrap_or(false)).collect();
    let mut t = bv.clone();
    t[0] = true;
    let t: Bits = raised(&t, l)[..64].to_vec();
    let mut out = vec![
        part(&raised(&av, k), 0, 64, false),
        part(&bv, k, 64, false),
        part(&bv, l, 64, bv[63]),
        part(&raised(&a32, k % 32), 0, 32, false),
        part(&b32, k % 32, 32, false),
        part(&a32, l % 32, 32, a32[31]),
    ];
    let (ab, ba) = ([bv.clone(), av.clone()].concat(), [av.clone(), bv.clone()].concat());
    out.extend([part(&raised(&ab, k), 64, 64, false), part(&ba, l, 64, false)]);
    for (x, count, left) in [
        (&av, k, true),
        (&bv, l, false),
        (&a32, k % 32, true),
        (&b32, l % 32, false),
        (&bits(a, 16), k % 16, true),
        (&bits(b, 8), l % 8, false),
    ] {
        out.push(number(&turned(x, count, left)));
    }
    let ring_a = turned(&[av.clone(), vec![bit(12)]].concat(), k, true);
    let ring_b = turned(&[bv.clone(), vec![bit(13)]].concat(), l, false);
    out.extend([number(&ring_a[..64]), number(&ring_b[..64])]);
    // counts and scans
    let ones = |x: &[bool]| x.iter().filter(|bit| **bit).count() as u64;
    let highest = |x: &[bool]| x.iter().rposition(|bit| *bit);
    let lowest = |x: &[bool]| x.iter().position(|bit| *bit);
    let above = |x: &[bool]| highest(x).map_or(x.len(), |i| x.len() - 1 - i) as u64;
    let below = |x: &[bool]| lowest(x).unwrap_or(x.len()) as u64;
    out.extend([ones(&av), ones(&a32), above(&z), above(&z[..32])]);
    out.extend([63 - above(&z), below(&t), below(&t), below(&t[..32])]);
    // spread and gather
    let mut source = as_one.clone();
    let spread: Bits = by_one.clone().map(|place| *place && *source.next().unwrap_or(&false)).collect();
    let gathered: Bits = by_one.zip(as_one).filter(|(_, place)| **place).map(|(bit, _)| *bit).collect();
    out.extend([number(&spread), number(&gathered)]);
    out.extend([part(&av, k, l, false), number(&bv[..k])]);
    let first = lowest(&t).unwrap_or(0);
    let pick = |f: &dyn Fn(usize) -> bool| number(&(0..64).map(f).collect::<Bits>());
    out.extend([
        pick(&|i| i == first),
        pick(&|i| t[i] && i != first),
        pick(&|i| i <= first),
        pick(&|i| !av[i] && bv[i]),
        number(&turned(&av, 27, false)),
    ]);
    let reversed = |x: &[bool]| number(&x.chunks(8).rev().flatten().copied().collect::<Bits>());
    out.extend([reversed(&av), reversed(&b32), reversed(&bv), reversed(&a32), reversed(&bits(a, 16))]);
    out.extend([pick(&|i| av[i] || i == k), pick(&|i| bv[i] && i != k), pick(&|i| av[i] != (i == l))]);
    // conditions
    let thin = |x: u64, width: usize| {
        let kept = [0, width - 2, width - 1];
        number(&(0..width).map(|i| x >> i & 1 == 1 && kept.contains(&i)).collect::<Bits>())
    };
    let moves = conditions(thin(a, 64), thin(b, 64), 64, true);
    out.push(moves.iter().fold(0u64, |h, c| h.wrapping_mul(9).wrapping_add(if *c { a } else { b })));
    for eight in conditions(thin(a, 32), thin(b, 32), 32, false).chunks(8) {
        out.push(eight.iter().rev().fold(0, |word, c| word << 8 | u64::from(*c)));
    }
    let jumps = conditions(thin(a >> 16, 16), thin(b >> 16, 16), 16, true);
    out.push((1..).zip(jumps).fold(0, |h, (i, c)| 9 * h + if c { 0 } else { i }));
    // exchanges
    let exact = i128::from;
    out.extend([cut(exact(c) + exact(b), 64), cut(exact(a) - exact(c), 64)]);
    let one_equal = bit(14) || a == b;
    out.extend(if one_equal { [c, a] } else { [b, b] });
    let halves_equal = bit(15) || b == c;
    out.extend(if halves_equal { [a, b] } else { [c, c] });
    let pair_equal = bit(16) || b == c;
    out.extend(if pair_equal { [c, a] } else { [a, c] });
    // arithmetic
    let sum = exact(a) + exact(b) + i128::from(bit(17));
    let rest = exact(b) - exact(a) - i128::from(bit(18));
    out.extend([cut(-exact(a), 64), cut(-1 - exact(b), 64), cut(sum, 64), cut(rest, 64)]);
    out.push(cut(exact(a) + if a == u64::MAX - 1 { 1 } else { 2 }, 64));
    out.push(low(a, 8) * low(b, 8));
    out.push(cut(signed(a, 16) * signed(b, 16), 32));
    let (q, r) = divided(exact(low(a, 8)), exact(low(b, 8) | 1));
    out.push(cut(q + (r << 8), 16));
    let (q, r) = divided(signed(a, 16), exact(low(b, 15) | 1));
    out.push(cut(q, 16) + (cut(r, 16) << 16));
    out.push(cut(exact(a) + 8 * exact(b) + 0x123_4567, 64));
    out.push(cut(exact(a) + 4 * exact(b) - 77, 32));
    out.push(cut(signed(a, 8) + 3 * signed(b, 16) + 9 * signed(a, 32), 64));
    out.extend([low(a, 8) + low(b, 16), cut(signed(b, 8), 64)]);
    out.push(cut(if av[63] { exact(u64::MAX) } else { 0 } + if b32[31] { exact(u64::from(u32::MAX)) } else { 0 }, 64));
    let byte = exact(low(c >> (8 * (k % 8)), 8));
    out.push(cut(exact(a) * [1, 3, 9, 27, 81, 243, 729, 2187][k % 8] + byte, 64));
    let mut carries = vec![ring_a[64], ring_b[64], av[l], av[k], bv[k], av[l]];
    carries.extend([sum >= 1 << 64, rest < 0, one_equal, halves_equal, pair_equal]);
    carries.resize(16, false);
    // the flags byte has bit 1 always, bits 3 and 5 never
    carries.extend((0..8).map(|i| i == 1 || bit(12 + i) && i != 3 && i != 5));
    out.push(number(&carries));
    out
}

/// The four sums after every eighth of 48 steps.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let (mut x, mut y) = (stream.word(), stream.word());
    let mut sums = stream.words(4);
    let mut out = Vec::new();
    for number in 1..=48 {
        let v = stream.words(3);
        for (i, r) in step(x.wrapping_add(v[0]), y ^ v[1], v[2]).into_iter().enumerate() {
            let s = sums[i % 4].wrapping_add(r);
            sums[i % 4] = s.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15);
        }
        x = sums[0].wrapping_add(sums[1]);
        y = sums[2].wrapping_add(sums[3]);
        if number % 8 == 0 {
            out.extend(&sums);
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Conditions that the manual of the architecture gives for comparisons: signed and unsigned order (the x86 manuals,
    /// condition codes, from memory): 0x8000 against 1 is above, and less with overflow; 1 against 1 equal.
    #[test]
    fn order_with_and_without_sign() {
        let named = |e, f| {
            let names = ["o", "no", "b", "ae", "e", "ne", "be", "a", "s", "ns", "p", "np", "l", "ge", "le", "g"];
            let holds = conditions(e, f, 16, true);
            names.into_iter().zip(holds).filter(|(_, h)| *h).map(|(n, _)| n).collect::<Vec<_>>()
        };
        assert_eq!(named(0x8000, 1), ["o", "ae", "ne", "a", "ns", "p", "l", "le"]);
        assert_eq!(named(1, 0x8000), ["o", "b", "ne", "be", "s", "np", "ge", "g"]);
        assert_eq!(named(1, 1), ["no", "ae", "e", "be", "ns", "p", "ge", "le"]);
    }

    #[test]
    fn one_step_has_as_many_results_as_the_kernel_says() {
        assert_eq!(step(1, 2, 3).len(), 70);
    }
}
