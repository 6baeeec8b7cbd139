//! `sync.pingpong`: cache lines change hands between two cores, back and forth, and each owner transforms them.
//!
//! A ball is some words and a turn number. Whose turn it is, owns the words: loads them (acquire), transforms them with its
//! operands, stores them, and passes the ball by writing the next turn number (release). Word j becomes
//! rotl₂₃(word_{j+1} + k_{j mod 8}), indices modulo the length: a bijection that does not commute with the next one's, so that a
//! wrong word stays wrong to the end, and so does one that was taken from an earlier turn. Two balls are in the air at a time,
//! so that both roles are busy and lines travel both ways: in step s role r has ball (s + r) mod 2.
//!
//! Four kinds of ball, each passed on in another way:
//! - `line`: 7 words and the turn in one cache line, plain stores
//! - `spread`: 32 words in four lines, the turn in a fifth, written by exchange
//! - `stream`: the same, but the words are stored past the caches (non-temporal) and a store fence comes before the turn
//! - `flush`: the same, but each line is written back and thrown out of all caches before the turn, with a full fence
//!
//! Output of role 0, then the same of role 1: for each kind in the above order, for each quarter of 8 steps, 2 words:
//! | word | |
//! |---|---|
//! | 0 | digest of the words as this role received them in its turns of the quarter |
//! | 1 | digest of the words as this role made them, before they were stored |
//!
//! Wrong words spread to all later quarters, so the first that is wrong counts. Where a role's *received* digest is wrong
//! while all that the partner has *made* up to then is right, the words were damaged between the two: stored wrongly by the
//! partner, loaded wrongly or too early by this role, or on the way. Where what a role *made* is wrong while what it received is
//! right, this role computed wrongly.
//!
//! Operands in stream order: for each kind the starts of ball 0, then of ball 1; then for each kind in each of 32 steps 8 words
//! for role 0, 8 for role 1.

use std::cell::UnsafeCell;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use super::common_carry::Carry;
use super::common_meet::{Meeting, chain, wait};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const KINDS: usize = 4;
const STEPS: usize = 32;
/// Steps that share their digests.
const QUARTER: usize = 8;
const QUARTERS: usize = STEPS / QUARTER;
/// Words of the smallest ball, with its turn in the same line, and of the others.
const SMALL: usize = 7;
const LARGE: usize = 32;
/// Words of one role's output.
const HALF: usize = KINDS * QUARTERS * 2;

/// See the file's head.
pub struct PingPong;

