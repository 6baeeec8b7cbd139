//! Five locks for two roles. Each is taken and released by instructions of its own, and orders what its holders do.

use std::sync::atomic::{AtomicU8, AtomicU32, AtomicU64, Ordering};

use super::common_atoms::{Atoms, Locked};
use super::common_meet::{Apart, wait};

/// A lock that two roles contend for. Free when made by `default`, and again when every holder has released it.
pub trait Lock: Default + Sync {
    /// Waits until this role holds the lock.
    fn take<A: Atoms>(&self, a: A, role: usize);
    /// Hands it on. To be called by its holder.
    fn release<A: Atoms>(&self, a: A, role: usize);
}

/// Test and set by exchange.
#[derive(Default)]
pub struct Swap(AtomicU8);

impl Lock for Swap {
    #[inline(always)]
    fn take<A: Atoms>(&self, a: A, _role: usize) {
        // looks first, so that a waiter does not take the line from the holder all the time
        wait(|| self.0.load(Ordering::Relaxed) == 0 && Locked::<u8>::swap(a, &self.0, 1) == 0);
    }

    #[inline(always)]
    fn release<A: Atoms>(&self, _a: A, _role: usize) {
        self.0.store(0, Ordering::Release);
    }
}

/// First come, first served, by exchange and add.
#[derive(Default)]
pub struct Ticket {
    next: AtomicU32,
    served: AtomicU32,
}

impl Lock for Ticket {
    #[inline(always)]
    fn take<A: Atoms>(&self, a: A, _role: usize) {
        let mine: u32 = a.exchange_add(&self.next, 1);
        wait(|| self.served.load(Ordering::Acquire) == mine);
    }

    #[inline(always)]
    fn release<A: Atoms>(&self, _a: A, _role: usize) {
        // only the holder writes it
        let served = self.served.load(Ordering::Relaxed);
        self.served.store(served.wrapping_add(1), Ordering::Release);
    }
}

/// One bit, set and cleared under lock, in a word whose other bits are never touched.
#[derive(Default)]
pub struct Bit(AtomicU64);

const BIT: u32 = 37;

impl Lock for Bit {
    #[inline(always)]
    fn take<A: Atoms>(&self, a: A, _role: usize) {
        wait(|| self.0.load(Ordering::Relaxed) >> BIT & 1 == 0 && !Locked::<u64>::set(a, &self.0, BIT));
    }

    #[inline(always)]
    fn release<A: Atoms>(&self, a: A, _role: usize) {
        Locked::<u64>::clear(a, &self.0, BIT);
    }
}

/// The queue lock of Mellor-Crummey and Scott, ACM TOCS 9(1), 1991 (from memory), its nodes numbered by role from 1.
#[derive(Default)]
pub struct Queue {
    tail: Apart<AtomicU64>,
    nodes: [Apart<Node>; 2],
}

/// A role's place in the queue; it waits on its own line.
#[derive(Default)]
struct Node {
    next: AtomicU64,
    waits: AtomicU64,
}

impl Lock for Queue {
    #[inline(always)]
    fn take<A: Atoms>(&self, a: A, role: usize) {
        let mine = &self.nodes[role].0;
        mine.next.store(0, Ordering::Relaxed);
        mine.waits.store(1, Ordering::Relaxed);
        let before: u64 = a.swap(&self.tail.0, role as u64 + 1);
        if before != 0 {
            // with two roles the other one is the only one that can be ahead
            self.nodes[1 - role].0.next.store(role as u64 + 1, Ordering::Release);
            wait(|| mine.waits.load(Ordering::Acquire) == 0);
        }
    }

    #[inline(always)]
    fn release<A: Atoms>(&self, a: A, role: usize) {
        let mine = &self.nodes[role].0;
        let me = role as u64 + 1;
        if mine.next.load(Ordering::Acquire) == 0 {
            if a.compare(&self.tail.0, me, 0) == me {
                return;
            }
            // somebody is in the queue, but has not yet said so
            wait(|| mine.next.load(Ordering::Acquire) != 0);
        }
        self.nodes[1 - role].0.waits.store(0, Ordering::Release);
    }
}

/// Peterson's algorithm (Information Processing Letters 12(3), 1981; from memory): no read-modify-write at all. It rests on
/// the fence: without it each role's load of the other's wish may be done before its own wish is seen.
#[derive(Default)]
pub struct Fence {
    wishes: [Apart<AtomicU64>; 2],
    yields: Apart<AtomicU64>,
}

impl Lock for Fence {
    #[inline(always)]
    fn take<A: Atoms>(&self, a: A, role: usize) {
        self.wishes[role].0.store(1, Ordering::Relaxed);
        // release: the wish is seen before the courtesy
        self.yields.0.store(role as u64, Ordering::Release);
        a.fence();
        wait(|| {
            self.wishes[1 - role].0.load(Ordering::Acquire) == 0 || self.yields.0.load(Ordering::Acquire) != role as u64
        });
    }

    #[inline(always)]
    fn release<A: Atoms>(&self, _a: A, role: usize) {
        self.wishes[role].0.store(0, Ordering::Release);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Each role adds to a number that is no atomic operation: without exclusion additions get lost.
    fn excludes<L: Lock, A: Atoms + Send>(a: A) {
        const TIMES: u64 = 2000;
        let lock = L::default();
        let number = AtomicU64::new(0);
        std::thread::scope(|s| {
            for role in 0..2 {
                let (lock, number) = (&lock, &number);
                s.spawn(move || {
                    for _ in 0..TIMES {
                        lock.take(a, role);
                        let seen = number.load(Ordering::Relaxed);
                        std::hint::spin_loop();
                        number.store(seen + 1, Ordering::Relaxed);
                        lock.release(a, role);
                    }
                });
            }
        });
        assert_eq!(number.into_inner(), 2 * TIMES);
    }

    fn all<A: Atoms + Send>(a: A) {
        excludes::<Swap, A>(a);
        excludes::<Ticket, A>(a);
        excludes::<Bit, A>(a);
        excludes::<Queue, A>(a);
        excludes::<Fence, A>(a);
    }

    #[test]
    fn every_lock_excludes() {
        #[cfg(target_arch = "x86_64")]
        all(super::super::common_atoms_x86::X86::baseline());
        #[cfg(target_arch = "aarch64")]
        all(super::super::common_atoms_arm::Exclusive);
    }
}
