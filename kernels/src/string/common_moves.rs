//! What can be done with strings of bytes, and how it is done without any special instruction.

/// Byte moves, fills, comparisons and searches. A value of the type is the evidence that its instructions may run.
///
/// A width is 1, 2, 4 or 8: the bytes of one element, little endian, at any address.
pub trait Moves: Copy {
    /// Moves `len` bytes from low addresses to high ones, elements of `width` first and the bytes that are left last: right for
    /// separate regions and for a move down over itself.
    ///
    /// # Safety
    /// `from` must be readable and `to` writable for `len` bytes.
    unsafe fn copy(self, from: *const u8, to: *mut u8, len: usize, width: usize);
    /// The same from high addresses to low ones: right for separate regions and for a move up over itself.
    ///
    /// # Safety
    /// As for [`Moves::copy`].
    unsafe fn copy_back(self, from: *const u8, to: *mut u8, len: usize, width: usize);
    /// Copies between separate regions, in pieces whose lengths are powers of two, the longest first.
    ///
    /// # Safety
    /// As for [`Moves::copy`]; the regions must not overlap.
    unsafe fn pieces(self, from: *const u8, to: *mut u8, len: usize);
    /// Writes `count` elements, each the low bytes of `value`.
    ///
    /// # Safety
    /// `to` must be writable for that many elements.
    unsafe fn fill(self, to: *mut u8, count: usize, width: usize, value: u64);
    /// The same, the last element first.
    ///
    /// # Safety
    /// As for [`Moves::fill`].
    unsafe fn fill_back(self, to: *mut u8, count: usize, width: usize, value: u64);
    /// Index of the first of `count` elements in which both differ, or `count`.
    ///
    /// # Safety
    /// Both must be readable for that many elements and 32 bytes more.
    unsafe fn differ(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize;
    /// One more than the index of the last element in which both differ, or 0.
    ///
    /// # Safety
    /// As for [`Moves::differ`].
    unsafe fn differ_back(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize;
    /// Index of the first of `count` elements that is the low bytes of `value`, or `count`.
    ///
    /// # Safety
    /// `a` must be readable for that many elements and 32 bytes more.
    unsafe fn find(self, a: *const u8, count: usize, width: usize, value: u64) -> usize;
    /// One more than the index of the last such element, or 0.
    ///
    /// # Safety
    /// As for [`Moves::find`].
    unsafe fn find_back(self, a: *const u8, count: usize, width: usize, value: u64) -> usize;
    /// Sum a of `count` elements and sum b of all the a on the way, as a + F · b.
    ///
    /// # Safety
    /// `a` must be readable for that many elements.
    unsafe fn read(self, a: *const u8, count: usize, width: usize) -> u64;
}

/// The odd constant F.
pub const F: u64 = 0xa24b_aed4_963e_e407;

/// The element at this address.
///
/// # Safety
/// It must be readable for `width` bytes.
#[inline(always)]
pub unsafe fn element(at: *const u8, width: usize) -> u64 {
    // SAFETY: the caller gives `width` readable bytes
    unsafe {
        match width {
            1 => u64::from(at.read()),
            2 => u64::from(at.cast::<u16>().read_unaligned()),
            4 => u64::from(at.cast::<u32>().read_unaligned()),
            _ => at.cast::<u64>().read_unaligned(),
        }
    }
}

/// Writes the low bytes of `value` as an element.
///
/// # Safety
/// It must be writable for `width` bytes.
#[inline(always)]
pub unsafe fn put(to: *mut u8, width: usize, value: u64) {
    // SAFETY: the caller gives `width` writable bytes
    unsafe {
        match width {
            1 => to.write(value as u8),
            2 => to.cast::<u16>().write_unaligned(value as u16),
            4 => to.cast::<u32>().write_unaligned(value as u32),
            _ => to.cast::<u64>().write_unaligned(value),
        }
    }
}

/// Moves one element, through a value that the compiler knows nothing of: it would make a loop of moves a library call.
///
/// # Safety
/// `from` must be readable and `to` writable for `width` bytes.
#[inline(always)]
pub unsafe fn shift(from: *const u8, to: *mut u8, width: usize) {
    // SAFETY: the caller gives `width` bytes on both sides; the assembly is empty
    unsafe {
        let mut value = element(from, width);
        std::arch::asm!("/* {0} */", inout(reg) value, options(nomem, nostack, preserves_flags));
        put(to, width, value);
    }
}

/// The sums of [`Moves::read`] by plain loads.
///
/// # Safety
/// As for [`Moves::read`].
#[inline(always)]
pub unsafe fn sums(at: *const u8, count: usize, width: usize) -> u64 {
    let (mut a, mut b) = (0u64, 0u64);
    for i in 0..count {
        // SAFETY: the caller gives `count` readable elements
        a = a.wrapping_add(unsafe { element(at.add(i * width), width) });
        b = b.wrapping_add(a);
    }
    a.wrapping_add(b.wrapping_mul(F))
}

/// Element after element.
#[cfg(any(test, not(target_arch = "x86_64")))]
#[derive(Clone, Copy)]
pub struct Plain;

#[cfg(any(test, not(target_arch = "x86_64")))]
impl Moves for Plain {
    #[inline(always)]
    unsafe fn copy(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        let whole = len / width * width;
        for i in (0..whole).step_by(width) {
            // SAFETY: i + width ≤ len
            unsafe { shift(from.add(i), to.add(i), width) };
        }
        for i in whole..len {
            // SAFETY: i < len
            unsafe { shift(from.add(i), to.add(i), 1) };
        }
    }

    #[inline(always)]
    unsafe fn copy_back(self, from: *const u8, to: *mut u8, len: usize, width: usize) {
        let rest = len % width;
        for i in (rest..len).step_by(width).rev() {
            // SAFETY: i + width ≤ len
            unsafe { shift(from.add(i), to.add(i), width) };
        }
        for i in (0..rest).rev() {
            // SAFETY: i < len
            unsafe { shift(from.add(i), to.add(i), 1) };
        }
    }

    #[inline(always)]
    unsafe fn pieces(self, from: *const u8, to: *mut u8, len: usize) {
        let mut at = 0;
        for width in [8, 4, 2, 1] {
            while len - at >= width {
                // SAFETY: at + width ≤ len
                unsafe { shift(from.add(at), to.add(at), width) };
                at += width;
            }
        }
    }

    #[inline(always)]
    unsafe fn fill(self, to: *mut u8, count: usize, width: usize, value: u64) {
        // SAFETY: the caller gives `count` writable elements
        (0..count).for_each(|i| unsafe { put(to.add(i * width), width, std::hint::black_box(value)) });
    }

    #[inline(always)]
    unsafe fn fill_back(self, to: *mut u8, count: usize, width: usize, value: u64) {
        // SAFETY: the caller gives `count` writable elements
        (0..count).rev().for_each(|i| unsafe { put(to.add(i * width), width, std::hint::black_box(value)) });
    }

    #[inline(always)]
    unsafe fn differ(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        // SAFETY: the caller gives `count` readable elements on both sides
        let unequal = |&i: &usize| unsafe { element(a.add(i * width), width) != element(b.add(i * width), width) };
        (0..count).find(unequal).unwrap_or(count)
    }

    #[inline(always)]
    unsafe fn differ_back(self, a: *const u8, b: *const u8, count: usize, width: usize) -> usize {
        // SAFETY: the caller gives `count` readable elements on both sides
        let unequal = |&i: &usize| unsafe { element(a.add(i * width), width) != element(b.add(i * width), width) };
        (0..count).rev().find(unequal).map_or(0, |i| i + 1)
    }

    #[inline(always)]
    unsafe fn find(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let value = value << (64 - 8 * width) >> (64 - 8 * width);
        // SAFETY: the caller gives `count` readable elements
        (0..count).find(|i| unsafe { element(a.add(i * width), width) } == value).unwrap_or(count)
    }

    #[inline(always)]
    unsafe fn find_back(self, a: *const u8, count: usize, width: usize, value: u64) -> usize {
        let value = value << (64 - 8 * width) >> (64 - 8 * width);
        // SAFETY: the caller gives `count` readable elements
        (0..count).rev().find(|i| unsafe { element(a.add(i * width), width) } == value).map_or(0, |i| i + 1)
    }

    #[inline(always)]
    unsafe fn read(self, a: *const u8, count: usize, width: usize) -> u64 {
        // SAFETY: the caller gives `count` readable elements
        unsafe { sums(a, count, width) }
    }
}
