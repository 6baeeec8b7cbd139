//! `cache.forward`: loads right behind stores that they overlap in whole, in part or not at all, at every byte distance.
//!
//! There are 36 pairs of a store of w and a load of v bytes (1, 2, 4, 8, 16, 32). In pair (w, v) the load begins δ bytes from the store,
//! δ = −v … w: just before it, over each of its bytes, just behind it; 792 steps (n = 0…791, w by w, v by v, δ by δ). A run makes
//! four passes (r = 0…3) over them; the pass chooses the instructions, so that a value stored from a vector register comes back
//! into a general one and the other way round. With the seed's z and h = ⌊seed / 64⌋, step n of pass r
//! - stores w bytes of the words T from index (5 · n + 17 · r) mod 61 on at A = B + (z + 16 · r + 11 · n) mod 64, B the 64 bytes before a
//!   border: in the midst of a page where n + r + h is even, at a page's end where it is odd;
//! - loads v bytes from A + δ at once;
//! - stores w bytes of T from (7 · n + 23 · r) mod 61 on at A and then u = 2^((n + r) mod 6) bytes of T from
//!   (11 · n + 29 · r) mod 61 on so that they overlap the coming load, at A + δ − u + 1 + (z + 3 · n + 5 · r) mod (v + u − 1);
//! - loads v bytes from A + δ at once, now made up of both stores and of what was there before.
//!
//! So in 16 seeds in a row each step meets all alignments, in 128 on both borders. A load that is given stale, foreign or shifted
//! bytes shows in its digest: d ← d · M + x for every word of the load mod 2⁶⁴, M odd, for each pair one digest of the loads after
//! one store and one of those after two, over all passes; one wrong word always shows.
//!
//! What is in memory around both borders at first are T_0…T_31, twice.
//!
//! Operands, in stream order: T_0…T_63. Digests start at 0; M = 0xd1342543de82ef95. Output: for each pair the digest after one store
//! and that after two.

use std::hint::black_box;

use super::common_touch::Touch;
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const PAIRS: usize = 36;
const STEPS: usize = 792;
const PASSES: usize = 4;
const WORDS: usize = 64;
const PAGE: usize = 4096;
/// Bytes on each side of a border that some step may touch.
const SIDE: usize = 128;
/// Multiplier of the digests: ≡ 5 mod 8, so that its powers have the longest period.
const M: u64 = 0xd134_2543_de82_ef95;
/// Pages from which the two borders are taken.
const KIB: u32 = 12;

/// See the file's head.
pub struct Forward;

