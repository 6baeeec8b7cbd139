//! What no such compressor does without: for each byte of a text a hash of the next four and an entry in a table. Nothing is
//! searched or written, so no kernel comes near.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "integer.compress";
const LENGTH: usize = 8192;

fn hashes(text: &[u8; LENGTH], table: &mut [u16; 4096]) {
    for (i, four) in text.array_windows::<4>().enumerate() {
        let hash = u32::from_le_bytes(*four).wrapping_mul(0x9e37_79b1) >> 20;
        table[hash as usize % 4096] = i as u16;
    }
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let list = |variant| {
        let text: Box<[u8; LENGTH]> = Box::new(std::array::from_fn(|i| (i * i / 7) as u8));
        let mut table = Box::new([0; 4096]);
        let run = Box::new(move || hashes(black_box(&text), black_box(&mut table)));
        Yardstick { kernel: KERNEL, variant, units: LENGTH as u64, run }
    };
    [Variant::Portable, Variant::Avx2].into_iter().filter(|v| available(KERNEL, *v)).map(list).collect()
}
