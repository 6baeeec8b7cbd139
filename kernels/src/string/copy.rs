//! `string.copy`: every length from 0 to 256 bytes, moved, overlapped, filled, compared, searched and read at every alignment.
//!
//! A book of 16 pages of 256 bytes: byte o is P(o mod 256) + K + ⌊o / 256⌋ · Q mod 256, P a permutation of the seed, Q odd. Within
//! a page every byte tells its own offset, and no byte at the same place of another page is equal to it. 32 slots of 512 bytes
//! take what is moved.
//!
//! A run writes the book, then works through the lengths in the order n_j = (A · j + C) mod 257, j = 0…256. With s and t for the
//! byte alignments of source and target (see [`align`]: over 64 seeds in a row each length meets each s and each t with each
//! form, over 4,096 every pair of them) it does, of these forms and each in the next slot in turn, those whose number is n + seed
//! mod 3 (all of them in 192 seeds):
//! - 0 copy, 1 copy by elements, 2 copy in pieces: n bytes from the book's offset B + s to the slot's 64 + t;
//! - 3 up, 4 up by elements: within the slot from 64 + s upwards by (t − s − 1) mod 64 + 1 bytes, from the end downwards;
//! - 5 down, 6 down by elements: within the slot from above to 64 + t, by (s − t − 1) mod 64 + 1 bytes;
//! - 7 fill, 8 fill from the end: ⌊n / w⌋ elements of the step's value at 64 + t;
//! - 9 search and sum in the book, without a slot.
//!
//! Before each of the first nine the slot is covered with 512 bytes of the book from T on, which never have the same byte where the moved one
//! belongs, so that a lost store shows; after it the digest takes in the slot's eight lines, guards before and after with them.
//! Elements have a width w of 1, 2, 4 or 8 bytes ([`width`]); forms 0, 3 and 5 are by single bytes.
//!
//! Then eight answers go into the digest as one line, 0 where their form is not done. After the copy in pieces byte p of the copy
//! is inverted and byte q then increased by one: 0 first and 1 last element that differs from the book's. Form 9, in the n bytes
//! at its B + s: first and last element equal to the one with index e (or to what follows the last one), by w in 2 and 3, by the
//! next width in 4 and 5; 6 and 7 the sums of `Moves::read` by the same widths.
//!
//! Digest: `common_digest` of the memory family, lanes starting at R_l + group. Group ⌊16 · j / 257⌋ for step j; group 16 reads
//! the whole book and all slots once more: what was written where nothing should be.
//!
//! Operands, in stream order: 255 words for P (for i = 255…1 exchange P(i) with P(word mod (i + 1)), from the identity), K, Q
//! (lowest bit set), A (1 + word mod 256), C, R_0…R_7, then for each step two words x, v: B = 64 · (x mod 57) and
//! T = 64 · ((x mod 57 + 1 + ⌊x / 2¹⁶⌋ mod 2¹⁶ mod 55) mod 57), both 5 · 64 further for each form (mod 57 · 64);
//! p = ⌊x / 2³²⌋ mod 2¹⁶ mod (n + 1), q the same of ⌊x / 2⁴⁸⌋; the value v; e = ⌊v / 2³²⌋ mod (⌊n / w⌋ + 1).
//! Output: for each group eight words, one a lane.

use std::hint::black_box;

use super::common_moves::{Moves, element};
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::memory::common_digest::Digest;
use crate::memory::common_lanes::Lanes;
use crate::operands::Operands;

const LENGTHS: usize = 257;
const PAGE: usize = 256;
const BOOK: usize = 16 * PAGE;
const SLOT: usize = 512;
const SLOTS: usize = 32;
const GROUPS: usize = 16;
/// Lines of the book at which something may begin: 512 bytes have to follow.
const BEGINS: usize = (BOOK - SLOT) / 64 + 1;
/// Forms that write into a slot.
const FORMS: usize = 9;
const KIB: u32 = 20;
const _: () = assert!(BOOK + SLOTS * SLOT == KIB as usize * 1024 && BEGINS == 57);

/// See the file's head.
pub struct Copy;

