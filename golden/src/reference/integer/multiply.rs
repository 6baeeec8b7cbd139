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

/// The eight chains after 1,024 steps, then both sums of each chain's high halves.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let mut chains = stream.words(8);
    let (mut sums, mut sums_of_sums) = (vec![0u64; 8], vec![0u64; 8]);
    for step in 0..1024 {
        let m = stream.word() | 1;
        for j in 0..8 {
            let (low, high) = product(chains[j], m);
            chains[j] = low;
            if step % 4 == 0 {
                let (upper, lower) = (sums[j] >> 32, sums[j] & 0xffff_ffff);
                sums[j] = lower << 32 | upper;
            }
            sums[j] = sums[j].wrapping_add(high);
            sums_of_sums[j] = sums_of_sums[j].wrapping_add(sums[j]);
        }
    }
    [chains, sums, sums_of_sums].concat()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against the language's own 128-bit product, and (2⁶⁴ − 1)² = 2¹²⁸ − 2⁶⁵ + 1.
    #[test]
    fn full_products() {
        assert_eq!(product(u64::MAX, u64::MAX), (1, u64::MAX - 1));
        let mut x = 0x0123_4567_89ab_cdef_u64;
        for _ in 0..10_000 {
            let y = x.wrapping_mul(0xd134_2543_de82_ef95).wrapping_add(1);
            let p = u128::from(x) * u128::from(y);
            assert_eq!(product(x, y), (p as u64, (p >> 64) as u64), "{x:#x} {y:#x}");
            x = y;
        }
    }
}
