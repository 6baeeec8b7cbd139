//! Checksums: the CRC instruction, and CRC by carry-less multiplication.

pub mod clmul;
#[cfg(target_arch = "aarch64")]
mod common_clmul_arm;
mod common_clmul_soft;
#[cfg(target_arch = "x86_64")]
mod common_clmul_x86;
mod common_steps;
pub mod crc32c;