impl Kernel for Copy {
    fn id(&self) -> &'static str {
        "string.copy"
    }

    fn summary(&self) -> &'static str {
        "byte moves: lengths 0 to 256 at every alignment, overlaps, fills, compares, searches"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(KIB)]
    }

    fn output_words(&self, _size: Size) -> usize {
        (GROUPS + 1) * 8
    }

    fn work(&self, _size: Size) -> Work {
        // a third of the forms for each
        Work { amount: LENGTHS as u64, unit: "length" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["rep", "std", "cld", "lods", "movdqu", "movups", "movupd", "loop"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi1, Feature::Lzcnt],
                    marks: &["vmovdqu", "vlddqu", "vmovups", "vmovupd", "vpcmpeq", "vpmovmskb", "tzcnt", "lzcnt"],
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
                    marks: &["ldrb", "strb", "add"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["ld1", "st1", "ldp", "stp", "cmeq", "addv"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let mut page: [u8; PAGE] = std::array::from_fn(|i| i as u8);
        for i in (1..PAGE).rev() {
            page.swap(i, (operands.word() % (i as u64 + 1)) as usize);
        }
        let (key, key_step) = (operands.word() as u8, operands.word() as u8 | 1);
        let (factor, first) = (1 + operands.word() % 256, operands.word() % LENGTHS as u64);
        let starts = std::array::from_fn(|_| operands.word());
        let step = |j| {
            let len = ((factor * j + first) % LENGTHS as u64) as usize;
            Step { len, draw: operands.word(), value: operands.word() }
        };
        let steps = (0..LENGTHS as u64).map(step).collect();
        operands.finish(PAGE - 1 + 4 + 8 + 2 * LENGTHS);
        let keys = std::array::from_fn(|i| key.wrapping_add(key_step.wrapping_mul(i as u8)));
        let plan = Plan { seed: case.seed.0, page, keys, starts, steps };
        Roles::One(Box::new(Book { lines: aligned::lines(KIB), plan, run: runner(proof.variant_for(self.id())) }))
    }
}

/// What one length takes from the stream.
struct Step {
    len: usize,
    draw: u64,
    value: u64,
}

struct Plan {
    seed: u64,
    page: [u8; PAGE],
    keys: [u8; BOOK / PAGE],
    starts: [u64; 8],
    steps: Vec<Step>,
}

/// Alignments s and t of source and target.
#[inline(always)]
fn align(seed: u64, len: usize, form: usize) -> (usize, usize) {
    let s = (seed as usize).wrapping_add(5 * len + 9 * form);
    let t = (seed as usize).wrapping_mul(27).wrapping_add((seed / 64) as usize + 11 * len + 23 * form);
    (s % 64, t % 64)
}

/// Bytes of an element.
#[inline(always)]
fn width(seed: u64, len: usize, form: usize, t: usize) -> usize {
    1 << ((len + t + form).wrapping_add((seed / 64) as usize) % 4)
}

impl Step {
    /// B and T of a form.
    #[inline(always)]
    fn places(&self, form: usize) -> (usize, usize) {
        let source = (self.draw % 57) as usize;
        let cover = source + 1 + ((self.draw >> 16) % (1 << 16) % 55) as usize;
        (64 * ((source + 5 * form) % BEGINS), 64 * ((cover + 5 * form) % BEGINS))
    }

    /// The two bytes that are altered before both sides are compared.
    #[inline(always)]
    fn altered(&self) -> (usize, usize) {
        let below = |x: u64| (x % (1 << 16)) as usize % (self.len + 1);
        (below(self.draw >> 32), below(self.draw >> 48))
    }
}

type Runner = fn(&mut [Line], &Plan, &mut [[u64; 8]]);

struct Book {
    lines: Vec<Line>,
    plan: Plan,
    run: Runner,
}

impl Ready for Book {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&mut self.lines, &self.plan, out.as_chunks_mut::<8>().0);
    }
}

/// Book, slots and the digest of the group, on their way through the steps.
struct Desk<'a, M: Moves, L: Lanes> {
    moves: M,
    lanes: L,
    book: &'a mut [u8],
    slots: &'a mut [u8],
    seed: u64,
    next: usize,
    digest: Digest<L>,
}

