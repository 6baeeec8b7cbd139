//! Eight bytes a CRC instruction, five independent chains over a buffer in the first cache; in plain code, one look-up for
//! every byte and nothing to wait for.

use std::hint::black_box;

use kernels::Variant;

use super::{Yardstick, available};

const KERNEL: &str = "checksum.crc32c";
const WORDS: usize = 2000;

/// Independent look-ups in tables of the kernel's size.
fn portable(data: &[u64; WORDS], tables: &[[u32; 256]; 8]) {
    let mut sums = [0u32; 4];
    for (i, word) in data.iter().enumerate() {
        let x = word.to_le_bytes().map(usize::from);
        let pair = |i: usize| tables[i][x[i]] ^ tables[i + 1][x[i + 1]];
        sums[i % 4] ^= (pair(0) ^ pair(2)) ^ (pair(4) ^ pair(6));
    }
    black_box(sums);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "sse4.2")]
fn avx2(data: &[u64; WORDS]) {
    use std::arch::x86_64::_mm_crc32_u64;
    let mut state = [0; 5];
    for words in data.as_chunks::<5>().0 {
        for (state, word) in state.iter_mut().zip(words) {
            *state = _mm_crc32_u64(*state, *word);
        }
    }
    black_box(state);
}

/// See the file's head.
pub fn yardsticks() -> Vec<Yardstick> {
    let data: [u64; WORDS] = black_box(std::array::from_fn(|i| (i as u64 + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15)));
    let tables: Box<[[u32; 256]; 8]> = black_box(Box::new([[7; 256]; 8]));
    let units = 8 * WORDS as u64;
    let run = Box::new(move || portable(black_box(&data), &tables));
    #[cfg_attr(not(target_arch = "x86_64"), expect(unused_mut, reason = "one yardstick only"))]
    let mut list = vec![Yardstick { kernel: KERNEL, variant: Variant::Portable, units, run }];
    #[cfg(target_arch = "x86_64")]
    if available(KERNEL, Variant::Avx2) {
        // SAFETY: the kernel's variant, which needs sse4.2, can run here
        let run = Box::new(move || unsafe { avx2(black_box(&data)) });
        list.push(Yardstick { kernel: KERNEL, variant: Variant::Avx2, units, run });
    }
    list
}
