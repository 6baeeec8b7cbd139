//! `cache.walk`: dependent loads and stores over a footprint of the first, second or third cache level.
//!
//! The footprint is N = 16 · KiB lines of 64 bytes. Words 0–3 of line i are links, words 4–7 tags:
//! link_q(i) = 8 · ((A_q · i + C_q) mod N), with A_q ≡ 1 mod 4 and C_q odd, so that each q is one cycle through all lines
//! (Knuth, The Art of Computer Programming, vol. 2, §3.2.1.2, theorem A), counted in words;
//! tag_j(i) = T_j + i · G mod 2⁶⁴: every word tells where it belongs.
//!
//! A run writes all lines anew, then makes the laps of the size. Lap k starts at line 0, follows link k mod 4 and at line i
//! reads tag a = (i + k) mod 4 and tag b = (a + 1) mod 4, of which it rewrites the second: tag_b ← tag_b + U_(k mod 8). In the
//! next lap that tag is the a of the same line: a store that was lost or went elsewhere shows. The last lap stores nothing.
//! Each lap is cut into equal segments; a segment has two digests, d ← d · M + tag mod 2⁶⁴ over its a and its b, M odd: one
//! wrong tag always shows, two cancel only if their difference is the power of M between them.
//!
//! A link is checked before it is followed: where it would leave the footprint the lap ends, and the rest of its words all
//! become the link that was wrong.
//!
//! Operands, in stream order: A_q, C_q for q = 0…3 (A ← A & !3 | 1, C ← C | 1), T_0…T_3, G (lowest bit set), U_0…U_7.
//! Digests start at 0; M = 0xd1342543de82ef95. Output: lap by lap, segment by segment, the digests of a and of b.

use std::hint::black_box;

use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

/// Multiplier of the digests: ≡ 5 mod 8, so that its powers have the longest period.
const M: u64 = 0xd134_2543_de82_ef95;

/// (KiB, laps, segments of a lap).
const SHAPES: [(u32, usize, usize); 3] = [(16, 32, 4), (256, 8, 16), (4096, 2, 64)];

fn shape(size: Size) -> (usize, usize, usize) {
    let found = SHAPES.iter().find(|(kib, ..)| *kib == size.0);
    let (kib, laps, segments) = found.copied().expect("size is one of the kernel's");
    (kib as usize * 16, laps, segments)
}

/// See the file's head.
pub struct Walk;

impl Kernel for Walk {
    fn id(&self) -> &'static str {
        "cache.walk"
    }

    fn summary(&self) -> &'static str {
        "caches and translation: dependent loads and stores over self-describing lines"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(256), Size(16), Size(4096)]
    }

    fn output_words(&self, size: Size) -> usize {
        let (_, laps, segments) = shape(size);
        laps * segments * 2
    }

    fn work(&self, size: Size) -> Work {
        let (lines, laps, _) = shape(size);
        Work { amount: (lines * laps) as u64, unit: "hop" }
    }

    fn builds(&self) -> &'static [Build] {
        // one variant: a dependent load is the same instruction at every level
        #[cfg(target_arch = "x86_64")]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["mov", "imul"], proven: Proven::Hardware }]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["ldr", "madd"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        assert_eq!(proof.variant_for(self.id()), Variant::Portable);
        let (_, laps, segments) = shape(case.size);
        let mut operands = Operands::new(case);
        let cycles = std::array::from_fn(|_| (operands.word() & !3 | 1, operands.word() | 1));
        let tags = std::array::from_fn(|_| operands.word());
        let step = operands.word() | 1;
        let updates = std::array::from_fn(|_| operands.word());
        operands.finish(8 + 4 + 1 + 8);
        let plan = Plan { cycles, tags, step, updates, laps, segments };
        Roles::One(Box::new(Footprint { lines: aligned::lines(case.size.0), plan }))
    }
}

struct Plan {
    cycles: [(u64, u64); 4],
    tags: [u64; 4],
    step: u64,
    updates: [u64; 8],
    laps: usize,
    segments: usize,
}

struct Footprint {
    lines: Vec<Line>,
    plan: Plan,
}

impl Ready for Footprint {
    fn run(&mut self, out: &mut [u64]) {
        portable(&mut self.lines, &self.plan, out);
    }
}

/// Every line as its index says.
#[inline(always)]
fn write_lines(lines: &mut [Line], plan: &Plan) {
    let mask = lines.len() as u64 * 8 - 1;
    let mut now: [u64; 8] =
        std::array::from_fn(|j| if j < 4 { plan.cycles[j].1.wrapping_mul(8) } else { plan.tags[j - 4] });
    let steps: [u64; 8] = std::array::from_fn(|j| if j < 4 { plan.cycles[j].0.wrapping_mul(8) } else { plan.step });
    let masks: [u64; 8] = std::array::from_fn(|j| if j < 4 { mask } else { u64::MAX });
    for line in lines {
        line.0 = std::array::from_fn(|j| now[j] & masks[j]);
        now = std::array::from_fn(|j| now[j].wrapping_add(steps[j]));
    }
}

