//! One store or one load of 1 to 32 bytes at any address, by instructions that the compiler can neither leave out nor answer itself.

/// Single stores and loads. A value of the type is the evidence that its instructions may run.
///
/// Forms 0–3 differ in the instruction, and in whether a general or a vector register takes part, never in the effect. The bytes are
/// those of up to four words, little endian.
pub trait Touch: Copy {
    /// Stores the first `BYTES` bytes of `words`.
    ///
    /// # Safety
    /// `to` must be writable for `BYTES` bytes; 1, 2, 4, 8, 16 or 32.
    unsafe fn store<const BYTES: usize, const FORM: usize>(self, words: &[u64; 4], to: *mut u8);
    /// Loads `BYTES` bytes; what is beyond them is zero.
    ///
    /// # Safety
    /// `from` must be readable for `BYTES` bytes; 1, 2, 4, 8, 16 or 32.
    unsafe fn load<const BYTES: usize, const FORM: usize>(self, from: *const u8) -> [u64; 4];
}
