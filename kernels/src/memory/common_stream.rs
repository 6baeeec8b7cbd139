//! Stores that go around the caches, prefetches, fences: what `memory.stream` needs over `Lanes`.

use super::common_lanes::{Lanes, Words};

/// Kinds of store: 0–3 go around the caches where the instruction set has such stores, 4–7 do not.
pub const BYPASS: usize = 0;
/// The first kind of ordinary store.
pub const ORDINARY: usize = 4;

/// Loads and stores of a line by named instructions, hints and fences. Kinds differ in the instruction only, never in the effect.
pub trait Streams: Lanes {
    /// Stores a line by kind 0–7.
    ///
    /// # Safety
    /// `to` must be writable for 64 bytes and aligned to them.
    unsafe fn put<const KIND: usize>(self, v: Self::V, to: *mut u8);
    /// Loads a line by kind 0–3.
    ///
    /// # Safety
    /// `from` must be readable for 64 bytes and aligned to them.
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> Self::V;
    /// Calls for the line at this address, which may be any, by kind 0–3.
    fn call<const KIND: usize>(self, _at: *const u8) {}
    /// Calls for the line at this address, which may be any, to be written.
    ///
    /// # Safety
    /// On x86 the CPU must have `prefetchw`.
    unsafe fn claim(self, _at: *const u8) {}
    /// Orders the stores before against those that follow.
    fn stores(self);
    /// Orders the loads before against those that follow.
    fn loads(self);
    /// Orders everything before against everything that follows.
    fn both(self);
}

/// Ordinary stores of the baseline.
impl Streams for Words {
    #[inline(always)]
    unsafe fn put<const KIND: usize>(self, v: [u64; 8], to: *mut u8) {
        // SAFETY: the caller gives 64 writable bytes on a line
        unsafe { to.cast::<[u64; 8]>().write(v) };
    }

    #[inline(always)]
    unsafe fn take<const KIND: usize>(self, from: *const u8) -> [u64; 8] {
        // SAFETY: the caller gives 64 readable bytes on a line
        unsafe { from.cast::<[u64; 8]>().read() }
    }

    #[inline(always)]
    fn stores(self) {
        std::sync::atomic::fence(std::sync::atomic::Ordering::Release);
    }

    #[inline(always)]
    fn loads(self) {
        std::sync::atomic::fence(std::sync::atomic::Ordering::Acquire);
    }

    #[inline(always)]
    fn both(self) {
        std::sync::atomic::fence(std::sync::atomic::Ordering::SeqCst);
    }
}
