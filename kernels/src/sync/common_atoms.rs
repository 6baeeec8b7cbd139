//! Read-modify-write in one piece, in every width: what the locked forms of each instruction set have to offer.

use std::fmt::Debug;
use std::sync::atomic::{AtomicU8, AtomicU16, AtomicU32, AtomicU64, Ordering};

/// An unsigned integer of 8, 16, 32 or 64 bits that has an atomic cell.
pub trait Width: Copy + PartialEq + Debug + Send + Sync + 'static {
    /// The cell.
    type Cell: Debug + Send + Sync;
    /// Bits in it.
    const BITS: u32;
    /// A cell with a value.
    fn cell(value: Self) -> Self::Cell;
    /// The low bits of a word.
    fn cut(word: u64) -> Self;
    /// Zero-extended.
    fn word(self) -> u64;
    /// A plain load (relaxed).
    fn load(cell: &Self::Cell) -> Self;
    /// A plain store (relaxed).
    fn store(cell: &Self::Cell, value: Self);
}

macro_rules! width {
    ($type:ty, $cell:ty) => {
        impl Width for $type {
            type Cell = $cell;
            const BITS: u32 = <$type>::BITS;
            #[inline(always)]
            fn cell(value: $type) -> $cell {
                <$cell>::new(value)
            }
            #[inline(always)]
            fn cut(word: u64) -> $type {
                word as $type
            }
            #[inline(always)]
            fn word(self) -> u64 {
                self as u64
            }
            #[inline(always)]
            fn load(cell: &$cell) -> $type {
                cell.load(Ordering::Relaxed)
            }
            #[inline(always)]
            fn store(cell: &$cell, value: $type) {
                cell.store(value, Ordering::Relaxed);
            }
        }
    };
}

width!(u8, AtomicU8);
width!(u16, AtomicU16);
width!(u32, AtomicU32);
width!(u64, AtomicU64);

/// Two words that one instruction may replace together.
#[repr(C, align(16))]
#[derive(Debug, Default)]
pub struct Pair(pub [AtomicU64; 2]);

/// Locked operations on cells of one width. All are sequentially consistent or acquire and release.
pub trait Locked<W: Width>: Copy {
    /// cell + x
    fn add(self, cell: &W::Cell, x: W);
    /// cell + 1
    fn inc(self, cell: &W::Cell);
    /// cell + x + 1: with the carry set
    fn adc(self, cell: &W::Cell, x: W);
    /// cell − x
    fn sub(self, cell: &W::Cell, x: W);
    /// cell − 1
    fn dec(self, cell: &W::Cell);
    /// cell − x − 1: with the borrow set
    fn sbb(self, cell: &W::Cell, x: W);
    /// cell | x
    fn or(self, cell: &W::Cell, x: W);
    /// cell & x
    fn and(self, cell: &W::Cell, x: W);
    /// cell ^ x
    fn xor(self, cell: &W::Cell, x: W);
    /// ¬cell
    fn not(self, cell: &W::Cell);
    /// −cell
    fn neg(self, cell: &W::Cell);
    /// Sets the bit; what it was.
    fn set(self, cell: &W::Cell, bit: u32) -> bool;
    /// Clears the bit; what it was.
    fn clear(self, cell: &W::Cell, bit: u32) -> bool;
    /// Changes the bit; what it was.
    fn toggle(self, cell: &W::Cell, bit: u32) -> bool;
    /// cell + x by exchange-and-add; what it was.
    fn exchange_add(self, cell: &W::Cell, x: W) -> W;
    /// Writes `new` where the cell holds `expected`; what it held.
    fn compare(self, cell: &W::Cell, expected: W, new: W) -> W;
    /// Writes x; what it was.
    fn swap(self, cell: &W::Cell, x: W) -> W;

    /// cell + x by compare-and-swap, repeated until nothing came between; what it was.
    #[inline(always)]
    fn compare_add(self, cell: &W::Cell, x: W) -> W {
        let mut expected = W::load(cell);
        loop {
            let seen = self.compare(cell, expected, W::cut(expected.word().wrapping_add(x.word())));
            if seen == expected {
                return seen;
            }
            expected = seen;
        }
    }
}

