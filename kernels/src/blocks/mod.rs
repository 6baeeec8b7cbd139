//! Blocks of 32 bytes and the ways in which vector units move bytes about in them.
//!
//! [`Blocks`] is one register of one or more blocks side by side, each shuffled by itself under the same control, so
//! that a 64-byte register does for two blocks what a 32-byte register does for one. Names and semantics follow the
//! 256-bit x86 instructions named beside each operation; "lane" is a 16-byte half of a block.

#[cfg(target_arch = "x86_64")]
pub mod avx2;
#[cfg(target_arch = "x86_64")]
pub mod avx512;
#[cfg(target_arch = "aarch64")]
pub mod neon;
pub mod portable;

/// 32 bytes in memory.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[repr(C, align(32))]
pub struct Block(pub [u8; 32]);

impl Block {
    /// Four little-endian words.
    pub fn from_words(words: [u64; 4]) -> Block {
        let mut bytes = [0; 32];
        for (place, word) in bytes.chunks_exact_mut(8).zip(words) {
            place.copy_from_slice(&word.to_le_bytes());
        }
        Block(bytes)
    }

    /// The inverse of [`Block::from_words`].
    pub fn to_words(self) -> [u64; 4] {
        std::array::from_fn(|i| u64::from_le_bytes(std::array::from_fn(|b| self.0[8 * i + b])))
    }
}

/// Which of a block's eight 32-bit elements goes to each place, in the forms that the instruction sets want.
#[derive(Clone, Copy, Debug)]
pub struct Elements {
    /// Source element of each place, below 8, as eight little-endian 32-bit numbers.
    pub elements: Block,
    /// Source byte of each byte, below 32.
    #[cfg(target_arch = "aarch64")]
    pub bytes: Block,
}

impl Elements {
    /// From source elements below 8.
    pub fn new(from: [u8; 8]) -> Elements {
        let mut elements = [0; 32];
        for (place, &source) in from.iter().enumerate() {
            elements[4 * place] = source & 7;
        }
        Elements {
            elements: Block(elements),
            #[cfg(target_arch = "aarch64")]
            bytes: Block(std::array::from_fn(|b| 4 * (from[b / 4] & 7) + (b % 4) as u8)),
        }
    }
}

/// One register of [`Blocks::WIDTH`] blocks. A value exists only where its instructions do, which whoever makes the
/// first one by `load` or `splat` has to know; everything else is safe from there on. Methods are inlined into a
/// function that has the features enabled.
pub trait Blocks: Copy {
    /// Blocks in one register.
    const WIDTH: usize;

    /// The k-th block of each of the first [`Blocks::WIDTH`] nets.
    ///
    /// # Safety
    /// The CPU must have the implementing type's features.
    unsafe fn load<const N: usize>(nets: &[[Block; N]], k: usize) -> Self;
    /// The inverse of [`Blocks::load`].
    fn store<const N: usize>(self, nets: &mut [[Block; N]], k: usize);
    /// The same block in every place.
    ///
    /// # Safety
    /// The CPU must have the implementing type's features.
    unsafe fn splat(block: &Block) -> Self;

    /// `vpshufb`: within each lane, byte i becomes byte `control[i] & 15`, or 0 where `control[i]` has bit 7.
    /// Bits 4 to 6 of a control must be 0: instruction sets differ in what they make of them.
    fn shuffle_bytes(self, control: Self) -> Self;
    /// `vpermd`: across lanes, element i of 32 bits becomes element `from[i]`.
    fn permute_elements(self, from: &Elements) -> Self;
    /// `vpermq`: across lanes, word i of 64 bits becomes word `(ORDER >> 2i) & 3`.
    fn permute_words<const ORDER: i32>(self) -> Self;
    /// `vpalignr`: within each lane, bytes `BYTES` to `BYTES + 15` of the lane of `low` followed by that of `self`.
    fn align<const BYTES: i32>(self, low: Self) -> Self;
    /// `vpblendvb`: the byte of `other` where the mask's byte has bit 7, else that of `self`.
    fn blend(self, other: Self, mask: Self) -> Self;
    /// `vpunpcklbw`: within each lane, the low 8 bytes of `self` and `other`, alternating.
    fn zip8_low(self, other: Self) -> Self;
    /// `vpunpckhbw`: the same for the high 8 bytes.
    fn zip8_high(self, other: Self) -> Self;
    /// `vpunpcklwd`: as [`Blocks::zip8_low`] with elements of 16 bits.
    fn zip16_low(self, other: Self) -> Self;
    /// `vpunpckhwd`.
    fn zip16_high(self, other: Self) -> Self;
    /// `vpunpckldq`: with elements of 32 bits.
    fn zip32_low(self, other: Self) -> Self;
    /// `vpunpckhdq`.
    fn zip32_high(self, other: Self) -> Self;
    /// `vpunpcklqdq`: with elements of 64 bits.
    fn zip64_low(self, other: Self) -> Self;
    /// `vpunpckhqdq`.
    fn zip64_high(self, other: Self) -> Self;
    /// `vperm2i128` with 0x20: the low lane of `self`, then that of `other`.
    fn low_lanes(self, other: Self) -> Self;
    /// `vperm2i128` with 0x31: the high lane of `self`, then that of `other`.
    fn high_lanes(self, other: Self) -> Self;
    /// `vpackuswb`: within each lane the eight signed 16-bit numbers of `self`, then those of `other`, as bytes,
    /// saturating at 0 and 255.
    fn pack(self, other: Self) -> Self;
    /// `vpaddq`: 64-bit sums.
    fn add(self, other: Self) -> Self;
    /// `vpand`.
    fn and(self, other: Self) -> Self;
}
