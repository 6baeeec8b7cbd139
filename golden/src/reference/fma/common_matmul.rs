//! Both closed matrix products: one element of C at a time, sums by recursion, digests by weights.

use kernels::Case;

use crate::reference::chacha::Stream;
use crate::softfloat::{Format, Round, add, fma, from_uint, less, mul, negate};

const ORDER: usize = 96;
const NEAR: Round = Round::NearestEven;

/// Format and scales of one kernel.
pub struct Plan {
    pub format: Format,
    pub span: u64,
}

impl Plan {
    fn bits(&self) -> u32 {
        1 + self.format.exponent_bits + self.format.fraction_bits
    }

    fn plus(&self, a: u64, b: u64) -> u64 {
        add(self.format, a, b, NEAR).0
    }

    fn power(&self, exponent: i64) -> u64 {
        ((exponent + i64::from(self.format.emax())) as u64) << self.format.fraction_bits
    }

    /// `count` elements of a matrix, two to a word where they fit.
    fn elements(&self, stream: &mut Stream, count: usize) -> Vec<u64> {
        let f = self.format;
        let mut all = Vec::new();
        while all.len() < count {
            let word = stream.word();
            for piece in 0..64 / self.bits() {
                let raw = word >> (piece * self.bits());
                let places = 1u64 << f.fraction_bits;
                let exponent = -1 - (raw / places % 4) as i64;
                all.push((raw & f.sign_bit()) + self.power(exponent) + raw % places);
            }
        }
        all
    }

    /// A by rows and B by columns, closed and scaled.
    fn factors(&self, case: &Case) -> (Vec<Vec<u64>>, Vec<Vec<u64>>) {
        let f = self.format;
        let mut stream = Stream::new(case);
        let drawn = self.elements(&mut stream, 2 * ORDER * (ORDER - 1));
        let (left, right) = drawn.split_at(ORDER * (ORDER - 1));
        let mut a: Vec<Vec<u64>> = left.chunks(ORDER).map(<[u64]>::to_vec).collect();
        let mut b: Vec<Vec<u64>> =
            (0..ORDER - 1).map(|j| right.chunks(ORDER - 1).map(|row| row[j]).collect()).collect();
        for side in [&mut a, &mut b] {
            let closing =
                (0..ORDER).map(|k| negate(f, side.iter().fold(0, |sum, line| self.plus(sum, line[k])))).collect();
            side.push(closing);
        }
        let scales: Vec<i64> =
            (0..ORDER).map(|_| (stream.word() % (2 * self.span + 1)) as i64 - self.span as i64).collect();
        if case.seed.0 % 2 == 1 {
            for (side, sign) in [(&mut a, 1), (&mut b, -1)] {
                for line in side.iter_mut() {
                    for (x, scale) in line.iter_mut().zip(&scales) {
                        *x = mul(f, *x, self.power(sign * scale), NEAR).0;
                    }
                }
            }
        }
        (a, b)
    }

    /// Lanes first + n·step of the elements, each lane summed in order, lanes joined in pairs.
    fn sum(&self, line: &[u64], lanes: usize, first: usize, step: usize) -> u64 {
        if step == lanes {
            return line.iter().skip(first).step_by(lanes).fold(0, |sum, x| self.plus(sum, *x));
        }
        self.plus(self.sum(line, lanes, first, 2 * step), self.sum(line, lanes, first + step, 2 * step))
    }

    /// s and t over bit patterns, packed into words.
    fn digest(&self, patterns: &[u64]) -> Vec<u64> {
        let bits = self.bits();
        let lanes = 512 / bits as usize;
        let groups = (patterns.len() / lanes) as u64;
        let mask = u64::MAX >> (64 - bits);
        let weighted = |lane: usize, weight: &dyn Fn(u64) -> u64| {
            let terms = (0..groups).map(|g| patterns[g as usize * lanes + lane].wrapping_mul(weight(g)));
            terms.fold(0u64, u64::wrapping_add) & mask
        };
        let s = (0..lanes).map(|lane| weighted(lane, &|_| 1));
        // the sum of g is in every one of the groups − g sums that follow
        let t = (0..lanes).map(|lane| weighted(lane, &|g| groups - g));
        let all: Vec<u64> = s.chain(t).collect();
        let word = |pieces: &[u64]| pieces.iter().rev().fold(0, |word, x| word << (bits % 64) | x);
        all.chunks(64 / bits as usize).map(word).collect()
    }

    /// Sums not within their bound of 4,400,000 (the last one 96 times that) units of roundoff.
    fn beyond(&self, sums: &[u64]) -> u64 {
        let f = self.format;
        let roundoff = self.power(-1 - i64::from(f.fraction_bits));
        let outside = |(i, sum): (usize, &u64)| {
            let limit =
                mul(f, from_uint(f, if i == ORDER - 1 { 96 * 4_400_000 } else { 4_400_000 }, NEAR).0, roundoff, NEAR).0;
            let size = sum & (f.sign_bit() - 1);
            // not "limit < size": a sum that is no number counts
            u64::from(!(less(f, size, limit) || size == limit))
        };
        sums.iter().enumerate().map(outside).sum()
    }

    /// Alarms, digests of C, of its rows' sums, of its columns' sums.
    pub fn words(&self, case: &Case) -> Vec<u64> {
        let (a, b) = self.factors(case);
        let element = |row: &[u64], column: &[u64]| {
            row.iter().zip(column).fold(0, |sum, (x, y)| fma(self.format, *x, *y, sum, NEAR).0)
        };
        let c: Vec<Vec<u64>> = a.iter().map(|row| b.iter().map(|column| element(row, column)).collect()).collect();
        let rows: Vec<u64> = c.iter().map(|row| self.sum(row, 512 / self.bits() as usize, 0, 1)).collect();
        let columns: Vec<u64> = (0..ORDER).map(|j| c.iter().fold(0, |sum, row| self.plus(sum, row[j]))).collect();
        let digests = [c.concat(), rows.clone(), columns.clone()].map(|patterns| self.digest(&patterns)).concat();
        [self.beyond(&rows), self.beyond(&columns)].into_iter().chain(digests).collect()
    }
}
