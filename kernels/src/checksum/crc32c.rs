//! `checksum.crc32c`: CRC-32C (Castagnoli; RFC 3720 §12.1) by the CRC instruction in all its operand widths.
//!
//! Four chains, each the CRC of 64 messages one after another, as if they were one. The messages lie at any byte offset of
//! one buffer and may overlap. The four messages of a group have one length, so that the chains can go in step and hide the
//! instruction's latency; all that is left over after whole words of eight bytes is taken in pieces of 1, 2 and 4 bytes. In
//! groups of odd number these come first, so that the wide pieces are unaligned in another way.
//!
//! A step of a CRC is a bijection of the state for fixed data: a wrong state stays wrong whatever follows, and two errors
//! meet only where the polynomial's powers say so.
//!
//! Operands, in stream order: 2,048 words, the buffer's 16,384 bytes in memory order; then, for each of 32 pairs of groups,
//! three words: v, whose low 10 bits are the length of the messages of the pair's first group (the second group has 1,023
//! less that), and one word for each group whose 14-bit field j, from the lowest bit, mod 15,361 is the offset of chain j's
//! message. Output: after every fourth group two words, the CRCs of chains 0 and 1, and of 2 and 3, the lower number in the
//! low half.

use super::common_steps::{Instruction, Slices, Steps};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const WORDS: usize = 2048;
const CHAINS: usize = 4;
const PAIRS: usize = 32;
/// Length of the messages of both groups of a pair together.
const LENGTHS: usize = 1023;
const OFFSETS: usize = 8 * WORDS - LENGTHS;
/// Groups between two places where the CRCs are put out.
const STRIDE: usize = 4;

/// See the file's head.
pub struct Crc32c;

impl Kernel for Crc32c {
    fn id(&self) -> &'static str {
        "checksum.crc32c"
    }

    fn summary(&self) -> &'static str {
        "CRC instruction: CRC-32C of messages of every length and alignment, in pieces of 1 to 8 bytes"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(17)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * PAIRS / STRIDE * (CHAINS / 2)
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (PAIRS * LENGTHS * CHAINS) as u64, unit: "byte" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["xor", "shr"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Sse42],
                    marks: &["crc32b", "crc32w", "crc32l", "crc32q"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["eor"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::ArmCrc],
                    marks: &["crc32cb", "crc32ch", "crc32cw", "crc32cx"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let data = operands.words(WORDS).into_iter().flat_map(u64::to_le_bytes).collect();
        let mut groups = Vec::with_capacity(2 * PAIRS);
        for _ in 0..PAIRS {
            let length = operands.word() as usize & 1023;
            for length in [length, LENGTHS - length] {
                let fields = operands.word();
                let at = std::array::from_fn(|j| (fields >> (14 * j) & 16383) as usize % OFFSETS);
                groups.push(Group { length, at });
            }
        }
        operands.finish(WORDS + 3 * PAIRS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => run_neon,
            _ => portable,
        };
        Roles::One(Box::new(Messages { data, groups, run }))
    }
}

/// Four messages of one length.
struct Group {
    length: usize,
    at: [usize; CHAINS],
}

struct Messages {
    data: Vec<u8>,
    groups: Vec<Group>,
    run: fn(&[u8], &[Group], &mut [u64]),
}

impl Ready for Messages {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.data, &self.groups, out);
    }
}

type Parts<'a> = [&'a [u8]; CHAINS];

/// Takes in all of the four parts, which have one length, a multiple of eight.
#[inline(always)]
fn longs(steps: impl Steps, state: &mut [u32; CHAINS], parts: Parts) {
    let [a, b, c, d] = parts.map(|part| part.as_chunks::<8>().0);
    for (((a, b), c), d) in a.iter().zip(b).zip(c).zip(d) {
        state[0] = steps.long(state[0], u64::from_le_bytes(*a));
        state[1] = steps.long(state[1], u64::from_le_bytes(*b));
        state[2] = steps.long(state[2], u64::from_le_bytes(*c));
        state[3] = steps.long(state[3], u64::from_le_bytes(*d));
    }
}

/// Takes in less than eight bytes of each part: one, two, four.
#[inline(always)]
fn rests(steps: impl Steps, state: &mut [u32; CHAINS], parts: Parts) {
    let length = parts[0].len();
    for (state, mut part) in state.iter_mut().zip(parts) {
        if length & 1 != 0 {
            let Some((byte, rest)) = part.split_first() else { return };
            *state = steps.byte(*state, *byte);
            part = rest;
        }
        if length & 2 != 0 {
            let Some((half, rest)) = part.split_first_chunk() else { return };
            *state = steps.half(*state, u16::from_le_bytes(*half));
            part = rest;
        }
        if length & 4 != 0 {
            let Some((word, _)) = part.split_first_chunk() else { return };
            *state = steps.word(*state, u32::from_le_bytes(*word));
        }
    }
}