impl Kernel for PingPong {
    fn id(&self) -> &'static str {
        "sync.pingpong"
    }

    fn summary(&self) -> &'static str {
        "ownership of cache lines passed between two cores: in cache, past it, through memory"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(21)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * HALF
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (2 * STEPS * KINDS) as u64, unit: "hand-over" }
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
                    marks: &["movnti", "movntdq", "sfence", "clflush", "mfence", "xchg", "rol"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &["vmovntdq", "vmovntps", "sfence", "clflush", "mfence", "xchg", "vpaddq", "vpsrlq"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["stnp", "dmb", "dc", "stlr", "ldar"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        Roles::Two(roles(case, proof.variant_for(self.id())).map(|role| Box::new(role) as Box<dyn Ready>))
    }
}

/// The words, and in which step who may touch them: a small ball is one line, a large one four and one for the turn.
#[repr(C, align(128))]
struct Ball<const N: usize> {
    words: UnsafeCell<[u64; N]>,
    turn: AtomicU64,
}

// SAFETY: the words are touched only by the role whose turn it is, who learns of that by an acquiring load of what the other
// wrote by a releasing store; or by role 0 before the roles have met
unsafe impl<const N: usize> Sync for Ball<N> {}

/// Two balls of one kind and what they start from.
struct Game<const N: usize> {
    balls: [Ball<N>; 2],
    starts: [[u64; N]; 2],
}

impl<const N: usize> Game<N> {
    fn draw(operands: &mut Operands) -> Game<N> {
        let starts = std::array::from_fn(|_| std::array::from_fn(|_| operands.word()));
        Game { balls: starts.map(|start| Ball { words: UnsafeCell::new(start), turn: AtomicU64::new(0) }), starts }
    }

    /// Puts the balls back to their starts.
    ///
    /// # Safety
    /// Nobody else may touch the balls.
    unsafe fn reset(&self) {
        for (ball, start) in self.balls.iter().zip(&self.starts) {
            // SAFETY: the caller's promise
            unsafe { *ball.words.get() = *start };
            ball.turn.store(0, Ordering::Relaxed);
        }
    }
}

/// What both roles have.
struct Shared {
    meeting: Meeting,
    line: Game<SMALL>,
    spread: Game<LARGE>,
    stream: Game<LARGE>,
    flush: Game<LARGE>,
}

/// One role's operands of each kind, by step.
type Moves = [[[u64; 8]; STEPS]; KINDS];
/// Digests of what was received and made, by kind and quarter.
type Digests = [[[u64; 2]; QUARTERS]; KINDS];
type Run = fn(&Shared, usize, &Moves) -> Digests;

struct Role {
    shared: Arc<Shared>,
    role: usize,
    moves: Box<Moves>,
    run: Run,
}

fn roles(case: &Case, variant: Variant) -> [Role; 2] {
    let mut operands = Operands::new(case);
    let shared = Arc::new(Shared {
        meeting: Meeting::new(),
        line: Game::draw(&mut operands),
        spread: Game::draw(&mut operands),
        stream: Game::draw(&mut operands),
        flush: Game::draw(&mut operands),
    });
    let mut moves = [Box::new([[[0; 8]; STEPS]; KINDS]), Box::new([[[0; 8]; STEPS]; KINDS])];
    for kind in 0..KINDS {
        for step in 0..STEPS {
            for list in &mut moves {
                list[kind][step] = std::array::from_fn(|_| operands.word());
            }
        }
    }
    operands.finish(2 * (SMALL + 3 * LARGE) + KINDS * STEPS * 2 * 8);
    let run: Run = match variant {
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => run_avx2,
        _ => portable,
    };
    let mut role = 0;
    moves.map(|moves| {
        role += 1;
        Role { shared: Arc::clone(&shared), role: role - 1, moves, run }
    })
}

/// Where a fault may be put in: tests do, the kernel's own runs pass [`Faultless`].
trait Fault {
    /// Words as received, before they are digested.
    fn received(&self, role: usize, kind: usize, step: usize, words: &mut [u64]);
    /// Words as made, before they are digested.
    fn made(&self, role: usize, kind: usize, step: usize, words: &mut [u64]);
    /// Words after they were digested, before they are stored.
    fn stored(&self, role: usize, kind: usize, step: usize, words: &mut [u64]);
}

/// Nothing is changed.
struct Faultless;

impl Fault for Faultless {
    #[inline(always)]
    fn received(&self, _role: usize, _kind: usize, _step: usize, _words: &mut [u64]) {}
    #[inline(always)]
    fn made(&self, _role: usize, _kind: usize, _step: usize, _words: &mut [u64]) {}
    #[inline(always)]
    fn stored(&self, _role: usize, _kind: usize, _step: usize, _words: &mut [u64]) {}
}

/// Who plays which kind in which way.
struct Player<'a, F> {
    role: usize,
    kind: usize,
    moves: &'a Moves,
    fault: &'a F,
}

