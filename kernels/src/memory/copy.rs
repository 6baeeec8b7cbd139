//! `memory.copy`: copies at every byte offset, between buffers and over themselves, of data that tell where they belong.
//!
//! R payloads of 190 lines (12,160 bytes) move through two sides of R slots of 12,288 bytes each. Lane l of line i of payload r
//! holds S_l + (190 · r + i) · D mod 2⁶⁴. A payload's places are a closed path of 128; place t is
//! - for t < 64: side t mod 2, byte offset 27 · t mod 64: copies from side to side, every offset once;
//! - for t = 64 + u: side 1, byte offset u / 2 where u is even and 63 − (u − 1) / 2 where it is odd: moves by 63, −62, 61, … ±1
//!   bytes, over the payload's own bytes, upwards from its end and downwards from its start.
//!
//! A run writes every payload afresh at place (128 · r / R) of the path, then lets each take one hop in turn, so many rounds that
//! all hops of all payloads are as [`SHAPES`] says, then reads every payload once more. A hop moves ten lines, then reads them back
//! where they now are and takes them into a digest: a wrong byte, loaded or stored, shows at once and in every later digest.
//!
//! What a store overwrites are other bytes, as the place visited before on that side has another offset; only where a run enters
//! a side once and last (one hop of 256 at 384 KiB, two of 1,024 at 3,072) are they the last run's equal ones.
//!
//! The hops are cut into 16 equal groups, group 16 is the last reading; the digest of `common_digest` starts at P_l + group and
//! takes the lines in the order in which they are moved (last line first where a move goes up over itself).
//!
//! Operands, in stream order: P_0…P_7, S_0…S_7, D (lowest bit set). Output: for each group eight words, one a lane.

use std::hint::black_box;

use super::common_digest::Digest;
use super::common_lanes::{Lanes, Words};
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

/// Lines of one payload.
const LINES: usize = 190;
/// Lines that are moved before they are read back.
const BLOCK: usize = 10;
const _: () = assert!(LINES.is_multiple_of(BLOCK));
/// Bytes by which a line is called for before it is moved.
const AHEAD: isize = 16 * 64;
/// Bytes of one slot: a payload at any offset below 64, and a line between neighbours.
const SLOT: usize = 12_288;
/// Places of the closed path.
const PATH: usize = 128;
const GROUPS: usize = 16;
/// (KiB, payloads, rounds of one hop each).
pub const SHAPES: [(u32, usize, usize); 3] = [(24, 1, 128), (384, 16, 16), (3072, 128, 8)];

fn shape(size: Size) -> (usize, usize) {
    let found = SHAPES.iter().find(|(kib, ..)| *kib == size.0);
    let (_, payloads, rounds) = found.copied().expect("size is one of the kernel's");
    (payloads, rounds)
}

/// Side and byte offset of place `t`.
fn place(t: usize) -> (usize, usize) {
    match t % PATH {
        t if t < 64 => (t % 2, 27 * t % 64),
        t if t % 2 == 0 => (1, (t - 64) / 2),
        t => (1, 63 - (t - 65) / 2),
    }
}

/// See the file's head.
pub struct Copy;

impl Kernel for Copy {
    fn id(&self) -> &'static str {
        "memory.copy"
    }

    fn summary(&self) -> &'static str {
        "load and store paths: copies at every byte offset, disjoint and overlapping"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(384), Size(24), Size(3072)]
    }

    fn output_words(&self, _size: Size) -> usize {
        (GROUPS + 1) * 8
    }

    fn work(&self, size: Size) -> Work {
        let (payloads, rounds) = shape(size);
        // bytes read and written: once written, once moved and read back a round, once read
        Work { amount: (payloads * LINES * 64 * (1 + 3 * rounds + 1)) as u64, unit: "byte" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["mov", "padd"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["vmovdqu", "vpaddq", "vpsrlq"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vmovdqu", "vpaddq", "vpsrlq"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["ld", "st", "add"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["ld", "st", "add", "ushr"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let (payloads, rounds) = shape(case.size);
        let mut operands = Operands::new(case);
        let mut eight = || std::array::from_fn(|_| operands.word());
        let (starts, first) = (eight(), eight());
        let step = operands.word() | 1;
        operands.finish(8 + 8 + 1);
        let plan = Plan { payloads, rounds, starts, first, step };
        Roles::One(Box::new(Buffers {
            lines: aligned::lines(case.size.0),
            plan,
            run: runner(proof.variant_for(self.id())),
        }))
    }
}

struct Plan {
    payloads: usize,
    rounds: usize,
    starts: [u64; 8],
    first: [u64; 8],
    step: u64,
}

impl Plan {
    /// Byte offset in the buffer of payload `r` after `round` rounds. The number of payloads divides that of places, so the quotient
    /// is exact and the same for every hop.
    #[inline(always)]
    fn at(&self, r: usize, round: usize) -> usize {
        let (side, offset) = place(r * (PATH / self.payloads) + round);
        (side * self.payloads + r) * SLOT + offset
    }
}

type Runner = fn(&mut [Line], &Plan, &mut [[u64; 8]]);

struct Buffers {
    lines: Vec<Line>,
    plan: Plan,
    run: Runner,
}

impl Ready for Buffers {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&mut self.lines, &self.plan, out.as_chunks_mut::<8>().0);
    }
}