/// Locked operations in all widths.
pub trait Atoms: Locked<u8> + Locked<u16> + Locked<u32> + Locked<u64> {
    /// cell + x by the compare-and-swap of two 32-bit halves, where there is one; what it was.
    fn halves_add(self, cell: &AtomicU64, x: u64) -> u64;
    /// Adds a word to each of the pair, without a carry between them; what they were. Both at once or one after the
    /// other, as the instruction set has it.
    fn pair_add(self, pair: &Pair, x: [u64; 2]) -> [u64; 2];
    /// No load after it is done before any store ahead of it has been seen by everyone.
    fn fence(self);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn width<W: Width, A: Locked<W>>(a: A) {
        let m = u64::MAX >> (64 - W::BITS);
        for x in [0, 1, 0x8080_8080_8080_8080, 0x0123_4567_89ab_cdefu64, 0xfedc_ba98_7654_3210, u64::MAX] {
            for y in [0x1111_2222_3333_4444u64, u64::MAX, 0x80, 0x7fff_ffff_ffff_ff7f] {
                let cell = W::cell(W::cut(x));
                let mut right = x & m;
                let mut check = |name: &str, value: u64| {
                    right = value & m;
                    assert_eq!(W::load(&cell).word(), right, "{name} {x:#x} {y:#x} in {} bits", W::BITS);
                    right
                };
                a.add(&cell, W::cut(y));
                let v = check("add", x.wrapping_add(y));
                a.inc(&cell);
                let v = check("inc", v.wrapping_add(1));
                a.adc(&cell, W::cut(y));
                let v = check("adc", v.wrapping_add(y).wrapping_add(1));
                a.sub(&cell, W::cut(x));
                let v = check("sub", v.wrapping_sub(x));
                a.dec(&cell);
                let v = check("dec", v.wrapping_sub(1));
                a.sbb(&cell, W::cut(x));
                let v = check("sbb", v.wrapping_sub(x).wrapping_sub(1));
                a.xor(&cell, W::cut(y));
                let v = check("xor", v ^ y);
                a.or(&cell, W::cut(x));
                let v = check("or", v | x);
                a.and(&cell, W::cut(y.rotate_left(3)));
                let v = check("and", v & y.rotate_left(3));
                a.not(&cell);
                let v = check("not", !v);
                a.neg(&cell);
                let mut v = check("neg", v.wrapping_neg());
                for bit in [0, 3, W::BITS - 1] {
                    assert_eq!(a.toggle(&cell, bit), v >> bit & 1 == 1);
                    v = check("toggle", v ^ 1 << bit);
                    assert_eq!(a.set(&cell, bit), v >> bit & 1 == 1);
                    v = check("set", v | 1 << bit);
                    assert_eq!(a.clear(&cell, bit), v >> bit & 1 == 1);
                    v = check("clear", v & !(1 << bit));
                }
                assert_eq!(a.exchange_add(&cell, W::cut(y)).word(), v);
                let v = check("exchange_add", v.wrapping_add(y));
                assert_eq!(a.compare_add(&cell, W::cut(x)).word(), v);
                let v = check("compare_add", v.wrapping_add(x));
                assert_eq!(a.compare(&cell, W::cut(!v), W::cut(y)).word(), v);
                let v = check("compare that fails", v);
                assert_eq!(a.swap(&cell, W::cut(y)).word(), v);
                check("swap", y);
            }
        }
    }

    /// Every operation against the language's own arithmetic, alone on one thread.
    pub fn all<A: Atoms>(a: A) {
        width::<u8, A>(a);
        width::<u16, A>(a);
        width::<u32, A>(a);
        width::<u64, A>(a);
        let cell = AtomicU64::new(u64::MAX - 5);
        assert_eq!(a.halves_add(&cell, 0x1_0000_0007), u64::MAX - 5);
        assert_eq!(cell.into_inner(), 0x1_0000_0001);
        let pair = Pair([AtomicU64::new(u64::MAX), AtomicU64::new(9)]);
        assert_eq!(a.pair_add(&pair, [2, 1 << 63]), [u64::MAX, 9]);
        assert_eq!(pair.0.map(AtomicU64::into_inner), [1, 1 << 63 | 9]);
        a.fence();
    }

    #[test]
    #[cfg(target_arch = "x86_64")]
    fn operations_are_the_arithmetic_they_claim() {
        use crate::isa::Feature;
        use crate::sync::common_atoms_x86::X86;
        all(X86::baseline());
        if Feature::Cmpxchg16b.present() {
            // SAFETY: the line above proved cmpxchg16b
            all(unsafe { X86::wide() });
        }
    }

    #[test]
    #[cfg(target_arch = "aarch64")]
    fn operations_are_the_arithmetic_they_claim() {
        use crate::isa::Feature;
        use crate::sync::common_atoms_arm::{Exclusive, Lse};
        all(Exclusive);
        if Feature::ArmLse.present() {
            // SAFETY: the line above proved lse
            all(unsafe { Lse::new() });
        }
    }
}
