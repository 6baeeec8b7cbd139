//! `sync.lock`: two cores take turns, under five kinds of lock, at a record of four cache lines.
//!
//! Each lock guards a record of its own: 30 words, the count n of updates and the sum S of their operands. An update adds its
//! operand x to S, 1 to n, and x + dᵢ to word i, where dᵢ is a 32-bit number of that word. Updates commute, so the end does not
//! depend on who comes first, and a whole record can be told from a torn one at any time: word i is always startᵢ + S + n·dᵢ.
//! Every holder looks at all words before it updates, and again after. A lock that lets both in, a line that is stale, a store
//! that gets lost or comes late leave a torn record.
//!
//! The locks, each by instructions of its own: `swap` (test and set by exchange, after a test that does not write), `ticket`
//! (exchange and add), `bit` (bit set and bit cleared under lock), `queue` (Mellor-Crummey and Scott, ACM TOCS 1991: the waiter
//! spins on a line of its own, handed over by the holder; exchange, compare and swap), `fence` (Peterson, IPL 1981: loads, stores
//! and a full fence between them, no read-modify-write at all).
//!
//! Also for each update h(S after) − h(S before), added up over both roles, is h(S at the end) − h(S at the start), for h a
//! bijection that mixes well: an update that was done upon a stale sum, whole as its record may have looked, breaks it.
//!
//! Output of role 0, then the same of role 1; for each lock in the above order 6 words:
//! | word | | whose view |
//! |---|---|---|
//! | 0 | torn words that this role met as a holder (0) | this role alone |
//! | 1 | sum of the operands that it added | this role alone, no shared memory |
//! | 2 | n at the end | this role's view of shared memory |
//! | 3 | S at the end | this role's view |
//! | 4 | digest of the 30 words at the end | this role's view |
//! | 5 | sum of h over both roles | both |
//!
//! Word 1 wrong: the role itself. Words 2–5 wrong and equal in both halves: an update was lost or torn, by either; a torn count
//! in one half only says that this role saw the damage first, so its partner made it or it read stale data. Words 2–4 wrong in
//! one half only: this role read stale or damaged data.
//!
//! Operands in stream order: for each lock 30 starts, the start of S, then 15 words of numbers d, the lower 32 bits first; then
//! for role 0, then role 1, in each of 48 rounds one x for each lock.

use std::cell::UnsafeCell;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use super::common_atoms::Atoms;
use super::common_locks::{Bit, Fence, Lock, Queue, Swap, Ticket};
use super::common_meet::{Apart, Meeting, chain, mix};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const LOCKS: usize = 5;
const ROUNDS: usize = 48;
/// Words of a record beside its count and sum.
const WORDS: usize = 30;
/// Operand words of one lock: starts, start of the sum, numbers d.
const SETUP: usize = WORDS + 1 + WORDS / 2;
/// Output words of one lock and role.
const SHOWN: usize = 6;

/// See the file's head.
pub struct Locks;

impl Kernel for Locks {
    fn id(&self) -> &'static str {
        "sync.lock"
    }

    fn summary(&self) -> &'static str {
        "mutual exclusion: two cores update records of several cache lines under five kinds of lock"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(9)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * LOCKS * SHOWN
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * ROUNDS * LOCKS) as u64, unit: "locked update" }
    }

    fn cpus(&self) -> usize {
        2
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["lock", "xchg", "mfence", "pause", "paddq", "pmuludq"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["lock", "xchg", "mfence", "pause", "vpaddq", "vpmuludq"],
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
                    marks: &["ldaxr", "stlxr", "dmb", "ldar", "stlr"],
                    proven: Proven::Emulator,
                },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon, Feature::ArmLse],
                    marks: &["ldadd", "swp", "cas", "ldset", "dmb", "umull"],
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

/// What a lock guards. Four lines.
#[repr(C, align(128))]
#[derive(Clone)]
struct Record {
    words: [u64; WORDS],
    count: u64,
    sum: u64,
}

/// What a record is checked against: its start and the numbers d.
struct Setup {
    start: [u64; WORDS],
    sum: u64,
    numbers: [u32; WORDS],
}

