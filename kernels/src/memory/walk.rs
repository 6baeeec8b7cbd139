//! `memory.walk`: page after page in pseudo-random order, every access over a border of lines or pages.
//!
//! The footprint is N = KiB / 4 pages of 4,096 bytes and the first line of one more; it begins on a page. Border i is between page i
//! and the next: the last 64 bytes of the one and the first 64 of the other. The word at index x of the footprint (x counts words of
//! 8 bytes) is T + x · G mod 2⁶⁴ there: it tells where it belongs. Within page i, ending K_i = 1 + i mod 7 bytes short of the end of
//! line 2 + i mod 60, stands the first of four links of eight bytes; the second lies across the lines' border, and all are
//! unaligned. Link (q + i) mod 4 of page i is page f_q(i) = (A_q · i + C_q) mod N, times 4,096; A_q ≡ 1 mod 4 and C_q odd,
//! so that each q is one cycle through all pages (Knuth, The Art of Computer Programming, vol. 2, §3.2.1.2, theorem A): the next page is known only
//! when the link is there, and in the larger sizes there are more pages than a translation buffer has entries.
//!
//! A run writes all borders and links anew, then makes the laps of the size. Lap k starts at page 0, follows the links of
//! q = k mod 4 and on page i does two things at its border, at byte offsets relative to it:
//! - reads the eight bytes from −b on, b = 1 + (i + k) mod 7, and puts them back as x + U_k;
//! - reads the 32 bytes from −c on, c = 1 + (i + 3 · k) mod 31, as four words y_0…y_3, and puts each back as y + U_k.
//!
//! The next lap reads what this one stored, at other offsets: a store that lost the half beyond the border shows.
//! Each lap is cut into equal segments; a segment has two digests, d ← d · M + x and d ← d · M + Σ y_j · M_j mod 2⁶⁴, all factors odd:
//! one wrong word always shows.
//!
//! A link is checked before it is followed: where it would leave the footprint the lap ends, and the rest of its words all
//! become the link that was wrong.
//!
//! Operands, in stream order: A_q, C_q for q = 0…3 (A ← A & !3 | 1, C ← C | 1), T, G (lowest bit set), U_0…U_7 (U_k is U of k mod 8).
//! Digests start at 0; M = 0xd1342543de82ef95, M_j = M^(j + 1). Output: lap by lap, segment by segment, both digests.

use std::hint::black_box;

#[cfg(not(target_arch = "x86_64"))]
use super::common_quad::Plain as Baseline;
use super::common_quad::Quad;
#[cfg(target_arch = "x86_64")]
use super::common_quad::Sse2 as Baseline;
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const PAGE: usize = 4096;
/// Multiplier of the digests: ≡ 5 mod 8, so that its powers have the longest period.
const M: u64 = 0xd134_2543_de82_ef95;
/// Multipliers of the words of a vector.
const FACTORS: [u64; 4] = {
    let square = M.wrapping_mul(M);
    [M, square, square.wrapping_mul(M), square.wrapping_mul(square)]
};

/// (KiB, laps, segments of a lap).
const SHAPES: [(u32, usize, usize); 3] = [(256, 32, 1), (4096, 4, 8), (32_768, 2, 16)];

fn shape(size: Size) -> (usize, usize, usize) {
    let found = SHAPES.iter().find(|(kib, ..)| *kib == size.0);
    let (kib, laps, segments) = found.copied().expect("size is one of the kernel's");
    (kib as usize * 1024 / PAGE, laps, segments)
}

/// Byte offset of the first link within page `i`.
#[inline(always)]
fn links(i: usize) -> usize {
    64 * (3 + i % 60) - (1 + i % 7) - 8
}

/// See the file's head.
pub struct Walk;

