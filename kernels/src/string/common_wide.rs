//! Strings by vectors of 32 bytes at any address: whole vectors, and one that overlaps the last of them at the end that is left.

use super::common_moves::{Moves, element, put, shift, sums};

/// Vector instructions. A value of the type is the evidence that they may run.
pub trait Wide: Copy {
    /// 32 bytes.
    type V: Copy;
    /// 16 bytes.
    type H: Copy;

    /// Loads 32 bytes; widths may differ in the instruction.
    ///
    /// # Safety
    /// They must be readable.
    unsafe fn load<const WIDTH: usize>(self, from: *const u8) -> Self::V;
    /// Stores 32 bytes.
    ///
    /// # Safety
    /// They must be writable.
    unsafe fn store<const WIDTH: usize>(self, v: Self::V, to: *mut u8);
    /// Loads 16 bytes.
    ///
    /// # Safety
    /// They must be readable.
    unsafe fn load_half(self, from: *const u8) -> Self::H;
    /// Stores 16 bytes.
    ///
    /// # Safety
    /// They must be writable.
    unsafe fn store_half(self, v: Self::H, to: *mut u8);
    /// The low bytes of `value` in every element.
    fn splat(self, width: usize, value: u64) -> Self::V;
    /// The lower half.
    fn low(self, v: Self::V) -> Self::H;
    /// A bit for each byte in which both differ.
    ///
    /// # Safety
    /// Both must be readable for 32 bytes.
    unsafe fn unequal(self, a: *const u8, b: *const u8) -> u32;
    /// Bits for all bytes of each element that is equal to that of `v`.
    ///
    /// # Safety
    /// `a` must be readable for 32 bytes.
    unsafe fn equal(self, a: *const u8, width: usize, v: Self::V) -> u32;
}

/// Strings by these vectors.
#[derive(Clone, Copy)]
pub struct Vectors<W>(pub W);

/// The lowest `bytes` bits.
#[inline(always)]
fn lowest(bytes: usize) -> u32 {
    ((1u64 << bytes) - 1) as u32
}

impl<W: Wide> Vectors<W> {
    /// At most 32 bytes, everything loaded before anything is stored.
    ///
    /// # Safety
    /// As for [`Moves::copy`].
    #[inline(always)]
    unsafe fn short(self, from: *const u8, to: *mut u8, len: usize) {
        // SAFETY: both loads and both stores are within `len` bytes, which the caller gives
        unsafe {
            if len >= 16 {
                let (head, tail) = (self.0.load_half(from), self.0.load_half(from.add(len - 16)));
                self.0.store_half(head, to);
                self.0.store_half(tail, to.add(len - 16));
                return;
            }
            for width in [8, 4, 2] {
                if len >= width {
                    let (head, tail) = (element(from, width), element(from.add(len - width), width));
                    put(to, width, head);
                    put(to.add(len - width), width, tail);
                    return;
                }
            }
            if len == 1 {
                put(to, 1, element(from, 1));
            }
        }
    }

    #[inline(always)]
    unsafe fn upwards<const WIDTH: usize>(self, from: *const u8, to: *mut u8, len: usize) {
        // SAFETY: len ≥ 32, and every vector ends at or before `len`; the last is loaded before a store can reach its bytes
        unsafe {
            let tail = self.0.load::<WIDTH>(from.add(len - 32));
            for at in (0..len - 31).step_by(32) {
                self.0.store::<WIDTH>(self.0.load::<WIDTH>(from.add(at)), to.add(at));
            }
            self.0.store::<WIDTH>(tail, to.add(len - 32));
        }
    }

    #[inline(always)]
    unsafe fn downwards<const WIDTH: usize>(self, from: *const u8, to: *mut u8, len: usize) {
        // SAFETY: len ≥ 32, and every vector begins at or after 0; the first is loaded before a store can reach its bytes
        unsafe {
            let head = self.0.load::<WIDTH>(from);
            let mut end = len;
            while end >= 32 {
                self.0.store::<WIDTH>(self.0.load::<WIDTH>(from.add(end - 32)), to.add(end - 32));
                end -= 32;
            }
            self.0.store::<WIDTH>(head, to);
        }
    }
}

impl<W: Wide> Moves for Vectors<W> {
    #[inline(always)]
    unsafe fn copy(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        // SAFETY: the caller gives `len` bytes on both sides
        unsafe {
            match width {
                _ if len < 32 => self.short(from, to, len),
                1 => self.upwards::<1>(from, to, len),
                2 => self.upwards::<2>(from, to, len),
                4 => self.upwards::<4>(from, to, len),
                _ => self.upwards::<8>(from, to, len),
            }
        }
    }

