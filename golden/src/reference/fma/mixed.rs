//! `fma.mixed` on softfloat, a column at a time.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::{Format, Round, convert, fma, negate};

const COLUMNS: usize = 64;
const ROWS: usize = 64;
const PASSES: usize = 64;
const SEGMENT: usize = 8;
const F: Format = Format::F32;
const NEAR: Round = Round::NearestEven;

/// Signs of (product, addend) by row of the segment, for even and for odd columns.
const SIGNS: [[(bool, bool); 2]; SEGMENT] = [
    [(false, false); 2],
    [(false, true); 2],
    [(true, false); 2],
    [(true, true); 2],
    [(false, true), (false, false)],
    [(false, false), (false, true)],
    [(true, false); 2],
    [(false, false); 2],
];

/// ± significand · 2^(exponent − fraction) in the format, the significand cut where the number is subnormal.
fn number(f: Format, negative: bool, exponent: i64, fraction: u64) -> u64 {
    let significand = (1u64 << f.fraction_bits) + fraction;
    let above = exponent - i64::from(f.emin());
    let magnitude = if above < 0 { significand >> -above } else { significand + ((above as u64) << f.fraction_bits) };
    magnitude + if negative { f.sign_bit() } else { 0 }
}

/// All numbers of one array, by rows, as drawn.
fn draw(stream: &mut Stream) -> Vec<u64> {
    (0..ROWS * COLUMNS / 4)
        .flat_map(|_| {
            let word = stream.word();
            (0..4).map(move |i| word >> (16 * i) & 0xffff)
        })
        .collect()
}

fn fused(a: u64, b: u64, x: u64, (product, addend): (bool, bool)) -> u64 {
    let sign = |value: u64, negative: bool| if negative { negate(F, value) } else { value };
    fma(F, sign(a, product), b, sign(x, addend), NEAR).0
}

/// Sums and sums of sums of a row of numbers, by weights.
fn sums(numbers: &[u64]) -> (u64, u64) {
    let count = numbers.len() as u64;
    let s = numbers.iter().fold(0u64, |sum, x| sum.wrapping_add(*x));
    let weighted = numbers.iter().zip(0..).map(|(x, i)| x.wrapping_mul(count - i));
    (s & 0xffff_ffff, weighted.fold(0u64, u64::wrapping_add) & 0xffff_ffff)
}

fn words_of(numbers: impl Iterator<Item = u64>) -> Vec<u64> {
    let all: Vec<u64> = numbers.collect();
    all.chunks(2).map(|pair| pair[0] | pair[1] << 32).collect()
}

/// s and t of x, s and t of the narrowed.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let (halves, bfloats) = (draw(&mut stream), draw(&mut stream));
    let mut ends: Vec<Vec<u64>> = Vec::new();
    for column in 0..COLUMNS {
        let level = (stream.word() % 35) as i64 - 20;
        let level = if case.seed.0 % 2 == 1 { level } else { 0 };
        let of_column = |all: &[u64], make: &dyn Fn(u64) -> u64| -> Vec<u64> {
            all.iter().skip(column).step_by(COLUMNS).map(|raw| make(*raw)).collect()
        };
        let h = of_column(&halves, &|raw| {
            let x = number(Format::F16, raw >> 15 == 1, level - 1 - (raw >> 10 & 3) as i64, raw & 1023);
            convert(Format::F16, F, x, NEAR).0
        });
        let b = of_column(&bfloats, &|raw| {
            let x = number(Format::BF16, raw >> 15 == 1, -level - (raw >> 7 & 3) as i64, raw & 127);
            convert(Format::BF16, F, x, NEAR).0
        });
        let segment = |pass: usize, first: usize| {
            (0..SEGMENT).fold(0, |x, i| fused(h[first + i], b[(first + i + pass) % ROWS], x, SIGNS[i][column % 2]))
        };
        ends.push(
            (0..PASSES)
                .flat_map(|pass| (0..ROWS).step_by(SEGMENT).map(move |first| (pass, first)))
                .map(|(pass, first)| segment(pass, first))
                .collect(),
        );
    }
    let whole: Vec<(u64, u64)> = ends.iter().map(|xs| sums(xs)).collect();
    let narrow: Vec<(u64, u64)> = [Format::F16, Format::BF16]
        .iter()
        .flat_map(|to| ends.chunks(2).map(move |pair| (pair, *to)))
        .map(|(pair, to)| {
            let short = |x: u64| convert(F, to, x, NEAR).0;
            let both: Vec<u64> = pair[0].iter().zip(&pair[1]).map(|(a, b)| short(*a) | short(*b) << 16).collect();
            sums(&both)
        })
        .collect();
    [
        words_of(whole.iter().map(|x| x.0)),
        words_of(whole.iter().map(|x| x.1)),
        words_of(narrow.iter().map(|x| x.0)),
        words_of(narrow.iter().map(|x| x.1)),
    ]
    .concat()
}
