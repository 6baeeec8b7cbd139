//! `integer.compress`: compression of a text by references to what came before (J. Ziv, A. Lempel, "A Universal Algorithm for
//! Sequential Data Compression", IEEE Transactions on Information Theory 23 (1977)), and its way back.
//!
//! The text has 8,192 bytes, made of 64 entries of 3 to 10 bytes, the first ones more often, with single bytes between them.
//!
//! From position i, at first 0, let a candidate be any earlier position at most 2,048 back; its length is the number of bytes
//! that are equal from it on and from i on, at most 259, at most as many as are left; both rows may overlap. If the greatest
//! length is at least 4, the match is the nearest candidate of that length, and i goes on by the length; otherwise the
//! byte is a literal and i goes on by 1. Nothing in this depends on how candidates are found: here by chains of the positions
//! whose next four bytes have the same hash, newest first.
//!
//! The stream is filled from each word's lowest bit on. A literal is a bit 0 and the byte. A match is a bit 1, its length less 3
//! in Elias' gamma code (k zeros, a one, the k bits below the number's highest), its distance less 1 in 11 bits. It ends
//! with zeros up to the end of a word. It is read back into a text of its own.
//!
//! A digest of words has eight sums, all 0 at first; word i goes into sum i mod 8: s ← rotl(s + w, 29)·0x9e3779b97f4a7c15.
//! Each token goes in the same way into one sum h: a literal as its byte, a match as its length + 2¹⁶ times its distance.
//!
//! Operands, in stream order: for each entry words u and v: its length is 3 + (u mod 8), its bytes are the first ones of v's
//! bytes followed by u's from the second on; then 512 words of four 16-bit fields f, the lowest first. A field adds to the text
//! the byte f >> 8 if f mod 16 = 0, else entry (f >> 4) ∧ (f >> 10) mod 64; after the last field comes the first, until the
//! text is full; what is over is cut off. Output: bits of the stream, literals, matches, h, digest of the stream's words, digest
//! of the text that was read back, as words.

use super::common_match::{ByWords, Compare, MARGIN};
use super::common_stream::{LEAST, LENGTH, STREAM, WINDOW, Writer, expand};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const MOST: usize = 259;
const ENTRIES: usize = 64;
const FIELDS: usize = 512;
const HASHES: usize = 4096;
const SUMS: usize = 8;
/// 2⁶⁴ divided by the golden ratio: odd, with its ones spread.
const SPREAD: u64 = 0x9e37_79b9_7f4a_7c15;

/// See the file's head.
pub struct Compress;

impl Kernel for Compress {
    fn id(&self) -> &'static str {
        "integer.compress"
    }

    fn summary(&self) -> &'static str {
        "realistic integer code: text compressed by back references and read back"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(8)]
    }

    fn output_words(&self, _size: Size) -> usize {
        4 + 2 * SUMS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: LENGTH as u64, unit: "byte" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["imul", "shl", "xor"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi1, Feature::Bmi2, Feature::Lzcnt],
                    marks: &["vpcmpeqb", "vpmovmskb", "tzcnt", "lzcnt", "shlx"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["rbit", "clz", "mul"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let entries: Vec<Vec<u8>> = (0..ENTRIES)
            .map(|_| {
                let (u, v) = (operands.word(), operands.word());
                let bytes = v.to_le_bytes().into_iter().chain(u.to_le_bytes().into_iter().skip(1));
                bytes.take(3 + (u % 8) as usize).collect()
            })
            .collect();
        let words = operands.words(FIELDS);
        operands.finish(2 * ENTRIES + FIELDS);
        let fields: Vec<u16> = words.iter().flat_map(|w| [0, 16, 32, 48].map(|at| (w >> at) as u16)).collect();
        let mut text = Vec::with_capacity(LENGTH + MARGIN);
        for f in fields.iter().cycle() {
            match f % 16 {
                0 => text.push((f >> 8) as u8),
                _ => text.extend(&entries[usize::from((f >> 4) & (f >> 10)) % ENTRIES]),
            }
            if text.len() >= LENGTH {
                break;
            }
        }
        text.truncate(LENGTH);
        text.resize(LENGTH + MARGIN, 0);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(Bench { text, room: Box::new(Room::new()), run }))
    }
}

/// Memory that a run writes.
struct Room {
    /// Newest position plus 1 of each hash; 0 for none.
    newest: [u16; HASHES],
    /// The position plus 1 that was the newest of its hash before this one, for the positions of a window.
    before: [u16; WINDOW],
    stream: [u64; STREAM],
    /// The text read back, and room for the last of eight bytes.
    back: [u8; LENGTH + 8],
}

impl Room {
    fn new() -> Room {
        Room { newest: [0; HASHES], before: [0; WINDOW], stream: [0; STREAM], back: [0; LENGTH + 8] }
    }
}

struct Bench {
    text: Vec<u8>,
    room: Box<Room>,
    run: fn(&[u8], &mut Room, &mut [u64]),
}

impl Ready for Bench {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.text, &mut self.room, out);
    }
}

#[inline(always)]
fn absorb(sum: &mut u64, word: u64) {
    *sum = sum.wrapping_add(word).rotate_left(29).wrapping_mul(SPREAD);
}

#[inline(always)]
fn digest(words: impl Iterator<Item = u64>) -> [u64; SUMS] {
    let mut sums = [0; SUMS];
    for (i, word) in words.enumerate() {
        absorb(&mut sums[i % SUMS], word);
    }
    sums
}

