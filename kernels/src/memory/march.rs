//! `memory.march`: March C− over a footprint that lives in the first, second or third cache level.
//!
//! ⇕(w0); ⇑(r0,w1); ⇑(r1,w0); ⇓(r0,w1); ⇓(r1,w0); ⇕(r0) (M. Marinescu, "Simple and efficient algorithms for functional RAM
//! testing", 1982, made irredundant by A. J. van de Goor, "Using march tests to test SRAMs", 1993): it finds all stuck-at,
//! transition, address-decoder and unlinked coupling faults. The cell is a line of 64 bytes; ⇕ goes upwards. "0" is a
//! background, "1" its complement: lane l of line i holds S_l + i · D mod 2⁶⁴, and for "1" the inverted bits of that.
//!
//! Three backgrounds, one after the other: a pattern of the seed, equal in every line (D = 0); the word's own byte offset,
//! in both halves of the word (S_l = 8l · (2³² + 1), D = 64 · (2³² + 1)); a progression of the seed (S and D from it).
//! The words to write are made from the address, never from what was read.
//!
//! Every read goes into the digest of `common_digest`, which starts at P_l + h + 2 · r + 10 · g for half h of the footprint
//! (0 the lower), the r-th reading element (0…4) and background g.
//!
//! Operands, in stream order: P_0…P_7, S of the first background, S of the third, D of the third (lowest bit set).
//! Output: for each background, reading element and half, eight words, one a lane.

use std::hint::black_box;

use super::common_digest::Digest;
use super::common_lanes::{Lanes, Words};
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

/// One march element over all cells.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Element {
    /// Whether the cells are visited from the last to the first.
    pub down: bool,
    /// Value that is read first, if one is.
    pub read: Option<Value>,
    /// Value that is then written, if one is.
    pub write: Option<Value>,
}

/// What a cell holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Value {
    /// The background.
    Zero,
    /// Its complement.
    One,
}

use Value::{One, Zero};

/// March C−.
pub const ELEMENTS: [Element; 6] = [
    Element { down: false, read: None, write: Some(Zero) },
    Element { down: false, read: Some(Zero), write: Some(One) },
    Element { down: false, read: Some(One), write: Some(Zero) },
    Element { down: true, read: Some(Zero), write: Some(One) },
    Element { down: true, read: Some(One), write: Some(Zero) },
    Element { down: false, read: Some(Zero), write: None },
];
const READS: usize = 5;
const HALVES: usize = 2;
const BACKGROUNDS: usize = 3;

/// See the file's head.
pub struct March;

impl Kernel for March {
    fn id(&self) -> &'static str {
        "memory.march"
    }

    fn summary(&self) -> &'static str {
        "cells and decoders of caches and memory: March C- with three backgrounds"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(1024), Size(32), Size(4096)]
    }

    fn output_words(&self, _size: Size) -> usize {
        BACKGROUNDS * READS * HALVES * 8
    }

    fn work(&self, size: Size) -> Work {
        let passes: usize =
            ELEMENTS.iter().map(|e| usize::from(e.read.is_some()) + usize::from(e.write.is_some())).sum();
        // bytes read and written
        Work { amount: u64::from(size.0) * 1024 * (passes * BACKGROUNDS) as u64, unit: "byte" }
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
                    marks: &["vmovdq", "vpaddq", "vpsrlq"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &["vmovdq", "vpaddq", "vpsrlq"],
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
        assert!(self.sizes().contains(&case.size), "size is not one of the kernel's");
        let mut operands = Operands::new(case);
        let mut eight = || std::array::from_fn(|_| operands.word());
        let (starts, pattern, seeded) = (eight(), eight(), eight());
        let step = operands.word() | 1;
        operands.finish(8 + 8 + 8 + 1);
        const BOTH: u64 = (1 << 32) + 1;
        let backgrounds = [
            Background { start: pattern, step: 0 },
            Background { start: std::array::from_fn(|l| 8 * l as u64 * BOTH), step: 64 * BOTH },
            Background { start: seeded, step },
        ];
        let run = runner(proof.variant_for(self.id()));
        Roles::One(Box::new(Cells { lines: aligned::lines(case.size.0), starts, backgrounds, run }))
    }
}

/// Lane l of line i holds start[l] + i · step.
#[derive(Clone, Copy, Debug)]
struct Background {
    start: [u64; 8],
    step: u64,
}

type Runner = fn(&mut [Line], &[u64; 8], &[Background; BACKGROUNDS], &mut [[u64; 8]]);