/// Moves one payload within `bytes`, block by block, and takes into the digest what each block's target then holds.
#[inline(always)]
fn hop<L: Lanes>(l: L, bytes: &mut [u8], from: usize, to: usize, digest: &mut Digest<L>) {
    const BYTES: usize = LINES * 64;
    assert!(from.max(to) + BYTES <= bytes.len());
    let base = bytes.as_mut_ptr();
    let move_line = |at: usize, ahead: isize| {
        // the digest's work on a block fills the core's queues while a line is awaited, unless it was called for before
        l.prefetch(base.wrapping_add(from + at).wrapping_offset(ahead));
        // SAFETY: `at` ≤ BYTES − 64 and both payloads end within `bytes`, as asserted above
        unsafe { l.store(l.load(base.add(from + at)), base.add(to + at)) };
    };
    // SAFETY: as above
    let moved = |at: usize| unsafe { l.load(base.add(to + at)) };
    // SAFETY: no instruction; the compiler takes it that memory may have changed and loads what was stored again
    let settle = || unsafe { std::arch::asm!("", options(nostack, preserves_flags)) };
    if from < to && to < from + BYTES {
        for block in (0..LINES / BLOCK).rev() {
            for i in (0..BLOCK).rev() {
                move_line(64 * (BLOCK * block + i), -AHEAD);
            }
            settle();
            for i in (0..BLOCK).rev() {
                digest.push(moved(64 * (BLOCK * block + i)));
            }
        }
    } else {
        for block in 0..LINES / BLOCK {
            for i in 0..BLOCK {
                move_line(64 * (BLOCK * block + i), AHEAD);
            }
            settle();
            for i in 0..BLOCK {
                digest.push(moved(64 * (BLOCK * block + i)));
            }
        }
    }
}

#[inline(always)]
fn copy<L: Lanes>(l: L, lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    let bytes = aligned::bytes_mut(lines);
    let (mut value, step) = (l.of(plan.first), l.of([plan.step; 8]));
    for r in 0..plan.payloads {
        let at = plan.at(r, 0);
        for line in bytes[at..at + LINES * 64].as_chunks_mut::<64>().0 {
            // SAFETY: the chunk is 64 writable bytes
            unsafe { l.store(value, line.as_mut_ptr()) };
            value = l.add(value, step);
        }
    }
    let start = |group: usize| Digest::new(l, plan.starts.map(|p| p.wrapping_add(group as u64)));
    let hops = plan.rounds * plan.payloads;
    let (mut r, mut round) = (0, 0);
    for (group, out) in out[..GROUPS].iter_mut().enumerate() {
        let mut digest = start(group);
        for _ in 0..hops / GROUPS {
            hop(l, black_box(&mut *bytes), plan.at(r, round), plan.at(r, round + 1), &mut digest);
            r += 1;
            if r == plan.payloads {
                (r, round) = (0, round + 1);
            }
        }
        *out = digest.finish();
    }
    let mut digest = start(GROUPS);
    let bytes = black_box(bytes);
    for r in 0..plan.payloads {
        let at = plan.at(r, plan.rounds);
        for line in bytes[at..at + LINES * 64].as_chunks::<64>().0 {
            // SAFETY: the chunk is 64 readable bytes
            digest.push(unsafe { l.load(line.as_ptr()) });
        }
    }
    out[GROUPS] = digest.finish();
}

#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    copy(Words, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    copy(unsafe { super::common_lanes_x86::Avx2::new() }, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx512f
    copy(unsafe { super::common_lanes_x86::Avx512::new() }, lines, plan, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    copy(super::common_lanes_arm::Neon, lines, plan, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |lines, plan, out| unsafe { avx2(lines, plan, out) },
        // SAFETY: as above
        #[cfg(target_arch = "x86_64")]
        Variant::Avx512 => |lines, plan, out| unsafe { avx512(lines, plan, out) },
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => neon,
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn path_visits_every_offset_as_source_and_target_and_moves_by_every_distance() {
        let places: Vec<_> = (0..PATH).map(place).collect();
        for offset in 0..64 {
            assert!(places[..64].contains(&(offset % 2, offset)), "offset {offset} between the sides");
            assert!(places[64..].contains(&(1, offset)), "offset {offset} in a move over itself");
        }
        let mut moves: Vec<isize> = places[64..].windows(2).map(|w| w[1].1 as isize - w[0].1 as isize).collect();
        moves.sort_by_key(|d| d.abs());
        let expected: Vec<isize> = (1..64).map(|d| if d % 2 == 1 { d } else { -d }).collect();
        assert_eq!(moves, expected);
        // a place is left stale by the visit before the last on its side: never at the same offset, or old bytes would pass
        for (t, (side, offset)) in places.iter().enumerate() {
            let before = (1..PATH).map(|k| places[(t + PATH - k) % PATH]).find(|p| p.0 == *side);
            assert_ne!(before, Some((*side, *offset)), "place {t}");
        }
    }

    #[test]
    fn a_move_over_itself_keeps_every_byte() {
        for (from, to) in [(64, 65), (65, 64), (0, 63), (63, 0), (7, 7 + 4096), (4103, 7)] {
            let mut lines = aligned::lines(24);
            let bytes = aligned::bytes_mut(&mut lines);
            bytes.iter_mut().enumerate().for_each(|(i, b)| *b = (i * 7 + i / 256) as u8);
            let before = bytes[from..from + LINES * 64].to_vec();
            hop(Words, bytes, from, to, &mut Digest::new(Words, [0; 8]));
            assert!(bytes[to..to + LINES * 64] == before[..], "{from} to {to}");
        }
    }
}
