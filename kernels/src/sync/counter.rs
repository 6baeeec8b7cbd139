//! `sync.counter`: two cores hammer the same counters with every locked instruction, in 8, 16, 32 and 64 bits.
//!
//! What the roles do commutes, so that what comes out is determined whoever comes first:
//! - `up` and `down` are only added to and subtracted from (add, inc, adc; sub, dec, sbb): a lost one misses in the sum.
//! - of `bits` role 0 owns the even bits, role 1 the odd ones (or, and, xor, bit set, cleared, toggled). A role knows its own
//!   bits after each operation; it looks at them each time, and at the old bit that the instruction hands back, and digests
//!   all of it. The partner's operations on the neighbouring bits must not show in it.
//! - `not` and `neg` are only inverted, or negated, by both: any value but x and ¬x (x and −x) is counted as foreign, and the
//!   parity of both roles' operations is in the end value. Each role also inverts and negates a `piece` of its own beside the
//!   partner's, in the same line, and digests it after each operation.
//! - `taken` (exchange and add), `compared` (compare and swap), `swapped` (exchange) hand back old values. Whatever the order,
//!   each new value is the next one's old value, so that Σ h(new) − h(old) over both roles' operations is h(end) − h(start),
//!   for any function h; h is a bijection that mixes well. A value that was handed out twice or got lost breaks the sum.
//!   `halves` and `pair` do the same with compare and swap of 2 × 32 and 2 × 64 bits, where the variant has them.
//! - `ticket` hands out numbers: those that a role draws have to rise.
//!
//! Output of role 0, then the same of role 1 (74 words each):
//! | word | | whose view |
//! |---|---|---|
//! | 0 | tickets that did not rise (0) | this role alone |
//! | 1 | foreign values of `not` and `neg` (0) | this role alone |
//! | 2–5 | digest of own bits in 8, 16, 32, 64 bits | this role alone |
//! | 6–9 | digest of the own piece, by width | this role alone |
//! | 10–25 | what the role has added, by width: up, down, taken, compared | this role alone, no shared memory |
//! | 26–53 | end values by width: up, down, bits, not, neg, taken, compared | this role's view of shared values |
//! | 54–65 | sums of h by width: taken, compared, swapped with h(end) | both roles' together |
//! | 66–67 | ticket: end, sum of h | both |
//! | 68–69 | halves: end, sum of h | both |
//! | 70–73 | pair: both ends, both sums of h | both |
//!
//! A wrong word below 26 speaks against the role in whose half it is (or what lies between it and the line); the same wrong
//! value in both halves from word 26 on says that an operation was lost or done twice, by either; a wrong value in one half
//! only, that this role read stale or damaged data.
//!
//! Operands in stream order: for each width the starts of up, down, bits, not, neg, taken, compared, swapped, and of both
//! pieces; the starts of ticket, halves and both words of pair. Then for role 0, then role 1, in each of 32 rounds: for each
//! width 11 words (add, adc, sub, sbb, or, and, xor, bit numbers, taken, compared, swapped), 1 for halves, 2 for pair.

use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use super::common_atoms::{Atoms, Pair, Width};
use super::common_counter::{Cells, FORMS, STARTS, Seen, ends, round};
use super::common_meet::{Apart, Meeting, mix};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const ROUNDS: usize = 32;
/// Rounds of one width that a role does before it turns to the next width.
const STRETCH: usize = 8;
const _: () = assert!(ROUNDS.is_multiple_of(STRETCH));
const WIDTHS: usize = 4;
/// Operand words of one role in a round.
const ROUND: usize = WIDTHS * FORMS + 3;
/// Locked operations of one width in a round, and of all widths with ticket, halves and pair.
const OPERATIONS: usize = 19 * WIDTHS + 3;
/// Words of one role's output.
const HALF: usize = 74;
/// Sums of h that the roles tell each other: three a width, ticket, halves, two of pair.
const SUMS: usize = 3 * WIDTHS + 4;

/// See the file's head.
pub struct Counter;

