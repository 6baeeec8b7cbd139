//! The map that `float.chain32`, `float.chain64` and the prologue of `float.powcast` iterate, and its operands.
//!
//! One step of one chain, with operands u, v, c, w, a:
//!
//! ```text
//! n = x · u      r = √n      s = r / v      q = n · s      d = c − q      t = |d| · w      x ← a + t
//! ```
//!
//! that is x ← a + |c − (x·u)^1.5 / v| · w. With |u| in [15/16, 1), v in [1/2, 17/32), c in [41/32, 42/32),
//! w in [5/8, 21/32), a in [1/2, 33/64) it maps the binade [1/2, 1) into itself, folding it once and stretching it
//! everywhere by 1.1 to 2: a difference that outlives its own step's rounding is not damped, but has spread over the
//! whole significand at the end. n is used beside its root because a root alone maps two binades on one; x stays in one binade so that the
//! last place means the same in every step. `common_persistence.rs` measures how many single errors the output shows.
//! Signs are drawn too, but in pairs (state and u; v and c; w and a), so that n > 0 and the fold is the only place where
//! a sign is dropped. Nothing overflows, v is never zero, so nothing is NaN.
//!
//! Two profiles. *Bounded* (even seeds): as above, states and nearly all operands in (−1, 1). *Full range* (odd seeds):
//! a row takes the state from scale 2^X to 2^X', by way of n near 2^M, M even, and q near 2^Y:
//! u · 2^(M−X), v · 2^(1.5M−Y), c · 2^Y, w · 2^(X'−Y), a · 2^X'. The X wander and return after the last row, so that the
//! rows can be walked any number of times. Some rows have subnormal operands; some make n, or the state itself, subnormal
//! by a few places (those places are lost, and errors below them).
//!
//! Operands, in stream order. For each chain two words: start (sign bit 63, fraction from the low bits) and the first X.
//! Then for each of 8 rows, for each chain, six words: exponents, u, v, c, w, a. The signs of v and c are bit 63 of v's
//! word, those of w, a and the next state bit 63 of w's; after the last row the state has the sign of the start.

use crate::lanes::Arithmetic;
use crate::operands::Operands;

/// Rows of operands; a run walks them `rounds` times.
pub const ROWS: usize = 8;

/// What the operand recipe needs to know of a format.
#[derive(Clone, Copy)]
pub struct Shape {
    pub fraction_bits: u32,
    pub exponent_bits: u32,
    /// X lies in [−span, span).
    pub span: i64,
    /// Places that a subnormal n or state has lost, at most.
    pub shallow: i64,
    /// Places that a subnormal u has lost, about, at most.
    pub deep: i64,
}

/// binary64.
pub const DOUBLE: Shape = Shape { fraction_bits: 52, exponent_bits: 11, span: 256, shallow: 4, deep: 16 };
/// binary32.
pub const SINGLE: Shape = Shape { fraction_bits: 23, exponent_bits: 8, span: 32, shallow: 2, deep: 8 };

impl Shape {
    fn emin(self) -> i64 {
        2 - (1 << (self.exponent_bits - 1))
    }

    /// The encoding of ±1.fraction · 2^exponent, cut (not rounded) where it is subnormal.
    /// The fraction is `word`'s low bits with its first `known` places replaced by `top`'s.
    fn encode(self, word: u64, negative: bool, exponent: i64, known: u32, top: u64) -> u64 {
        let free = self.fraction_bits - known;
        let fraction = top << free | word & ((1 << free) - 1);
        let below = self.emin() - exponent;
        let magnitude = if below > 0 {
            (1 << self.fraction_bits | fraction) >> below
        } else {
            ((1 - below) as u64) << self.fraction_bits | fraction
        };
        u64::from(negative) << (self.fraction_bits + self.exponent_bits) | magnitude
    }
}

/// Exponents of one row for one chain: those of the powers of two in the file's head.
struct Scales {
    u: i64,
    v: i64,
    c: i64,
    w: i64,
    a: i64,
}

/// The chain's way through the exponents and signs, row by row.
struct Path {
    shape: Shape,
    full: bool,
    home: (i64, bool),
    x: i64,
    negative: bool,
    /// Places that the state lost on becoming subnormal.
    lost: i64,
}

impl Path {
    fn new(shape: Shape, full: bool, start: u64, word: u64) -> Path {
        let x = if full { (word % (2 * shape.span as u64)) as i64 - shape.span } else { 0 };
        let negative = start >> 63 == 1;
        Path { shape, full, home: (x, negative), x, negative, lost: 0 }
    }

    fn row(&mut self, row: usize, word: u64) -> Scales {
        let Shape { span, shallow, deep, .. } = self.shape;
        let emin = self.shape.emin();
        let field = |shift: u32, n: i64| ((word >> shift) % n as u64) as i64;
        let kind = word >> 59;
        let x = self.x;
        let mut next = field(0, 2 * span) - span;
        let mut m = 2 * (field(12, 2 * span) - span);
        let mut y = field(24, 2 * span) - span;
        let mut lost = 0;
        if !self.full {
            (m, y, next) = (0, 0, 0);
        } else if self.lost > 0 {
            // back from a subnormal state: only an n just below one is in reach of u
            m = -(self.lost & !1);
        } else if kind == 0 && row < ROWS - 1 {
            lost = 1 + field(36, shallow);
            y = -span / 4 - field(24, span / 2);
            next = emin - lost;
        } else if kind < 3 && x <= 0 {
            // n subnormal; only a low q is in reach of v
            m = emin - 2 * field(36, shallow / 2 + 1);
            y = -2 * span - 1 - field(24, span / 8);
        } else if kind < 12 && x >= deep + 3 {
            // u subnormal
            m = (x + emin - 2 - field(36, deep)) & !1;
            y = -2 * span - 1 - field(24, span / 8);
        }
        if row == ROWS - 1 {
            next = self.home.0;
        }
        self.x = next;
        self.lost = lost;
        Scales { u: m - x, v: m + m / 2 - y, c: y, w: next - y, a: next }
    }
}

