//! What the scalar units could do for `float.powcast`: the operations of an average power, all independent.
//!
//! An average power (two families of operands, see the kernel) is about 12 double-double products and 4 roots; that is,
//! with the fused product error, 40 multiplications or fused ones, 70 additions, 4 square roots and 4.5 divisions, and
//! with Dekker's split 270 further ones (128 multiplications, 144 additions). The kernel is one dependent chain of
//! scalars and its prologue has another: a ratio near 1 is neither possible nor meant; the ratio shows how long the
//! chain is.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "float.powcast";
const POWERS: u64 = 128;

/// One power's worth: `GROUPS` times 4 multiplications and 6 additions, then 4 roots and 4 divisions.
#[inline(always)]
fn bare<const GROUPS: usize>() {
    let factor = black_box(0.999_999_3f64);
    let start = black_box(2.713_1f64);
    let mut x: [f64; 10] = std::array::from_fn(|i| start + factor * i as f64);
    let mut roots = [start, start + 1.0, start + 2.0, start + 3.0];
    let mut quotients = roots;
    for _ in 0..POWERS {
        for _ in 0..GROUPS {
            let (products, sums) = x.split_at_mut(4);
            for x in products {
                *x *= factor;
            }
            for x in sums {
                *x += factor;
            }
        }
        for (root, quotient) in roots.iter_mut().zip(&mut quotients) {
            *root = (*root + start).sqrt();
            *quotient /= factor;
        }
        // a scalar each: the kernel's operations are scalar ones
        x = black_box(x);
    }
    black_box((x, roots, quotients));
}

#[inline(never)]
fn split() {
    bare::<38>();
}

#[inline(never)]
fn fused() {
    bare::<11>();
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    [(Variant::Portable, split as fn()), (Variant::Avx2, fused), (Variant::Avx512, fused), (Variant::Neon, fused)]
        .into_iter()
        .filter(|(variant, _)| available(KERNEL, *variant))
        .map(|(variant, run)| Yardstick { kernel: KERNEL, variant, units: POWERS, run: Box::new(run) })
        .collect()
}
