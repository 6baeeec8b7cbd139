//! A matrix product by fused multiply-add, with sums that must vanish as an alarm that needs no golden value.
//!
//! C = A·B of order 96, blocked into tiles of 6 rows by two to four registers that stay in registers over all of k. Every
//! element is one chain in the order of k: c ← 0; c ← a[i][k]·b[k][j] + c, each step rounded once. So an element has the
//! same bits whatever the tile and the width.
//!
//! A and B carry checksums (Huang and Abraham, "Algorithm-based fault tolerance for matrix operations", IEEE Trans. Comput.
//! C-33, 1984): the last row of A is minus the sum of its other rows, the last column of B minus the sum of its other
//! columns, added in order. So in exact arithmetic every row and every column of C sums to zero. In floating point the sum
//! of a row is bounded (Higham, *Accuracy and Stability of Numerical Algorithms*, 2nd ed. 2002, lemma 3.1: γₙ = nu/(1 − nu)
//! bounds the relative error of n roundings). With n = 96, u the unit roundoff, and operands |a[i][k]·b[k][j]| < 1:
//!
//! ```text
//! the closing column of B is itself rounded          |Σⱼ b[k][j]| ≤ γ₉₄ · 95 · max|b[k]|
//! an element takes 96 roundings, a sum 95 at most     γ₁₉₁ on each of the terms |a[i][k]·b[k][j]|
//! the terms of the closing column are up to 95(1 + γ₉₄) times larger, so those of all columns add up to 95(2 + γ₉₄)
//! |sum of a row| ≤ 96 · 95 · (γ₉₄ + γ₁₉₁(2 + γ₉₄)) ≤ 4,400,000 u
//! ```
//!
//! and 96 times that for the closing row, whose elements of A are up to 95(1 + γ₉₄) large. Columns likewise. A sum beyond
//! the bound (or not a number) is counted; honest arithmetic can never reach it, for any seed. One wrong element of C
//! shows in one row and in one column: where they cross it lies.
//!
//! What is too small for the alarm is for the digests: s ← s + bits, t ← t + s over the elements of C in the order of rows,
//! in as many lanes as 64 bytes hold, modulo 2^width of an element; the same over the sums of the rows and of the columns.
//! Two equal errors that cancel in s leave t wrong by their distance times the error, unless both are in the leading bits,
//! and those are the alarm's.
//!
//! Operands: even seeds in ±[1/16, 1). Odd seeds also scale column k of A by 2^s and row k of B by 2^−s, with s over most of
//! the exponent range: products, elements and bound are the same as before.

use std::hint::black_box;

use crate::lanes::Arithmetic;
use crate::lanes::fma::FmaLanes;

/// Rows and columns of each matrix, the closing ones included.
pub const ORDER: usize = 96;
/// Rows of a tile.
const ROWS: usize = 6;
/// The most lanes that 64 bytes hold.
const LANES: usize = 16;
/// The bound on the sum of a row or column, in units of roundoff; see the file's head.
pub const BOUND: u32 = 4_400_000;
/// How many times larger the bound on a closing row or column is.
pub const CLOSING: u32 = 96;
/// Words of an output.
pub const OUTPUT_WORDS: usize = 2 + 6 * 8;
/// Elements that come from the stream, in A and in B.
pub const DRAWN: usize = ORDER * (ORDER - 1);

/// A scalar that can be closed and judged.
pub trait Real: Copy + PartialOrd {
    /// Zero.
    const ZERO: Self;
    /// [`BOUND`] and [`CLOSING`] times that, times the unit roundoff. Both exact.
    const LIMITS: [Self; 2];
    /// self + other.
    fn plus(self, other: Self) -> Self;
    /// −self.
    fn minus(self) -> Self;
    /// Sign bit cleared.
    fn size(self) -> Self;
}

macro_rules! real {
    ($real:ident) => {
        impl Real for $real {
            const ZERO: $real = 0.0;
            const LIMITS: [$real; 2] =
                [BOUND as $real * $real::EPSILON / 2.0, BOUND as $real * CLOSING as $real * $real::EPSILON / 2.0];
            #[inline(always)]
            fn plus(self, other: $real) -> $real {
                self + other
            }
            #[inline(always)]
            fn minus(self) -> $real {
                -self
            }
            #[inline(always)]
            fn size(self) -> $real {
                self.abs()
            }
        }
    };
}
real!(f32);
real!(f64);

/// By rows.
#[repr(C, align(64))]
pub struct Square<S>(pub [[S; ORDER]; ORDER]);

/// A and B with their closing row and column.
pub struct Factors<S> {
    a: Square<S>,
    b: Square<S>,
}