struct Cells {
    lines: Vec<Line>,
    starts: [u64; 8],
    backgrounds: [Background; BACKGROUNDS],
    run: Runner,
}

impl Ready for Cells {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&mut self.lines, &self.starts, &self.backgrounds, out.as_chunks_mut::<8>().0);
    }
}

/// Visits `lines` in the order given; `value` is what the first one is to be given, `step` the change from each to the next.
#[inline(always)]
fn visit<'a, L: Lanes, const READ: bool, const WRITE: bool>(
    l: L,
    lines: impl Iterator<Item = &'a mut Line>,
    (mut value, step): (L::V, L::V),
    mut digest: Digest<L>,
) -> [u64; 8] {
    for line in lines {
        if READ {
            digest.push(l.read(line));
        }
        if WRITE {
            l.write(value, line);
            value = l.add(value, step);
        }
    }
    digest.finish()
}

/// One element over one half, whose first line has the index `first`.
#[inline(always)]
fn element<L: Lanes>(
    l: L,
    e: Element,
    half: &mut [Line],
    first: usize,
    ground: &Background,
    start: [u64; 8],
) -> [u64; 8] {
    // no store may be left out and no load answered from what the compiler knows was stored
    let half = black_box(half);
    let from = if e.down { first + half.len() - 1 } else { first } as u64;
    let (mut value, mut step) = (ground.start.map(|s| s.wrapping_add(from.wrapping_mul(ground.step))), ground.step);
    if e.down {
        step = step.wrapping_neg();
    }
    if e.write == Some(One) {
        // !(s + i·d) = !s − i·d
        (value, step) = (value.map(|s| !s), step.wrapping_neg());
    }
    let (value, digest) = ((l.of(value), l.of([step; 8])), Digest::new(l, start));
    match (e.read.is_some(), e.write.is_some(), e.down) {
        (true, true, false) => visit::<L, true, true>(l, half.iter_mut(), value, digest),
        (true, true, true) => visit::<L, true, true>(l, half.iter_mut().rev(), value, digest),
        (true, false, false) => visit::<L, true, false>(l, half.iter_mut(), value, digest),
        (true, false, true) => visit::<L, true, false>(l, half.iter_mut().rev(), value, digest),
        (false, _, false) => visit::<L, false, true>(l, half.iter_mut(), value, digest),
        (false, _, true) => visit::<L, false, true>(l, half.iter_mut().rev(), value, digest),
    }
}

#[inline(always)]
fn march<L: Lanes>(
    l: L,
    lines: &mut [Line],
    starts: &[u64; 8],
    grounds: &[Background; BACKGROUNDS],
    out: &mut [[u64; 8]],
) {
    let middle = lines.len() / 2;
    for (g, (ground, out)) in grounds.iter().zip(out.chunks_exact_mut(READS * HALVES)).enumerate() {
        let mut reads = 0;
        for e in ELEMENTS {
            let (low, high) = lines.split_at_mut(middle);
            let mut halves = [(0, low, 0), (1, high, middle)];
            if e.down {
                halves.reverse();
            }
            for (h, half, first) in halves {
                let slot = HALVES * reads + h;
                let start = starts.map(|p| p.wrapping_add((slot + HALVES * READS * g) as u64));
                let words = element(l, e, half, first, ground, start);
                if e.read.is_some() {
                    out[slot] = words;
                }
            }
            reads += usize::from(e.read.is_some());
        }
    }
}

