//! Cipher and hash units: AES rounds, SHA-256 rounds, and the same work in plain integer code.

pub mod aes;
mod common_aes;
#[cfg(target_arch = "aarch64")]
mod common_aes_arm;
mod common_aes_soft;
#[cfg(target_arch = "x86_64")]
mod common_aes_x86;
#[cfg(target_arch = "aarch64")]
mod common_sha_arm;
#[cfg(target_arch = "x86_64")]
mod common_sha_x86;
pub mod sha256;
