//! `integer.multiply`: schoolbook products of 32-bit halves, so that no wide multiply is needed.

use kernels::Case;

use crate::reference::chacha::Stream;

/// (low, high) of the 128-bit product.
fn product(a: u64, b: u64) -> (u64, u64) {
    const HALF: u64 = 0xffff_ffff;
    let (al, ah, bl, bh) = (a & HALF, a >> 32, b & HALF, b >> 32);
    let low = al * bl;
    let middle = ah * bl + (low >> 32);
    let other = al * bh + (middle & HALF);
    (other << 32 | low & HALF, ah * bh + (middle >> 32) + (other >> 32))
}

/// The eight chains after 1,024 steps.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let mut chains = stream.words(8);
    for _ in 0..1024 {
        let m = stream.word() | 1;
        for x in &mut chains {
            let (low, high) = product(*x, m);
            *x = (low ^ high).wrapping_add(m);
        }
    }
    chains
}
