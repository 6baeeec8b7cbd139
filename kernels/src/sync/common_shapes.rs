//! Litmus shapes of two threads: what each thread does, and which outcomes no memory model of ours permits.
//!
//! The names are those of the literature (Alglave, Maranget, Tautschnig, "Herding cats", TOPLAS 36(2), 2014). The same outcomes
//! are forbidden by x86-TSO (Sewell, Sarkar, Owens, Zappa Nardelli, Myreen, "x86-TSO", CACM 53(7), 2010) and by ARMv8 with the
//! acquire, release and barrier instructions that stand here, whose barriers x86 mostly does not need. Intel's manual, volume
//! 3A, chapter "Memory ordering", gives some of them as examples. All citations from memory; a test derives the forbidden
//! outcomes of every shape from the store-buffer machine of the x86-TSO paper and finds just the ones listed.

/// One of a shape's two places, each on a cache line of its own.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Place {
    /// The first.
    X,
    /// The second.
    Y,
}

/// One access or fence. Values are numbered: 0 is what a place starts from. Registers are numbered by role.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Op {
    /// Store.
    Write(Place, u8),
    /// Store that comes after all earlier accesses of its thread (x86: any store).
    Release(Place, u8),
    /// Store past the caches, which only a store fence orders.
    Stream(Place, u8),
    /// Exchange: a store that is seen before the thread's next load is done.
    Exchange(Place, u8),
    /// Load to a register.
    Read(Place, u8),
    /// Load that comes before all later accesses of its thread (x86: any load).
    Acquire(Place, u8),
    /// Full fence.
    Fence,
    /// Full fence by a locked operation on a line of the thread's own (x86; elsewhere as `Fence`).
    Locked,
    /// Fence between stores.
    Stores,
    /// Nothing; fills up a thread.
    Nothing,
}

/// One thing that may be so at the end of an iteration.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fact {
    /// This role's register holds the value of this number.
    Seen(usize, usize, u8),
    /// This place holds the value of this number.
    End(Place, u8),
}

/// A litmus shape.
#[derive(Debug)]
pub struct Shape {
    /// The name in the literature, and what the threads use to keep order.
    pub name: &'static str,
    /// What each role does.
    pub threads: [[Op; 3]; 2],
    /// The number of the value that each place must hold at the end, where that is determined.
    pub ends: [Option<u8>; 2],
    /// Outcomes that are forbidden, each a conjunction of facts, beside those against `ends`.
    pub forbidden: &'static [&'static [Fact]],
}

/// What came out of one iteration, in numbers of values.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Outcome {
    /// Registers by role.
    pub seen: [[u8; 2]; 2],
    /// Places.
    pub ends: [u8; 2],
}

/// The number that stands for a value which nobody has written.
pub const FOREIGN: u8 = 3;

impl Shape {
    /// Whether no run of the threads can bring this about.
    #[inline]
    pub fn forbids(&self, outcome: &Outcome) -> bool {
        let holds = |fact: &Fact| match *fact {
            Fact::Seen(role, register, value) => outcome.seen[role][register] == value,
            Fact::End(place, value) => outcome.ends[place as usize] == value,
        };
        self.ends.iter().zip(outcome.ends).any(|(must, is)| must.is_some_and(|must| must != is))
            || self.forbidden.iter().any(|facts| facts.iter().all(holds))
    }
}

use Fact::{End, Seen};
use Op::{Acquire, Exchange, Fence, Locked, Nothing, Read, Release, Stores, Stream, Write};
use Place::{X, Y};

/// How many shapes there are.
pub const COUNT: usize = 17;