impl<M: Moves, L: Lanes> Desk<'_, M, L> {
    /// Covers the next slot with the book from `cover` on, lets `act` work on both (book, slot), takes the slot in.
    #[inline(always)]
    fn slot<R>(&mut self, cover: usize, act: impl FnOnce(M, *const u8, *mut u8) -> R) -> R {
        let slot = &mut self.slots[SLOT * self.next..][..SLOT];
        self.next = (self.next + 1) % SLOTS;
        for (from, to) in self.book[cover..cover + SLOT].as_chunks::<64>().0.iter().zip(slot.as_chunks_mut::<64>().0) {
            // SAFETY: both are 64 bytes
            unsafe { self.lanes.store(self.lanes.load(from.as_ptr()), to.as_mut_ptr()) };
        }
        let answer = act(self.moves, self.book.as_ptr(), slot.as_mut_ptr());
        for line in slot.as_chunks::<64>().0 {
            // SAFETY: 64 readable bytes
            self.digest.push(unsafe { self.lanes.load(line.as_ptr()) });
        }
        answer
    }

    #[inline(always)]
    fn step(&mut self, step: &Step) {
        let (n, value) = (step.len, step.value);
        let mut answers = [0; 8];
        let class = (n + (self.seed % 3) as usize) % 3;
        for form in (class..FORMS).step_by(3) {
            let (from, cover) = step.places(form);
            let (s, t) = align(self.seed, n, form);
            let w = width(self.seed, n, form, t);
            let up = (t + 63 - s) % 64 + 1;
            let down = (s + 63 - t) % 64 + 1;
            // SAFETY (of what follows): n ≤ 256, and B + s + n + 32 ≤ 56 · 64 + 63 + 288 is within the book. In a slot everything begins
            // at 64 + 63 + 64 at most, so that n bytes end within its 512, and 32 more where both sides are compared
            match form {
                // SAFETY: as above
                0 => self.slot(cover, |m, book, slot| unsafe { m.copy(book.add(from + s), slot.add(64 + t), n, 1) }),
                // SAFETY: as above
                1 => self.slot(cover, |m, book, slot| unsafe { m.copy(book.add(from + s), slot.add(64 + t), n, w) }),
                2 => {
                    let (p, q) = step.altered();
                    [answers[0], answers[1]] = self.slot(cover, |m, book, slot| {
                        // SAFETY: as above; p and q are at most n
                        unsafe {
                            let (source, copy) = (book.add(from + s), slot.add(64 + t));
                            m.pieces(source, copy, n);
                            *copy.add(p) = !*copy.add(p);
                            *copy.add(q) = (*copy.add(q)).wrapping_add(1);
                            [m.differ(copy, source, n / w, w) as u64, m.differ_back(copy, source, n / w, w) as u64]
                        }
                    });
                }
                3 | 4 => {
                    let w = if form == 3 { 1 } else { w };
                    // SAFETY: as above
                    self.slot(cover, |m, _, slot| unsafe {
                        m.copy_back(slot.add(64 + s), slot.add(64 + s + up), n, w)
                    });
                }
                5 | 6 => {
                    let w = if form == 5 { 1 } else { w };
                    // SAFETY: as above
                    self.slot(cover, |m, _, slot| unsafe { m.copy(slot.add(64 + t + down), slot.add(64 + t), n, w) });
                }
                // SAFETY: as above
                7 => self.slot(cover, |m, _, slot| unsafe { m.fill(slot.add(64 + t), n / w, w, value) }),
                // SAFETY: as above
                _ => self.slot(cover, |m, _, slot| unsafe { m.fill_back(slot.add(64 + t), n / w, w, value) }),
            }
        }
        if class == FORMS % 3 {
            let (s, t) = align(self.seed, n, FORMS);
            let w = width(self.seed, n, FORMS, t);
            let e = (value >> 32) as usize % (n / w + 1);
            let text = self.book[step.places(FORMS).0 + s..].as_ptr();
            for (i, w) in [w, if w == 8 { 1 } else { 2 * w }].into_iter().enumerate() {
                // SAFETY: as above; e ≤ n / w, and by the next width it is taken modulo the elements and one
                unsafe {
                    let wanted = element(text.add(e % (n / w + 1) * w), w);
                    answers[2 + 2 * i] = self.moves.find(text, n / w, w, wanted) as u64;
                    answers[3 + 2 * i] = self.moves.find_back(text, n / w, w, wanted) as u64;
                    answers[6 + i] = self.moves.read(text, n / w, w);
                }
            }
        }
        self.digest.push(self.lanes.of(answers));
    }
}

