//! The stream of bits of `integer.compress`: written, and read back into a text. Its form is at the head of `compress.rs`.

/// Bytes of the text.
pub(super) const LENGTH: usize = 8192;
/// How far back a match may begin; a power of two.
pub(super) const WINDOW: usize = 2048;
/// Shortest match.
pub(super) const LEAST: usize = 4;
/// Words that hold any stream, a power of two: nine bits for every byte fit.
pub(super) const STREAM: usize = 2048;

/// Bits into a stream of words. Indices wrap, so that even a miscounting core writes where it may.
pub(super) struct Writer<'a> {
    words: &'a mut [u64; STREAM],
    bits: usize,
    open: u64,
}

impl<'a> Writer<'a> {
    pub(super) fn new(words: &'a mut [u64; STREAM]) -> Writer<'a> {
        Writer { words, bits: 0, open: 0 }
    }

    /// At most 57 bits, none set above `count`.
    #[inline(always)]
    pub(super) fn put(&mut self, value: u64, count: usize) {
        let used = self.bits % 64;
        self.open |= value << used;
        self.bits += count;
        if used + count >= 64 {
            self.words[(self.bits / 64).wrapping_sub(1) % STREAM] = self.open;
            // two shifts, as one by 64 would not be defined
            self.open = value >> 1 >> (63 - used);
        }
    }

    /// Writes what is left of the last word; the number of bits.
    #[inline(always)]
    pub(super) fn finish(self) -> usize {
        if !self.bits.is_multiple_of(64) {
            self.words[self.bits / 64 % STREAM] = self.open;
        }
        self.bits
    }
}

/// The 64 bits of the stream from bit `at` on.
#[inline(always)]
fn peek(stream: &[u64; STREAM], at: usize) -> u64 {
    let (word, shift) = (at / 64, at % 64);
    stream[word % STREAM] >> shift | stream[(word + 1) % STREAM] << 1 << (63 - shift)
}

/// Reads the text back. Positions wrap, so that even a wrong stream is read to the end.
#[inline(always)]
pub(super) fn expand(stream: &[u64; STREAM], back: &mut [u8; LENGTH + 8]) {
    let (mut at, mut i) = (0, 0);
    while i < LENGTH {
        let bits = peek(stream, at);
        if bits & 1 == 0 {
            back[i] = (bits >> 1) as u8;
            (at, i) = (at + 9, i + 1);
            continue;
        }
        let k = ((bits >> 1).trailing_zeros() as usize).min(8);
        let number = bits >> (2 + k) & ((1 << k) - 1) | 1 << k;
        let distance = (bits >> (2 + 2 * k)) as usize % WINDOW + 1;
        at += 2 + 2 * k + WINDOW.ilog2() as usize;
        let length = (number as usize + LEAST - 1).min(LENGTH - i);
        let from = i.wrapping_sub(distance) % LENGTH;
        if distance >= 8 && from < i {
            // eight bytes at a time; what goes past the end of the match is written again
            for j in (0..length).step_by(8) {
                let mut eight = [0; 8];
                eight.copy_from_slice(&back[from + j..][..8]);
                back[i + j..][..8].copy_from_slice(&eight);
            }
        } else {
            for j in 0..length {
                back[i + j] = back[(from + j) % LENGTH];
            }
        }
        i += length;
    }
}