impl Setup {
    fn draw(operands: &mut Operands) -> Setup {
        let start = std::array::from_fn(|_| operands.word());
        let sum = operands.word();
        let halves: Vec<u32> = operands.words(WORDS / 2).iter().flat_map(|&w| [w as u32, (w >> 32) as u32]).collect();
        Setup { start, sum, numbers: std::array::from_fn(|i| halves[i]) }
    }

    fn record(&self) -> Record {
        Record { words: self.start, count: 0, sum: self.sum }
    }

    /// How many words do not fit the record's count and sum.
    #[inline(always)]
    fn torn(&self, record: &Record) -> u64 {
        let added = record.sum.wrapping_sub(self.sum);
        let mut torn = 0;
        for i in 0..WORDS {
            // the count stays small: one 32-bit product
            let counted = u64::from(record.count as u32) * u64::from(self.numbers[i]);
            torn += u64::from(record.words[i] != self.start[i].wrapping_add(added).wrapping_add(counted));
        }
        torn
    }
}

/// A lock and the record that it guards.
struct Guarded<L> {
    lock: Apart<L>,
    record: UnsafeCell<Record>,
    setup: Setup,
}

// SAFETY: the record is touched only while its lock is held, or by role 0 before the roles have met
unsafe impl<L: Sync> Sync for Guarded<L> {}

impl<L: Lock> Guarded<L> {
    fn draw(operands: &mut Operands) -> Guarded<L> {
        let setup = Setup::draw(operands);
        Guarded { lock: Apart(L::default()), record: UnsafeCell::new(setup.record()), setup }
    }

    /// Runs `body` on the record, as its only holder.
    #[inline(always)]
    fn hold<A: Atoms, T>(&self, a: A, role: usize, body: impl FnOnce(&Setup, &mut Record) -> T) -> T {
        self.lock.0.take(a, role);
        // SAFETY: the lock is held, and taking it ordered this after all that the last holder did
        let result = body(&self.setup, unsafe { &mut *self.record.get() });
        self.lock.0.release(a, role);
        result
    }

    /// Puts the record back to its start.
    ///
    /// # Safety
    /// Nobody else may touch the record.
    unsafe fn reset(&self) {
        // SAFETY: the caller's promise
        unsafe { *self.record.get() = self.setup.record() };
    }
}

/// What both roles have.
struct Shared {
    meeting: Meeting,
    swap: Guarded<Swap>,
    ticket: Guarded<Ticket>,
    bit: Guarded<Bit>,
    queue: Guarded<Queue>,
    fence: Guarded<Fence>,
    /// What each role tells the other of its sums of h.
    told: [Apart<[AtomicU64; LOCKS]>; 2],
}

/// What one role has seen of one lock.
#[derive(Clone, Copy, Default)]
struct Seen {
    torn: u64,
    added: u64,
    telescoped: u64,
}

/// Count, sum and digest at the end.
type End = [u64; 3];
type Run = fn(&Shared, usize, &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]);

struct Role {
    shared: Arc<Shared>,
    role: usize,
    operands: Vec<[u64; LOCKS]>,
    run: Run,
}

