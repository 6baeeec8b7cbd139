//! Double-double arithmetic and the power of `float.powcast`; the steps are written out at the head of `powcast.rs`.

/// hi + lo.
type Pair = (f64, f64);

#[inline(always)]
fn fast_sum(a: f64, b: f64) -> Pair {
    let s = a + b;
    (s, b - (s - a))
}

/// How a level gets the exact error of a product.
pub trait ProductError {
    /// a·b − p, where p is the rounded product.
    fn error(a: f64, b: f64, p: f64) -> f64;
}

/// Dekker's: each factor is split into halves whose products are exact.
pub struct Split;
impl ProductError for Split {
    #[inline(always)]
    fn error(a: f64, b: f64, p: f64) -> f64 {
        let halves = |x: f64| {
            let c = 134_217_729.0 * x;
            let high = c - (c - x);
            (high, x - high)
        };
        let ((ah, al), (bh, bl)) = (halves(a), halves(b));
        ((ah * bh - p) + ah * bl + al * bh) + al * bl
    }
}

/// One instruction; only used where the level has it, a library call elsewhere.
pub struct Fused;
impl ProductError for Fused {
    #[inline(always)]
    fn error(a: f64, b: f64, p: f64) -> f64 {
        a.mul_add(b, -p)
    }
}

#[inline(always)]
fn product<E: ProductError>(a: Pair, b: Pair) -> Pair {
    let p = a.0 * b.0;
    fast_sum(p, E::error(a.0, b.0, p) + (a.0 * b.1 + a.1 * b.0))
}

#[inline(always)]
fn root<E: ProductError>(a: Pair) -> Pair {
    let q = a.0.sqrt();
    let p = q * q;
    fast_sum(q, (((a.0 - p) - E::error(q, q, p)) + a.1) / (q + q))
}

#[inline(always)]
fn reciprocal<E: ProductError>(a: Pair) -> Pair {
    let q = 1.0 / a.0;
    let p = q * a.0;
    fast_sum(q, (((1.0 - p) - E::error(q, a.0, p)) - q * a.1) / a.0)
}

/// x to the power `sixteenths` / 16.
#[inline(always)]
pub fn pow<E: ProductError>(x: f64, sixteenths: i32) -> f64 {
    let n = sixteenths.unsigned_abs();
    let mut r = (1.0, 0.0);
    let mut b = (x, 0.0);
    let mut whole = n >> 4;
    while whole != 0 {
        if whole & 1 == 1 {
            r = product::<E>(r, b);
        }
        whole >>= 1;
        if whole != 0 {
            b = product::<E>(b, b);
        }
    }
    b = (x, 0.0);
    for bit in (0..4).rev() {
        b = root::<E>(b);
        if n >> bit & 1 == 1 {
            r = product::<E>(r, b);
        }
    }
    if sixteenths < 0 {
        r = reciprocal::<E>(r);
    }
    r.0
}
