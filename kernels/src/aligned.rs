//! Operand memory that starts on a cache-line boundary.

/// One line of 64 bytes, aligned to its own size.
#[repr(C, align(64))]
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Line(pub [u64; 8]);

/// Zeroed lines covering `kib` KiB.
pub fn lines(kib: u32) -> Vec<Line> {
    vec![Line::default(); kib as usize * 16]
}

/// The words of these lines, in address order.
pub fn words_mut(lines: &mut [Line]) -> &mut [u64] {
    let count = lines.len() * 8;
    // SAFETY: `Line` is `repr(C)` around eight u64 and 64 bytes long without padding, so the region is `count` words
    unsafe { std::slice::from_raw_parts_mut(lines.as_mut_ptr().cast(), count) }
}

/// The bytes of these lines, in address order.
pub fn bytes_mut(lines: &mut [Line]) -> &mut [u8] {
    let count = size_of_val(lines);
    // SAFETY: `Line` has no padding and every bit pattern is valid for it, so its bytes may be read and written as they are
    unsafe { std::slice::from_raw_parts_mut(lines.as_mut_ptr().cast(), count) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_are_the_lines_in_order_and_start_on_a_line() {
        let mut buffer = lines(1);
        for (i, line) in buffer.iter_mut().enumerate() {
            line.0 = std::array::from_fn(|l| (i * 8 + l) as u64);
        }
        let words = words_mut(&mut buffer);
        assert_eq!(words.as_ptr() as usize % 64, 0);
        assert_eq!(words, (0..128).collect::<Vec<u64>>());
    }
}
