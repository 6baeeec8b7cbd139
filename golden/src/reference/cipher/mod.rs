//! References of the cipher family.

pub mod aes;
pub mod sha256;