impl Kernel for Walk {
    fn id(&self) -> &'static str {
        "memory.walk"
    }

    fn summary(&self) -> &'static str {
        "address translation: dependent hops over pages, accesses across line and page borders"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(4096), Size(256), Size(32_768)]
    }

    fn output_words(&self, size: Size) -> usize {
        let (_, laps, segments) = shape(size);
        laps * segments * 2
    }

    fn work(&self, size: Size) -> Work {
        let (pages, laps, _) = shape(size);
        Work { amount: (pages * laps) as u64, unit: "hop" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["mov", "movdqu", "paddq", "imul"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["mov", "vmovdqu", "vpaddq", "imul"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            // Advanced SIMD is part of the baseline: there is nothing that another variant could do otherwise
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["ld", "st", "add", "madd"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let (pages, _, segments) = shape(case.size);
        let mut operands = Operands::new(case);
        let cycles = std::array::from_fn(|_| (operands.word() & !3 | 1, operands.word() | 1));
        let (tag, step) = (operands.word(), operands.word() | 1);
        let updates = std::array::from_fn(|_| operands.word());
        operands.finish(8 + 2 + 8);
        let plan = Plan { pages, cycles, tag, step, updates, segments };
        let run = runner(proof.variant_for(self.id()));
        // one page more for the last line, one for the way to the first border
        Roles::One(Box::new(Footprint { lines: aligned::lines(case.size.0 + 8), plan, run }))
    }
}

struct Plan {
    pages: usize,
    cycles: [(u64, u64); 4],
    tag: u64,
    step: u64,
    updates: [u64; 8],
    segments: usize,
}

type Runner = fn(&mut [u8], &Plan, &mut [[u64; 2]]);

struct Footprint {
    lines: Vec<Line>,
    plan: Plan,
    run: Runner,
}

impl Ready for Footprint {
    fn run(&mut self, out: &mut [u64]) {
        let bytes = aligned::bytes_mut(&mut self.lines);
        let first = bytes.as_ptr().align_offset(PAGE);
        (self.run)(&mut bytes[first..][..self.plan.pages * PAGE + 64], &self.plan, out.as_chunks_mut::<2>().0);
    }
}

/// Borders and links as their places say.
#[inline(always)]
fn write(bytes: &mut [u8], plan: &Plan) {
    let mask = plan.pages as u64 - 1;
    let mut now: [u64; 4] = std::array::from_fn(|q| plan.cycles[q].1);
    for i in 0..plan.pages {
        let border = (i + 1) * PAGE - 64;
        let first = plan.tag.wrapping_add((border as u64 / 8).wrapping_mul(plan.step));
        let words = bytes[border..border + 128].as_chunks_mut::<8>().0;
        for (j, word) in words.iter_mut().enumerate() {
            *word = first.wrapping_add((j as u64).wrapping_mul(plan.step)).to_le_bytes();
        }
        let place = i * PAGE + links(i);
        let places = bytes[place..place + 32].as_chunks_mut::<8>().0;
        for q in 0..4 {
            places[(q + i) % 4] = ((now[q] & mask) * PAGE as u64).to_le_bytes();
            now[q] = now[q].wrapping_add(plan.cycles[q].0);
        }
    }
}

/// `hops` pages from byte `from` on; gives where the next page begins and the two digests, or the link that left the footprint.
#[inline(always)]
fn segment<Q: Quad>(
    quad: Q,
    bytes: &mut [u8],
    mut from: usize,
    hops: usize,
    lap: usize,
    update: u64,
) -> Result<(usize, [u64; 2]), u64> {
    let (mut d, mut e) = (0u64, 0u64);
    // a page and the line behind it
    let Some(last) = bytes.len().checked_sub(PAGE + 64) else { return Err(from as u64) };
    for _ in 0..hops {
        if from > last {
            return Err(from as u64);
        }
        let i = from / PAGE;
        let (link, word) = (from + links(i) + 8 * ((lap + i) % 4), from + PAGE - (1 + (i + lap) % 7));
        let words = from + PAGE - (1 + (i + 3 * lap) % 31);
        let base = bytes.as_mut_ptr();
        // SAFETY: links are within a page, the words begin within it and end within 64 bytes behind it, and all that is within `bytes`
        let (next, y) = unsafe {
            let next = base.add(link).cast::<u64>().read_unaligned();
            let word = base.add(word).cast::<u64>();
            let x = word.read_unaligned();
            word.write_unaligned(x.wrapping_add(update));
            d = d.wrapping_mul(M).wrapping_add(x);
            (next, quad.bump(base.add(words), update))
        };
        let sum = (0..4).fold(0u64, |sum, j| sum.wrapping_add(y[j].wrapping_mul(FACTORS[j])));
        e = e.wrapping_mul(M).wrapping_add(sum);
        from = next as usize;
    }
    Ok((from, [d, e]))
}

#[inline(always)]
fn walk<Q: Quad>(quad: Q, bytes: &mut [u8], plan: &Plan, out: &mut [[u64; 2]]) {
    write(bytes, plan);
    let hops = plan.pages / plan.segments;
    let bytes = black_box(bytes);
    for (k, lap) in out.chunks_exact_mut(plan.segments).enumerate() {
        let mut from = 0;
        for digests in lap {
            match segment(quad, bytes, from, hops, k, plan.updates[k % 8]) {
                Ok((next, pair)) => (from, *digests) = (next, pair),
                // out of the footprint it stays, so that the rest of the lap ends the same way
                Err(link) => (from, *digests) = (link as usize, [link; 2]),
            }
        }
    }
}

#[inline(never)]
fn portable(bytes: &mut [u8], plan: &Plan, out: &mut [[u64; 2]]) {
    walk(Baseline, bytes, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(bytes: &mut [u8], plan: &Plan, out: &mut [[u64; 2]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    walk(unsafe { super::common_lanes_x86::Avx2::new() }, bytes, plan, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |bytes, plan, out| unsafe { avx2(bytes, plan, out) },
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn footprint() -> (Vec<u8>, Plan) {
        let cycles = [(5, 1), (9, 3), (13, 7), (61, 91)];
        let plan = Plan { pages: 64, cycles, tag: 3, step: 0x9e37_79b9_7f4a_7c15, updates: [77; 8], segments: 1 };
        let mut bytes = vec![0; 64 * PAGE + 64];
        write(&mut bytes, &plan);
        (bytes, plan)
    }

    /// Theorem A of the file's head, seen: the links of each q lead once through every page.
    #[test]
    fn each_link_is_one_cycle_through_all_pages() {
        let (mut bytes, _) = footprint();
        for q in 0..4 {
            let (mut seen, mut page) = ([false; 64], 0);
            for _ in 0..64 {
                assert!(!std::mem::replace(&mut seen[page / PAGE], true), "link {q} comes to byte {page} twice");
                page = segment(Baseline, &mut bytes, page, 1, q, 0).expect("links are right").0;
            }
            assert_eq!(page, 0, "link {q}");
        }
    }

    #[test]
    fn links_and_borders_keep_apart_and_every_second_link_straddles_two_lines() {
        for i in 0..8192 {
            let first = links(i);
            assert!(first >= 64 && first + 32 <= PAGE - 64, "page {i}: the first and the last line are the borders'");
            assert_ne!((first + 8) / 64, (first + 15) / 64, "page {i}");
        }
    }

    #[test]
    fn half_a_store_lost_beyond_a_border_shows_in_the_next_lap() {
        let (bytes, _) = footprint();
        let lap = |bytes: &mut [u8], k| segment(Baseline, bytes, 0, 64, k, 77).expect("links are right").1;
        let mut sound = bytes.clone();
        lap(&mut sound, 0);
        let right = lap(&mut sound.clone(), 1);
        for page in [0, 5, 63] {
            let (low, high) = ((page + 1) * PAGE - 64, (page + 1) * PAGE);
            for half in [low..low + 64, high..high + 64] {
                let mut bad = sound.clone();
                bad[half.clone()].copy_from_slice(&bytes[half]);
                assert_ne!(bad, sound);
                let wrong = lap(&mut bad, 1);
                assert!(wrong[1] != right[1], "page {page}");
            }
        }
    }

    #[test]
    fn a_link_out_of_the_footprint_ends_the_lap_and_is_shown() {
        let (mut bytes, plan) = footprint();
        let wild = 1u64 << 40;
        bytes[links(0)..links(0) + 8].copy_from_slice(&wild.to_le_bytes());
        assert_eq!(segment(Baseline, &mut bytes, 0, 64, 0, 1), Err(wild));
        assert_eq!(
            segment(Baseline, &mut bytes, 64 * PAGE, 64, 0, 1),
            Err(64 * PAGE as u64),
            "a page that begins too late"
        );
        assert_eq!(
            segment(Baseline, &mut bytes, usize::MAX, 64, 0, 1),
            Err(u64::MAX),
            "an address that would wrap around"
        );
        assert_eq!(plan.pages, 64);
    }
}