/// `hops` lines from word `at` on; gives the next `at` and the two digests, or the link that left the footprint.
#[inline(always)]
fn segment<const STORE: bool>(
    words: &mut [u64],
    mut at: usize,
    hops: usize,
    lap: usize,
    update: u64,
) -> Result<(usize, [u64; 2]), u64> {
    let (mut a, mut b) = (0u64, 0u64);
    for _ in 0..hops {
        let Some(line) = words.get_mut(at..).and_then(|rest| rest.first_chunk_mut::<8>()) else {
            return Err(at as u64);
        };
        let column = (at >> 3) + lap;
        let next = line[lap % 4] as usize;
        a = a.wrapping_mul(M).wrapping_add(line[4 + column % 4]);
        let tag = &mut line[4 + (column + 1) % 4];
        b = b.wrapping_mul(M).wrapping_add(*tag);
        if STORE {
            *tag = tag.wrapping_add(update);
        }
        at = next;
    }
    Ok((at, [a, b]))
}

#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [u64]) {
    write_lines(lines, plan);
    let hops = lines.len() / plan.segments;
    let words = aligned::words_mut(black_box(lines));
    let mut at = 0;
    for (k, lap) in out.chunks_exact_mut(2 * plan.segments).enumerate() {
        let update = plan.updates[k % 8];
        for (s, digests) in lap.as_chunks_mut::<2>().0.iter_mut().enumerate() {
            let from = if s == 0 { 0 } else { at };
            let walked = if k + 1 < plan.laps {
                segment::<true>(words, from, hops, k, update)
            } else {
                segment::<false>(words, from, hops, k, update)
            };
            match walked {
                Ok((next, pair)) => (at, *digests) = (next, pair),
                Err(link) => (at, *digests) = (link as usize, [link; 2]),
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::isa;
    use crate::kernel::Seed;

    fn plan() -> Plan {
        Plan {
            cycles: [(5, 1), (9, 3), (13, 7), (61, 91)],
            tags: [1, 2, 3, 4],
            step: 0x9e37_79b9,
            updates: [77; 8],
            laps: 32,
            segments: 4,
        }
    }

    /// Theorem A of the file's head, seen: each of the four link words leads once through every line.
    #[test]
    fn each_link_is_one_cycle_through_all_lines() {
        let mut lines = aligned::lines(16);
        write_lines(&mut lines, &plan());
        for q in 0..4 {
            let mut seen = vec![false; lines.len()];
            let mut at = 0;
            for _ in 0..lines.len() {
                assert!(!std::mem::replace(&mut seen[at / 8], true), "link {q} comes to word {at} twice");
                at = lines[at / 8].0[q] as usize;
            }
            assert_eq!(at, 0, "link {q}");
        }
    }

    #[test]
    fn a_link_out_of_the_footprint_ends_the_walk_and_is_shown() {
        let mut lines = aligned::lines(16);
        write_lines(&mut lines, &plan());
        lines[0].0[0] = 1 << 40;
        let words = aligned::words_mut(&mut lines);
        assert_eq!(segment::<true>(words, 0, 256, 0, 1), Err(1 << 40));
        assert_eq!(segment::<true>(words, 2041, 1, 0, 1), Err(2041), "a line that begins too late");
    }

    #[test]
    fn a_lost_store_shows_in_the_next_lap() {
        let mut lines = aligned::lines(16);
        write_lines(&mut lines, &plan());
        let words = aligned::words_mut(&mut lines);
        let lap = |words: &mut [u64], k| segment::<true>(words, 0, 256, k, 77).expect("links are right").1;
        let before = lap(&mut words.to_vec(), 1);
        let first = lap(words, 0);
        let right = lap(&mut words.to_vec(), 1);
        assert_ne!(before, right, "stores change what is read");
        // line 5 in lap 0: column 5, tag b = (5 + 1) mod 4 = 2
        words[5 * 8 + 4 + 2] -= 77;
        let wrong = lap(words, 1);
        assert_ne!(wrong[0], right[0]);
        assert_eq!(wrong[1], right[1], "only the re-read tag differs");
        assert_ne!(first, right);
    }

    #[test]
    fn other_seeds_give_other_words() {
        let run = |seed| {
            let case = Case { kernel: Walk.id(), seed: Seed(seed), size: Size(16) };
            let mut out = vec![0; 256];
            Walk.prepare(&case, isa::prove(&Walk, Variant::Portable).expect("portable")).alone().run(&mut out);
            out
        };
        assert!(run(1).iter().zip(run(2)).all(|(a, b)| *a != b));
    }
}
