//! Byte moves: every alignment, every short length, overlaps, string instructions.

mod common_moves;
#[cfg(target_arch = "x86_64")]
mod common_moves_x86;
mod common_wide;
#[cfg(target_arch = "aarch64")]
mod common_wide_arm;
#[cfg(target_arch = "x86_64")]
mod common_wide_x86;
pub mod copy;
