//! References of the vector family.

pub mod dot8;
pub mod gather;
pub mod integer;
pub mod mask;
pub mod permute;
pub mod shuffle;
