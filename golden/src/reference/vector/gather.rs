//! `vector.gather`: the table as bytes, every element put together from the bytes at its address, lane by lane.

use kernels::Case;

use crate::reference::chacha::Stream;

fn halves(words: &[u64]) -> Vec<u64> {
    words.iter().flat_map(|w| [w % (1 << 32), w >> 32]).collect()
}

/// The `size` bytes from `address` as a little-endian number.
fn read(memory: &[u8], address: u64, size: u64) -> u64 {
    (0..size).rev().fold(0, |value, b| value << 8 | u64::from(memory[(address + b) as usize]))
}

/// Sums of indexed loads, then the two chases.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let key = stream.word();
    let turns: Vec<u64> = stream.words(4).iter().map(|t| t % (1 << 32)).collect();
    let (half, full) = (halves(&stream.words(8)), stream.words(8));
    let indices = halves(&stream.words(1024));
    let bytes = u64::from(case.size.0 - 9) * 1024;
    let mut memory = Vec::new();
    for (j, random) in halves(&stream.words(bytes as usize / 8)).into_iter().enumerate() {
        let place = (j as u64).wrapping_add(key);
        memory.extend([place, place >> 8, random >> 16, random >> 24].map(|v| (v % 256) as u8));
    }
    let element = |i: u64| read(&memory, i % (bytes / 4) * 4, 4);
    let word = |i: u64| read(&memory, i % (bytes / 8) * 8, 8);

    let mut sums = [0u64; 32];
    for turn in turns {
        for vector in indices.chunks(16) {
            for (lane, i) in vector.iter().enumerate() {
                sums[lane] = (sums[lane] + element(i ^ turn)) % (1 << 32);
                sums[16 + lane] = sums[16 + lane].wrapping_add(word(i ^ turn));
            }
        }
    }
    let steps = 4 * indices.len() / 16;
    let chased_half = half
        .iter()
        .map(|&start| (0..steps).fold(start, |d, _| (d << 7 | d >> 25).wrapping_add(element(d)) % (1 << 32)));
    let chased_full = full.iter().map(|&start| (0..steps).fold(start, |e, _| e.rotate_left(13).wrapping_add(word(e))));
    sums.into_iter().chain(chased_half).chain(chased_full).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Addresses and byte order as the architectures define them (little endian).
    #[test]
    fn elements_lie_side_by_side() {
        let memory: Vec<u8> = (0..32).collect();
        assert_eq!(read(&memory, 4, 4), 0x0706_0504);
        assert_eq!(read(&memory, 8, 8), 0x0f0e_0d0c_0b0a_0908);
        assert_eq!(halves(&[0x1111_1111_2222_2222]), [0x2222_2222, 0x1111_1111]);
    }
}