#[inline(always)]
fn body(steps: impl Steps, data: &[u8], groups: &[Group], out: &mut [u64]) {
    let mut state = [u32::MAX; CHAINS];
    for (groups, out) in groups.as_chunks::<STRIDE>().0.iter().zip(out.as_chunks_mut::<2>().0) {
        for (number, group) in groups.iter().enumerate() {
            let parts = group.at.map(|at| &data[at..at + group.length]);
            if number % 2 == 0 {
                let cut = parts.map(|part| part.split_at(group.length & !7));
                longs(steps, &mut state, cut.map(|(longs, _)| longs));
                rests(steps, &mut state, cut.map(|(_, rest)| rest));
            } else {
                let cut = parts.map(|part| part.split_at(group.length & 7));
                rests(steps, &mut state, cut.map(|(rest, _)| rest));
                longs(steps, &mut state, cut.map(|(_, longs)| longs));
            }
        }
        let crc = state.map(|state| u64::from(!state));
        *out = [crc[0] | crc[1] << 32, crc[2] | crc[3] << 32];
    }
}

#[inline(never)]
fn portable(data: &[u8], groups: &[Group], out: &mut [u64]) {
    body(Slices, data, groups, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "sse4.2")]
fn avx2(data: &[u8], groups: &[Group], out: &mut [u64]) {
    // SAFETY: a function of sse4.2
    body(unsafe { Instruction::new() }, data, groups, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(data: &[u8], groups: &[Group], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when sse4.2 is present
    unsafe { avx2(data, groups, out) }
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "crc")]
fn neon(data: &[u8], groups: &[Group], out: &mut [u64]) {
    // SAFETY: a function of crc
    body(unsafe { Instruction::new() }, data, groups, out);
}

#[cfg(target_arch = "aarch64")]
fn run_neon(data: &[u8], groups: &[Group], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Neon`, which `isa` makes only when crc is present
    unsafe { neon(data, groups, out) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn crc(steps: impl Steps, message: &[u8]) -> u32 {
        let mut state = [u32::MAX; CHAINS];
        let (longs_part, rest) = message.split_at(message.len() & !7);
        longs(steps, &mut state, [longs_part; CHAINS]);
        rests(steps, &mut state, [rest; CHAINS]);
        assert_eq!(state, [state[0]; CHAINS]);
        !state[0]
    }

    fn holds(steps: impl Steps) {
        // RFC 3720 appendix B.4, whose byte strings are the CRC's bytes from the lowest
        let sent = |bytes: [u8; 4]| u32::from_le_bytes(bytes);
        assert_eq!(crc(steps, &[0; 32]), sent([0xaa, 0x36, 0x91, 0x8a]));
        assert_eq!(crc(steps, &[0xff; 32]), sent([0x43, 0xab, 0xa8, 0x62]));
        let mut up: [u8; 32] = std::array::from_fn(|i| i as u8);
        assert_eq!(crc(steps, &up), sent([0x4e, 0x79, 0xdd, 0x46]));
        up.reverse();
        assert_eq!(crc(steps, &up), sent([0x5c, 0xdb, 0x3f, 0x11]));
        // an iSCSI SCSI Read (10) command PDU
        let mut pdu = [0; 48];
        for (at, byte) in [(0, 0x01), (1, 0xc0), (16, 0x14), (22, 0x04), (27, 0x14), (31, 0x18), (32, 0x28), (40, 0x02)]
        {
            pdu[at] = byte;
        }
        assert_eq!(crc(steps, &pdu), sent([0x56, 0x3a, 0x96, 0xd9]));
        // the check value of the CRC catalogues
        assert_eq!(crc(steps, b"123456789"), 0xe306_9283);
        // the same in other pieces: 7 bytes are 1 + 2 + 4, 3 are 1 + 2
        let mut state = [u32::MAX; CHAINS];
        for piece in [&b"123"[..], b"456", b"789"] {
            rests(steps, &mut state, [piece; CHAINS]);
        }
        assert_eq!(!state[0], 0xe306_9283);
        let mut state = [u32::MAX; CHAINS];
        for piece in [&b"1234567"[..], b"89"] {
            rests(steps, &mut state, [piece; CHAINS]);
        }
        assert_eq!(!state[0], 0xe306_9283);
    }

    #[test]
    fn tables_give_the_published_values() {
        holds(Slices);
    }

    #[test]
    fn the_instruction_gives_the_published_values() {
        #[cfg(target_arch = "x86_64")]
        let present = crate::isa::Feature::Sse42.present();
        #[cfg(target_arch = "aarch64")]
        let present = crate::isa::Feature::ArmCrc.present();
        if present {
            // SAFETY: the feature is present
            holds(unsafe { Instruction::new() });
        }
    }
}
