//! One line of 64 bytes in registers, as eight lanes of 64 bits, over one instruction set.

use crate::aligned::Line;

/// The operations that march and copy need. A value of the type is the evidence that its instructions may run.
pub trait Lanes: Copy {
    /// Eight lanes, lane 0 at the lowest address.
    type V: Copy;

    /// Into registers.
    fn of(self, words: [u64; 8]) -> Self::V;
    /// Out of registers.
    fn words(self, v: Self::V) -> [u64; 8];
    /// Lane-wise sum mod 2⁶⁴.
    fn add(self, a: Self::V, b: Self::V) -> Self::V;
    /// In every lane the high half xored onto the low half: v ⊕ (v >> 32).
    fn fold(self, a: Self::V) -> Self::V;
    /// Loads 64 bytes at any address.
    ///
    /// # Safety
    /// `from` must be readable for 64 bytes.
    unsafe fn load(self, from: *const u8) -> Self::V;
    /// Stores 64 bytes at any address.
    ///
    /// # Safety
    /// `to` must be writable for 64 bytes.
    unsafe fn store(self, v: Self::V, to: *mut u8);

    /// Calls for the line at this address, which may be any: it is not touched. Nothing where the instruction set has no such hint.
    #[inline(always)]
    fn prefetch(self, _from: *const u8) {}

    /// Loads a whole line.
    #[inline(always)]
    fn read(self, line: &Line) -> Self::V {
        // SAFETY: a line is 64 readable bytes
        unsafe { self.load((&raw const *line).cast()) }
    }

    /// Stores a whole line.
    #[inline(always)]
    fn write(self, v: Self::V, line: &mut Line) {
        // SAFETY: a line is 64 writable bytes
        unsafe { self.store(v, (&raw mut *line).cast()) }
    }
}

/// 64-bit words on the baseline instruction set.
#[derive(Clone, Copy)]
pub struct Words;

impl Lanes for Words {
    type V = [u64; 8];

    #[inline(always)]
    fn of(self, words: [u64; 8]) -> [u64; 8] {
        words
    }

    #[inline(always)]
    fn words(self, v: [u64; 8]) -> [u64; 8] {
        v
    }

    #[inline(always)]
    fn add(self, a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        std::array::from_fn(|l| a[l].wrapping_add(b[l]))
    }

    #[inline(always)]
    fn fold(self, a: [u64; 8]) -> [u64; 8] {
        a.map(|x| x ^ x >> 32)
    }

    #[inline(always)]
    unsafe fn load(self, from: *const u8) -> [u64; 8] {
        // SAFETY: the caller gives 64 readable bytes
        unsafe { from.cast::<[u64; 8]>().read_unaligned() }
    }

    #[inline(always)]
    unsafe fn store(self, v: [u64; 8], to: *mut u8) {
        // SAFETY: the caller gives 64 writable bytes
        unsafe { to.cast::<[u64; 8]>().write_unaligned(v) }
    }
}
