//! `sync.ordering`: in which order two cores see each other's loads and stores.
//!
//! The litmus shapes of `common_shapes.rs` one after the other, each 32 times upon places of its own, while the other core does
//! its part upon the same places at the same time. What came out of each iteration is judged by the shape's table: an outcome
//! that the memory model forbids is counted; one that it allows is not, however weak. So the count is 0 whatever happens, on a
//! core that keeps order. Values are full words of the operand stream; each value of a place is told from its others by all of
//! its bits, and one that nobody has written there is counted apart, as foreign.
//!
//! Output of role 0, then the same of role 1; for each shape 3 words:
//! | word | | whose view |
//! |---|---|---|
//! | 0 | forbidden outcomes (0) | registers of both, places as this role found them at the end |
//! | 1 | foreign values (0) | registers of this role, places as this role found them at the end |
//! | 2 | digest: places at the end where they are determined, otherwise what in them and in the role's registers is foreign | this role alone |
//!
//! A forbidden outcome in both halves: a load done too early or a store seen too late; which of the two threads broke the order
//! cannot be told from the outcome, only from other pairs. In one half only, or foreign values in one half only: this role found
//! the places damaged or stale. Foreign values in both: the places are damaged, by the role that wrote them (X by role 0, Y by
//! role 1 in SB; X and Y by role 0 in MP, and so on by the table) or on the way.
//!
//! Operands in stream order: for each shape, for each iteration, the base word of X, then of Y. Value 0 of a place is its base,
//! values 1 and 2 are the base, exclusive or with 0x9e3779b97f4a7c15 and 0x6a09e667f3bcc908 (fractions of the golden ratio and
//! of √2): they differ whatever the base.

use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use super::common_access::{Access, Scalar, Spot};
use super::common_meet::{Apart, Meeting, chain};
use super::common_shapes::{COUNT, FOREIGN, Op, Outcome, Place, SHAPES, Shape};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

/// Iterations of a shape.
const TIMES: usize = 32;
/// Words of one role's output for a shape.
const SHOWN: usize = 3;
/// What tells the values of a place apart.
const MARKS: [u64; 3] = [0, 0x9e37_79b9_7f4a_7c15, 0x6a09_e667_f3bc_c908];

/// See the file's head.
pub struct MemoryOrder;