#[inline(always)]
fn work<M: Moves, L: Lanes>(moves: M, lanes: L, lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    let (book, slots) = aligned::bytes_mut(lines).split_at_mut(BOOK);
    for (page, key) in book.as_chunks_mut::<PAGE>().0.iter_mut().zip(plan.keys) {
        for (to, from) in page.iter_mut().zip(plan.page) {
            *to = from.wrapping_add(key);
        }
    }
    let start = |group: usize| Digest::new(lanes, plan.starts.map(|r| r.wrapping_add(group as u64)));
    let mut desk = Desk {
        moves,
        lanes,
        book: black_box(book),
        slots: black_box(slots),
        seed: plan.seed,
        next: 0,
        digest: start(0),
    };
    for (group, out) in out[..GROUPS].iter_mut().enumerate() {
        desk.digest = start(group);
        // the j of which ⌊16 · j / 257⌋ is the group
        let (first, end) = ((group * LENGTHS).div_ceil(GROUPS), ((group + 1) * LENGTHS).div_ceil(GROUPS));
        for step in &plan.steps[first..end] {
            desk.step(step);
        }
        *out = desk.digest.finish();
    }
    let mut digest = start(GROUPS);
    for line in desk.book.as_chunks::<64>().0.iter().chain(desk.slots.as_chunks::<64>().0) {
        // SAFETY: 64 readable bytes
        digest.push(unsafe { lanes.load(line.as_ptr()) });
    }
    out[GROUPS] = digest.finish();
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    work(super::common_moves_x86::Strings, crate::memory::common_lanes::Words, lines, plan, out);
}

