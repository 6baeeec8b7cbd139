//! `float.x87` on the integer-only extended format.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::extended::{Control, Extended};
use crate::softfloat::{Format, Round};

const PAIRS: usize = 8;

/// The first 128 bits of each constant that is not exact, cut; leading bit first, and the exponent of that.
/// π, log₂e, log₂10, log₁₀2, ln 2: by MPFR, as are the witness's.
const CONSTANTS: [(u128, i32); 5] = [
    (0xc90f_daa2_2168_c234_c4c6_628b_80dc_1cd1, 1),
    (0xb8aa_3b29_5c17_f0bb_be87_fed0_691d_3e88, 0),
    (0xd49a_784b_cd1b_8afe_492b_f6ff_4daf_db4c, 1),
    (0x9a20_9a84_fbcf_f798_8f89_59ac_0b7c_9178, -2),
    (0xb172_17f7_d1cf_79ab_c9e3_b398_03f2_f6af, -1),
];

struct Pair {
    a: Extended,
    b: Extended,
    /// With integer parts of 16, 32 and 64 bits.
    n: [Extended; 3],
    long: i64,
    int: i64,
    short: i64,
    scale: i64,
    single: u64,
    double: u64,
}

/// The significand with its leading one, and in one of four a tie of 24 or of 53 bits.
fn significand(word: u64, choice: u64) -> u64 {
    let all = word | 1 << 63;
    match choice % 4 {
        0 => all >> 11 << 11 | 1 << 10,
        1 => all >> 40 << 40 | 1 << 39,
        _ => all,
    }
}

fn draw(stream: &mut Stream, wide: bool) -> Pair {
    let [am, bm, e, long, ints, single, double, nm, ne] = std::array::from_fn(|_| stream.word());
    let near = (e % 41) as i32 - 20;
    let exponent = if wide { (e % 14001) as i32 - 7000 } else { near };
    let below = (e >> 16 & 63) as i32;
    let below = if wide { below.min(62) } else { below % 8 };
    let a = Extended { negative: e >> 63 == 1, exponent, significand: significand(am, e >> 32) };
    let b = Extended { negative: e >> 62 & 1 == 1, exponent: exponent - below, significand: significand(bm, e >> 34) };
    let n = [(16u64, 0), (32, 8), (64, 16)].map(|(span, shift)| {
        let exponent = ((ne >> shift) % span) as i32 - 2;
        let all = nm | 1 << 63;
        let cut = 62 - exponent;
        let significand = if ne >> 40 & 3 == 0 && (1..63).contains(&cut) { (all >> cut | 1) << cut } else { all };
        Extended { negative: ne >> (48 + shift / 8) & 1 == 1, exponent, significand }
    });
    Pair {
        a,
        b,
        n,
        long: long as i64,
        int: i64::from(ints as i32),
        short: i64::from((ints >> 32) as i16 | 1),
        scale: ((ints >> 48) % 2001) as i64 - 1000,
        single: single & 0x807f_ffff | (120 + (single >> 23 & 15)) << 23,
        double: double & 0x800f_ffff_ffff_ffff | (1015 + (double >> 52 & 15)) << 52,
    }
}

fn constant(i: usize, r: Round) -> Extended {
    let (digits, exponent) = CONSTANTS[i];
    let (high, low) = ((digits >> 64) as u64, digits as u64);
    // none of them is near a carry out of 64 bits, or near a tie
    let up = match r {
        Round::NearestEven => low >> 63 == 1,
        Round::Up => true,
        Round::Down | Round::TowardZero => false,
    };
    Extended { negative: false, exponent, significand: high + u64::from(up) }
}

/// All results of a pair under one control word, in the kernel's order.
fn results(p: &Pair, c: Control) -> Vec<[u64; 2]> {
    let (a, b, r) = (p.a, p.b, c.round);
    let one = |x: u64| [x, 0];
    let single = Extended::from_bits(Format::F32, p.single);
    let double = Extended::from_bits(Format::F64, p.double);
    let size = Extended { negative: false, ..a };
    let scaled = Extended { exponent: a.exponent + p.scale as i32, ..a };
    let (rest, quotient) = a.remainder(b);
    // C0, C3, C1 are the quotient's bits 2, 1, 0; status bits 8, 14, 9
    let partial = (quotient >> 2 & 1) << 8 | (quotient >> 1 & 1) << 14 | (quotient & 1) << 9;
    let (less, same) = (a.less(b), a == b);
    let compared = u64::from(less) << 8 | u64::from(same) << 14;
    let flags = u64::from(less) | u64::from(same) << 8;
    let choose = |taken: bool| if taken { b } else { a }.words();
    let mut all = vec![
        a.add(b, c).words(),
        a.add(b.negate(), c).words(),
        b.add(a.negate(), c).words(),
        a.mul(b, c).words(),
        a.div(b, c).words(),
        b.div(a, c).words(),
        size.sqrt(c).words(),
        a.negate().words(),
        a.integral(r).words(),
        scaled.words(),
        Extended { exponent: 0, ..a }.words(),
        Extended::from_integer(a.exponent.into()).words(),
        rest.words(),
        one(partial),
        one(compared),
        one(flags | flags << 32),
        choose(less),
        choose(!less),
        choose(less || same),
        choose(!(less || same)),
        choose(same),
        choose(!same),
        choose(false),
        choose(true),
        b.add(a.negate(), c).words(),
        a.add(single, c).words(),
        a.mul(double, c).words(),
        if p.int == 0 { a.mul(Extended::from_integer(1), c) } else { a.add(Extended::from_integer(p.int), c) }.words(),
        a.div(Extended::from_integer(p.short), c).words(),
        one(a.to_bits(Format::F32, r)),
        one(a.to_bits(Format::F64, r)),
    ];
    for direction in [r, Round::TowardZero] {
        for (n, bits) in p.n.iter().zip([16, 32, 64]) {
            all.push(one(n.to_integer(direction) as u64 & (u64::MAX >> (64 - bits))));
        }
    }
    all.extend([p.short, p.int, p.long].map(|v| Extended::from_integer(v).words()));
    all.push(Extended::from_integer(1).words());
    all.extend((0..5).map(|i| constant(i, r).words()));
    all.push(Extended::zero(false).words());
    all.push(single.words());
    all.push(double.words());
    all
}

/// For each result s and t over all control words and pairs.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let pairs: Vec<Pair> = (0..PAIRS).map(|_| draw(&mut stream, case.seed.0 % 2 == 1)).collect();
    let mut columns: Vec<Vec<u64>> = Vec::new();
    for round in [Round::NearestEven, Round::Down, Round::Up, Round::TowardZero] {
        for bits in [24, 53, 64] {
            for pair in &pairs {
                let results = results(pair, Control { round, bits });
                columns.resize(results.len(), Vec::new());
                for (column, words) in columns.iter_mut().zip(results) {
                    column.extend(words);
                }
            }
        }
    }
    let sums = |column: &Vec<u64>| {
        let mut both = [0u64; 2];
        for word in column {
            both[0] = both[0].wrapping_add(*word);
            both[1] = both[1].wrapping_add(both[0]);
        }
        both
    };
    columns.iter().flat_map(sums).collect()
}