impl Kernel for Counter {
    fn id(&self) -> &'static str {
        "sync.counter"
    }

    fn summary(&self) -> &'static str {
        "atomic read-modify-write: two cores on the same counters, every locked form in 8 to 128 bits"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(25)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * HALF
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * ROUNDS * OPERATIONS) as u64, unit: "atomic operation" }
    }

    fn cpus(&self) -> usize {
        2
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["lock", "xchg"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Cmpxchg16b],
                    marks: &["lock", "xchg"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["ldaxr", "stlxr", "ldaxp", "stlxp"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon, Feature::ArmLse],
                    marks: &["ldadd", "ldclr", "ldset", "ldeor", "swp", "cas", "casp"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let (_, roles) = roles(case, proof.variant_for(self.id()));
        Roles::Two(roles.map(|role| Box::new(role) as Box<dyn Ready>))
    }
}

/// What both roles have.
struct Shared {
    meeting: Meeting,
    bytes: Cells<u8>,
    words: Cells<u16>,
    doubles: Cells<u32>,
    quads: Cells<u64>,
    ticket: Apart<AtomicU64>,
    wide: Apart<(AtomicU64, Pair)>,
    /// What each role tells the other of its sums of h.
    told: [Apart<[AtomicU64; SUMS]>; 2],
    starts: Vec<u64>,
}

impl Shared {
    fn start(&self) {
        let (widths, [ticket, halves, low, high]) = self.starts.split_last_chunk().expect("counted in `roles`");
        let widths: Vec<&[u64]> = widths.chunks_exact(STARTS).collect();
        self.bytes.start(widths[0]);
        self.words.start(widths[1]);
        self.doubles.start(widths[2]);
        self.quads.start(widths[3]);
        self.ticket.0.store(*ticket, Ordering::Relaxed);
        self.wide.0.0.store(*halves, Ordering::Relaxed);
        self.wide.0.1.0[0].store(*low, Ordering::Relaxed);
        self.wide.0.1.0[1].store(*high, Ordering::Relaxed);
    }
}

type Run = fn(&Shared, usize, &[[u64; ROUND]], &mut View);

/// One of the pair.
struct Role {
    shared: Arc<Shared>,
    role: usize,
    operands: Vec<[u64; ROUND]>,
    run: Run,
}

fn roles(case: &Case, variant: Variant) -> (Arc<Shared>, [Role; 2]) {
    let mut operands = Operands::new(case);
    let starts = operands.words(WIDTHS * STARTS + 4);
    let mut list = || (0..ROUNDS).map(|_| std::array::from_fn(|_| operands.word())).collect();
    let lists = [list(), list()];
    operands.finish(WIDTHS * STARTS + 4 + 2 * ROUNDS * ROUND);
    let shared = Arc::new(Shared {
        meeting: Meeting::new(),
        bytes: Cells::new(),
        words: Cells::new(),
        doubles: Cells::new(),
        quads: Cells::new(),
        ticket: Apart(AtomicU64::new(0)),
        wide: Apart((AtomicU64::new(0), Pair::default())),
        told: std::array::from_fn(|_| Apart(std::array::from_fn(|_| AtomicU64::new(0)))),
        starts,
    });
    let run: Run = match variant {
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => run_avx2,
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => run_neon,
        _ => portable,
    };
    let mut role = 0;
    let roles = lists.map(|operands| {
        role += 1;
        Role { shared: Arc::clone(&shared), role: role - 1, operands, run }
    });
    (shared, roles)
}

/// What one role has seen.
#[derive(Default)]
struct View {
    not_rising: u64,
    foreign: u64,
    widths: [Seen; WIDTHS],
    /// Sums of h: ticket, halves, two of pair.
    sums: [u64; 4],
}

/// All rounds of one role, in stretches; which operations come first changes no output word.
#[inline(always)]
fn hammer<A: Atoms>(a: A, shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    let mut last = None;
    // several rounds of one width at a stretch, and both roles abreast: otherwise the second would walk behind the first, a
    // line apart, and the two would seldom want the same line
    let (stretches, _) = operands.as_chunks::<STRETCH>();
    for stretch in stretches {
        for x in stretch {
            shared.meeting.draw_level(role);
            round(a, &shared.bytes, role, &x[..FORMS], &mut view.foreign, &mut view.widths[0]);
        }
        for x in stretch {
            shared.meeting.draw_level(role);
            round(a, &shared.words, role, &x[FORMS..2 * FORMS], &mut view.foreign, &mut view.widths[1]);
        }
        for x in stretch {
            shared.meeting.draw_level(role);
            round(a, &shared.doubles, role, &x[2 * FORMS..3 * FORMS], &mut view.foreign, &mut view.widths[2]);
        }
        for x in stretch {
            shared.meeting.draw_level(role);
            round(a, &shared.quads, role, &x[3 * FORMS..4 * FORMS], &mut view.foreign, &mut view.widths[3]);
        }
        for x in stretch {
            last = Some(draw(a, shared, &x[4 * FORMS..], last, view));
        }
    }
}

/// A ticket, and one round of halves and pair; the ticket.
#[inline(always)]
fn draw<A: Atoms>(a: A, shared: &Shared, wide: &[u64], last: Option<u64>, view: &mut View) -> u64 {
    let View { not_rising, sums, .. } = view;
    let ticket: u64 = a.exchange_add(&shared.ticket.0, 1);
    // as a difference, because the start may be just below 2⁶⁴
    let rises = last.is_none_or(|last| ticket.wrapping_sub(last) as i64 > 0);
    *not_rising += u64::from(!rises);
    sums[0] = sums[0].wrapping_add(mix(ticket.wrapping_add(1))).wrapping_sub(mix(ticket));
    let (halves, pair) = &shared.wide.0;
    let old = a.halves_add(halves, wide[0]);
    sums[1] = sums[1].wrapping_add(mix(old.wrapping_add(wide[0]))).wrapping_sub(mix(old));
    let old = a.pair_add(pair, [wide[1], wide[2]]);
    for i in 0..2 {
        sums[2 + i] = sums[2 + i].wrapping_add(mix(old[i].wrapping_add(wide[1 + i]))).wrapping_sub(mix(old[i]));
    }
    ticket
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
fn portable(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    hammer(super::common_atoms_x86::X86::baseline(), shared, role, operands, view);
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,cmpxchg16b")]
fn avx2(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    // SAFETY: this function has cmpxchg16b enabled
    let wide = unsafe { super::common_atoms_x86::X86::wide() };
    hammer(wide, shared, role, operands, view);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 and cx16 are present
    unsafe { avx2(shared, role, operands, view) }
}

#[inline(never)]
#[cfg(target_arch = "aarch64")]
fn portable(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    hammer(super::common_atoms_arm::Exclusive, shared, role, operands, view);
}

#[inline(never)]
#[cfg(target_arch = "aarch64")]
#[target_feature(enable = "lse")]
fn neon(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    // SAFETY: this function has lse enabled
    let lse = unsafe { super::common_atoms_arm::Lse::new() };
    hammer(lse, shared, role, operands, view);
}

#[cfg(target_arch = "aarch64")]
fn run_neon(shared: &Shared, role: usize, operands: &[[u64; ROUND]], view: &mut View) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Neon`, which `isa` makes only when lse is present
    unsafe { neon(shared, role, operands, view) }
}

impl Ready for Role {
    fn run(&mut self, out: &mut [u64]) {
        let Role { shared, role, operands, run } = self;
        let role = *role;
        if role == 0 {
            shared.start();
        }
        shared.meeting.meet(role);
        let mut view = View::default();
        run(shared, role, operands, &mut view);

        let sums: Vec<u64> = view.widths.iter().flat_map(|seen| seen.sums).chain(view.sums).collect();
        for (cell, &sum) in shared.told[role].0.iter().zip(&sums) {
            cell.store(sum, Ordering::Relaxed);
        }
        shared.meeting.meet(role);
        let told = &shared.told[1 - role].0;
        let mut both: Vec<u64> =
            sums.iter().zip(told).map(|(a, b)| a.wrapping_add(b.load(Ordering::Relaxed))).collect();
        let Shared { bytes, words, doubles, quads, ticket, wide: Apart((halves, pair)), .. } = &**shared;
        let swapped = [
            u8::load(&bytes.swapped).word(),
            u16::load(&words.swapped).word(),
            u32::load(&doubles.swapped).word(),
            u64::load(&quads.swapped).word(),
        ];
        for (width, end) in swapped.into_iter().enumerate() {
            both[3 * width + 2] = both[3 * width + 2].wrapping_add(mix(end));
        }
        let ends = [ends(bytes), ends(words), ends(doubles), ends(quads)];
        let load = |cell: &AtomicU64| cell.load(Ordering::Relaxed);
        let (by_width, [of_ticket, of_halves, of_low, of_high]) = both.split_last_chunk().expect("as many as SUMS");
        let words = [view.not_rising, view.foreign]
            .into_iter()
            .chain(view.widths.map(|seen| seen.own_bits))
            .chain(view.widths.map(|seen| seen.piece))
            .chain(
                view.widths
                    .iter()
                    .enumerate()
                    .flat_map(|(i, seen)| seen.added.map(move |sum| sum & (u64::MAX >> (64 - (8 << i))))),
            )
            .chain(ends.into_iter().flatten())
            .chain(by_width.iter().copied())
            .chain([load(&ticket.0), *of_ticket, load(halves), *of_halves])
            .chain([load(&pair.0[0]), load(&pair.0[1]), *of_low, *of_high]);
        let mut written = 0;
        for (to, word) in out.iter_mut().zip(words) {
            *to = word;
            written += 1;
        }
        assert_eq!(written, HALF, "words of one half");
    }
}

#[cfg(test)]
#[path = "common_counter_tests.rs"]
mod tests;
