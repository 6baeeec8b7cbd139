//! References of the checksum family.

pub mod clmul;
pub mod crc32c;
