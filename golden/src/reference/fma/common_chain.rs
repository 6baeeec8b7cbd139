//! What both FMA references share: operands as bit patterns, and one chain walked at a time.
//!
//! A chain repeats x·x + c, x·v + x, x·u + b, x·w + x over 64 rows of operands, eight times over; the bit pattern after
//! each x·w + x goes into the lane's sum. Operands are put together as sign, integer and power of two; 1/|u| by long
//! division, bit by bit.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::{Format, Round, fma};

const ROWS: usize = 64;
const REPEATS: usize = 8;
const ACCUMULATORS: usize = 12;

/// Format and vector length of one kernel.
pub struct Plan {
    pub format: Format,
    pub lanes: usize,
}

/// Everything that drives a case.
pub struct Drive {
    /// By accumulator, then lane.
    pub starts: Vec<u64>,
    /// c, v, u, b, w by row, then lane.
    pub rows: Vec<Vec<[u64; 5]>>,
}

/// ± integer · 2^power, cut toward zero; integer below 2^(fraction + 1), the result not above the format's range.
fn number(f: Format, negative: bool, mut integer: u64, mut power: i32) -> u64 {
    let sign = if negative { f.sign_bit() } else { 0 };
    let lowest = f.emin() - f.fraction_bits as i32;
    if integer == 0 {
        return sign;
    }
    while integer >> f.fraction_bits == 0 && power > lowest {
        integer <<= 1;
        power -= 1;
    }
    while power < lowest {
        integer >>= 1;
        power += 1;
    }
    // a subnormal has no leading one: the field below then comes out as zero by itself
    let steps = (power - lowest) as u64;
    sign | ((steps << f.fraction_bits) + integer)
}

/// ⌊2^(2·fraction + 1) / divisor⌋, at most 2^(fraction + 1) − 1, by restoring division.
fn reciprocal(f: Format, divisor: u64) -> u64 {
    let (mut quotient, mut rest) = (0u64, 0u64);
    for place in 0..2 * f.fraction_bits + 2 {
        rest = rest << 1 | u64::from(place == 0);
        quotient <<= 1;
        if rest >= divisor {
            rest -= divisor;
            quotient |= 1;
        }
    }
    quotient.min((2 << f.fraction_bits) - 1)
}

impl Plan {
    fn raw_vector(&self, stream: &mut Stream) -> Vec<u64> {
        let words = stream.words(8);
        if self.lanes == 8 {
            return words;
        }
        words.iter().flat_map(|w| [w & 0xffff_ffff, w >> 32]).collect()
    }

    fn row(&self, raw: [u64; 5], odd_seed: bool, deep: bool) -> [u64; 5] {
        let f = self.format;
        let point = f.fraction_bits as i32;
        let one = 1u64 << f.fraction_bits;
        let minus = |r: u64| r & f.sign_bit() != 0;
        let random = |r: u64| r & (one - 1) | one;
        // the least exponent that keeps u normal
        let reach = (f.emax() - 2) as u64;
        let (up, down) = match (odd_seed, deep) {
            (false, _) => (0, 0),
            (true, true) => (0, reach - raw[4] % 4),
            (true, false) => {
                let half = f.sign_bit().trailing_zeros().div_ceil(2);
                let up = 16 + raw[4] % (1 << half) % (reach - 37);
                (up, 16 + (raw[4] >> half) % (reach - 15 - up))
            }
        };
        let (up, down) = (up as i32, down as i32);
        let inverse = reciprocal(f, random(raw[1]));
        let v = if up == 0 { number(f, false, inverse - one, -point) } else { number(f, false, inverse, up - point) };
        let w = if down == 0 {
            number(f, false, one + one / 32 * 30 + raw[3] % (one / 32), -1 - point)
        } else {
            number(f, false, one + one / 64 * 62 + raw[3] % (one / 64), down - point)
        };
        [
            number(f, true, one + one / 128 * 126 + raw[0] % (one / 128), -2 - point),
            v,
            number(f, minus(raw[1]), random(raw[1]), -1 - up - down - point),
            number(f, minus(raw[2]), random(raw[2]), -9 - down - point),
            w,
        ]
    }

    /// The operands of `case`.
    pub fn drive(&self, case: &Case) -> Drive {
        let mut stream = Stream::new(case);
        let f = self.format;
        let one = 1u64 << f.fraction_bits;
        let starts = (0..ACCUMULATORS)
            .flat_map(|_| self.raw_vector(&mut stream))
            .map(|r| number(f, r & f.sign_bit() != 0, r & (one - 1) | one, -1 - f.fraction_bits as i32))
            .collect();
        let rows = (0..ROWS)
            .map(|i| {
                let raw: [Vec<u64>; 5] = std::array::from_fn(|_| self.raw_vector(&mut stream));
                (0..self.lanes)
                    .map(|lane| self.row(std::array::from_fn(|k| raw[k][lane]), case.seed.0 & 1 == 1, i % 4 == 3))
                    .collect()
            })
            .collect();
        Drive { starts, rows }
    }
}

/// Where chain number `chain` ends, and what it adds to its lane's sum; `see` is shown every intermediate and gives
/// what the chain goes on with.
pub fn end(plan: &Plan, drive: &Drive, chain: usize, mut see: impl FnMut(usize, u64) -> u64) -> (u64, u64) {
    let lane = chain % plan.lanes;
    let (mut x, mut sum) = (drive.starts[chain], 0u64);
    let mut step = 0;
    for _ in 0..REPEATS {
        for row in &drive.rows {
            let [c, v, u, b, w] = row[lane];
            for kind in 0..4 {
                let (factor, addend) = match kind {
                    0 => (x, c),
                    1 => (v, x),
                    2 => (u, b),
                    _ => (w, x),
                };
                x = see(step, fma(plan.format, x, factor, addend, Round::NearestEven).0);
                step += 1;
            }
            sum = sum.wrapping_add(x);
        }
    }
    (x, sum)
}

/// The ends of all chains, by accumulator, then lane, then the lanes' sums.
pub fn ends(plan: &Plan, case: &Case) -> Vec<u64> {
    let drive = plan.drive(case);
    let mut sums = vec![0u64; plan.lanes];
    let mut all = Vec::new();
    for chain in 0..drive.starts.len() {
        let (x, sum) = end(plan, &drive, chain, |_, x| x);
        all.push(x);
        let total = &mut sums[chain % plan.lanes];
        *total = total.wrapping_add(sum) & (plan.format.sign_bit() | (plan.format.sign_bit() - 1));
    }
    all.append(&mut sums);
    all
}

#[cfg(test)]
#[path = "common_chain_tests.rs"]
mod tests;