#[cfg(not(target_arch = "x86_64"))]
#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    work(super::common_moves::Plain, crate::memory::common_lanes::Words, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi1,lzcnt")]
fn avx2(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    let moves = super::common_wide::Vectors(unsafe { super::common_wide_x86::Avx2::new() });
    // SAFETY: as above
    work(moves, unsafe { crate::memory::common_lanes_x86::Avx2::new() }, lines, plan, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    let moves = super::common_wide::Vectors(super::common_wide_arm::Neon);
    work(moves, crate::memory::common_lanes_arm::Neon, lines, plan, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |lines, plan, out| unsafe { avx2(lines, plan, out) },
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => neon,
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::super::common_moves::Plain;
    use super::*;

    #[test]
    fn in_4096_seeds_every_length_meets_every_pair_of_alignments_and_in_64_each_of_both() {
        for len in [0, 1, 100, 256] {
            for form in 0..=FORMS {
                let mut pairs = vec![false; 4096];
                for seed in 0..4096 {
                    let (s, t) = align(seed, len, form);
                    assert!(!std::mem::replace(&mut pairs[64 * s + t], true), "{len} {form}: {s}, {t} twice");
                }
                let mut some = [[false; 64]; 2];
                for seed in 64..128 {
                    let (s, t) = align(seed, len, form);
                    (some[0][s], some[1][t]) = (true, true);
                }
                assert_eq!(some, [[true; 64]; 2]);
            }
        }
    }

    #[test]
    fn what_covers_a_slot_is_never_what_will_be_copied_there() {
        for draw in (0..57u64).flat_map(|x| (0..55u64).map(move |y| (x, y << 16))) {
            // draw mod 57 counts: y · 2^16 moves it, so it is put back
            let draw = draw.1 + (57 - draw.1 % 57 + draw.0) % 57;
            for form in 0..FORMS {
                let (source, cover) = Step { len: 0, draw, value: 0 }.places(form);
                assert!(source + 64 + 288 <= BOOK && cover + SLOT <= BOOK);
                // equal alignments: source byte B + s + i meets cover byte T + 64 + t + i
                assert_ne!(source, cover + 64, "draw {draw}");
            }
        }
    }

    /// All forms of every length against the standard library's moves and searches.
    fn holds<M: Moves>(m: M) {
        let text: Vec<u8> = (0..1024u32).map(|i| (i * i / 7 + i / 3) as u8).collect();
        for n in 0..=256 {
            for (s, t, w) in [(0, 0, 1), (1, 0, 2), (7, 33, 4), (63, 62, 8), (31, 5, 8), (40, 63, 2)] {
                let (count, wide) = (n / w, n / w * w);
                let check = |what: &str, act: &dyn Fn(*mut u8), right: &dyn Fn(&mut [u8])| {
                    let (mut got, mut expected) = (text[..512].to_vec(), text[..512].to_vec());
                    act(got.as_mut_ptr());
                    right(&mut expected);
                    assert!(got == expected, "{what}: length {n} from {s} to {t} width {w}");
                };
                let source = text[512 + s..].as_ptr();
                let copied = |to: &mut [u8]| to[64 + t..64 + t + n].copy_from_slice(&text[512 + s..512 + s + n]);
                // SAFETY: everything is within 512 bytes on both sides
                unsafe {
                    check("copy", &|to| m.copy(source, to.add(64 + t), n, w), &copied);
                    check("copy_back", &|to| m.copy_back(source, to.add(64 + t), n, w), &copied);
                    check("pieces", &|to| m.pieces(source, to.add(64 + t), n), &copied);
                    for d in [1, 2, 7, 8, 31, 63, 64] {
                        check("up", &|to| m.copy_back(to.add(64), to.add(64 + d), n, w), &|to| {
                            to.copy_within(64..64 + n, 64 + d);
                        });
                        check("down", &|to| m.copy(to.add(64 + d), to.add(64), n, w), &|to| {
                            to.copy_within(64 + d..64 + d + n, 64);
                        });
                    }
                    let value = 0x0123_4567_89ab_cdef_u64;
                    let filled = |to: &mut [u8]| {
                        let bytes = value.to_le_bytes();
                        to[64 + t..64 + t + wide].chunks_exact_mut(w).for_each(|e| e.copy_from_slice(&bytes[..w]));
                    };
                    check("fill", &|to| m.fill(to.add(64 + t), count, w, value), &filled);
                    check("fill_back", &|to| m.fill_back(to.add(64 + t), count, w, value), &filled);
                    let elements: Vec<&[u8]> = text[512 + s..512 + s + wide].chunks_exact(w).collect();
                    for e in [0, count / 3, count.saturating_sub(1), count] {
                        let wanted = &text[512 + s + e * w..][..w];
                        let value = element(wanted.as_ptr(), w) | if w < 8 { 0xa5 << 56 } else { 0 };
                        let (first, last) =
                            (elements.iter().position(|x| *x == wanted), elements.iter().rposition(|x| *x == wanted));
                        assert_eq!(
                            m.find(source, count, w, value),
                            first.unwrap_or(count),
                            "find {e} of {count} by {w}"
                        );
                        assert_eq!(
                            m.find_back(source, count, w, value),
                            last.map_or(0, |i| i + 1),
                            "find_back {e} by {w}"
                        );
                        let mut other = text[512 + s..512 + s + n + 40].to_vec();
                        other[e * w] ^= 0x40;
                        let differs = |i: &usize| other[i * w..i * w + w] != *elements[*i];
                        let (first, last) = ((0..count).find(differs), (0..count).rfind(differs));
                        assert_eq!(
                            m.differ(other.as_ptr(), source, count, w),
                            first.unwrap_or(count),
                            "differ {e} by {w}"
                        );
                        let back = m.differ_back(other.as_ptr(), source, count, w);
                        assert_eq!(back, last.map_or(0, |i| i + 1), "differ_back {e} by {w}");
                    }
                    assert_eq!(m.read(source, count, w), Plain.read(source, count, w), "read {count} by {w}");
                }
            }
        }
    }

    #[test]
    fn plain_moves_hold() {
        holds(Plain);
    }

    #[cfg(target_arch = "x86_64")]
    #[test]
    fn string_instructions_hold_and_leave_the_direction_flag_clear() {
        holds(super::super::common_moves_x86::Strings);
        let flags: u64;
        // SAFETY: takes the flags from the stack where it put them
        unsafe { std::arch::asm!("pushfq", "pop {0}", out(reg) flags) };
        assert_eq!(flags >> 10 & 1, 0);
    }

    #[cfg(target_arch = "x86_64")]
    #[test]
    fn wide_moves_hold() {
        if is_x86_feature_detected!("avx2") {
            // SAFETY: avx2 was just detected
            holds(super::super::common_wide::Vectors(unsafe { super::super::common_wide_x86::Avx2::new() }));
        }
    }

    #[cfg(target_arch = "aarch64")]
    #[test]
    fn wide_moves_hold() {
        holds(super::super::common_wide::Vectors(super::super::common_wide_arm::Neon));
    }
}
