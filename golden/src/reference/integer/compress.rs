//! `integer.compress` by its definition alone: every earlier position within the window is compared byte by byte.

use kernels::Case;

use crate::reference::chacha::Stream;

const LENGTH: usize = 8192;

fn text(case: &Case) -> Vec<u8> {
    let mut stream = Stream::new(case);
    let mut entries = Vec::new();
    for _ in 0..64 {
        let (u, v) = (stream.word(), stream.word());
        let bytes = [&v.to_le_bytes()[..], &u.to_le_bytes()[1..]].concat();
        entries.push(bytes[..3 + (u % 8) as usize].to_vec());
    }
    let fields: Vec<u64> =
        stream.words(512).into_iter().flat_map(|w| [w, w >> 16, w >> 32, w >> 48]).map(|f| f % 65536).collect();
    let mut text = Vec::new();
    let mut number = 0;
    while text.len() < LENGTH {
        let f = fields[number % fields.len()];
        if f.is_multiple_of(16) {
            text.push((f / 256) as u8);
        } else {
            text.extend_from_slice(&entries[((f / 16) & (f / 1024)) as usize % 64]);
        }
        number += 1;
    }
    text.truncate(LENGTH);
    text
}

/// Greatest length and the nearest distance that has it, if there is a match at `i`.
fn best(text: &[u8], i: usize) -> Option<(usize, usize)> {
    let length = |distance: usize| {
        let rest = text[i..].iter().zip(&text[i - distance..]);
        rest.take(259).take_while(|(a, b)| a == b).count()
    };
    let lengths: Vec<usize> = (1..=i.min(2048)).map(length).collect();
    let most = lengths.iter().copied().max().filter(|most| *most >= 4)?;
    lengths.iter().position(|l| *l == most).map(|at| (most, at + 1))
}

/// Appends the lowest `count` bits of `value`, lowest first.
fn append(bits: &mut Vec<bool>, value: u64, count: u32) {
    bits.extend((0..count).map(|i| value >> i & 1 == 1));
}

fn mix(sum: u64, word: u64) -> u64 {
    let s = sum.wrapping_add(word);
    s.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15)
}

fn digest(words: impl Iterator<Item = u64>) -> [u64; 8] {
    let mut sums = [0; 8];
    for (i, word) in words.enumerate() {
        sums[i % 8] = mix(sums[i % 8], word);
    }
    sums
}

/// Bits, literals, matches, tokens' sum, digest of the stream, digest of the text.
pub fn words(case: &Case) -> Vec<u64> {
    let text = text(case);
    let mut bits = Vec::new();
    let (mut literals, mut matches, mut h) = (0, 0, 0);
    let mut i = 0;
    while i < LENGTH {
        if let Some((length, distance)) = best(&text, i) {
            let number = length as u64 - 3;
            let k = 63 - number.leading_zeros();
            append(&mut bits, 1, 1);
            append(&mut bits, 0, k);
            append(&mut bits, 1, 1);
            append(&mut bits, number, k);
            append(&mut bits, distance as u64 - 1, 11);
            matches += 1;
            h = mix(h, length as u64 + 65536 * distance as u64);
            i += length;
        } else {
            append(&mut bits, 0, 1);
            append(&mut bits, u64::from(text[i]), 8);
            literals += 1;
            h = mix(h, u64::from(text[i]));
            i += 1;
        }
    }
    let word = |bits: &[bool]| bits.iter().rev().fold(0, |w, bit| w << 1 | u64::from(*bit));
    let mut out = vec![bits.len() as u64, literals, matches, h];
    out.extend(digest(bits.chunks(64).map(word)));
    let bytes = |bytes: &[u8]| bytes.iter().rev().fold(0, |w, byte| w << 8 | u64::from(*byte));
    out.extend(digest(text.chunks(8).map(bytes)));
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By hand: in "abcdabcdabcd" the match at 4 reaches over itself to the end; a longer match beats a nearer one.
    #[test]
    fn matches_by_hand() {
        assert_eq!(best(b"abcdabcdabcd", 4), Some((8, 4)));
        assert_eq!(best(b"abcdabcdabcd", 3), None);
        assert_eq!(best(b"abcdeXabcdYabcde", 11), Some((5, 11)));
        assert_eq!(best(b"abcdXabcdYabcdZ", 10), Some((4, 5)));
    }
}
