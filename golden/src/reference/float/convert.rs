//! `float.convert` on softfloat: operands on rounding boundaries, fifteen tracks, position-sensitive sums.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::{Format, Round, convert, from_int, from_uint, to_i32, to_i64, to_u32};

const ITEMS: usize = 256;
const PASSES: usize = 24;
const NEAR: Round = Round::NearestEven;
const ZERO: Round = Round::TowardZero;

/// `digits` of `places` binary places, the lowest `cut` of which may be put on a boundary, the others all to one.
fn boundary(digits: u64, places: u32, cut: u32, w: u64) -> u64 {
    let digits = digits % (1 << places);
    if cut == 0 {
        return digits;
    }
    let unit = 1u64 << cut;
    let kept = if w >> 53 & 3 == 0 { (1 << places) / unit - 1 } else { digits / unit };
    let rest = match w >> 48 & 7 {
        0 => 0,
        1 => 1,
        2 => unit / 2 - 1,
        3 => unit / 2,
        4 => unit / 2 + 1,
        5 => unit - 1,
        _ => digits,
    };
    kept * unit + rest % unit
}

fn number(f: Format, negative: bool, exponent: i64, fraction: u64) -> u64 {
    let significand = fraction + (1 << f.fraction_bits);
    let above = exponent - i64::from(f.emin());
    let magnitude = if above < 0 { significand >> -above } else { significand + ((above as u64) << f.fraction_bits) };
    magnitude + if negative { f.sign_bit() } else { 0 }
}

fn narrowing(from: Format, to: Format, w: u64, z: u64) -> u64 {
    let (emin, emax) = (i64::from(to.emin()), i64::from(to.emax()));
    let pick = |n: i64| (w % n as u64) as i64;
    let wanted = match w >> 56 & 7 {
        0..2 => emin - 1 - pick(i64::from(to.fraction_bits) + 2),
        2 => emax - 1 + pick(3),
        _ => emin + pick(emax - emin + 1),
    };
    let exponent = wanted.min(from.emax().into());
    let cut = i64::from(from.fraction_bits - to.fraction_bits) + (emin - exponent).max(0);
    let cut = cut.min(from.fraction_bits.into()) as u32;
    number(from, w >> 63 == 1, exponent, boundary(z, from.fraction_bits, cut, w))
}

fn any(f: Format, w: u64, z: u64) -> u64 {
    let specials = (1u64 << f.exponent_bits) - 1;
    let biased = w % if f == Format::F16 { specials + 1 } else { specials };
    let fraction = if biased == specials { 0 } else { z % (1 << f.fraction_bits) };
    (w >> 63) * f.sign_bit() + (biased << f.fraction_bits) + fraction
}

fn to_integer(top: u64, signed: bool, w: u64, z: u64) -> u64 {
    let exponent = (w % (top + 2)) as i64 - 2;
    let cut = (52 - exponent).clamp(0, 52) as u32;
    number(Format::F64, signed && w >> 63 == 1, exponent, boundary(z, 52, cut, w))
}

/// A magnitude, and whether it is to be negated.
fn integer(longest: u64, kept: u32, w: u64, z: u64) -> (u64, bool) {
    let places = (w % longest) as u32;
    ((1 << places) + boundary(z, places, (places + 1).saturating_sub(kept), w), w >> 63 == 1)
}

fn signed((magnitude, negative): (u64, bool)) -> i64 {
    if negative { -(magnitude as i64) } else { magnitude as i64 }
}

/// Sums over the rows of a track whose results are `bits` wide, and its last word.
fn sums(results: &[u64], bits: u32) -> Vec<u64> {
    let a_word = (64 / bits) as usize;
    let words: Vec<u64> = results
        .chunks(a_word)
        .map(|group| group.iter().enumerate().fold(0, |word, (i, x)| word | x << (i as u32 * bits)))
        .collect();
    let mut s = [0u64; 8];
    let mut t = [0u64; 8];
    for _ in 0..PASSES {
        for (i, word) in words.iter().enumerate() {
            s[i % 8] = s[i % 8].wrapping_add(*word);
            t[i % 8] = t[i % 8].wrapping_add(s[i % 8]);
        }
    }
    s.into_iter().chain(t).chain(words.last().copied()).collect()
}

/// For each track 8 sums, 8 sums of sums, the last word.
pub fn words(case: &Case) -> Vec<u64> {
    let stream = &mut Stream::new(case);
    fn draw<T>(stream: &mut Stream, number: impl Fn(u64, u64) -> T) -> Vec<T> {
        let words = stream.words(2 * ITEMS);
        words.chunks(2).map(|pair| number(pair[0], pair[1])).collect()
    }
    let (half_f, bfloat_f, single_f, double_f) = (Format::F16, Format::BF16, Format::F32, Format::F64);
    let double_to_single = draw(stream, |w, z| narrowing(double_f, single_f, w, z));
    let single = draw(stream, |w, z| any(single_f, w, z));
    let single_to_half = draw(stream, |w, z| narrowing(single_f, half_f, w, z));
    let half = draw(stream, |w, z| any(half_f, w, z));
    let single_to_bfloat = draw(stream, |w, z| narrowing(single_f, bfloat_f, w, z));
    let bfloat = draw(stream, |w, z| any(bfloat_f, w, z));
    let double_to_i32 = draw(stream, |w, z| to_integer(30, true, w, z));
    let small = draw(stream, |w, z| signed(integer(31, 24, w, z)));
    let unsigned = draw(stream, |w, z| integer(32, 24, w, z).0);
    let double_to_i64 = draw(stream, |w, z| to_integer(62, true, w, z));
    let large = draw(stream, |w, z| signed(integer(63, 53, w, z)));
    let full = draw(stream, |w, z| integer(64, 53, w, z).0);
    let double_to_u32 = draw(stream, |w, z| to_integer(32, false, w, z));

    let between = |from: Format, to: Format, xs: &[u64]| {
        let results: Vec<u64> = xs.iter().map(|&x| convert(from, to, x, NEAR).0).collect();
        sums(&results, 1 + to.exponent_bits + to.fraction_bits)
    };
    let each =
        |bits: u32, xs: &[u64], one: &dyn Fn(u64) -> u64| sums(&xs.iter().map(|&x| one(x)).collect::<Vec<_>>(), bits);
    let from_signed = |to: Format, xs: &[i64]| {
        let results: Vec<u64> = xs.iter().map(|&x| from_int(to, x, NEAR).0).collect();
        sums(&results, 1 + to.exponent_bits + to.fraction_bits)
    };
    [
        between(double_f, single_f, &double_to_single),
        between(single_f, double_f, &single),
        between(single_f, half_f, &single_to_half),
        between(half_f, single_f, &half),
        between(single_f, bfloat_f, &single_to_bfloat),
        between(bfloat_f, single_f, &bfloat),
        each(32, &double_to_i32, &|x| u64::from(to_i32(double_f, x, ZERO).0 as u32)),
        each(32, &double_to_i32, &|x| u64::from(to_i32(double_f, x, NEAR).0 as u32)),
        from_signed(double_f, &small),
        from_signed(single_f, &small),
        each(32, &unsigned, &|x| from_uint(single_f, x, NEAR).0),
        each(64, &double_to_i64, &|x| to_i64(double_f, x, ZERO).0 as u64),
        from_signed(double_f, &large),
        each(64, &full, &|x| from_uint(double_f, x, NEAR).0),
        each(32, &double_to_u32, &|x| u64::from(to_u32(double_f, x, ZERO).0)),
    ]
    .concat()
}