    #[inline(always)]
    unsafe fn copy_back(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        // SAFETY: the caller gives `len` bytes on both sides
        unsafe {
            match width {
                _ if len < 32 => self.short(from, to, len),
                1 => self.downwards::<1>(from, to, len),
                2 => self.downwards::<2>(from, to, len),
                4 => self.downwards::<4>(from, to, len),
                _ => self.downwards::<8>(from, to, len),
            }
        }
    }

    #[inline(always)]
    unsafe fn pieces(self, from: *const u8, to: *mut u8, len: usize) {
        let mut at = 0;
        // SAFETY: every piece ends at or before `len`, in regions that the caller gives
        unsafe {
            while len - at >= 64 {
                let (a, b) = (self.0.load::<4>(from.add(at)), self.0.load::<8>(from.add(at + 32)));
                self.0.store::<8>(a, to.add(at));
                self.0.store::<4>(b, to.add(at + 32));
                at += 64;
            }
            if len & 32 != 0 {
                self.0.store::<2>(self.0.load::<2>(from.add(at)), to.add(at));
                at += 32;
            }
            if len & 16 != 0 {
                self.0.store_half(self.0.load_half(from.add(at)), to.add(at));
                at += 16;
            }
            for width in [8, 4, 2, 1] {
                if len & width != 0 {
                    shift(from.add(at), to.add(at), width);
                    at += width;
                }
            }
        }
    }

    #[inline(always)]
    unsafe fn fill(self, to: *mut u8, count: usize, width: usize, value: u64) {
        let len = count * width;
        let v = self.0.splat(width, value);
        // SAFETY: every store is within `len` bytes, which the caller gives, and begins at a multiple of `width`, or, as a power of
        // two of bytes, ends at `len`, which is one as well
        unsafe {
            if len >= 32 {
                for at in (0..len - 31).step_by(32) {
                    self.0.store::<1>(v, to.add(at));
                }
                self.0.store::<4>(v, to.add(len - 32));
            } else if len >= 16 {
                self.0.store_half(self.0.low(v), to);
                self.0.store_half(self.0.low(v), to.add(len - 16));
            } else {
                (0..count).for_each(|i| put(to.add(i * width), width, std::hint::black_box(value)));
            }
        }
    }

    #[inline(always)]
    unsafe fn fill_back(self, to: *mut u8, count: usize, width: usize, value: u64) {
        let mut end = count * width;
        let v = self.0.splat(width, value);
        // SAFETY: every store begins at or after 0 and ends at or before the end of what the caller gives
        unsafe {
            while end >= 32 {
                self.0.store::<8>(v, to.add(end - 32));
                end -= 32;
            }
            if end >= 16 {
                self.0.store_half(self.0.low(v), to.add(end - 16));
                end -= 16;
            }
            (0..end / width).rev().for_each(|i| put(to.add(i * width), width, std::hint::black_box(value)));
        }
    }

    #[inline(always)]
    unsafe fn differ(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        let len = count * width;
        for at in (0..len).step_by(32) {
            // SAFETY: a vector begins within `len` bytes; the caller gives 32 more
            let bits = unsafe { self.0.unequal(a.add(at), b.add(at)) } & lowest((len - at).min(32));
            if bits != 0 {
                return (at + bits.trailing_zeros() as usize) / width;
            }
        }
        count
    }

    #[inline(always)]
    unsafe fn differ_back(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        let mut end = count * width;
        while end > 0 {
            let at = end.saturating_sub(32);
            // SAFETY: a vector begins within the elements; the caller gives 32 bytes more
            let bits = unsafe { self.0.unequal(a.add(at), b.add(at)) } & lowest(end - at);
            if bits != 0 {
                return (at + 31 - bits.leading_zeros() as usize) / width + 1;
            }
            end = at;
        }
        0
    }

    #[inline(always)]
    unsafe fn find(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let (len, v) = (count * width, self.0.splat(width, value));
        for at in (0..len).step_by(32) {
            // SAFETY: a vector begins within `len` bytes; the caller gives 32 more
            let bits = unsafe { self.0.equal(a.add(at), width, v) } & lowest((len - at).min(32));
            if bits != 0 {
                return (at + bits.trailing_zeros() as usize) / width;
            }
        }
        count
    }

    #[inline(always)]
    unsafe fn find_back(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let (mut end, v) = (count * width, self.0.splat(width, value));
        while end > 0 {
            let at = end.saturating_sub(32);
            // SAFETY: a vector begins within the elements; the caller gives 32 bytes more
            let bits = unsafe { self.0.equal(a.add(at), width, v) } & lowest(end - at);
            if bits != 0 {
                return (at + 31 - bits.leading_zeros() as usize) / width + 1;
            }
            end = at;
        }
        0
    }

    #[inline(always)]
    unsafe fn read(self, a: *const u8, count: usize, width: usize) -> u64 {
        // SAFETY: the caller gives `count` readable elements
        unsafe { sums(a, count, width) }
    }
}
