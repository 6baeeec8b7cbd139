//! `cache.evict`: more dirty lines than ways in the same sets of every cache level, so that each visit writes another line back.
//!
//! The footprint is P pages of 4,096 bytes. On each page q it has G lines, line g at byte 64 · ((C + 9 · g) mod 64), so that all pages
//! compete for the G sets of a first level that is indexed by the bits below the page, and for few sets of the levels above it.
//! Lane l of line (q, g) begins as S_l + (q · G + g) · D mod 2⁶⁴: every word tells where it belongs.
//!
//! A run writes all lines, then makes the rounds of the size. Round r takes the lines g by g, and for each g the pages s apart,
//! then those beside them: q = h · s + w for h = 0 … P / s − 1 within w = 0 … s − 1, s = 1, 16 or 256 pages (4 KiB, 64 KiB, 1 MiB)
//! for r mod 3 = 0, 1, 2, but at most P / 2; odd rounds the whole way backwards. On each line it takes the eight lanes into the digest
//! and, but for the last round, leaves them as v + U_l + r · E. A line that was written back to the wrong place, or from the wrong
//! place, or not at all, is another line's or another round's word.
//!
//! Which physical sets the larger strides meet is the business of the page tables; the run needs no say in it.
//!
//! Each round has the digest of `common_digest` of the memory family, started at R_l + r.
//!
//! Operands, in stream order: R_0…R_7, S_0…S_7, U_0…U_7, C, D, E (the last two with the lowest bit set). Output: for each round eight
//! words, one a lane.

use std::hint::black_box;

use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::memory::common_digest::Digest;
use crate::memory::common_lanes::{Lanes, Words};
use crate::operands::Operands;

const LINES_A_PAGE: usize = 64;
/// Pages between neighbours in the order of visiting, by round.
const STRIDES: [usize; 3] = [1, 16, 256];

/// One size: (KiB, lines on each page, rounds).
pub const SHAPES: [(u32, usize, usize); 3] = [(512, 8, 8), (4096, 4, 4), (32_768, 2, 3)];

fn shape(size: Size) -> (usize, usize, usize) {
    let found = SHAPES.iter().find(|(kib, ..)| *kib == size.0);
    let (kib, groups, rounds) = found.copied().expect("size is one of the kernel's");
    (kib as usize / 4, groups, rounds)
}

/// See the file's head.
pub struct Evict;

impl Kernel for Evict {
    fn id(&self) -> &'static str {
        "cache.evict"
    }

    fn summary(&self) -> &'static str {
        "cache replacement and write-back: more dirty lines than ways in the same sets"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(512), Size(4096), Size(32_768)]
    }

    fn output_words(&self, size: Size) -> usize {
        8 * shape(size).2
    }

    fn work(&self, size: Size) -> Work {
        let (pages, groups, rounds) = shape(size);
        // lines written at first, then read and written, at last read
        Work { amount: (pages * groups * 2 * rounds) as u64, unit: "line" }
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
        let (pages, groups, rounds) = shape(case.size);
        let mut operands = Operands::new(case);
        let mut eight = || std::array::from_fn(|_| operands.word());
        let (starts, first, update) = (eight(), eight(), eight());
        let column = operands.word() as usize % LINES_A_PAGE;
        let (step, round_step) = (operands.word() | 1, operands.word() | 1);
        operands.finish(3 * 8 + 3);
        let plan = Plan { pages, groups, rounds, starts, first, update, column, step, round_step };
        let run = runner(proof.variant_for(self.id()));
        Roles::One(Box::new(Footprint { lines: aligned::lines(case.size.0), plan, run }))
    }
}

struct Plan {
    pages: usize,
    groups: usize,
    rounds: usize,
    starts: [u64; 8],
    first: [u64; 8],
    update: [u64; 8],
    column: usize,
    step: u64,
    round_step: u64,
}

impl Plan {
    /// Line of group `g` within its page.
    #[inline(always)]
    fn line(&self, g: usize) -> usize {
        (self.column + 9 * g) % LINES_A_PAGE
    }
}

type Runner = fn(&mut [Line], &Plan, &mut [[u64; 8]]);

struct Footprint {
    lines: Vec<Line>,
    plan: Plan,
    run: Runner,
}

impl Ready for Footprint {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&mut self.lines, &self.plan, out.as_chunks_mut::<8>().0);
    }
}

/// The n-th of `count`, from the end if `back`.
#[inline(always)]
fn turn(n: usize, count: usize, back: bool) -> usize {
    if back { count - 1 - n } else { n }
}

#[inline(always)]
fn evict<L: Lanes>(l: L, lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    let pages = lines.as_chunks_mut::<LINES_A_PAGE>().0;
    let pages = &mut pages[..plan.pages];
    let (mut value, step) = (l.of(plan.first), l.of([plan.step; 8]));
    for page in pages.iter_mut() {
        for g in 0..plan.groups {
            l.write(value, &mut page[plan.line(g)]);
            value = l.add(value, step);
        }
    }
    for (round, out) in out[..plan.rounds].iter_mut().enumerate() {
        let later = plan.round_step.wrapping_mul(round as u64);
        let update = l.of(plan.update.map(|u| u.wrapping_add(later)));
        let mut digest = Digest::new(l, plan.starts.map(|r| r.wrapping_add(round as u64)));
        let stride = STRIDES[round % 3].min(plan.pages / 2);
        let (back, last) = (round % 2 == 1, round + 1 == plan.rounds);
        // no load may be answered from what the compiler knows was stored
        let pages = black_box(&mut *pages);
        let ways = plan.pages / stride;
        for k in 0..plan.groups {
            let column = plan.line(turn(k, plan.groups, back));
            for w in 0..stride {
                let w = turn(w, stride, back);
                for h in 0..ways {
                    let line = &mut pages[turn(h, ways, back) * stride + w][column];
                    let v = l.read(line);
                    digest.push(v);
                    if !last {
                        l.write(l.add(v, update), line);
                    }
                }
            }
        }
        *out = digest.finish();
    }
}

#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    evict(Words, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    evict(unsafe { crate::memory::common_lanes_x86::Avx2::new() }, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx512f
    evict(unsafe { crate::memory::common_lanes_x86::Avx512::new() }, lines, plan, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    evict(crate::memory::common_lanes_arm::Neon, lines, plan, out);
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
    fn a_run_touches_its_lines_alone_and_begins_anew() {
        let mut plan = plan(5);
        (plan.pages, plan.rounds) = (4, 3);
        let mut lines = aligned::lines(16);
        let mut right = [[0; 8]; 3];
        evict(Words, &mut lines, &plan, &mut right);
        let last = lines.clone();
        // what was left behind is overwritten
        plan.rounds = 1;
        let mut once = [[0; 8]; 1];
        evict(Words, &mut lines, &plan, &mut once);
        assert_eq!(once[0], right[0], "a run does not depend on what was there before");
        let touched = last.iter().filter(|line| line.0 != [0; 8]).count();
        assert_eq!(touched, 4 * plan.groups, "as many lines as pages times groups");
    }

    fn plan(column: usize) -> Plan {
        let (starts, first, update) = ([1; 8], [2; 8], [3; 8]);
        Plan { pages: 1, groups: 8, rounds: 1, starts, first, update, column, step: 0x9e37_79b9, round_step: 5 }
    }

    #[test]
    fn lines_of_a_page_are_apart() {
        for column in 0..LINES_A_PAGE {
            let mut seen = [false; LINES_A_PAGE];
            for g in 0..8 {
                assert!(!std::mem::replace(&mut seen[plan(column).line(g)], true), "column {column} group {g}");
            }
        }
    }
}