#[inline(never)]
fn portable(lines: &mut [Line], starts: &[u64; 8], grounds: &[Background; BACKGROUNDS], out: &mut [[u64; 8]]) {
    march(Words, lines, starts, grounds, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(lines: &mut [Line], starts: &[u64; 8], grounds: &[Background; BACKGROUNDS], out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    march(unsafe { super::common_lanes_x86::Avx2::new() }, lines, starts, grounds, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(lines: &mut [Line], starts: &[u64; 8], grounds: &[Background; BACKGROUNDS], out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx512f
    march(unsafe { super::common_lanes_x86::Avx512::new() }, lines, starts, grounds, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(lines: &mut [Line], starts: &[u64; 8], grounds: &[Background; BACKGROUNDS], out: &mut [[u64; 8]]) {
    march(super::common_lanes_arm::Neon, lines, starts, grounds, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |lines, starts, grounds, out| unsafe { avx2(lines, starts, grounds, out) },
        // SAFETY: as above
        #[cfg(target_arch = "x86_64")]
        Variant::Avx512 => |lines, starts, grounds, out| unsafe { avx512(lines, starts, grounds, out) },
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => neon,
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A. J. van de Goor, "Using march tests to test SRAMs", IEEE Design & Test 10(1), 1993, March C− (from memory).
    #[test]
    fn elements_are_the_published_ones() {
        let one = |e: &Element| {
            let value = |name: &str, v: Option<Value>| v.map(|v| format!("{name}{}", usize::from(v == One)));
            let operations: Vec<String> = [value("r", e.read), value("w", e.write)].into_iter().flatten().collect();
            // an element without both operations may run either way
            let order = if operations.len() < 2 {
                '⇕'
            } else if e.down {
                '⇓'
            } else {
                '⇑'
            };
            format!("{order}({})", operations.join(","))
        };
        let text: Vec<String> = ELEMENTS.iter().map(one).collect();
        assert_eq!(text.join(";"), "⇕(w0);⇑(r0,w1);⇑(r1,w0);⇓(r0,w1);⇓(r1,w0);⇕(r0)");
    }

    const CELLS: usize = 6;

    /// Whether some read of the elements gives another value than the one that it names, in cells that `write` alters.
    fn detects(initial: [bool; CELLS], write: impl Fn(&mut [bool; CELLS], usize, bool)) -> bool {
        let mut cells = initial;
        ELEMENTS.iter().any(|e| {
            let mut order: Vec<usize> = (0..CELLS).collect();
            if e.down {
                order.reverse();
            }
            order.into_iter().any(|i| {
                let wrong = e.read.is_some_and(|v| cells[i] != (v == One));
                if let Some(v) = e.write {
                    write(&mut cells, i, v == One);
                }
                wrong
            })
        })
    }

    /// What the test is published to find: stuck-at, transition, and inversion, idempotent and state coupling faults, whatever
    /// the cells held before.
    #[test]
    fn every_fault_of_the_published_classes_is_detected() {
        for initial in (0..1 << CELLS).map(|bits: usize| std::array::from_fn(|i| bits >> i & 1 == 1)) {
            assert!(!detects(initial, |cells, i, v| cells[i] = v), "a sound memory passes");
            for victim in 0..CELLS {
                for value in [false, true] {
                    let mut stuck = initial;
                    stuck[victim] = value;
                    assert!(detects(stuck, |cells, i, v| cells[i] = if i == victim { value } else { v }), "stuck at");
                    let transition = |cells: &mut [bool; CELLS], i: usize, v: bool| {
                        cells[i] = if i == victim && v == value && cells[i] != value { cells[i] } else { v };
                    };
                    assert!(detects(initial, transition), "no transition to {value} in {victim}");
                    for aggressor in (0..CELLS).filter(|a| *a != victim) {
                        for (name, effect) in
                            [("inversion", None), ("idempotent", Some(false)), ("idempotent", Some(true))]
                        {
                            let coupled = |cells: &mut [bool; CELLS], i: usize, v: bool| {
                                let moved = i == aggressor && cells[i] != v && v == value;
                                cells[i] = v;
                                if moved {
                                    cells[victim] = effect.unwrap_or(!cells[victim]);
                                }
                            };
                            assert!(detects(initial, coupled), "{name} {aggressor} to {victim}");
                        }
                        for forced in [false, true] {
                            let state = |cells: &mut [bool; CELLS], i: usize, v: bool| {
                                cells[i] = v;
                                if cells[aggressor] == value {
                                    cells[victim] = forced;
                                }
                            };
                            assert!(detects(initial, state), "state {aggressor} to {victim}");
                        }
                    }
                }
            }
        }
    }

    #[test]
    fn a_wrong_line_shows_in_its_half_and_lane_alone() {
        let ground = Background { start: [11, 22, 33, 44, 55, 66, 77, 88], step: 0x9e37_79b9_7f4a_7c15 };
        let [first, last] = [ELEMENTS[0], ELEMENTS[5]];
        let mut lines = aligned::lines(1);
        element(Words, first, &mut lines, 0, &ground, [0; 8]);
        let right = element(Words, last, &mut lines, 0, &ground, [0; 8]);
        lines[9].0[5] ^= 1 << 40;
        let wrong = element(Words, last, &mut lines, 0, &ground, [0; 8]);
        let differing: Vec<usize> = (0..8).filter(|l| right[*l] != wrong[*l]).collect();
        assert_eq!(differing, [5]);
    }
}