impl<S: Real> Factors<S> {
    /// From the drawn elements of A and of B, each by rows.
    pub fn close(mut a: impl FnMut() -> S, mut b: impl FnMut() -> S) -> Factors<S> {
        let mut both = Factors { a: Square([[S::ZERO; ORDER]; ORDER]), b: Square([[S::ZERO; ORDER]; ORDER]) };
        let (closing, rows) = both.a.0.split_last_mut().expect("96 rows");
        for row in rows {
            for (x, sum) in row.iter_mut().zip(closing.iter_mut()) {
                *x = a();
                *sum = sum.plus(*x);
            }
        }
        closing.iter_mut().for_each(|x| *x = x.minus());
        for row in &mut both.b.0 {
            let (closing, columns) = row.split_last_mut().expect("96 columns");
            for x in columns {
                *x = b();
                *closing = closing.plus(*x);
            }
            *closing = closing.minus();
        }
        both
    }

    /// Column k of A times `factors[k].0`, row k of B times `factors[k].1`.
    pub fn scale(&mut self, factors: &[(S, S); ORDER], times: impl Fn(S, S) -> S) {
        for row in &mut self.a.0 {
            row.iter_mut().zip(factors).for_each(|(x, (up, _))| *x = times(*x, *up));
        }
        for (row, (_, down)) in self.b.0.iter_mut().zip(factors) {
            row.iter_mut().for_each(|x| *x = times(*x, *down));
        }
    }
}

/// Everything that a run writes; kept out of the stack so that vectors on it can only be spills.
#[repr(C, align(64))]
pub struct Product<S> {
    c: Square<S>,
    columns: [S; ORDER],
    rows: [S; ORDER],
    /// A row's sum in as many parts as there are lanes.
    parts: [S; LANES],
    /// s and t of C, of the rows' sums, of the columns' sums; bit patterns.
    pub digests: [[S; LANES]; 6],
}

impl<S: Real> Product<S> {
    /// Nothing computed yet.
    pub fn empty() -> Box<Product<S>> {
        Box::new(Product {
            c: Square([[S::ZERO; ORDER]; ORDER]),
            columns: [S::ZERO; ORDER],
            rows: [S::ZERO; ORDER],
            parts: [S::ZERO; LANES],
            digests: [[S::ZERO; LANES]; 6],
        })
    }

    /// How many rows and how many columns have a sum beyond the bound.
    #[inline(never)]
    pub fn alarms(&self) -> [u64; 2] {
        [beyond(&self.rows), beyond(&self.columns)].map(|found| found.count() as u64)
    }
}

/// One run: the product in tiles of `COLUMNS` registers, then the checks with 64 bytes in `REGISTERS` of them.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
pub unsafe fn run<V, const REGISTERS: usize, const COLUMNS: usize>(
    factors: &Factors<<V as FmaLanes>::Scalar>,
    to: &mut Product<<V as FmaLanes>::Scalar>,
) where
    V: FmaLanes<Scalar: Real> + Arithmetic<Scalar = <V as FmaLanes>::Scalar>,
{
    // SAFETY: instructions by this function's contract
    unsafe {
        multiply::<V, COLUMNS>(factors, &mut to.c);
        check::<V, REGISTERS>(to);
    }
}

/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn multiply<V: FmaLanes, const COLUMNS: usize>(factors: &Factors<V::Scalar>, c: &mut Square<V::Scalar>) {
    let width = COLUMNS * V::WIDTH;
    const { assert!(ORDER.is_multiple_of(COLUMNS * V::WIDTH) && ORDER.is_multiple_of(ROWS)) };
    for j in (0..ORDER).step_by(width) {
        for i in (0..ORDER).step_by(ROWS) {
            // SAFETY: i + ROWS and j + width are within ORDER, for which every matrix has that many rows and columns;
            // instructions by this function's contract
            unsafe {
                let a = factors.a.0.as_ptr().add(i).cast::<V::Scalar>();
                let b = factors.b.0.as_ptr().cast::<V::Scalar>().add(j);
                let to = c.0.as_mut_ptr().add(i).cast::<V::Scalar>().add(j);
                let mut tile = [[V::no_bits(); COLUMNS]; ROWS];
                for k in 0..ORDER {
                    let mut right = [V::no_bits(); COLUMNS];
                    for (v, right) in right.iter_mut().enumerate() {
                        *right = V::load(b.add(k * ORDER + v * V::WIDTH));
                    }
                    for (r, row) in tile.iter_mut().enumerate() {
                        let left = V::broadcast(a.add(r * ORDER + k));
                        for (x, right) in row.iter_mut().zip(right) {
                            *x = left.mul_add(right, *x);
                        }
                    }
                }
                for (r, row) in tile.iter().enumerate() {
                    for (v, x) in row.iter().enumerate() {
                        FmaLanes::store(*x, to.add(r * ORDER + v * V::WIDTH));
                    }
                }
            }
        }
    }
}

