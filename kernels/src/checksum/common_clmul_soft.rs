//! Carry-less multiplication in plain integers: sixteen products of one factor by four bits, shifted and added.

use super::clmul::{Block, Multiplier};

/// Plain integer code.
#[derive(Clone, Copy)]
pub struct Soft;

/// One factor's products with 0 … 15.
type Products = [u128; 16];

#[inline(always)]
fn products(factor: u64) -> Products {
    let once = u128::from(factor);
    let mut products = [0; 16];
    for i in 1..16usize {
        products[i] = products[i / 2] << 1 ^ (once & (i as u128 & 1).wrapping_neg());
    }
    products
}

#[inline(always)]
fn product(x: u64, by: &Products) -> u128 {
    (0..16).fold(0, |sum, i| sum ^ by[(x >> (4 * i)) as usize & 15] << (4 * i))
}

#[inline(always)]
fn number(block: Block) -> u128 {
    u128::from(block[0]) | u128::from(block[1]) << 64
}

impl Multiplier for Soft {
    type Pair = [Products; 2];
    type One = u128;
    type Four = [u128; 4];

    #[inline(always)]
    fn pair(self, constants: Block) -> [Products; 2] {
        constants.map(products)
    }

    #[inline(always)]
    fn block(self, block: Block) -> u128 {
        number(block)
    }

    #[inline(always)]
    fn words(self, block: u128) -> Block {
        [block as u64, (block >> 64) as u64]
    }

    #[inline(always)]
    fn load(self, bytes: &[u8; 16]) -> u128 {
        u128::from_le_bytes(*bytes)
    }

    #[inline(always)]
    fn fold(self, x: u128, by: &[Products; 2], next: u128) -> u128 {
        product(x as u64, &by[0]) ^ product((x >> 64) as u64, &by[1]) ^ next
    }

    #[inline(always)]
    fn load_four(self, bytes: &[u8; 64]) -> [u128; 4] {
        let blocks = bytes.as_chunks::<16>().0;
        std::array::from_fn(|j| u128::from_le_bytes(blocks[j]))
    }

    #[inline(always)]
    fn fold_four(self, x: [u128; 4], by: &[Products; 2], next: [u128; 4]) -> [u128; 4] {
        std::array::from_fn(|j| self.fold(x[j], by, next[j]))
    }

    #[inline(always)]
    fn add_first(self, mut x: [u128; 4], word: u64) -> [u128; 4] {
        x[0] ^= u128::from(word);
        x
    }

    #[inline(always)]
    fn split(self, x: [u128; 4]) -> [u128; 4] {
        x
    }
}