/// Chains of earlier positions with the same hash of four bytes.
struct Chains<'a> {
    newest: &'a mut [u16; HASHES],
    before: &'a mut [u16; WINDOW],
}

impl Chains<'_> {
    /// Makes `i` the newest of its hash; the one that was, plus 1. The place in `before` was that of the position a window
    /// back, whose own predecessor is too far away to be asked for.
    #[inline(always)]
    fn insert(&mut self, text: &[u8], i: usize) -> usize {
        let next = text[i..].first_chunk().map_or(0, |next| u32::from_le_bytes(*next));
        let hash = (next.wrapping_mul(0x9e37_79b1) >> 20) as usize;
        let newest = std::mem::replace(&mut self.newest[hash % HASHES], i as u16 + 1);
        self.before[i % WINDOW] = newest;
        usize::from(newest)
    }

    /// Length and distance of the match from `i` on, given its chain's beginning; less than [`LEAST`] for none.
    #[inline(always)]
    fn search<C: Compare>(&self, text: &[u8], i: usize, mut candidate: usize, limit: usize) -> (usize, usize) {
        let oldest = (i + 1).saturating_sub(WINDOW).max(1);
        let (mut length, mut distance) = (LEAST - 1, 0);
        let mut last = i + 1;
        // positions plus 1; they fall all the time, or the chain is at its end
        while candidate >= oldest && candidate < last && length < limit {
            last = candidate;
            let common = C::common(text, candidate - 1, i, limit);
            if common > length {
                (length, distance) = (common, i + 1 - candidate);
            }
            candidate = usize::from(self.before[(candidate - 1) % WINDOW]);
        }
        (length, distance)
    }
}

struct Tokens {
    bits: usize,
    literals: u64,
    matches: u64,
    h: u64,
}

#[inline(always)]
fn compress<C: Compare>(text: &[u8], room: &mut Room) -> Tokens {
    room.newest.fill(0);
    let mut chains = Chains { newest: &mut room.newest, before: &mut room.before };
    let mut writer = Writer::new(&mut room.stream);
    let mut tokens = Tokens { bits: 0, literals: 0, matches: 0, h: 0 };
    let mut i = 0;
    while i < LENGTH {
        let limit = MOST.min(LENGTH - i);
        let candidate = chains.insert(text, i);
        let (length, distance) = chains.search::<C>(text, i, candidate, limit);
        if length >= LEAST {
            let number = length - (LEAST - 1);
            let k = number.ilog2() as usize;
            // from the lowest bit: the mark, k zeros, a one, the rest of the number, the distance
            let rest = (number - (1 << k)) | ((distance - 1) << k);
            writer.put(1 | 1 << (1 + k) | (rest as u64) << (2 + k), 2 + 2 * k + WINDOW.ilog2() as usize);
            tokens.matches += 1;
            absorb(&mut tokens.h, length as u64 | (distance as u64) << 16);
            for covered in i + 1..i + length {
                chains.insert(text, covered);
            }
            i += length;
        } else {
            writer.put(u64::from(text[i]) << 1, 9);
            tokens.literals += 1;
            absorb(&mut tokens.h, u64::from(text[i]));
            i += 1;
        }
    }
    tokens.bits = writer.finish();
    tokens
}

#[inline(always)]
fn body<C: Compare>(text: &[u8], room: &mut Room, out: &mut [u64]) {
    let tokens = compress::<C>(text, room);
    expand(&room.stream, &mut room.back);
    let (head, sums) = out.split_at_mut(4);
    head.copy_from_slice(&[tokens.bits as u64, tokens.literals, tokens.matches, tokens.h]);
    let (stream, back) = sums.split_at_mut(SUMS);
    let words = tokens.bits.div_ceil(64).min(STREAM);
    stream.copy_from_slice(&digest(room.stream[..words].iter().copied()));
    back.copy_from_slice(&digest(room.back[..LENGTH].as_chunks().0.iter().map(|bytes| u64::from_le_bytes(*bytes))));
}

#[inline(never)]
fn portable(text: &[u8], room: &mut Room, out: &mut [u64]) {
    body::<ByWords>(text, room, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi1,bmi2,lzcnt")]
fn avx2(text: &[u8], room: &mut Room, out: &mut [u64]) {
    body::<super::common_match::ByVectors>(text, room, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(text: &[u8], room: &mut Room, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when its features are present
    unsafe { avx2(text, room, out) }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What is read back is what was written, for texts of every degree of repetition, and long runs are one match after
    /// another of the greatest length at distance 1.
    #[test]
    fn there_and_back_and_long_runs() {
        let mut room = Room::new();
        for letters in [1u64, 2, 3, 5, 17, 256] {
            let mut state = letters;
            let mut text = vec![0; LENGTH + MARGIN];
            for byte in &mut text[..LENGTH] {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                *byte = ((state >> 33) % letters) as u8;
            }
            let tokens = compress::<ByWords>(&text, &mut room);
            expand(&room.stream, &mut room.back);
            assert_eq!(room.back[..LENGTH], text[..LENGTH], "{letters} letters");
            if letters == 1 {
                // 8191 = 31 · 259 + 162
                assert_eq!((tokens.literals, tokens.matches), (1, 32));
            }
            #[cfg(target_arch = "x86_64")]
            if crate::isa::Feature::Avx2.present() {
                let vectors = compress::<super::super::common_match::ByVectors>(&text, &mut room);
                assert_eq!((vectors.bits, vectors.h), (tokens.bits, tokens.h));
            }
        }
    }
}