/// Operands of every chain for one step, in memory order. The alignment is a cache line's.
#[repr(C, align(64))]
pub struct Operand<S, const N: usize> {
    u: [S; N],
    v: [S; N],
    c: [S; N],
    w: [S; N],
    a: [S; N],
}

/// Starts and rows of a case.
pub struct Chains<S, const N: usize> {
    pub start: Box<[S; N]>,
    pub rows: Box<[Operand<S, N>]>,
}

/// Words that [`Chains::draw`] takes from the stream.
pub const fn words_drawn(chains: usize) -> usize {
    2 * chains + 6 * ROWS * chains
}

impl<S: Copy, const N: usize> Chains<S, N> {
    /// Draws a case's operands; `full` is the full-range profile, `scalar` makes an encoding a number.
    pub fn draw(shape: Shape, full: bool, operands: &mut Operands, scalar: fn(u64) -> S) -> Chains<S, N> {
        let mut paths = Vec::with_capacity(N);
        let mut start = Box::new([scalar(0); N]);
        for chain in start.iter_mut() {
            let word = operands.word();
            let path = Path::new(shape, full, word, operands.word());
            *chain = scalar(shape.encode(word, path.negative, path.x - 1, 0, 0));
            paths.push(path);
        }
        let mut rows = Vec::with_capacity(ROWS);
        for row in 0..ROWS {
            let zero = [scalar(0); N];
            let mut operand = Operand { u: zero, v: zero, c: zero, w: zero, a: zero };
            for (chain, path) in paths.iter_mut().enumerate() {
                let [e, u, v, c, w, a] = std::array::from_fn(|_| operands.word());
                let before = path.negative;
                let middle = v >> 63 == 1;
                let after = if row == ROWS - 1 { path.home.1 } else { w >> 63 == 1 };
                let scale = path.row(row, e);
                operand.u[chain] = scalar(shape.encode(u, before, scale.u - 1, 3, 0b111));
                operand.v[chain] = scalar(shape.encode(v, middle, scale.v - 1, 4, 0b0000));
                operand.c[chain] = scalar(shape.encode(c, middle, scale.c, 5, 0b01001));
                operand.w[chain] = scalar(shape.encode(w, after, scale.w - 1, 4, 0b0100));
                operand.a[chain] = scalar(shape.encode(a, after, scale.a - 1, 5, 0b00000));
                path.negative = after;
            }
            rows.push(operand);
        }
        Chains { start, rows: rows.into_boxed_slice() }
    }
}

/// Registers in flight: enough independent chains to hide the latency of root and division.
const IN_FLIGHT: usize = 8;

/// Iterates all chains over all rows, `rounds` times, writing the last states to `x`, which holds the first.
///
/// # Safety
/// The CPU has the instructions of `A`'s level.
#[inline(always)]
pub unsafe fn walk<A: Arithmetic, const N: usize>(
    rows: &[Operand<A::Scalar, N>],
    x: &mut [A::Scalar; N],
    rounds: usize,
) {
    const { assert!(N.is_multiple_of(A::WIDTH)) };
    let mut group = 0;
    // the compiler packs the baseline's scalars into short registers of its own
    while A::WIDTH == 1 && group + 2 * IN_FLIGHT <= N {
        // SAFETY: the loop condition keeps every scalar of the group below N
        unsafe { walk_group::<A, N, { 2 * IN_FLIGHT }>(rows, x, rounds, group) };
        group += 2 * IN_FLIGHT;
    }
    while group + IN_FLIGHT * A::WIDTH <= N {
        // SAFETY: the loop condition keeps every register of the group below N; features by this function's contract
        unsafe { walk_group::<A, N, IN_FLIGHT>(rows, x, rounds, group) };
        group += IN_FLIGHT * A::WIDTH;
    }
    while group < N {
        // SAFETY: N is a multiple of WIDTH; features by this function's contract
        unsafe { walk_group::<A, N, 1>(rows, x, rounds, group) };
        group += A::WIDTH;
    }
}

/// # Safety
/// `group + K * A::WIDTH <= N`, and the CPU has the instructions of `A`'s level.
#[inline(always)]
unsafe fn walk_group<A: Arithmetic, const N: usize, const K: usize>(
    rows: &[Operand<A::Scalar, N>],
    x: &mut [A::Scalar; N],
    rounds: usize,
    group: usize,
) {
    let at = |k: usize| group + k * A::WIDTH;
    let to = x.as_mut_ptr();
    // SAFETY: at(k) + WIDTH <= N by this function's contract, for the states as for each operand array
    unsafe {
        let mut state: [A; K] = std::array::from_fn(|k| A::load(to.add(at(k))));
        for _ in 0..rounds {
            for row in rows {
                for (k, x) in state.iter_mut().enumerate() {
                    let read = |from: &[A::Scalar; N]| A::load(from.as_ptr().add(at(k)));
                    let n = x.mul(read(&row.u));
                    let q = n.mul(n.sqrt().div(read(&row.v)));
                    let d = read(&row.c).sub(q);
                    *x = read(&row.a).add(d.abs().mul(read(&row.w)));
                }
            }
        }
        for (k, x) in state.iter().enumerate() {
            x.store(to.add(at(k)));
        }
    }
}