fn roles(case: &Case, variant: Variant) -> (Arc<Shared>, [Role; 2]) {
    let mut operands = Operands::new(case);
    let shared = Arc::new(Shared {
        meeting: Meeting::new(),
        swap: Guarded::draw(&mut operands),
        ticket: Guarded::draw(&mut operands),
        bit: Guarded::draw(&mut operands),
        queue: Guarded::draw(&mut operands),
        fence: Guarded::draw(&mut operands),
        told: std::array::from_fn(|_| Apart(std::array::from_fn(|_| AtomicU64::new(0)))),
    });
    let mut list = || (0..ROUNDS).map(|_| std::array::from_fn(|_| operands.word())).collect();
    let lists = [list(), list()];
    operands.finish(LOCKS * SETUP + 2 * ROUNDS * LOCKS);
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

/// One update. Both roles come to the lock at about the same time, or the second would walk behind the first, a lock apart.
#[inline(always)]
fn update<A: Atoms, L: Lock>(a: A, meeting: &Meeting, guarded: &Guarded<L>, role: usize, x: u64, seen: &mut Seen) {
    let setup = &guarded.setup;
    meeting.draw_level(role);
    guarded.lock.0.take(a, role);
    // SAFETY: the lock is held, and taking it ordered this after all that the last holder did
    let record = unsafe { &mut *guarded.record.get() };
    seen.torn += setup.torn(record);
    let before = record.sum;
    for (word, &number) in record.words.iter_mut().zip(&setup.numbers) {
        *word = word.wrapping_add(x).wrapping_add(u64::from(number));
    }
    record.count = record.count.wrapping_add(1);
    record.sum = before.wrapping_add(x);
    // another look, at what is in memory rather than in registers: a partner that came in between shows at once
    let record = std::hint::black_box(record);
    seen.torn += setup.torn(record);
    let after = record.sum;
    guarded.lock.0.release(a, role);
    seen.added = seen.added.wrapping_add(x);
    seen.telescoped = seen.telescoped.wrapping_add(mix(after)).wrapping_sub(mix(before));
}

#[inline(always)]
fn end<A: Atoms, L: Lock>(a: A, guarded: &Guarded<L>, role: usize) -> End {
    guarded.hold(a, role, |_, record| [record.count, record.sum, record.words.iter().fold(0, |d, &w| chain(d, w))])
}

#[inline(always)]
fn contend<A: Atoms>(a: A, shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    let mut seen = [Seen::default(); LOCKS];
    let meeting = &shared.meeting;
    for x in operands {
        update(a, meeting, &shared.swap, role, x[0], &mut seen[0]);
        update(a, meeting, &shared.ticket, role, x[1], &mut seen[1]);
        update(a, meeting, &shared.bit, role, x[2], &mut seen[2]);
        update(a, meeting, &shared.queue, role, x[3], &mut seen[3]);
        update(a, meeting, &shared.fence, role, x[4], &mut seen[4]);
    }
    for (cell, seen) in shared.told[role].0.iter().zip(&seen) {
        cell.store(seen.telescoped, Ordering::Relaxed);
    }
    shared.meeting.meet(role);
    let ends = [
        end(a, &shared.swap, role),
        end(a, &shared.ticket, role),
        end(a, &shared.bit, role),
        end(a, &shared.queue, role),
        end(a, &shared.fence, role),
    ];
    (seen, ends)
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
fn portable(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    contend(super::common_atoms_x86::X86::baseline(), shared, role, operands)
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn avx2(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    contend(super::common_atoms_x86::X86::baseline(), shared, role, operands)
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 is present
    unsafe { avx2(shared, role, operands) }
}

#[inline(never)]
#[cfg(target_arch = "aarch64")]
fn portable(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    contend(super::common_atoms_arm::Exclusive, shared, role, operands)
}

#[inline(never)]
#[cfg(target_arch = "aarch64")]
#[target_feature(enable = "lse")]
fn neon(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    // SAFETY: this function has lse enabled
    let lse = unsafe { super::common_atoms_arm::Lse::new() };
    contend(lse, shared, role, operands)
}

#[cfg(target_arch = "aarch64")]
fn run_neon(shared: &Shared, role: usize, operands: &[[u64; LOCKS]]) -> ([Seen; LOCKS], [End; LOCKS]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Neon`, which `isa` makes only when lse is present
    unsafe { neon(shared, role, operands) }
}

impl Ready for Role {
    fn run(&mut self, out: &mut [u64]) {
        let Role { shared, role, operands, run } = self;
        if *role == 0 {
            let Shared { swap, ticket, bit, queue, fence, .. } = &**shared;
            // SAFETY: role 1 touches no record before the roles have met, and has returned from the last run; see `Roles`
            unsafe {
                swap.reset();
                ticket.reset();
                bit.reset();
                queue.reset();
                fence.reset();
            }
        }
        shared.meeting.meet(*role);
        let (seen, ends) = run(shared, *role, operands);
        let (rows, _) = out.as_chunks_mut::<SHOWN>();
        assert_eq!(rows.len(), LOCKS, "words of one half");
        for (lock, row) in rows.iter_mut().enumerate() {
            let Seen { torn, added, telescoped } = seen[lock];
            let theirs = shared.told[1 - *role].0[lock].load(Ordering::Relaxed);
            let [count, sum, digest] = ends[lock];
            *row = [torn, added, count, sum, digest, telescoped.wrapping_add(theirs)];
        }
    }
}

#[cfg(test)]
#[path = "common_lock_tests.rs"]
mod tests;
