//! The chains' operand recipe and step on bit patterns.
//!
//! Recipe: every operand is ±significand · 2^exponent with the leading places of the significand given and the others
//! from a stream word; the exponents of a row bring the state from 2^X to 2^X' by way of n near 2^M and q near 2^Y.

use crate::reference::chacha::Stream;
use crate::softfloat::{Format, Round, add, div, mul, sqrt, sub};

const ROWS: usize = 8;

/// A format and how far its exponents swing.
pub struct Recipe {
    pub format: Format,
    pub span: i64,
    pub shallow: i64,
    pub deep: i64,
}

/// [u, v, c, w, a] of one chain in one row.
type Step = [u64; 5];

/// One chain: its first state and its rows.
pub struct Chain {
    pub start: u64,
    pub steps: Vec<Step>,
}

/// Where a chain's state is: sign, scale, and by how much it is below the normal numbers.
#[derive(Clone, Copy)]
struct Place {
    negative: bool,
    scale: i64,
    below: i64,
}

impl Recipe {
    /// Sign, significand with `lead` (in binary, its highest bit set) in front of the word's low bits, exponent of its
    /// leading bit.
    fn number(&self, negative: bool, lead: u64, word: u64, exponent: i64) -> u64 {
        let f = self.format;
        let free = f.fraction_bits - lead.ilog2();
        let significand = (lead << free) + word % (1 << free);
        let emin = i64::from(f.emin());
        let magnitude = if exponent < emin {
            significand >> (emin - exponent)
        } else {
            // the leading one adds itself to the exponent field
            significand + (((exponent - emin) as u64) << f.fraction_bits)
        };
        if negative { magnitude + f.sign_bit() } else { magnitude }
    }

    /// M, Y and the next place's scale and depth below the normal numbers, from the exponent word of a row.
    fn plan(&self, last: bool, at: Place, e: u64) -> (i64, i64, i64, i64) {
        let emin = i64::from(self.format.emin());
        let (span, x) = (self.span, at.scale);
        let take = |from: u32, n: i64| ((e >> from) % n as u64) as i64;
        let anywhere = |from: u32| take(from, 2 * span) - span;
        let low = -(2 * span + 1 + take(24, span / 8));
        match e >> 59 {
            _ if at.below > 0 => (at.below % 2 - at.below, anywhere(24), anywhere(0), 0),
            0 if !last => {
                let below = 1 + take(36, self.shallow);
                (2 * anywhere(12), -(span / 4 + take(24, span / 2)), emin - below, below)
            }
            0..3 if x <= 0 => (emin - 2 * take(36, self.shallow / 2 + 1), low, anywhere(0), 0),
            0..12 if x >= self.deep + 3 => {
                let m = x + emin - 2 - take(36, self.deep);
                (m - m.rem_euclid(2), low, anywhere(0), 0)
            }
            _ => (2 * anywhere(12), anywhere(24), anywhere(0), 0),
        }
    }

    /// Draws `count` chains.
    pub fn draw(&self, stream: &mut Stream, count: usize, full: bool) -> Vec<Chain> {
        let negative = |word: u64| word >= 1 << 63;
        let mut chains = Vec::new();
        let mut places = Vec::new();
        for _ in 0..count {
            let (word, scale) = (stream.word(), stream.word());
            let scale = if full { (scale % (2 * self.span) as u64) as i64 - self.span } else { 0 };
            let place = Place { negative: negative(word), scale, below: 0 };
            chains.push(Chain { start: self.number(place.negative, 1, word, scale - 1), steps: Vec::new() });
            places.push((place, place));
        }
        for row in 1..=ROWS {
            for (chain, (home, at)) in chains.iter_mut().zip(&mut places) {
                let [e, u, v, c, w, a] = std::array::from_fn(|_| stream.word());
                let (m, y, scale, below) = if full { self.plan(row == ROWS, *at, e) } else { (0, 0, 0, 0) };
                let next = if row == ROWS { *home } else { Place { negative: negative(w), scale, below } };
                chain.steps.push([
                    self.number(at.negative, 0b1111, u, m - at.scale - 1),
                    self.number(negative(v), 0b10000, v, m / 2 * 3 - y - 1),
                    self.number(negative(v), 0b101001, c, y),
                    self.number(next.negative, 0b10100, w, next.scale - y - 1),
                    self.number(next.negative, 0b100000, a, next.scale - 1),
                ]);
                *at = next;
            }
        }
        chains
    }

    /// x after one step.
    pub fn step(&self, x: u64, [u, v, c, w, a]: Step) -> u64 {
        let (f, near) = (self.format, Round::NearestEven);
        let n = mul(f, x, u, near).0;
        let r = sqrt(f, n, near).0;
        let s = div(f, r, v, near).0;
        let q = mul(f, n, s, near).0;
        let d = sub(f, c, q, near).0;
        let t = mul(f, d & (f.sign_bit() - 1), w, near).0;
        add(f, a, t, near).0
    }

    /// The last states after `rounds` walks over all rows.
    pub fn walk(&self, chains: &[Chain], rounds: usize) -> Vec<u64> {
        let one = |chain: &Chain| {
            (0..rounds).fold(chain.start, |x, _| chain.steps.iter().fold(x, |x, step| self.step(x, *step)))
        };
        chains.iter().map(one).collect()
    }
}
