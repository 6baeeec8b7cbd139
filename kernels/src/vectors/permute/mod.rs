//! Permutations of the bytes of blocks of 64, alone or in pairs, by each instruction set's own moves.
//!
//! Every function moves each byte somewhere and none twice, so that a block of which every byte is different stays so.
//! "Lane" is a 16-byte quarter of a block, "half" its 32 bytes; elements are counted from the lowest address.

#[cfg(target_arch = "x86_64")]
pub mod avx2;
#[cfg(target_arch = "x86_64")]
pub mod avx512;
#[cfg(target_arch = "aarch64")]
pub mod neon;
#[cfg(target_arch = "x86_64")]
pub mod sse2;

use super::Line;

/// Which of a block's sixteen 32-bit elements goes to each place, in the forms that the instruction sets want.
#[derive(Clone, Copy, Debug)]
pub struct Order {
    /// Source element of each place, as sixteen little-endian 32-bit numbers below 16.
    pub elements: Line,
    /// Source byte of each byte, below 64.
    pub bytes: Line,
}

impl Order {
    /// From source elements below 16.
    pub fn new(from: [u8; 16]) -> Order {
        Order {
            elements: Line(std::array::from_fn(|i| if i % 4 == 0 { from[i / 4] & 15 } else { 0 })),
            bytes: Line(std::array::from_fn(|i| 4 * (from[i / 4] & 15) + (i % 4) as u8)),
        }
    }
}

/// One round of `vector.permute`, on the blocks `$p[0]` … `$p[3]` with the four orders `$o`.
#[doc(hidden)]
#[macro_export]
macro_rules! permute_round {
    ($p:ident, $o:expr) => {{
        $p[0] = elements::<0>($p[0], &$o[0]);
        $p[1] = elements::<1>($p[1], &$o[1]);
        $p[2] = elements::<2>($p[2], &$o[2]);
        $p[3] = elements::<3>($p[3], &$o[3]);
        $p[0] = swap32($p[0]);
        $p[1] = swap64($p[1]);
        $p[2] = turn32($p[2]);
        $p[3] = turn16($p[3]);
        ($p[0], $p[1]) = zip32($p[0], $p[1]);
        ($p[2], $p[3]) = zip64($p[2], $p[3]);
        $p[0] = up64($p[0]);
        $p[1] = down64($p[1]);
        $p[2] = middle64($p[2]);
        $p[3] = swap128($p[3]);
        ($p[0], $p[2]) = change32($p[0], $p[2]);
        ($p[1], $p[3]) = change64($p[1], $p[3]);
        $p[0] = first32($p[0]);
        $p[1] = first64($p[1]);
        $p[2] = turn512($p[2]);
        $p[3] = lanes($p[3]);
        ($p[0], $p[3]) = change16($p[0], $p[3]);
        ($p[1], $p[2]) = align($p[1], $p[2]);
        ($p[0], $p[1]) = split32($p[0], $p[1]);
        ($p[2], $p[3]) = halves($p[2], $p[3]);
        ($p[0], $p[2]) = odd64($p[0], $p[2]);
        ($p[1], $p[3]) = mix32($p[1], $p[3]);
    }};
}