impl<F: Fault> Player<'_, F> {
    /// All steps of one kind: `put` stores the words, `pass` writes the turn.
    #[inline(always)]
    fn play<const N: usize>(
        &self,
        game: &Game<N>,
        put: impl Fn(*mut [u64; N], &[u64; N]),
        pass: impl Fn(&AtomicU64, u64),
    ) -> [[u64; 2]; QUARTERS] {
        let Player { role, kind, moves, fault } = *self;
        let mut digests = [[0; 2]; QUARTERS];
        for (step, k) in moves[kind].iter().enumerate() {
            let ball = &game.balls[(step + role) % 2];
            wait(|| ball.turn.load(Ordering::Acquire) == step as u64);
            // SAFETY: it is this role's turn
            let mut received = unsafe { *ball.words.get() };
            fault.received(role, kind, step, &mut received);
            let mut made = [0; N];
            made[..N - 1].copy_from_slice(&received[1..]);
            made[N - 1] = received[0];
            for words in made.chunks_mut(k.len()) {
                for (word, k) in words.iter_mut().zip(k) {
                    *word = word.wrapping_add(*k).rotate_left(23);
                }
            }
            fault.made(role, kind, step, &mut made);
            let [of_received, of_made] = &mut digests[step / QUARTER];
            for (&r, &m) in received.iter().zip(&made) {
                *of_received = chain(*of_received, r);
                *of_made = chain(*of_made, m);
            }
            fault.stored(role, kind, step, &mut made);
            put(ball.words.get(), &made);
            pass(&ball.turn, step as u64 + 1);
        }
        digests
    }
}

/// All kinds, one after the other.
#[inline(always)]
fn play<C: Carry, F: Fault>(carry: C, shared: &Shared, role: usize, moves: &Moves, fault: &F) -> Digests {
    let player = |kind| Player { role, kind, moves, fault };
    // SAFETY: `Player::play` hands out the words of the ball whose turn it is, which are this role's
    let plain = |to: *mut [u64; LARGE], words: &[u64; LARGE]| unsafe { *to = *words };
    let release = |turn: &AtomicU64, next| turn.store(next, Ordering::Release);
    [
        // SAFETY: as above
        player(0).play(&shared.line, |to, words| unsafe { *to = *words }, release),
        player(1).play(&shared.spread, plain, |turn, next| {
            turn.swap(next, Ordering::AcqRel);
        }),
        player(2).play(
            &shared.stream,
            // SAFETY: as above; a ball is aligned to 128 bytes
            |to, words| unsafe { carry.stream(to.cast(), words.as_chunks().0) },
            release,
        ),
        player(3).play(
            &shared.flush,
            |to, words| {
                plain(to, words);
                // SAFETY: as above; a ball is aligned to 128 bytes
                unsafe { carry.flush(to.cast(), LARGE / 8) };
            },
            release,
        ),
    ]
}

#[inline(never)]
fn portable(shared: &Shared, role: usize, moves: &Moves) -> Digests {
    play(super::common_carry::Baseline, shared, role, moves, &Faultless)
}

#[inline(never)]
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn avx2(shared: &Shared, role: usize, moves: &Moves) -> Digests {
    // SAFETY: this function has avx2 enabled
    let carry = unsafe { super::common_carry::Avx::new() };
    play(carry, shared, role, moves, &Faultless)
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(shared: &Shared, role: usize, moves: &Moves) -> Digests {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 is present
    unsafe { avx2(shared, role, moves) }
}

impl Role {
    fn run_with(&self, out: &mut [u64], run: impl FnOnce(&Shared, usize, &Moves) -> Digests) {
        let Role { shared, role, moves, .. } = self;
        if *role == 0 {
            let Shared { line, spread, stream, flush, .. } = &**shared;
            // SAFETY: role 1 touches no ball before the roles have met, and has returned from the last run; see `Roles`
            unsafe {
                line.reset();
                spread.reset();
                stream.reset();
                flush.reset();
            }
        }
        shared.meeting.meet(*role);
        out.copy_from_slice(run(shared, *role, moves).as_flattened().as_flattened());
    }
}

impl Ready for Role {
    fn run(&mut self, out: &mut [u64]) {
        self.run_with(out, self.run);
    }
}

#[cfg(test)]
#[path = "common_pingpong_tests.rs"]
mod tests;
