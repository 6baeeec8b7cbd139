//! Vector instructions, one function each, as kernels want them: the instruction itself and nothing that a compiler
//! would rather have.
//!
//! The compiler knows what its intrinsics mean and may put another instruction in their place, or none. So each function
//! is the instruction's own mnemonic in assembly, and where an instruction set lacks one, its result is made from others.
//!
//! One module an instruction set, all with the same names, so that one text of a kernel ([`integer_round!`] and its like)
//! does for all of them. A register `V` holds [`WIDTH`](sse2::WIDTH) bytes, that is one or more blocks of 16 bytes side
//! by side; every function treats each block by itself and in the same way, whatever the hardware's lanes are. Names end
//! with the width in bits of the elements that an operation looks at; `s` and `u` before it mean signed and unsigned.

#![expect(
    clippy::missing_safety_doc,
    reason = "safe functions: calling them is unsafe only where their target features are not enabled, as for any such function"
)]

#[cfg(target_arch = "x86_64")]
#[macro_use]
mod encodings;
#[macro_use]
pub mod dot8;
#[macro_use]
mod integer_round;
#[macro_use]
pub mod mask;
#[macro_use]
pub mod permute;

#[cfg(target_arch = "x86_64")]
pub mod avx2;
#[cfg(target_arch = "x86_64")]
pub mod avx512;
#[cfg(target_arch = "aarch64")]
pub mod neon;
#[cfg(target_arch = "x86_64")]
pub mod sse2;
#[cfg(target_arch = "x86_64")]
mod sse2_made;

/// One line of operands: 16 bytes for each of four nets.
#[repr(C, align(64))]
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Line(pub [u8; 64]);

impl Line {
    /// Eight little-endian words.
    pub fn from_words(words: [u64; 8]) -> Line {
        let mut bytes = [0; 64];
        for (place, word) in bytes.as_chunks_mut::<8>().0.iter_mut().zip(words) {
            *place = word.to_le_bytes();
        }
        Line(bytes)
    }

    /// The inverse of [`Line::from_words`].
    pub fn to_words(self) -> [u64; 8] {
        std::array::from_fn(|i| u64::from_le_bytes(self.0.as_chunks::<8>().0[i]))
    }
}