impl Kernel for MemoryOrder {
    fn id(&self) -> &'static str {
        "sync.ordering"
    }

    fn summary(&self) -> &'static str {
        "memory order between two cores: outcomes of litmus shapes that the memory model forbids"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(19)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * COUNT * SHOWN
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (COUNT * TIMES) as u64, unit: "litmus iteration" }
    }

    fn cpus(&self) -> usize {
        2
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["mfence", "sfence", "movnti", "xchg", "lock"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["vmovlps", "vmovhps", "vpbroadcastq", "vpextrq", "mfence", "xchg", "lock"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["stlr", "ldar", "dmb", "stnp", "ldaxr"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let (_, roles) = roles(case, proof.variant_for(self.id()));
        Roles::Two(roles.map(|role| Box::new(role) as Box<dyn Ready>))
    }
}

/// Base words of X and Y, by shape and iteration.
type Bases = [[[u64; 2]; TIMES]; COUNT];
/// What a role has loaded, by iteration.
type Registers = [[u64; 2]; TIMES];

/// Places and what the roles tell each other of what they loaded there.
struct Arena {
    places: [[Spot; 2]; TIMES],
    told: [Apart<[[AtomicU64; 2]; TIMES]>; 2],
}

/// What both roles have: two arenas, so that one can be made ready while the other is still looked at.
struct Shared {
    meeting: Meeting,
    arenas: [Arena; 2],
    bases: Bases,
}

type Run = fn(&Shared, usize, &mut [[u64; SHOWN]]);

struct Role {
    shared: Arc<Shared>,
    role: usize,
    run: Run,
}

fn roles(case: &Case, variant: Variant) -> (Arc<Shared>, [Role; 2]) {
    let mut operands = Operands::new(case);
    let bases = std::array::from_fn(|_| std::array::from_fn(|_| std::array::from_fn(|_| operands.word())));
    operands.finish(COUNT * TIMES * 2);
    let zero = || std::array::from_fn(|_| std::array::from_fn(|_| AtomicU64::new(0)));
    let arena = || Arena {
        places: std::array::from_fn(|_| std::array::from_fn(|_| Spot::default())),
        told: [Apart(zero()), Apart(zero())],
    };
    let shared = Arc::new(Shared { meeting: Meeting::new(), arenas: [arena(), arena()], bases });
    let run: Run = match variant {
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => run_avx2,
        _ => portable,
    };
    let roles = [0, 1].map(|role| Role { shared: Arc::clone(&shared), role, run });
    (shared, roles)
}

/// One access or fence. `op` is a constant wherever this is inlined to.
#[inline(always)]
fn step<A: Access>(a: A, op: Op, places: &[Spot; 2], bases: &[u64; 2], registers: &mut [u64; 2]) {
    let spot = |place: Place| &places[place as usize];
    let value = |place: Place, number: u8| bases[place as usize] ^ MARKS[number as usize];
    match op {
        Op::Write(place, number) => a.write(&spot(place).value, value(place, number)),
        Op::Release(place, number) => a.release(&spot(place).value, value(place, number)),
        Op::Stream(place, number) => a.stream(spot(place), value(place, number)),
        Op::Exchange(place, number) => a.exchange(&spot(place).value, value(place, number)),
        Op::Read(place, register) => registers[register as usize] = a.read(&spot(place).value),
        Op::Acquire(place, register) => registers[register as usize] = a.acquire(&spot(place).value),
        Op::Fence => a.fence(),
        Op::Locked => a.locked(),
        Op::Stores => a.stores(),
        Op::Nothing => {}
    }
}

/// A few cycles, by the top bits of a word: who is first, and by how much, changes from one iteration to the next.
#[inline(always)]
fn dally(word: u64) {
    for _ in 0..word >> 58 {
        // SAFETY: does nothing
        unsafe { std::arch::asm!("nop", "nop", "nop", "nop", options(nomem, nostack, preserves_flags)) };
    }
}

/// All iterations of one role's thread of one shape: straight code, no test of what comes next between two accesses.
#[inline(always)]
fn thread<A: Access, const SHAPE: usize, const ROLE: usize>(
    a: A,
    shared: &Shared,
    places: &[[Spot; 2]; TIMES],
) -> Registers {
    let [first, second, third] = const { SHAPES[SHAPE].threads[ROLE] };
    let mut all = [[0; 2]; TIMES];
    // a loop rather than a closure: that would be a function of its own, without the features of its caller
    for ((registers, places), bases) in all.iter_mut().zip(places).zip(&shared.bases[SHAPE]) {
        shared.meeting.draw_level(ROLE);
        dally(bases[ROLE]);
        step(a, first, places, bases, registers);
        step(a, second, places, bases, registers);
        step(a, third, places, bases, registers);
    }
    all
}

/// Which place each register of a thread is loaded from.
fn sources(thread: &[Op; 3]) -> [Option<Place>; 2] {
    let mut sources = [None; 2];
    for op in thread {
        if let Op::Read(place, register) | Op::Acquire(place, register) = *op {
            sources[register as usize] = Some(place);
        }
    }
    sources
}

/// The number of a value of a place, and what in the word is foreign.
fn number(word: u64, base: u64) -> (u8, u64) {
    match MARKS.iter().position(|mark| base ^ mark == word) {
        Some(number) => (number as u8, 0),
        None => (FOREIGN, word ^ base),
    }
}

/// What one role makes of all iterations of a shape.
fn judge(shape: &Shape, role: usize, arena: &Arena, bases: &[[u64; 2]; TIMES]) -> [u64; SHOWN] {
    let (mut forbidden, mut foreign, mut digest) = (0, 0, 0);
    let sources = [sources(&shape.threads[0]), sources(&shape.threads[1])];
    for (i, base) in bases.iter().enumerate() {
        let mut outcome = Outcome { seen: [[0; 2]; 2], ends: [0; 2] };
        for (who, sources) in sources.iter().enumerate() {
            for (register, place) in sources.iter().enumerate() {
                let Some(place) = place else { continue };
                let word = arena.told[who].0[i][register].load(Ordering::Relaxed);
                let (seen, odd) = number(word, base[*place as usize]);
                outcome.seen[who][register] = seen;
                if who == role {
                    foreign += u64::from(seen == FOREIGN);
                    digest = chain(digest, odd);
                }
            }
        }
        for (place, spot) in arena.places[i].iter().enumerate() {
            let word = spot.value.load(Ordering::Relaxed);
            let (end, odd) = number(word, base[place]);
            outcome.ends[place] = end;
            foreign += u64::from(end == FOREIGN);
            digest = chain(digest, if shape.ends[place].is_some() { word } else { odd });
        }
        forbidden += u64::from(shape.forbids(&outcome));
    }
    [forbidden, foreign, digest]
}

/// One shape from start to judgement.
#[inline(always)]
fn shape<A: Access, const SHAPE: usize>(a: A, shared: &Shared, role: usize, out: &mut [[u64; SHOWN]]) {
    let (arena, bases) = (&shared.arenas[SHAPE % 2], &shared.bases[SHAPE]);
    // each role makes every other iteration's places ready; the partner has judged this arena before it came to the last meeting
    for (places, bases) in arena.places.iter().zip(bases).skip(role).step_by(2) {
        for (spot, &base) in places.iter().zip(bases) {
            spot.value.store(base, Ordering::Relaxed);
        }
    }
    shared.meeting.meet(role);
    let registers = match role {
        0 => thread::<A, SHAPE, 0>(a, shared, &arena.places),
        _ => thread::<A, SHAPE, 1>(a, shared, &arena.places),
    };
    for (cells, words) in arena.told[role].0.iter().zip(registers) {
        for (cell, word) in cells.iter().zip(words) {
            cell.store(word, Ordering::Relaxed);
        }
    }
    // what is stored past the caches is not ordered by the meeting itself
    a.stores();
    shared.meeting.meet(role);
    out[SHAPE] = judge(&SHAPES[SHAPE], role, arena, bases);
}

macro_rules! shapes {
    ($a:expr, $shared:expr, $role:expr, $out:expr; $($number:literal)*) => {
        const _: () = assert!([$($number),*].len() == COUNT);
        $(shape::<_, $number>($a, $shared, $role, $out);)*
    };
}

#[inline(always)]
fn all<A: Access>(a: A, shared: &Shared, role: usize, out: &mut [[u64; SHOWN]]) {
    shapes!(a, shared, role, out; 0 1 2 3 4 5 6 7 8 9 10 11 12 13 14 15 16);
}

#[inline(never)]
fn portable(shared: &Shared, role: usize, out: &mut [[u64; SHOWN]]) {
    all(Scalar, shared, role, out);
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn avx2(shared: &Shared, role: usize, out: &mut [[u64; SHOWN]]) {
    // SAFETY: this function has avx2 enabled
    let vector = unsafe { super::common_access::Vector::new() };
    all(vector, shared, role, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(shared: &Shared, role: usize, out: &mut [[u64; SHOWN]]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 is present
    unsafe { avx2(shared, role, out) }
}

impl Ready for Role {
    fn run(&mut self, out: &mut [u64]) {
        let Role { shared, role, run } = self;
        let (rows, rest) = out.as_chunks_mut::<SHOWN>();
        assert_eq!((rows.len(), rest.len()), (COUNT, 0), "words of one half");
        run(shared, *role, rows);
    }
}

#[cfg(test)]
#[path = "common_ordering_tests.rs"]
mod tests;