/// All shapes, in the order of the output.
pub const SHAPES: [Shape; COUNT] = [
    Shape {
        name: "MP, release and acquire",
        threads: [[Write(X, 1), Release(Y, 1), Nothing], [Acquire(Y, 0), Read(X, 1), Nothing]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(1, 0, 1), Seen(1, 1, 0)]],
    },
    Shape {
        name: "MP, full fences",
        threads: [[Write(X, 1), Fence, Write(Y, 1)], [Read(Y, 0), Fence, Read(X, 1)]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(1, 0, 1), Seen(1, 1, 0)]],
    },
    Shape {
        name: "MP, store past the caches and store fence",
        threads: [[Stream(X, 1), Stores, Write(Y, 1)], [Acquire(Y, 0), Read(X, 1), Nothing]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(1, 0, 1), Seen(1, 1, 0)]],
    },
    Shape {
        name: "SB, full fences",
        threads: [[Write(X, 1), Fence, Read(Y, 0)], [Write(Y, 1), Fence, Read(X, 0)]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(0, 0, 0), Seen(1, 0, 0)]],
    },
    Shape {
        name: "SB, locked operations",
        threads: [[Write(X, 1), Locked, Read(Y, 0)], [Write(Y, 1), Locked, Read(X, 0)]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(0, 0, 0), Seen(1, 0, 0)]],
    },
    Shape {
        name: "SB, exchanges",
        threads: [[Exchange(X, 1), Acquire(Y, 0), Nothing], [Exchange(Y, 1), Acquire(X, 0), Nothing]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(0, 0, 0), Seen(1, 0, 0)]],
    },
    Shape {
        // Intel's example "loads may be reordered with earlier stores to different locations": every outcome is allowed
        name: "SB, nothing between",
        threads: [[Write(X, 1), Read(Y, 0), Nothing], [Write(Y, 1), Read(X, 0), Nothing]],
        ends: [Some(1), Some(1)],
        forbidden: &[],
    },
    Shape {
        name: "LB, acquire",
        threads: [[Acquire(X, 0), Write(Y, 1), Nothing], [Acquire(Y, 0), Write(X, 1), Nothing]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(0, 0, 1), Seen(1, 0, 1)]],
    },
    Shape {
        name: "S, release and acquire",
        threads: [[Write(X, 2), Release(Y, 1), Nothing], [Acquire(Y, 0), Write(X, 1), Nothing]],
        ends: [None, Some(1)],
        forbidden: &[&[Seen(1, 0, 1), End(X, 2)], &[End(X, 0)]],
    },
    Shape {
        name: "R, full fences",
        threads: [[Write(X, 1), Fence, Write(Y, 1)], [Write(Y, 2), Fence, Read(X, 0)]],
        ends: [Some(1), None],
        forbidden: &[&[Seen(1, 0, 0), End(Y, 2)], &[End(Y, 0)]],
    },
    Shape {
        name: "2+2W, releases",
        threads: [[Write(X, 1), Release(Y, 2), Nothing], [Write(Y, 1), Release(X, 2), Nothing]],
        ends: [None, None],
        forbidden: &[&[End(X, 1), End(Y, 1)], &[End(X, 0)], &[End(Y, 0)]],
    },
    Shape {
        name: "CoRR",
        threads: [[Write(X, 1), Nothing, Nothing], [Read(X, 0), Read(X, 1), Nothing]],
        ends: [Some(1), Some(0)],
        forbidden: &[&[Seen(1, 0, 1), Seen(1, 1, 0)]],
    },
    Shape {
        name: "CoWW, read twice",
        threads: [[Write(X, 1), Write(X, 2), Nothing], [Read(X, 0), Read(X, 1), Nothing]],
        ends: [Some(2), Some(0)],
        forbidden: &[&[Seen(1, 0, 1), Seen(1, 1, 0)], &[Seen(1, 0, 2), Seen(1, 1, 0)], &[Seen(1, 0, 2), Seen(1, 1, 1)]],
    },
    Shape {
        name: "CoRW",
        threads: [[Read(X, 0), Write(X, 1), Nothing], [Write(X, 2), Nothing, Nothing]],
        ends: [None, Some(0)],
        forbidden: &[&[Seen(0, 0, 1)], &[Seen(0, 0, 2), End(X, 2)], &[End(X, 0)]],
    },
    Shape {
        name: "CoWR",
        threads: [[Write(X, 1), Read(X, 0), Nothing], [Write(X, 2), Nothing, Nothing]],
        ends: [None, Some(0)],
        forbidden: &[&[Seen(0, 0, 0)], &[Seen(0, 0, 2), End(X, 1)], &[End(X, 0)]],
    },
    Shape {
        // Intel's example "intra-processor forwarding is allowed": both may see their own store first, but each must see it
        name: "SB with forwarding",
        threads: [[Write(X, 1), Read(X, 0), Read(Y, 1)], [Write(Y, 1), Read(Y, 0), Read(X, 1)]],
        ends: [Some(1), Some(1)],
        forbidden: &[&[Seen(0, 0, 0)], &[Seen(1, 0, 0)]],
    },
    Shape {
        name: "exchanges of one place",
        threads: [[Exchange(X, 1), Read(X, 0), Nothing], [Exchange(X, 2), Read(X, 0), Nothing]],
        ends: [None, Some(0)],
        forbidden: &[
            &[Seen(0, 0, 0)],
            &[Seen(1, 0, 0)],
            &[Seen(0, 0, 2), End(X, 1)],
            &[Seen(1, 0, 1), End(X, 2)],
            &[End(X, 0)],
        ],
    },
];

#[cfg(test)]
#[path = "common_shapes_tests.rs"]
mod tests;