/// Sums and digests of what stands in `to.c`.
///
/// # Safety
/// The CPU has the instructions of `V`.
#[inline(always)]
unsafe fn check<V, const REGISTERS: usize>(to: &mut Product<<V as FmaLanes>::Scalar>)
where
    V: FmaLanes<Scalar: Real> + Arithmetic<Scalar = <V as FmaLanes>::Scalar>,
{
    let lanes = REGISTERS * <V as FmaLanes>::WIDTH;
    const { assert!(REGISTERS * <V as FmaLanes>::WIDTH * size_of::<<V as FmaLanes>::Scalar>() == 64) };
    to.columns = [Real::ZERO; ORDER];
    // SAFETY: every offset into a row or into the columns' sums stays below ORDER, which `lanes` divides; `lanes` is LANES at
    // most; instructions by this function's contract
    unsafe {
        let mut s = [V::no_bits(); REGISTERS];
        let mut t = s;
        for (row, sum) in to.c.0.iter().zip(&mut to.rows) {
            let mut parts = [V::no_bits(); REGISTERS];
            // hidden, or the compiler would want more registers than there are for the columns' sums
            let columns = black_box(to.columns.as_mut_ptr());
            for at in (0..ORDER).step_by(lanes) {
                for r in 0..REGISTERS {
                    let at = at + r * <V as FmaLanes>::WIDTH;
                    let x = <V as FmaLanes>::load(row.as_ptr().add(at));
                    let column = columns.add(at);
                    FmaLanes::store(<V as FmaLanes>::load(column).add(x), column);
                    parts[r] = parts[r].add(x);
                    s[r] = s[r].add_bits(x);
                    t[r] = t[r].add_bits(s[r]);
                }
            }
            for (r, part) in parts.iter().enumerate() {
                FmaLanes::store(*part, to.parts.as_mut_ptr().add(r * <V as FmaLanes>::WIDTH));
            }
            let mut half = lanes / 2;
            while half > 0 {
                for l in 0..half {
                    to.parts[l] = to.parts[l].plus(to.parts[l + half]);
                }
                half /= 2;
            }
            *sum = to.parts[0];
        }
        let [c_s, c_t, row_s, row_t, column_s, column_t] = &mut to.digests;
        put(&s, c_s);
        put(&t, c_t);
        digest::<V, REGISTERS>(&to.rows, row_s, row_t);
        digest::<V, REGISTERS>(&to.columns, column_s, column_t);
    }
}

/// # Safety
/// The CPU has the instructions of `V`; `x` is no longer than `to`.
#[inline(always)]
unsafe fn put<V: FmaLanes>(x: &[V], to: &mut [V::Scalar; LANES]) {
    for (r, x) in x.iter().enumerate() {
        // SAFETY: by this function's contract
        unsafe { x.store(to.as_mut_ptr().add(r * V::WIDTH)) };
    }
}

/// # Safety
/// The CPU has the instructions of `V`; `REGISTERS` of them hold 64 bytes.
#[inline(always)]
unsafe fn digest<V: FmaLanes, const REGISTERS: usize>(
    sums: &[V::Scalar; ORDER],
    s_to: &mut [V::Scalar; LANES],
    t_to: &mut [V::Scalar; LANES],
) {
    // SAFETY: ORDER is a multiple of the lanes of 64 bytes; the rest by this function's contract
    unsafe {
        let mut s = [V::no_bits(); REGISTERS];
        let mut t = s;
        for at in (0..ORDER).step_by(REGISTERS * V::WIDTH) {
            for r in 0..REGISTERS {
                s[r] = s[r].add_bits(V::load(sums.as_ptr().add(at + r * V::WIDTH)));
                t[r] = t[r].add_bits(s[r]);
            }
        }
        put(&s, s_to);
        put(&t, t_to);
    }
}

/// The rows or columns whose sum is beyond its bound, or not a number.
#[inline(always)]
fn beyond<S: Real>(sums: &[S; ORDER]) -> impl Iterator<Item = usize> {
    sums.iter()
        .enumerate()
        .filter(|(i, sum)| {
            let limit = S::LIMITS[usize::from(*i == ORDER - 1)];
            !matches!(sum.size().partial_cmp(&limit), Some(std::cmp::Ordering::Less | std::cmp::Ordering::Equal))
        })
        .map(|(i, _)| i)
}

#[cfg(test)]
#[path = "common_matmul_tests.rs"]
mod tests;