impl Kernel for Forward {
    fn id(&self) -> &'static str {
        "cache.forward"
    }

    fn summary(&self) -> &'static str {
        "store queue: loads of every width at every distance right behind one store or two"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(KIB)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * PAIRS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * STEPS * PASSES) as u64, unit: "load" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &[
                        "movzb", "movsb", "movzw", "movsw", "movslq", "movd", "movss", "movq", "movsd", "movlps",
                        "movhps", "movdqu", "movups", "movupd",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &[
                        "movzb",
                        "movsb",
                        "movzw",
                        "movsw",
                        "movslq",
                        "vmovd",
                        "vmovss",
                        "vmovq",
                        "vmovsd",
                        "vmovlps",
                        "vmovhps",
                        "vmovdqu",
                        "vmovups",
                        "vmovupd",
                        "vlddqu",
                        "vextracti128",
                    ],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["strb", "strh", "str", "stp", "ldrb", "ldrsb", "ldrh", "ldrsh", "ldrsw", "ldp"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["strb", "strh", "str", "stp", "ldrsb", "ldr", "ldp"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let words = std::array::from_fn(|_| operands.word());
        operands.finish(WORDS);
        let run = runner(proof.variant_for(self.id()));
        Roles::One(Box::new(Queue { lines: aligned::lines(KIB), words, seed: case.seed.0, run }))
    }
}

type Runner = fn(&mut [u8], &[u64; WORDS], u64, &mut [[u64; 2]; PAIRS]);

struct Queue {
    lines: Vec<Line>,
    words: [u64; WORDS],
    seed: u64,
    run: Runner,
}

impl Ready for Queue {
    fn run(&mut self, out: &mut [u64]) {
        let bytes = aligned::bytes_mut(&mut self.lines);
        let first = bytes.as_ptr().align_offset(PAGE);
        let out = out.as_chunks_mut::<2>().0.first_chunk_mut().expect("two words for each pair");
        (self.run)(&mut bytes[first..][..2 * PAGE], &self.words, self.seed, out);
    }
}

/// Widths of stores and loads, as powers of two.
const WIDTHS: usize = 6;

/// One arm for each width and form: a jump whose target stays the same for many steps in a row.
macro_rules! dispatch {
    ($power:expr, $form:expr, $do:ident) => {
        match 4 * $power + $form {
            0 => $do!(1, 0),
            1 => $do!(1, 1),
            2 => $do!(1, 2),
            3 => $do!(1, 3),
            4 => $do!(2, 0),
            5 => $do!(2, 1),
            6 => $do!(2, 2),
            7 => $do!(2, 3),
            8 => $do!(4, 0),
            9 => $do!(4, 1),
            10 => $do!(4, 2),
            11 => $do!(4, 3),
            12 => $do!(8, 0),
            13 => $do!(8, 1),
            14 => $do!(8, 2),
            15 => $do!(8, 3),
            16 => $do!(16, 0),
            17 => $do!(16, 1),
            18 => $do!(16, 2),
            19 => $do!(16, 3),
            20 => $do!(32, 0),
            21 => $do!(32, 1),
            22 => $do!(32, 2),
            _ => $do!(32, 3),
        }
    };
}

/// Stores 2^`power` bytes of `words`.
///
/// # Safety
/// `to` must be writable for that many bytes.
#[inline(always)]
unsafe fn store<T: Touch>(touch: T, power: usize, form: usize, words: &[u64; 4], to: *mut u8) {
    macro_rules! arm {
        ($bytes:literal, $form:literal) => {
            // SAFETY: the caller gives the bytes
            unsafe { touch.store::<$bytes, $form>(words, to) }
        };
    }
    dispatch!(power, form, arm);
}

/// Loads 2^`power` bytes and takes their words into the digest.
///
/// # Safety
/// `from` must be readable for that many bytes.
#[inline(always)]
unsafe fn load<T: Touch>(touch: T, power: usize, form: usize, from: *const u8, digest: u64) -> u64 {
    macro_rules! arm {
        ($bytes:literal, $form:literal) => {{
            // SAFETY: the caller gives the bytes
            let words = unsafe { touch.load::<$bytes, $form>(from) };
            words[..usize::div_ceil($bytes, 8)].iter().fold(digest, |d, word| d.wrapping_mul(M).wrapping_add(*word))
        }};
    }
    dispatch!(power, form, arm)
}

#[inline(always)]
fn forward<T: Touch>(touch: T, bytes: &mut [u8], words: &[u64; WORDS], seed: u64, out: &mut [[u64; 2]; PAIRS]) {
    for border in [PAGE / 2, PAGE] {
        let around = bytes[border - SIDE..border + SIDE].as_chunks_mut::<8>().0;
        around.iter_mut().zip(words).for_each(|(to, word)| *to = word.to_le_bytes());
    }
    *out = [[0; 2]; PAIRS];
    let base = black_box(bytes).as_mut_ptr();
    let borders = [base.wrapping_add(PAGE / 2 - SIDE), base.wrapping_add(PAGE - SIDE)];
    let (z, h) = ((seed % 64) as usize, (seed / 64 % 2) as usize);
    let take = |index: usize| words[index % 61..].first_chunk::<4>().expect("64 words reach beyond index 60");
    for pass in 0..PASSES {
        let mut n = 0;
        for (pair, digests) in out.iter_mut().enumerate() {
            let (w, v) = (pair / WIDTHS, pair % WIDTHS);
            for distance in 0..=(1 << w) + (1 << v) {
                // all offsets begin SIDE bytes before the border, so that none is negative
                let border = borders[(n + pass + h) % 2];
                let at = SIDE - 64 + (z + 16 * pass + 11 * n) % 64;
                let from = at + distance - (1 << v);
                let u = (n + pass) % WIDTHS;
                // divided in 32 bits, which is faster
                let over =
                    from + 1 - (1 << u) + ((z + 3 * n + 5 * pass) as u32 % ((1u32 << v) + (1 << u) - 1)) as usize;
                let values = [take(5 * n + 17 * pass), take(7 * n + 23 * pass)];
                for (second, digest) in digests.iter_mut().enumerate() {
                    // SAFETY: at is 64…127, from at least at − 32 and at most at + 32, over within 31 bytes of the load: everything
                    // is within SIDE bytes of the border on both sides
                    unsafe {
                        store(touch, w, pass, values[second], border.add(at));
                        if second == 1 {
                            store(touch, u, pass, take(11 * n + 29 * pass), border.add(over));
                        }
                        *digest = load(touch, v, pass, border.add(from), *digest);
                    }
                }
                n += 1;
            }
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable(bytes: &mut [u8], words: &[u64; WORDS], seed: u64, out: &mut [[u64; 2]; PAIRS]) {
    forward(super::common_touch_x86::Sse2, bytes, words, seed, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn portable(bytes: &mut [u8], words: &[u64; WORDS], seed: u64, out: &mut [[u64; 2]; PAIRS]) {
    forward(super::common_touch_arm::General, bytes, words, seed, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(bytes: &mut [u8], words: &[u64; WORDS], seed: u64, out: &mut [[u64; 2]; PAIRS]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    forward(unsafe { super::common_touch_x86::Avx2::new() }, bytes, words, seed, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(bytes: &mut [u8], words: &[u64; WORDS], seed: u64, out: &mut [[u64; 2]; PAIRS]) {
    forward(super::common_touch_arm::Neon, bytes, words, seed, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |bytes, words, seed, out| unsafe { avx2(bytes, words, seed, out) },
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => neon,
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every width and form, stored and loaded at every offset of a line, against slices of bytes.
    fn holds<T: Touch>(t: T) {
        fn one<T: Touch, const BYTES: usize, const FORM: usize>(t: T) {
            let words = [0x8081_8283_8485_8687, 0x9091_9293_9495_9697, 0xa0a1_a2a3_a4a5_a6a7, 0xb0b1_b2b3_b4b5_b6b7];
            let text: Vec<u8> = words.iter().flat_map(|w: &u64| w.to_le_bytes()).collect();
            for at in 0..64 {
                let (mut bytes, mut right) = ([0x11u8; 128], [0x11u8; 128]);
                right[at..at + BYTES].copy_from_slice(&text[..BYTES]);
                // SAFETY: at + 32 bytes are within the array
                let loaded = unsafe {
                    t.store::<BYTES, FORM>(&words, bytes.as_mut_ptr().add(at));
                    t.load::<BYTES, FORM>(bytes.as_ptr().add(at))
                };
                assert!(bytes == right, "store of {BYTES} form {FORM} at {at}");
                let mut expected = text[..BYTES].to_vec();
                expected.resize(32, 0);
                let loaded: Vec<u8> = loaded.iter().flat_map(|w| w.to_le_bytes()).collect();
                assert_eq!(loaded, expected, "load of {BYTES} form {FORM} at {at}");
            }
        }
        macro_rules! forms {
            ($($bytes:literal)*) => {$(
                one::<T, $bytes, 0>(t);
                one::<T, $bytes, 1>(t);
                one::<T, $bytes, 2>(t);
                one::<T, $bytes, 3>(t);
            )*};
        }
        forms!(1 2 4 8 16 32);
    }

    #[cfg(target_arch = "x86_64")]
    #[test]
    fn stores_and_loads_are_what_they_say() {
        holds(super::super::common_touch_x86::Sse2);
        if is_x86_feature_detected!("avx2") {
            // SAFETY: avx2 was just detected
            holds(unsafe { super::super::common_touch_x86::Avx2::new() });
        }
    }

    #[cfg(target_arch = "aarch64")]
    #[test]
    fn stores_and_loads_are_what_they_say() {
        holds(super::super::common_touch_arm::General);
        holds(super::super::common_touch_arm::Neon);
    }

    #[test]
    fn pairs_and_distances_make_the_stated_steps() {
        let widths = [1, 2, 4, 8, 16, 32];
        let steps: usize = widths.iter().flat_map(|w| widths.map(|v| w + v + 1)).sum();
        assert_eq!(steps, STEPS);
    }
}
